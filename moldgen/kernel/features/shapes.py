"""Solids and booleans with the checks that the kernel leaves out: one solid, valid, volume as it must be."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Final

import numpy as np
from OCP.Bnd import Bnd_Box
from OCP.BRepAlgoAPI import BRepAlgoAPI_Common, BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_Copy,
    BRepBuilderAPI_MakeFace,
    BRepBuilderAPI_MakePolygon,
    BRepBuilderAPI_MakeSolid,
    BRepBuilderAPI_Sewing,
    BRepBuilderAPI_Transform,
)
from OCP.BRepLib import BRepLib
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools
from OCP.gp import gp_Trsf
from OCP.ShapeUpgrade import ShapeUpgrade_UnifySameDomain
from OCP.TopoDS import TopoDS, TopoDS_Shape

from moldgen.errors import KernelError, PartError
from moldgen.kernel.features.frame import pnt
from moldgen.kernel.guard import operation, present
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.topology import faces_of, only_solid, shape_list, solids_of

LEAST_CHANGE: Final = 1e-6
"""mm^3: a feature that changes the volume by less did nothing."""

BOX_SAG: Final = 0.05
"""mm, sag of the mesh behind `rough_box`."""

VOLUME_SLACK: Final = 4e-3
"""Relative error granted to the kernel's default volume integration (2.6e-3 measured on spline faces)."""

_BOOLEANS: Final = {"add": BRepAlgoAPI_Fuse, "cut": BRepAlgoAPI_Cut, "intersect": BRepAlgoAPI_Common}
_VERBS: Final = {"add": "join", "cut": "cut", "intersect": "intersect"}


def combine(mode: str, body: TopoDS_Shape, tools: Sequence[TopoDS_Shape]) -> TopoDS_Shape:
    """Return the body after adding, cutting or intersecting with the tools, as one valid solid."""
    return combine_sized(mode, body, tools, volume(body))[0]


def combine_sized(
    mode: str, body: TopoDS_Shape, tools: Sequence[TopoDS_Shape], size: float
) -> tuple[TopoDS_Shape, float]:
    """Return the body after adding, cutting or intersecting with the tools, as one valid solid, and its volume [mm^3].

    Parameters
    ----------
    mode : ``add``, ``cut`` or ``intersect``
    body, tools : solids
    size : volume of the body [mm^3]: on spline faces it takes the kernel a while, so nobody asks twice

    Raises
    ------
    PartError : nothing or several pieces are left
    KernelError : the kernel fails, or returns something invalid or with an impossible volume
    """
    verb = _VERBS[mode]
    with operation(f"{verb} bodies", operands=(body, *tools)):
        algorithm = _BOOLEANS[mode]()
        algorithm.SetArguments(shape_list([body]))
        algorithm.SetTools(shape_list(tools))
        algorithm.Build()
        raw = present(algorithm.Shape() if algorithm.IsDone() else None, f"{verb} bodies")
    pieces = len(solids_of(raw))
    if pieces == 0:
        raise PartError(f"nothing is left after the {verb}", remedy="check sizes and places of the bodies")
    if pieces > 1:
        raise PartError(f"the body falls into {pieces} pieces", remedy="let the bodies overlap, or cut less")
    after = volume(raw)
    _check_volume(mode, after, size, sum(volume(t) for t in tools))
    return tidy(only_solid(raw), after), after


def _check_volume(mode: str, after: float, body: float, tools: float) -> None:
    """A boolean can be done, valid and wrong: hold its volume against what set algebra allows."""
    slack = VOLUME_SLACK * (body + tools)
    low, high = {"add": (body, body + tools), "cut": (body - tools, body), "intersect": (0.0, min(body, tools))}[mode]
    if not low - slack <= after <= high + slack:
        raise KernelError(
            f"{_VERBS[mode]} gave {after:.4g} mm^3, which must lie between {low:.4g} and {high:.4g} mm^3",
            remedy="move the feature by 0.01 mm so that faces do not nearly coincide",
        )


def tidy(solid: TopoDS_Shape, size: float) -> TopoDS_Shape:
    """Return the solid with faces of one surface joined, if that leaves it valid and its volume `size` [mm^3]."""
    with operation("join faces of one surface", operands=(solid,)):
        unify = ShapeUpgrade_UnifySameDomain(solid, True, True, False)
        unify.Build()
        joined = unify.Shape()
    pieces = [] if joined is None or joined.IsNull() else solids_of(joined)
    if len(pieces) == 1 and len(faces_of(pieces[0])) == len(faces_of(solid)):
        pieces = []  # nothing was joined: keep the solid that was checked already
    if len(pieces) == 1 and np.isclose(volume(pieces[0]), size, rtol=1e-5, atol=1e-9) and is_valid(pieces[0]):
        solid = pieces[0]
    # a copy drops the leftovers of the boolean that make later ones fail
    return only_solid(BRepBuilderAPI_Copy(solid).Shape())


def rough_box(shape: TopoDS_Shape) -> tuple[np.ndarray, np.ndarray]:
    """Return the axis-parallel box, lower and upper corner, (3,), (3,) [mm], up to about BOX_SAG too large or small.

    The exact box of a body with spline faces takes the kernel minutes.
    """
    BRepMesh_IncrementalMesh(shape, BOX_SAG, False, 0.5)
    box = Bnd_Box()
    BRepBndLib.Add_s(shape, box, True)
    BRepTools.Clean_s(shape)  # the validity check would judge the mesh too
    return np.array(box.CornerMin().Coord()), np.array(box.CornerMax().Coord())


def polyhedron(corners: Sequence[np.ndarray], faces: Iterable[Sequence[int]]) -> TopoDS_Shape:
    """Return the solid bounded by planar faces.

    Parameters
    ----------
    corners : points, (3,) each [mm]
    faces : indices of the corners of each face, in order round it
    """
    with operation("build a polyhedron"):
        sewing = BRepBuilderAPI_Sewing(1e-7)
        for face in faces:
            polygon = BRepBuilderAPI_MakePolygon()
            for index in face:
                polygon.Add(pnt(corners[index]))
            polygon.Close()
            sewing.Add(BRepBuilderAPI_MakeFace(polygon.Wire(), True).Face())
        sewing.Perform()
        solid = BRepBuilderAPI_MakeSolid(TopoDS.Shell_s(sewing.SewedShape())).Solid()
        BRepLib.OrientClosedSolid_s(solid)
    return solid


def moved(shape: TopoDS_Shape, transformation: gp_Trsf) -> TopoDS_Shape:
    """Return a moved or mirrored copy with geometry of its own."""
    return BRepBuilderAPI_Transform(shape, transformation, True).Shape()


def checked_solid(shape: TopoDS_Shape | None, what: str) -> TopoDS_Shape:
    """Return the one valid solid, with positive volume, in a kernel result.

    Raises
    ------
    PartError : there is none, more than one, or it is not valid
    """
    pieces = [] if shape is None or shape.IsNull() else solids_of(shape)
    if len(pieces) != 1:
        raise PartError(f"{what} gives {len(pieces)} solids instead of one", remedy="check its sizes")
    solid, size = pieces[0], volume(pieces[0])
    if size < 0:
        solid = TopoDS.Solid_s(solid.Reversed())
    if abs(size) < LEAST_CHANGE or not is_valid(solid):
        raise PartError(f"{what} gives a solid that crosses itself or is empty", remedy="check its sizes")
    return solid


def boundary(shapes: Iterable[TopoDS_Shape]) -> tuple[TopoDS_Shape, ...]:
    """Return all faces of the shapes."""
    return tuple(face for shape in shapes for face in faces_of(shape))
