"""Faces written as splines that are planes, cylinders, cones, spheres or tori: written as those."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.Geom import Geom_Surface
from OCP.Geom2d import Geom2d_Curve, Geom2d_Line
from OCP.gp import gp_Dir2d, gp_Pnt2d
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FORWARD
from OCP.TopExp import TopExp
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Solid, TopoDS_Wire
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.kernel.build import forward
from moldgen.kernel.elementary import from_axis, goes_round, is_elementary, parameters_of
from moldgen.kernel.guard import operation
from moldgen.kernel.heal_curves import PlainCurve, flat_curve, plain_curve
from moldgen.kernel.heal_fit import Fit, elementary_fit
from moldgen.kernel.measure import area, is_valid, volume
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import edge_faces_map, edge_points, edges_of, faces_of, parts_of, same_order, walk
from moldgen.model.part import HealNote
from moldgen.tolerances import SAME_SURFACE

PLACES: Final = 65
"""Places of an edge from which its curves are made."""

INTEGRATION: Final = 0.03
"""Relative change of area or volume that may be the kernel's error of integration over splines: 1.3e-2 was measured on
whole turns. More means that a face came out as another one; the true effect is told from the distances."""

MOST_TRIES: Final = 4

_HERE: Final = TopLoc_Location()


@dataclass
class _Rewriting:
    """A solid while its faces are written anew: the faces, what some of them are, and the edges made for them."""

    faces: list[TopoDS_Face]
    fits: dict[int, Fit]

    def __post_init__(self) -> None:
        self.bare = {i: _bare_face(fit.surface) for i, fit in self.fits.items()}
        self.made: dict[int, TopoDS_Edge] = {}


def recognized(solid: TopoDS_Solid, volume_mm3: float) -> tuple[TopoDS_Solid, float, tuple[HealNote, ...]]:
    """Return the solid with every spline face that keeps to an elementary surface written as that surface.

    No face moves by more than `SAME_SURFACE`. Edges become lines and circles where they are such and no freeform face
    uses them. A face whose new form the kernel does not accept stays as it was; so does the whole solid if its
    faces do not close any more.

    volume_mm3 : the solid's volume, returned as it is if nothing changes

    Raises
    ------
    KernelError : the kernel threw
    """
    faces = faces_of(solid)
    with operation("look for plain surfaces written as splines", operands=(solid,)):
        fits = {i: fit for i, fit in ((i, elementary_fit(f)) for i, f in enumerate(faces)) if fit is not None}
    for _ in range(MOST_TRIES):
        if not fits:
            break
        with operation("write splines as plain surfaces", operands=(solid,)):
            new, bad = _written(solid, faces, fits)
        if not bad:
            return _accepted(solid, volume_mm3, new, fits)
        fits = {i: fit for i, fit in fits.items() if i not in bad}
    return solid, volume_mm3, ()


def _accepted(
    solid: TopoDS_Solid, volume_mm3: float, new: list[TopoDS_Face], fits: dict[int, Fit]
) -> tuple[TopoDS_Solid, float, tuple[HealNote, ...]]:
    with operation("close the rewritten faces", operands=(solid,)):
        made = solid_from_faces(new)
        now = volume(made.solid)
        if made.complaint or abs(now - volume_mm3) > INTEGRATION * volume_mm3:
            return solid, volume_mm3, ()
    grown = sum(_sign(new[i], fit) * fit.mean_off_mm * area(new[i]) for i, fit in fits.items())
    worst = max(fit.off_mm for fit in fits.values())
    what = (
        "splines written as the planes, cylinders, cones, spheres and tori that they are, "
        f"moved by up to {max(worst, 1e-9):.1g} mm"
    )
    return TopoDS.Solid_s(made.solid), now, (HealNote(what, len(fits), grown),)


def _sign(face: TopoDS_Face, fit: Fit) -> float:
    """Return whether the old surface's own normal points out of the solid (1) or into it (-1)."""
    return 1.0 if (face.Orientation() == TopAbs_FORWARD) != fit.flipped else -1.0


def _written(solid: TopoDS_Solid, faces: list[TopoDS_Face], fits: dict[int, Fit]) -> tuple[list[TopoDS_Face], set[int]]:
    """Return the new faces, and the numbers of the fits that the kernel does not accept."""
    work = _Rewriting(faces, fits)
    links, face_index, edge_index = edge_faces_map(solid), same_order(faces), same_order(edges_of(solid))
    users: dict[int, list[int]] = {}
    touched: set[int] = set(fits)
    bad: set[int] = set()
    for i in range(1, links.Extent() + 1):
        edge, list_of = TopoDS.Edge_s(links.FindKey(i)), links.FindFromIndex(i)
        mine = sorted({face_index.FindIndex(f) - 1 for f in (list_of.First(), list_of.Last())})
        if not any(m in fits for m in mine):
            continue
        number = edge_index.FindIndex(edge)
        users[number] = mine
        touched.update(mine)
        new = _pole(work, edge, mine[0]) if BRep_Tool.Degenerated_s(edge) else _new_edge(work, edge, mine)
        if new is not None:
            work.made[number] = new
        elif not BRep_Tool.Degenerated_s(edge):
            bad.update(m for m in mine if m in fits)
    if bad:
        return faces, bad
    new_faces = [_new_face(work, i, edge_index, users) if i in touched else f for i, f in enumerate(faces)]
    for i in sorted(touched):
        if not is_valid(new_faces[i]) or abs(area(new_faces[i]) - area(faces[i])) > INTEGRATION * area(faces[i]):
            near = {m for mine in users.values() if i in mine for m in mine}
            bad.update(({i} if i in fits else near) & set(fits))
    return new_faces, bad


def _bare_face(surface: Geom_Surface) -> TopoDS_Face:
    face = TopoDS_Face()
    BRep_Builder().MakeFace(face, surface, 1e-7)
    return face


def _new_face(
    work: _Rewriting, number: int, edge_index: TopTools_IndexedMapOfShape, users: dict[int, list[int]]
) -> TopoDS_Face:
    """Return a face on its new or old surface whose wires use the new edges in the old order."""
    builder = BRep_Builder()
    old = work.faces[number]
    flat = old.Oriented(TopAbs_FORWARD)
    fit = work.fits.get(number)
    new = work.bare[number] if fit else flat.EmptyCopied()
    for wire in parts_of(flat):
        loop = TopoDS_Wire()
        builder.MakeWire(loop)
        for edge in parts_of(wire.Oriented(TopAbs_FORWARD)):
            place = edge_index.FindIndex(edge)
            made = work.made.get(place)
            if made is not None:
                builder.Add(loop, made.Oriented(edge.Orientation()))
            elif place not in users:
                builder.Add(loop, edge)
        loop.Closed(True)
        turned = loop.Oriented(wire.Orientation())
        builder.Add(new, turned.Reversed() if fit and fit.flipped else turned)
    whole = new.Oriented(old.Orientation())
    return TopoDS.Face_s(whole.Reversed() if fit and fit.flipped else whole)


def _new_edge(work: _Rewriting, edge: TopoDS_Edge, users: list[int]) -> TopoDS_Edge | None:
    """Return an edge between the same vertices with curves on all new surfaces, or None where there is none."""
    old = forward(edge)
    first, last = BRep_Tool.Range_s(old)
    times = np.linspace(first, last, PLACES)
    points = edge_points(old, PLACES)
    all_plain = all(i in work.fits or is_elementary(BRep_Tool.Surface_s(work.faces[i])) for i in users)
    plain = plain_curve(points) if all_plain else None
    new, parameters = _copied(old, plain), times if plain is None else plain.parameters
    builder, off = BRep_Builder(), 0.0 if plain is None else plain.off_mm
    if plain is not None:
        points = np.array([plain.curve.Value(float(t)).Coord() for t in parameters])
    for i in users:
        target = work.bare.get(i, work.faces[i] if plain is not None else None)
        if target is None or not goes_round(BRep_Tool.Surface_s(target))[0]:
            continue
        curves = _flat_curves(work, i, old, times, (points, parameters))
        off = max([off, *(stray for _, stray in curves.values())])
        pair = [curve for _, (curve, _) in sorted(curves.items())]
        if len(pair) == 2 and all(pair[0].Value(float(t)).Distance(pair[1].Value(float(t))) < 1e-9 for t in parameters):
            return None  # a seam that the new surface does not have
        builder.UpdateEdge(new, *pair, TopoDS.Face_s(target.Oriented(TopAbs_FORWARD)), SAME_SURFACE / 100.0)
    if off > 2.0 * SAME_SURFACE:
        return None
    _loosened(new, max(1.2 * off, 1e-7))
    return new


def _flat_curves(
    work: _Rewriting, number: int, edge: TopoDS_Edge, times: np.ndarray, at: tuple[np.ndarray, np.ndarray]
) -> dict[bool, tuple[Geom2d_Curve, float]]:
    """Return the curves of the uses of an edge in the parameter plane of a face, by "used backwards"."""
    flat = TopoDS.Face_s(work.faces[number].Oriented(TopAbs_FORWARD))
    fit = work.fits.get(number)
    surface = fit.surface if fit else BRep_Tool.Surface_s(flat)
    curves: dict[bool, tuple[Geom2d_Curve, float]] = {}
    for use in walk(flat, TopAbs_EDGE):
        if not use.IsSame(edge):
            continue
        old = BRep_Tool.CurveOnSurface_s(TopoDS.Edge_s(use), flat, 0.0, 0.0)
        uv = np.array([old.Value(float(t)).Coord() for t in times])
        backwards = (use.Orientation() != TopAbs_FORWARD) != bool(fit and fit.flipped)
        curves[backwards] = flat_curve(surface, *at, fit.near(uv) if fit else uv)
    return curves


def _copied(old: TopoDS_Edge, plain: PlainCurve | None) -> TopoDS_Edge:
    """Return an edge between the same vertices, on the plain curve or on a copy of the old curves."""
    builder = BRep_Builder()
    if plain is None:
        new = TopoDS.Edge_s(old.EmptyCopied())
    else:
        new = TopoDS_Edge()
        builder.MakeEdge(new, plain.curve, BRep_Tool.Tolerance_s(old))
    for vertex in parts_of(old):
        builder.Add(new, vertex)
    if plain is not None:
        builder.Range(new, float(plain.parameters[0]), float(plain.parameters[-1]))
    return new


def _loosened(edge: TopoDS_Edge, tolerance: float) -> None:
    builder = BRep_Builder()
    builder.UpdateEdge(edge, tolerance)
    for vertex in (TopExp.FirstVertex_s(edge), TopExp.LastVertex_s(edge)):
        builder.UpdateVertex(vertex, max(tolerance, BRep_Tool.Tolerance_s(edge)))


def _pole(work: _Rewriting, edge: TopoDS_Edge, number: int) -> TopoDS_Edge | None:
    """Return the edge without length at a pole of the new surface, or None where the new surface has no pole."""
    flat = TopoDS.Face_s(work.faces[number].Oriented(TopAbs_FORWARD))
    fit = work.fits[number]
    vertex = TopExp.FirstVertex_s(edge)
    at = np.array([BRep_Tool.Pnt_s(vertex).Coord()])
    if goes_round(fit.surface) != (True, False) or from_axis(fit.surface, at)[0] > SAME_SURFACE:
        return None
    old = forward(edge)
    first, last = BRep_Tool.Range_s(old)
    curve = BRep_Tool.CurveOnSurface_s(old, flat, 0.0, 0.0)
    start, end = fit.near(np.array([curve.Value(t).Coord() for t in (first, last)]))[:, 0]
    v = float(parameters_of(fit.surface, at)[0, 1])
    line = Geom2d_Line(gp_Pnt2d(float(start), v), gp_Dir2d(1.0 if end > start else -1.0, 0.0))
    builder, new = BRep_Builder(), TopoDS_Edge()
    builder.MakeEdge(new)
    builder.UpdateEdge(new, line, work.bare[number], 1e-7)
    for end_vertex in parts_of(old):
        builder.Add(new, end_vertex)
    builder.Range(new, work.bare[number], 0.0, abs(float(end - start)))
    builder.Degenerated(new, True)
    return new
