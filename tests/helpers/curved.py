"""Twelve bodies without a plane of symmetry to spare, pulled along directions that favor none of their faces."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import cadquery as cq
from cadquery import Vector as Point
from OCP.BRepBuilderAPI import BRepBuilderAPI_GTransform, BRepBuilderAPI_Transform
from OCP.gp import gp_GTrsf, gp_Mat, gp_Trsf, gp_XYZ

from moldgen.release.frame import rotation_to_z


def _solid(made: Any) -> Any:
    return (made.val().Solids()[0] if isinstance(made, cq.Workplane) else made).wrapped


def pulled_along(solid: Any, direction: tuple[float, float, float]) -> Any:
    """The solid in mold coordinates when it leaves along this direction."""
    size = math.sqrt(sum(c * c for c in direction))
    rows = rotation_to_z(tuple(c / size for c in direction))
    turn = gp_Trsf()
    turn.SetValues(*rows[0], 0.0, *rows[1], 0.0, *rows[2], 0.0)
    return BRepBuilderAPI_Transform(solid, turn, True).Shape()


def ring() -> Any:
    """A torus."""
    return _solid(cq.Solid.makeTorus(20.0, 6.0))


def egg() -> Any:
    """A sphere stretched three ways: one spline face with a seam and two poles."""
    ball = _solid(cq.Workplane().sphere(8.0))
    stretch = gp_GTrsf(gp_Mat(1.5, 0, 0, 0, 0.7, 0, 0, 0, 1.1), gp_XYZ(0, 0, 0))
    return BRepBuilderAPI_GTransform(ball, stretch, True).Shape()


def ball() -> Any:
    """A sphere whose poles lie askew to every pull."""
    return _solid(cq.Workplane().sphere(9.0))


def lofted_bar() -> Any:
    """A square bar that becomes round."""
    return _solid(cq.Workplane().rect(14, 10).workplane(offset=30).circle(6).loft(combine=True))


def lofted_spindle() -> Any:
    """An ellipse, a smaller one across, an ellipse: one spline face that bulges in and out."""
    made = cq.Workplane().ellipse(10, 6).workplane(offset=15).ellipse(5, 7).workplane(offset=15).ellipse(9, 8)
    return _solid(made.loft(combine=True))


def elbow() -> Any:
    """A pipe round a corner in a plane."""
    path = cq.Workplane("XZ").lineTo(0, 20).radiusArc((12, 32), 12).lineTo(30, 32)
    return _solid(cq.Workplane().circle(5).sweep(path))


def winding_pipe() -> Any:
    """A pipe along a free curve in space."""
    path = cq.Workplane().spline([Point(0, 0, 0), Point(4, 3, 14), Point(-3, 9, 26), Point(5, 16, 36)])
    return _solid(cq.Workplane().circle(4).sweep(path))


def rounded_block() -> Any:
    """A block, all its edges rounded: cylinders and pieces of spheres."""
    return _solid(cq.Workplane().box(30, 20, 12).edges().fillet(3))


def vase() -> Any:
    """A free profile turned round an axis."""
    profile = cq.Workplane("XZ").moveTo(0, 0).lineTo(9, 0).spline([(6, 9), (10, 18), (7, 26)], includeCurrent=True)
    return _solid(profile.lineTo(0, 26).close().revolve(360, (0, 0, 0), (0, 1, 0)))


def twisted_bar() -> Any:
    """A rectangle that turns while it rises."""
    return _solid(cq.Workplane().rect(16, 9).twistExtrude(28, 70))


def double_cone() -> Any:
    """Two cones on one rim, one of them with its apex."""
    upper = cq.Solid.makeCone(10, 0, 14, pnt=Point(0, 0, 0), dir=Point(0, 0, 1))
    lower = cq.Solid.makeCone(10, 4, 9, pnt=Point(0, 0, 0), dir=Point(0, 0, -1))
    return _solid(cq.Workplane(upper).union(cq.Workplane(lower)))


def domed_pad() -> Any:
    """A pad with a dome of one spline face on it and a bore askew through both."""
    pad = cq.Workplane().rect(34, 22).extrude(7).edges("|Z").fillet(5)
    heights = [
        [Point(x, y, 9 - 0.012 * x * x - 0.03 * y * y + 0.01 * x * y) for y in (-15, -7, 0, 7, 15)]
        for x in (-20, -9, 0, 9, 20)
    ]
    roof = cq.Face.makeSplineApprox(heights, tol=1e-4, maxDeg=5)
    below = cq.Workplane(cq.Solid.extrudeLinear(roof, Point(0, 0, -30)))
    bore = cq.Workplane(cq.Solid.makeCylinder(3, 60, Point(-8, -12, -20), Point(0.3, 0.5, 1)))
    return _solid(pad.intersect(below).cut(bore))


BODIES: dict[str, Callable[[], Any]] = {
    "ring": ring,
    "egg": egg,
    "ball": ball,
    "lofted bar": lofted_bar,
    "lofted spindle": lofted_spindle,
    "elbow": elbow,
    "winding pipe": winding_pipe,
    "rounded block": rounded_block,
    "vase": vase,
    "twisted bar": twisted_bar,
    "double cone": double_cone,
    "domed pad": domed_pad,
}

PULLS: tuple[tuple[float, float, float], ...] = (
    (0.2673, 0.5345, 0.8018),
    (-0.8729, 0.4364, 0.2182),
    (0.4311, -0.8377, 0.3353),
    (-0.1192, -0.2744, 0.9542),
    (0.9204, 0.1103, -0.3751),
    (-0.5066, 0.6217, -0.5973),
)
"""Unit vectors drawn once at random."""
