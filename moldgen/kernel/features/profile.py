"""Closed outlines as planar kernel faces."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence
from typing import Any, Final

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakeWire
from OCP.BRepFilletAPI import BRepFilletAPI_MakeFillet2d
from OCP.ChFi2d import ChFi2d_IsDone
from OCP.GC import GC_MakeArcOfCircle
from OCP.GeomAPI import GeomAPI_Interpolate
from OCP.gp import gp_Ax2, gp_Circ, gp_Elips, gp_Pln
from OCP.TColgp import TColgp_HArray1OfPnt
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face

from moldgen.errors import PartError
from moldgen.kernel.features.frame import Frame, direction, pnt, vec
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import vertices_of

Array = np.ndarray
SAME_POINT: Final = 1e-6
"""mm: points closer than this are one."""


def outline_face(profile: Mapping[str, Any], frame: Frame) -> TopoDS_Face:
    """Return the face inside an outline, without its inner outlines (see `inner_faces`).

    Parameters
    ----------
    profile : ``shape`` and the values of that shape (mm, deg)
    frame : plane of the outline

    Raises
    ------
    PartError : the outline is open, crosses itself, or a corner radius does not fit
    """
    edges, rounds = _EDGES[profile["shape"]](profile, frame)
    with operation("build an outline"):
        wire = BRepBuilderAPI_MakeWire()
        for edge in edges:
            wire.Add(edge)
        if not wire.IsDone():
            raise PartError("the outline is not closed", remedy="check that each step ends where the next begins")
        face = BRepBuilderAPI_MakeFace(gp_Pln(frame.plane()), wire.Wire(), True).Face()
    face = _rounded(face, rounds, frame)
    if not is_valid(face):
        raise PartError("the outline crosses itself", remedy="check the order of its points")
    return face


def inner_faces(profile: Mapping[str, Any], frame: Frame) -> list[TopoDS_Face]:
    """Return the faces of the outlines cut out of a profile."""
    return [outline_face(inner, frame) for inner in profile["minus"]]


# --- shapes ----------------------------------------------------------------------------------------------------------
Edges = tuple[list[TopoDS_Edge], list[tuple[Array, float]]]


def _circle(profile: Mapping[str, Any], frame: Frame) -> Edges:
    axes = gp_Ax2(frame.point(*profile["at"]), direction(frame.normal()), direction(frame.u))
    return [BRepBuilderAPI_MakeEdge(gp_Circ(axes, profile["diameter"] / 2)).Edge()], []


def _ellipse(profile: Mapping[str, Any], frame: Frame) -> Edges:
    a, b = (s / 2 for s in profile["size"])
    turn = profile["angle"] + (0.0 if a >= b else 90.0)
    axes = gp_Ax2(frame.point(*profile["at"]), direction(frame.normal()), direction(frame.along(turn)))
    if abs(a - b) < SAME_POINT:
        return [BRepBuilderAPI_MakeEdge(gp_Circ(axes, a)).Edge()], []
    return [BRepBuilderAPI_MakeEdge(gp_Elips(axes, max(a, b), min(a, b))).Edge()], []


def _rectangle(profile: Mapping[str, Any], frame: Frame) -> Edges:
    w, h = (s / 2 for s in profile["size"])
    corners = np.array([[w, -h], [w, h], [-w, h], [-w, -h]])
    return _polygon_edges(corners, profile, frame)


def _polygon(profile: Mapping[str, Any], frame: Frame) -> Edges:
    sides = profile["sides"]
    if sides < 3:
        raise PartError(f"a polygon of {sides} sides has no area", remedy="use 3 sides or more")
    radius = profile["diameter"] / 2
    if profile["across"] == "flats":
        radius /= math.cos(math.pi / sides)
    turns = 2 * np.pi * np.arange(sides) / sides
    return _polygon_edges(radius * np.column_stack([np.cos(turns), np.sin(turns)]), profile, frame)


def _slot(profile: Mapping[str, Any], frame: Frame) -> Edges:
    length, width = profile["length"], profile["width"]
    if length <= width:
        raise PartError(f"a slot of length {length:g} must be longer than its width {width:g}", remedy="use a circle")
    half = length / 2
    corners = np.array([[half, -width / 2], [half, width / 2], [-half, width / 2], [-half, -width / 2]])
    return _polygon_edges(corners, {**profile, "radius": width / 2}, frame)


def _polygon_edges(corners: Array, profile: Mapping[str, Any], frame: Frame) -> Edges:
    """Return the edges of a convex polygon whose corners are all rounded with one radius."""
    local = frame.turned(profile["at"], profile["angle"])
    radius = profile["radius"]
    if radius < SAME_POINT:
        return [_line(local, a, b) for a, b in zip(corners, np.roll(corners, -1, axis=0), strict=True)], []
    starts, middles, ends = [], [], []
    for before, corner, after in zip(np.roll(corners, 1, 0), corners, np.roll(corners, -1, 0), strict=True):
        to_before, to_after = _unit(before - corner), _unit(after - corner)
        half_angle = math.acos(float(np.clip(to_before @ to_after, -1, 1))) / 2
        reach = radius / math.tan(half_angle)
        if reach > min(np.linalg.norm(before - corner), np.linalg.norm(after - corner)) / 2 + SAME_POINT:
            raise PartError(f"corner radius {radius:g} is too large for its sides", remedy="use a smaller radius")
        starts.append(corner + reach * to_before)
        ends.append(corner + reach * to_after)
        middles.append(corner + (radius / math.sin(half_angle) - radius) * _unit(to_before + to_after))
    edges = []
    for index, start in enumerate(starts):
        edges.append(_arc(local, start, middles[index], ends[index]))
        following = starts[(index + 1) % len(starts)]
        if np.linalg.norm(following - ends[index]) > SAME_POINT:
            edges.append(_line(local, ends[index], following))
    return edges, []


def _closed_spline(profile: Mapping[str, Any], frame: Frame) -> Edges:
    return [spline_edge(frame, [np.array(p) for p in profile["points"]], periodic=True)], []


def _path(profile: Mapping[str, Any], frame: Frame) -> Edges:
    start = np.array(profile["start"])
    edges: list[TopoDS_Edge] = []
    rounds: list[tuple[Array, float]] = []
    here, heading = start, None
    for step in profile["steps"]:
        edge, end, heading = _step(step, here, heading, frame)
        edges.append(edge)
        if step["round"]:
            rounds.append((end, step["round"]))
        here = end
    if np.linalg.norm(here - start) > SAME_POINT:
        edges.append(_line(frame, here, start))
    if profile["round"]:
        rounds.append((start, profile["round"]))
    return edges, rounds


_EDGES: Final = {
    "circle": _circle,
    "ellipse": _ellipse,
    "rectangle": _rectangle,
    "polygon": _polygon,
    "slot": _slot,
    "spline": _closed_spline,
    "path": _path,
}


# --- steps of a path -------------------------------------------------------------------------------------------------
def _step(
    step: Mapping[str, Any], here: Array, heading: Array | None, frame: Frame
) -> tuple[TopoDS_Edge, Array, Array | None]:
    """Return the edge of a step, its end, and the direction in which it arrives."""
    if "line" in step:
        end = np.array(step["line"])
        _must_differ(here, end)
        return _line(frame, here, end), end, _unit(end - here)
    if "arc" in step:
        end = np.array(step["arc"])
        _must_differ(here, end)
        middle = _arc_middle(step, here, end, heading)
        return _arc(frame, here, middle, end), end, _arrival(here, middle, end)
    points = [here, *(np.array(p) for p in step["spline"])]
    for a, b in itertools.pairwise(points):
        _must_differ(a, b)
    tangents = [None if step[k] is None else np.array(step[k]) for k in ("start_tangent", "end_tangent")]
    if (tangents[0] is None) != (tangents[1] is None):
        # the kernel wants both or none: the chord stands in for the one that is missing
        tangents = [
            points[1] - points[0] if tangents[0] is None else tangents[0],
            points[-1] - points[-2] if tangents[1] is None else tangents[1],
        ]
    end_direction = None if tangents[1] is None else _unit(tangents[1])
    return spline_edge(frame, points, tangents=tangents), points[-1], end_direction


def _arc_middle(step: Mapping[str, Any], start: Array, end: Array, heading: Array | None) -> Array:
    chord = end - start
    length = float(np.linalg.norm(chord))
    left = np.array([-chord[1], chord[0]]) / length
    if step["through"] is not None:
        middle = np.array(step["through"])
        if abs(float((middle - start) @ left)) < SAME_POINT:
            raise PartError("the three points of an arc lie on one line", remedy="use a line, or move 'through'")
        return middle
    if step["tangent"]:
        if heading is None:
            raise PartError("a tangent arc needs a line or an arc before it", remedy="use 'through' or 'radius'")
        # the arc leaves at angle a from its chord; it bulges by length / 2 * tan(a / 2) to the side it leaves to
        turn = math.atan2(float(heading @ left), float(heading @ chord) / length)
        if abs(turn) < 1e-9:
            raise PartError("a tangent arc straight ahead is a line", remedy="use a line")
        return (start + end) / 2 + length / 2 * math.tan(turn / 2) * left  # type: ignore[no-any-return]
    radius = step["radius"]
    if radius < length / 2 - SAME_POINT:
        raise PartError(
            f"an arc of radius {radius:g} cannot span {length:g}", remedy=f"use a radius of {length / 2:g} or more"
        )
    bulge = radius - math.sqrt(max(radius**2 - length**2 / 4, 0.0))
    return (start + end) / 2 + (bulge if step["side"] == "left" else -bulge) * left  # type: ignore[no-any-return]


def _arrival(start: Array, middle: Array, end: Array) -> Array:
    """Return the unit tangent at the end of the arc through three points: square to the radius there."""
    sides = 2 * np.array([middle - start, end - start])
    centre = np.linalg.solve(sides, np.array([middle @ middle - start @ start, end @ end - start @ start]))
    (ax, ay), (bx, by) = middle - start, end - middle
    x, y = _unit(end - centre)
    return np.array([-y, x]) if ax * by - ay * bx > 0 else np.array([y, -x])


def _line(frame: Frame, a: Array, b: Array) -> TopoDS_Edge:
    return BRepBuilderAPI_MakeEdge(frame.point(*a), frame.point(*b)).Edge()


def _arc(frame: Frame, a: Array, middle: Array, b: Array) -> TopoDS_Edge:
    return BRepBuilderAPI_MakeEdge(
        GC_MakeArcOfCircle(frame.point(*a), frame.point(*middle), frame.point(*b)).Value()
    ).Edge()


def spline_edge(
    frame: Frame, points: Sequence[Array], *, tangents: Sequence[Array | None] = (None, None), periodic: bool = False
) -> TopoDS_Edge:
    """Return the smooth curve through points of a plane.

    Parameters
    ----------
    frame : the plane
    points : (2,) each [mm]
    tangents : directions at both ends, both or none
    periodic : close the curve smoothly; the first point is not repeated
    """
    array = TColgp_HArray1OfPnt(1, len(points))
    for index, point in enumerate(points, start=1):
        array.SetValue(index, frame.point(*point))
    with operation("run a spline through points"):
        curve = GeomAPI_Interpolate(array, periodic, SAME_POINT)
        if tangents[0] is not None and tangents[1] is not None:
            first, last = (vec(t[0] * frame.u + t[1] * frame.v) for t in tangents if t is not None)
            curve.Load(first, last, True)
        curve.Perform()
        return BRepBuilderAPI_MakeEdge(curve.Curve()).Edge()


def _rounded(face: TopoDS_Face, rounds: Sequence[tuple[Array, float]], frame: Frame) -> TopoDS_Face:
    for corner, radius in rounds:
        place = pnt(frame.place(*corner))
        with operation(f"round a corner of the outline with radius {radius:g}"):
            maker = BRepFilletAPI_MakeFillet2d(face)
            vertex = min(vertices_of(face), key=lambda v: BRep_Tool.Pnt_s(v).Distance(place))
            maker.AddFillet(vertex, radius)
            done = maker.Status() == ChFi2d_IsDone
            if done:
                face = TopoDS.Face_s(maker.Shape())
        if not done:
            raise PartError(
                f"radius {radius:g} does not fit the outline's corner at {corner[0]:g}, {corner[1]:g}",
                remedy="use a smaller radius, or leave it out where the steps already run into each other smoothly",
            )
    return face


def _must_differ(a: Array, b: Array) -> None:
    if np.linalg.norm(a - b) < SAME_POINT:
        raise PartError(f"a step of the outline has no length at {a[0]:g}, {a[1]:g}", remedy="drop the step")


def _unit(vector: Array) -> Array:
    return vector / np.linalg.norm(vector)  # type: ignore[no-any-return]
