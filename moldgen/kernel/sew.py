"""Close a surface model or an open shell, or say where it is open."""

from __future__ import annotations

from typing import Final

from OCP.BRep import BRep_Tool
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeSolid, BRepBuilderAPI_Sewing
from OCP.BRepLib import BRepLib
from OCP.TopAbs import TopAbs_SHELL
from OCP.TopoDS import TopoDS, TopoDS_Shape, TopoDS_Solid

from moldgen.errors import PartError
from moldgen.finding import Point
from moldgen.kernel.guard import operation
from moldgen.kernel.topology import compound_of, edge_faces_map, edge_points, explore, faces_of
from moldgen.tolerances import MAX_EDGE_TOLERANCE

SEWING_STEPS: Final = (1e-4, 1e-3, 1e-2, MAX_EDGE_TOLERANCE)
"""Gaps that are tried to be closed, in this order [mm]: the smallest that closes the shell moves the least."""

_MOST_NAMED: Final = 5


def open_edges(shape: TopoDS_Shape) -> list[Point]:
    """Return the middle of each edge that only one face uses, [mm]; a closed shape has none."""
    links = edge_faces_map(shape)
    found = []
    for i in range(1, links.Extent() + 1):
        edge = TopoDS.Edge_s(links.FindKey(i))
        if links.FindFromIndex(i).Size() == 1 and not BRep_Tool.Degenerated_s(edge):
            x, y, z = (float(v) for v in edge_points(edge, 3)[1])
            found.append((x, y, z))
    return sorted(found)


def close(shape: TopoDS_Shape) -> tuple[TopoDS_Solid, float]:
    """Return one solid sewn from the faces of `shape`, and the gap [mm] that had to be closed.

    Raises
    ------
    PartError : the faces do not enclose one volume: it names the open edges
    """
    faces = faces_of(shape)
    sewn = shape
    for gap in SEWING_STEPS:
        with operation("sew the faces of an open shell", operands=(shape,), faces=len(faces), gap_mm=gap):
            sewing = BRepBuilderAPI_Sewing(gap)
            sewing.Add(compound_of(faces))
            sewing.Perform()
            sewn = sewing.SewedShape()
        shells = explore(sewn, TopAbs_SHELL)
        if len(shells) == 1 and not open_edges(sewn):
            with operation("make a solid of a closed shell", operands=(sewn,)):
                solid = BRepBuilderAPI_MakeSolid(TopoDS.Shell_s(shells[0])).Solid()
                BRepLib.OrientClosedSolid_s(solid)
            return solid, gap
    raise PartError(
        f"the surfaces do not enclose a volume: {_named(open_edges(sewn))}, also after closing gaps of up to "
        f"{MAX_EDGE_TOLERANCE:g} mm",
        remedy="close the part in the CAD and export it as one solid",
    )


def _named(places: list[Point]) -> str:
    if not places:
        return "the faces form several shells"
    text = "; ".join(f"{x:.3f}, {y:.3f}, {z:.3f}" for x, y, z in places[:_MOST_NAMED])
    more = f" and {len(places) - _MOST_NAMED} more" if len(places) > _MOST_NAMED else ""
    return f"{len(places)} open edges, at {text}{more}"
