"""Faces that close a loop of edges: plane, on a neighbour's surface, or filled."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from OCP.BOPTools import BOPTools_AlgoTools2D
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace
from OCP.BRepFill import BRepFill_Filling
from OCP.Geom import Geom_Surface
from OCP.GeomAbs import GeomAbs_C0, GeomAbs_Cone, GeomAbs_Cylinder, GeomAbs_Sphere
from OCP.ShapeFix import ShapeFix_Face
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_FORWARD, TopAbs_WIRE
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward, forward, plane_face, plane_through, wire_of
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import area, is_valid
from moldgen.kernel.polygon import contains, signed_area
from moldgen.kernel.topology import directed_points, edges_of, explore, same_order
from moldgen.tolerances import MAX_EDGE_TOLERANCE

PLANE_FIT = 1e-4
"""mm: a loop that leaves its best plane by no more (or by its own edge tolerance) is flat."""

SAME_PLANE = 1e-3
"""mm: loops whose planes are this close share one face with holes."""

FILLING_DEGREES = (3, 2)
"""Degrees of the energy that a filling minimises, in the order in which they are tried."""

SLACK_SKIN = 1.5
"""Area of a filling over the largest area of a minimal surface, from which it is not believed."""

_ROUND = {
    GeomAbs_Cylinder: BRepAdaptor_Surface.Cylinder,
    GeomAbs_Cone: BRepAdaptor_Surface.Cone,
    GeomAbs_Sphere: BRepAdaptor_Surface.Sphere,
}

Loop = Sequence[TopoDS_Edge]


@dataclass(frozen=True)
class FlatPatch:
    """One plane face and the numbers of the loops that bound it: the outer one first."""

    face: TopoDS_Face
    loops: tuple[int, ...]


@dataclass(frozen=True)
class _Flat:
    number: int
    normal: np.ndarray
    centre: np.ndarray
    points: np.ndarray


def flat_patches(loops: Sequence[Loop]) -> list[FlatPatch]:
    """Return plane faces for all flat loops; loops of one plane that lie inside each other share a face with holes."""
    flats = [f for f in (_flat(i, loop) for i, loop in enumerate(loops)) if f is not None]
    groups: list[list[_Flat]] = []
    for flat in flats:
        for group in groups:
            if _coplanar(group[0], flat):
                group.append(flat)
                break
        else:
            groups.append([flat])
    return [patch for group in groups for patch in _nested(group, loops)]


def host_patch(body: Body, loop: Loop) -> TopoDS_Face | None:
    """Return a face that closes a loop on the surface of a neighbour whose boundary holds the whole loop.

    The hole in a curved wall is closed by the wall's own surface. None when there is no such neighbour, or when the
    loop runs round the axis of the wall, which then does not close it.
    """
    numbers = [body.edge_index.FindIndex(e) - 1 for e in loop]
    if min(numbers) < 0:
        return None
    for face in sorted({int(f) for n in numbers for f in body.edge_faces[n]}):
        if body.surface_kind(face) == "torus":  # a torus closes on itself both ways: either side would do
            continue
        around = same_order(edges_of(body.faces[face]))
        if all(around.Contains(e) for e in loop):
            patch = _wire_of_host(body.faces[face], loop) or _across_seam(body.faces[face], loop)
            if patch is not None and not _same_region(patch, body.faces[face]):
                return patch
    return None


def _wire_of_host(host: TopoDS_Face, loop: Loop) -> TopoDS_Face | None:
    """Return the face inside a wire of the host: its curves on the surface are there already."""
    edges = same_order(loop)
    for wire in explore(host, TopAbs_WIRE):
        own = explore(wire, TopAbs_EDGE)
        if len(own) == len(loop) and all(edges.Contains(e) for e in own):
            bare = TopoDS.Face_s(host.Oriented(TopAbs_FORWARD).EmptyCopied())
            return _inside(bare, TopoDS.Wire_s(wire))
    return None


def _across_seam(host: TopoDS_Face, loop: Loop) -> TopoDS_Face | None:
    """Return the face inside a loop over the seam of a round wall, on the same surface turned until the seam is away.

    Other surfaces, and loops round the axis, give None.
    """
    adaptor = BRepAdaptor_Surface(host)
    kind = adaptor.GetType()
    if kind not in _ROUND:
        return None
    position = _ROUND[kind](adaptor).Position()
    frame = np.array([position.XDirection().Coord(), position.YDirection().Coord()])
    across = (loop_points(loop, 16) - position.Location().Coord()) @ frame.T
    angle = np.unwrap(np.arctan2(across[:, 1], across[:, 0]))
    if np.ptp(angle) > 0.9 * math.pi:
        return None
    turn = float(angle.mean()) - math.pi
    surface = BRep_Tool.Surface_s(host).Copy()
    surface.Rotate(position.Axis(), turn if position.Direct() else -turn)
    return _trimmed(surface, loop)


def filled_patch(loop: Loop) -> TopoDS_Face:
    """Return a smooth face through the loop (the kernel's energy-minimising filling, position continuity only).

    Raises
    ------
    KernelError : the kernel finds none that is valid and as large as a skin over this loop can be
    """
    for degree in FILLING_DEGREES:
        with operation("fill a loop of edges", operands=loop):
            filling = BRepFill_Filling(degree, 15, 2, False, 1e-5, 1e-4, 1e-2, 1e-1, 8, 9)
            for edge in loop:
                filling.Add(forward(edge), GeomAbs_C0)
            filling.Build()
        if not filling.IsDone():
            continue
        patch = _mended(BRep_Tool.Surface_s(filling.Face()), loop)
        if patch is not None and area(patch) < _largest_skin(loop):
            return patch
    raise KernelError(f"the kernel finds no sound filling for a loop of {len(loop)} edges")


def _largest_skin(loop: Loop) -> float:
    """Return the area [mm^2] that a taut skin over a loop cannot exceed: length^2 / 4 pi (isoperimetric inequality of
    minimal surfaces), with room for a skin that is not quite taut. The kernel once made one of 800 000 mm^2.
    """
    points = loop_points(loop, 32)
    length = float(np.linalg.norm(np.roll(points, -1, axis=0) - points, axis=1).sum())
    return SLACK_SKIN * length**2 / (4.0 * math.pi)


def loop_points(loop: Loop, count: int) -> np.ndarray:
    """Return points along a closed loop of directed edges, `count` per edge without its end, (n, 3) [mm]."""
    return np.vstack([directed_points(e, count + 1)[:-1] for e in loop])


def _flat(number: int, loop: Loop) -> _Flat | None:
    points = np.vstack([directed_points(e, 9) for e in loop])
    centre = points.mean(axis=0)
    normal = np.linalg.svd(points - centre)[2][2]
    allowed = max(PLANE_FIT, min(MAX_EDGE_TOLERANCE, 1.01 * max(BRep_Tool.Tolerance_s(e) for e in loop)))
    if np.abs((points - centre) @ normal).max() >= allowed:
        return None
    normal = normal * np.sign(normal[np.argmax(np.abs(normal))])
    return _Flat(number, normal, centre, loop_points(loop, 8))


def _coplanar(one: _Flat, other: _Flat) -> bool:
    parallel = abs(one.normal @ other.normal) > 1 - 1e-6
    return bool(parallel and abs(one.normal @ (other.centre - one.centre)) < SAME_PLANE)


def _nested(group: list[_Flat], loops: Sequence[Loop]) -> list[FlatPatch]:
    """Sort coplanar loops into outlines and the holes directly inside them, and make the faces that are valid."""
    normal, centre = group[0].normal, group[0].centre
    first = np.cross(normal, [1.0, 0, 0] if abs(normal[0]) < 0.9 else [0, 1.0, 0])
    first /= np.linalg.norm(first)
    axes = np.column_stack([first, np.cross(normal, first)])
    plan = {f.number: f.points @ axes for f in group}
    signed = {n: signed_area(p) for n, p in plan.items()}
    hole_of: dict[int, int] = {}
    for number in sorted(plan, key=lambda n: -abs(signed[n])):
        around = [
            o
            for o in plan
            if o != number and abs(signed[o]) > abs(signed[number]) and _lies_within(plan[number], plan[o])
        ]
        parent = min(around, key=lambda o: abs(signed[o]), default=None)
        if parent is not None and parent not in hole_of and signed[number] * signed[parent] < 0:
            hole_of[number] = parent
    patches = []
    plane = plane_through(centre, normal)
    for number in plan:
        if number in hole_of:
            continue
        holes = [h for h, parent in hole_of.items() if parent == number]
        outline = loops[number] if signed[number] > 0 else _turned(loops[number])
        inner = [wire_of(loops[h] if signed[h] < 0 else _turned(loops[h])) for h in holes]
        try:
            face = plane_face(plane, wire_of(outline), inner)
        except KernelError:
            continue
        if is_valid(face):
            patches.append(FlatPatch(face, (number, *holes)))
    return patches


def _lies_within(points: np.ndarray, polygon: np.ndarray) -> bool:
    """True when two far-apart points of one loop lie inside another polygon."""
    return bool(contains(polygon, points[[1, len(points) // 2]]).all())


def _turned(loop: Loop) -> list[TopoDS_Edge]:
    return [backward(e) for e in reversed(loop)]


def _trimmed(surface: Geom_Surface, loop: Loop) -> TopoDS_Face | None:
    """Return the part of a round surface inside a loop that lies on it."""
    bare = TopoDS_Face()
    BRep_Builder().MakeFace(bare, surface, 1e-7)
    for edge in loop:
        BOPTools_AlgoTools2D.BuildPCurveForEdgeOnFace_s(forward(edge), bare)
    return _inside(bare, wire_of(loop))


def _mended(surface: Geom_Surface, loop: Loop) -> TopoDS_Face | None:
    """Return the part of a free surface inside a loop near it; the kernel's repair finds the curves on the surface."""
    for edges in (loop, _turned(loop)):
        maker = BRepBuilderAPI_MakeFace(surface, wire_of(edges), True)
        if not maker.IsDone():
            continue
        fixer = ShapeFix_Face(maker.Face())
        fixer.Perform()
        result: TopoDS_Shape = fixer.Result()
        face = TopoDS.Face_s(result) if result.ShapeType() == TopAbs_FACE else fixer.Face()
        if area(face) > 0.0:
            return face if is_valid(face) else None
    return None


def _inside(bare: TopoDS_Face, wire: TopoDS_Wire) -> TopoDS_Face | None:
    """Return a face without boundary as the one inside a wire, whichever way that runs.

    The wrong side has negative area; the kernel calls it valid, and finds no triangles in it.
    """
    for turned in (wire, wire.Reversed()):
        face = TopoDS.Face_s(bare.EmptyCopied())
        BRep_Builder().Add(face, turned)
        if area(face) > 0.0:
            return face if is_valid(face) else None
    return None


def _same_region(patch: TopoDS_Face, host: TopoDS_Face) -> bool:
    """True when the patch covers the host itself instead of the hole in it."""
    return len(edges_of(patch)) == len(edges_of(host)) and all(
        same_order(edges_of(host)).Contains(e) for e in edges_of(patch)
    )
