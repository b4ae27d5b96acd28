"""Splitting faces of a body along curves, touching as few faces as possible."""

from __future__ import annotations

from collections.abc import Sequence

from OCP.BRepAlgoAPI import BRepAlgoAPI_Splitter
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy
from OCP.TopAbs import TopAbs_VERTEX
from OCP.TopoDS import TopoDS_Shape
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.measure import is_valid
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import compound_of, explore, faces_of, only_solid, shape_list


def split_shape(shape: TopoDS_Shape, tools: Sequence[TopoDS_Shape]) -> TopoDS_Shape:
    """Return `shape` with its faces and edges split by the tools (edges or vertices that lie on it).

    Raises
    ------
    KernelError : the splitter gave up
    """
    splitter = BRepAlgoAPI_Splitter()
    splitter.SetArguments(shape_list([shape]))
    splitter.SetTools(shape_list(tools))
    splitter.SetNonDestructive(True)
    splitter.SetRunParallel(False)
    splitter.Build()
    if not splitter.IsDone() or splitter.Shape() is None:
        raise KernelError(f"splitting with {len(tools)} curves failed")
    return splitter.Shape()


def split_faces(body: Body, touched: Sequence[int], tools: Sequence[TopoDS_Shape]) -> Body:
    """Return the body with the touched faces split; every other face is kept as it is.

    First only the touched faces and those that share a vertex with them are split and put back; where that does not
    close, the whole solid is split.

    Raises
    ------
    KernelError : neither way gives a valid solid
    """
    near = _with_vertex_neighbours(body, set(touched))
    pieces = faces_of(split_shape(compound_of([body.faces[i] for i in sorted(near)]), tools))
    kept = [f for i, f in enumerate(body.faces) if i not in near]
    result = solid_from_faces(kept + pieces)
    if not result.complaint:
        return body.like(result.solid)
    # after a whole split the kernel's result shares history with its argument: later cuts fail unless it is copied
    whole = BRepBuilderAPI_Copy(only_solid(split_shape(body.solid, tools))).Shape()
    if not is_valid(whole):
        raise KernelError(f"splitting {len(touched)} faces left an invalid solid ({result.complaint})")
    return body.like(whole)


def _with_vertex_neighbours(body: Body, touched: set[int]) -> set[int]:
    corners = TopTools_IndexedMapOfShape()
    for number in touched:
        for vertex in explore(body.faces[number], TopAbs_VERTEX):
            corners.Add(vertex)
    near = set(touched)
    for number, face in enumerate(body.faces):
        if number not in near and any(corners.Contains(v) for v in explore(face, TopAbs_VERTEX)):
            near.add(number)
    return near
