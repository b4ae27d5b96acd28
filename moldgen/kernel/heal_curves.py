"""Edges written as splines that are lines or circles, and the curves of edges on plain surfaces, in closed form."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from OCP.Geom import Geom_Circle, Geom_Curve, Geom_Line, Geom_Surface
from OCP.Geom2d import Geom2d_BSplineCurve, Geom2d_Curve, Geom2d_Line
from OCP.Geom2dAPI import Geom2dAPI_Interpolate
from OCP.gp import gp_Ax2, gp_Dir, gp_Dir2d, gp_Pnt, gp_Pnt2d
from OCP.TColgp import TColgp_Array1OfPnt2d, TColgp_HArray1OfPnt2d
from OCP.TColStd import TColStd_Array1OfInteger, TColStd_Array1OfReal, TColStd_HArray1OfReal

from moldgen.kernel.elementary import TURN, goes_round, parameters_of, points_at
from moldgen.tolerances import SAME_SURFACE

STRAIGHT: Final = 1e-7
"""mm: a curve in the parameter plane that bends by less is a line there (the kernel's own precision)."""

UNIT_SPEED: Final = 1e-9
"""Relative difference from one of the speed of a line over its parameter, under which it is one."""


class PlainCurve(NamedTuple):
    """A line or a circle, the parameters on it (n,) of the points it was found from, and its distance from them."""

    curve: Geom_Curve
    parameters: np.ndarray
    off_mm: float


def plain_curve(points: np.ndarray) -> PlainCurve | None:
    """Return the line or circle that keeps to points in running order, (n, 3) [mm], to `SAME_SURFACE`, or None."""
    line = _line(points)
    found = line or _circle(points)
    if found is None or np.any(np.diff(found.parameters) <= 0.0):
        return None
    return found


def _line(points: np.ndarray) -> PlainCurve | None:
    whole = points[-1] - points[0]
    length = float(np.linalg.norm(whole))
    if length < SAME_SURFACE:
        return None
    along = whole / length
    parameters = (points - points[0]) @ along
    off = float(np.linalg.norm(points - points[0] - parameters[:, None] * along, axis=1).max())
    if off > SAME_SURFACE:
        return None
    return PlainCurve(Geom_Line(gp_Pnt(*points[0].tolist()), gp_Dir(*along.tolist())), parameters, off)


def _circle(points: np.ndarray) -> PlainCurve | None:
    middle = points.mean(axis=0)
    _, spread, axes = np.linalg.svd(points - middle)
    if spread[1] < SAME_SURFACE:
        return None
    flat = (points - middle) @ axes[:2].T
    solved = np.linalg.lstsq(np.column_stack([2.0 * flat, np.ones(len(flat))]), (flat**2).sum(axis=1), rcond=None)[0]
    center = middle + solved[:2] @ axes[:2]
    radius = float(np.sqrt(solved[2] + solved[:2] @ solved[:2]))
    start = (points[0] - center) - ((points[0] - center) @ axes[2]) * axes[2]
    start /= np.linalg.norm(start)
    normal = axes[2]
    if (points[1] - center) @ np.cross(normal, start) < 0.0:
        normal = -normal
    out = (points - center) @ np.array([start, np.cross(normal, start)]).T
    angles = np.unwrap(np.arctan2(out[:, 1], out[:, 0]))
    off = float(np.hypot(np.hypot(*out.T) - radius, (points - center) @ normal).max())
    if off > SAME_SURFACE or abs(angles[-1]) > TURN + 1e-6:
        return None
    if np.linalg.norm(points[-1] - points[0]) < SAME_SURFACE:
        angles[-1] = TURN
    at = gp_Ax2(gp_Pnt(*center.tolist()), gp_Dir(*normal.tolist()), gp_Dir(*start.tolist()))
    return PlainCurve(Geom_Circle(at, radius), angles, off)


def flat_curve(
    surface: Geom_Surface, points: np.ndarray, parameters: np.ndarray, near: np.ndarray
) -> tuple[Geom2d_Curve, float]:
    """Return the curve of an edge in the parameter plane of an elementary surface, and its distance from the edge [mm].

    points, parameters : places of the edge (n, 3) [mm] and its parameters there, (n,), ascending
    near : roughly the parameters of the places on the surface, (n, 2): it settles full turns, and angles on an axis
    """
    uv = parameters_of(surface, points)
    for axis, is_angle in enumerate(goes_round(surface)):
        if is_angle:
            uv[:, axis] += TURN * np.round((near[:, axis] - uv[:, axis]) / TURN)
    on_axis = np.linalg.norm(points_at(surface, near) - points, axis=1) < STRAIGHT
    uv[on_axis] = near[on_axis]
    curve = _straight(surface, uv, parameters) or _bent(uv, parameters)
    found = np.array([curve.Value(float(t)).Coord() for t in parameters])
    return curve, float(np.linalg.norm(points_at(surface, found) - points, axis=1).max())


def _straight(surface: Geom_Surface, uv: np.ndarray, parameters: np.ndarray) -> Geom2d_Curve | None:
    span = parameters[-1] - parameters[0]
    way = (uv[-1] - uv[0]) / span
    way[np.abs(way) < UNIT_SPEED * np.abs(way).max()] = 0.0  # lines along the parameter plane are meant exactly so
    line = uv[0] + (parameters - parameters[0])[:, None] * way
    exact = points_at(surface, uv)
    if np.linalg.norm(points_at(surface, line) - exact, axis=1).max() > STRAIGHT:
        return None
    speed = float(np.hypot(*way))
    if abs(speed - 1.0) < UNIT_SPEED:
        start = line[0] - parameters[0] * way
        return Geom2d_Line(gp_Pnt2d(*start.tolist()), gp_Dir2d(*way.tolist()))
    poles, knots, uses = TColgp_Array1OfPnt2d(1, 2), TColStd_Array1OfReal(1, 2), TColStd_Array1OfInteger(1, 2)
    for i in (0, -1):
        poles.SetValue(1 if i == 0 else 2, gp_Pnt2d(*line[i].tolist()))
        knots.SetValue(1 if i == 0 else 2, float(parameters[i]))
        uses.SetValue(1 if i == 0 else 2, 2)
    return Geom2d_BSplineCurve(poles, knots, uses, 1)


def _bent(uv: np.ndarray, parameters: np.ndarray) -> Geom2d_Curve:
    places, times = TColgp_HArray1OfPnt2d(1, len(uv)), TColStd_HArray1OfReal(1, len(uv))
    for number, (place, t) in enumerate(zip(uv, parameters, strict=True), start=1):
        places.SetValue(number, gp_Pnt2d(*place.tolist()))
        times.SetValue(number, float(t))
    made = Geom2dAPI_Interpolate(places, times, False, 1e-12)
    made.Perform()
    return made.Curve()
