"""What touches without being joined: slits of no width, a solid that meets itself along an edge, lumps side by side."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import Final

import numpy as np
from OCP.BOPAlgo import BOPAlgo_MakerVolume
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepAlgoAPI import BRepAlgoAPI_Fuse
from OCP.BRepExtrema import BRepExtrema_DistShapeShape
from OCP.gp import gp_Pnt, gp_Vec
from OCP.ShapeUpgrade import ShapeUpgrade_UnifySameDomain
from OCP.TopoDS import TopoDS, TopoDS_Face, TopoDS_Shape, TopoDS_Solid

from moldgen.errors import KernelError, PartError
from moldgen.finding import Point
from moldgen.kernel.guard import operation
from moldgen.kernel.heal_doubles import without_doubles
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.rehearse import made_apart
from moldgen.kernel.topology import (
    edge_faces_map,
    edge_points,
    faces_of,
    is_reversed,
    shape_list,
    solids_of,
    vertex_point,
    vertices_of,
)
from moldgen.model.part import HealNote

SAME_VOLUME: Final = 1e-6
"""Relative change of volume that joining may cause: bodies that only touch lose nothing."""

TOUCHING: Final = 1e-6
"""Bodies nearer than this touch [mm] (our choice: ten times the kernel's own precision)."""

BACK_TO_BACK: Final = -0.5
"""Largest cosine between the normals of two faces of one slit: exactly -1 but where their parameters differ."""

MOST_LUMPS: Final = 12
"""More bodies in one product are not tried to be joined: a file of many bodies is an assembly (our choice)."""

LIMIT_S: Final = 30


def without_slits(solid: TopoDS_Solid, volume_mm3: float) -> tuple[TopoDS_Solid, tuple[HealNote, ...]]:
    """Return the solid without slits of no width: pairs of faces that lie on each other, back to back.

    Raises
    ------
    PartError : it has some, and the kernel cannot close them; with their place
    """
    places = _slits(solid)
    if not places:
        return solid, ()
    with operation("close slits of no width", operands=(solid,)):
        try:
            made = [s for shape in made_apart(lambda: [_volume_of(solid)], LIMIT_S) for s in solids_of(shape)]
        except KernelError:
            made = []
        if len(made) == 1 and is_valid(made[0]) and abs(volume(made[0]) - volume_mm3) < SAME_VOLUME * volume_mm3:
            change = volume(made[0]) - volume_mm3
            what = f"slits of no width closed, at {_named(places)}"
            return TopoDS.Solid_s(made[0]), (HealNote(what, len(places), change),)
    raise PartError(
        f"the solid has {len(places)} slits of no width that could not be closed",
        where=_named(places),
        remedy="join both sides of each slit in the CAD, or give it a width",
    )


def refuse_touching_itself(solid: TopoDS_Solid) -> None:
    """Pass if no edge of the solid belongs to more than two faces.

    Raises
    ------
    PartError : some do; with their places
    """
    links, places = edge_faces_map(solid), []
    for i in range(1, links.Extent() + 1):
        edge = TopoDS.Edge_s(links.FindKey(i))
        if links.FindFromIndex(i).Size() > 2 and not BRep_Tool.Degenerated_s(edge):
            places.append(_point(edge_points(edge, 3)[1]))
    if places:
        raise PartError(
            f"the solid touches itself along {len(places)} edges: there plastic and steel have no thickness",
            where=_named(sorted(places)),
            remedy="part both sides by a gap, or join them by a wall or a fillet",
        )


def joined(solids: Sequence[TopoDS_Shape]) -> tuple[TopoDS_Shape | None, str]:
    """Return solids that touch face to face as one, or None and how they lie to each other."""
    if len(solids) > MOST_LUMPS:
        return None, ""
    with operation("join bodies that touch", operands=tuple(solids)):
        try:
            made = [s for shape in made_apart(lambda: [_fused(solids)], LIMIT_S) for s in solids_of(shape)]
        except KernelError:
            return None, ""
        total = sum(abs(volume(s)) for s in solids)
        now = sum(abs(volume(s)) for s in made)
        if total - now > SAME_VOLUME * total:
            return None, f"they overlap by {total - now:.6g} mm^3"
        if len(made) == 1 and is_valid(made[0]):
            return made[0], ""
        return None, _contacts(solids)


def _fused(solids: Sequence[TopoDS_Shape]) -> TopoDS_Shape:
    fuse = BRepAlgoAPI_Fuse()
    fuse.SetArguments(shape_list(solids[:1]))
    fuse.SetTools(shape_list(solids[1:]))
    fuse.Build()
    return _merged(fuse.Shape())


def _volume_of(solid: TopoDS_Shape) -> TopoDS_Shape:
    """Return what the faces enclose, without those that have plastic on both sides."""
    maker = BOPAlgo_MakerVolume()
    maker.SetArguments(shape_list(faces_of(solid)))
    maker.SetIntersect(True)
    maker.SetAvoidInternalShapes(True)
    maker.Perform()
    return _merged(maker.Shape())


def _merged(shape: TopoDS_Shape) -> TopoDS_Shape:
    merger = ShapeUpgrade_UnifySameDomain(shape, True, True, False)
    merger.Build()
    return merger.Shape()


def _contacts(solids: Sequence[TopoDS_Shape]) -> str:
    found = []
    for (i, one), (k, other) in combinations(enumerate(solids, start=1), 2):
        nearest = BRepExtrema_DistShapeShape(one, other)
        if nearest.IsDone() and nearest.Value() < TOUCHING:
            found.append(f"{i} and {k} touch at {_named([_point(np.array(nearest.PointOnShape1(1).Coord()))])}")
    return "no common face joins all of them" + (": " + "; ".join(found) if found else "")


def _slits(solid: TopoDS_Shape) -> list[Point]:
    """Return the middle of each pair of faces that lie on each other, back to back."""
    alike: dict[tuple[tuple[float, ...], ...], list[TopoDS_Shape]] = {}
    for face in faces_of(solid):
        corners = tuple(sorted(tuple(np.round(vertex_point(v), 3).tolist()) for v in vertices_of(face)))
        alike.setdefault(corners, []).append(face)
    places = []
    for corners, faces in alike.items():
        for one, other in combinations([TopoDS.Face_s(f) for f in faces], 2):
            if len(without_doubles([one, other])) == 1 and _outward(one) @ _outward(other) < BACK_TO_BACK:
                places.append(_point(np.mean(corners, axis=0)))
    return sorted(places)


def _outward(face: TopoDS_Face) -> np.ndarray:
    """Return the unit normal in the middle of a face's parameters, out of the solid, (3,)."""
    surface = BRepAdaptor_Surface(face)
    u = 0.5 * (surface.FirstUParameter() + surface.LastUParameter())
    v = 0.5 * (surface.FirstVParameter() + surface.LastVParameter())
    at, along_u, along_v = gp_Pnt(), gp_Vec(), gp_Vec()
    surface.D1(u, v, at, along_u, along_v)
    normal = np.array(along_u.Crossed(along_v).Coord())
    normal /= max(float(np.linalg.norm(normal)), 1e-300)
    return np.asarray(-normal if is_reversed(face) else normal)


def _point(at: np.ndarray) -> Point:
    x, y, z = (float(value) for value in at)
    return x, y, z


def _named(places: Sequence[Point]) -> str:
    return "; ".join(f"{x:.3f}, {y:.3f}, {z:.3f}" for x, y, z in places[:5])
