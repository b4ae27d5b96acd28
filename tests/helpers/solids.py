"""Simple solids of the geometry kernel whose volumes a pocket calculator knows."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise
from typing import Any

from OCP.BRep import BRep_Builder
from OCP.BRepAlgoAPI import BRepAlgoAPI_Common, BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakeEdge,
    BRepBuilderAPI_MakeFace,
    BRepBuilderAPI_MakePolygon,
    BRepBuilderAPI_MakeSolid,
    BRepBuilderAPI_MakeWire,
    BRepBuilderAPI_Transform,
)
from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeBox,
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakePrism,
    BRepPrimAPI_MakeSphere,
    BRepPrimAPI_MakeTorus,
)
from OCP.GeomAPI import GeomAPI_PointsToBSpline
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf, gp_Vec
from OCP.TColgp import TColgp_Array1OfPnt
from OCP.TopoDS import TopoDS_Shell

from moldgen.kernel.topology import faces_of, only_solid

Vector = tuple[float, float, float]
Z: Vector = (0.0, 0.0, 1.0)


def box(low: Sequence[float], high: Sequence[float]) -> Any:
    """The box between two corners."""
    return BRepPrimAPI_MakeBox(gp_Pnt(*low), gp_Pnt(*high)).Solid()


def cylinder(radius: float, height: float, at: Vector = (0.0, 0.0, 0.0), along: Vector = Z) -> Any:
    """A cylinder that starts at a point."""
    return BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(*at), gp_Dir(*along)), radius, height).Solid()


def cone(low: float, high: float, height: float, at: Vector = (0.0, 0.0, 0.0), along: Vector = Z) -> Any:
    """A truncated cone, radius `low` at its start and `high` at its end."""
    return BRepPrimAPI_MakeCone(gp_Ax2(gp_Pnt(*at), gp_Dir(*along)), low, high, height).Solid()


def sphere(radius: float, at: Vector = (0.0, 0.0, 0.0)) -> Any:
    """A ball."""
    return BRepPrimAPI_MakeSphere(gp_Pnt(*at), radius).Solid()


def torus(ring: float, tube: float) -> Any:
    """A ring about the z axis."""
    return BRepPrimAPI_MakeTorus(ring, tube).Solid()


def extruded(points: Sequence[Vector], by: Vector) -> Any:
    """A plane polygon carried along a vector."""
    polygon = BRepBuilderAPI_MakePolygon()
    for point in points:
        polygon.Add(gp_Pnt(*point))
    polygon.Close()
    return BRepPrimAPI_MakePrism(BRepBuilderAPI_MakeFace(polygon.Wire(), True).Face(), gp_Vec(*by)).Shape()


def under_curve(heights: Sequence[float], length: float, width: float, floor: float = 0.0) -> Any:
    """What lies above z = floor and below a spline through heights at equal steps of x, width wide in y."""
    points = TColgp_Array1OfPnt(1, len(heights))
    for i, z in enumerate(heights):
        points.SetValue(i + 1, gp_Pnt(length * i / (len(heights) - 1), 0.0, z))
    curve = GeomAPI_PointsToBSpline(points).Curve()
    corners = [gp_Pnt(length, 0.0, heights[-1]), gp_Pnt(length, 0.0, floor), gp_Pnt(0.0, 0.0, floor), points.Value(1)]
    wire = BRepBuilderAPI_MakeWire(BRepBuilderAPI_MakeEdge(curve).Edge())
    for start, end in pairwise(corners):
        wire.Add(BRepBuilderAPI_MakeEdge(start, end).Edge())
    return BRepPrimAPI_MakePrism(BRepBuilderAPI_MakeFace(wire.Wire(), True).Face(), gp_Vec(0.0, width, 0.0)).Shape()


def cut(solid: Any, *tools: Any) -> Any:
    """One without the others."""
    for tool in tools:
        solid = only_solid(BRepAlgoAPI_Cut(solid, tool).Shape())
    return solid


def fuse(solid: Any, *others: Any) -> Any:
    """All as one solid."""
    for other in others:
        solid = only_solid(BRepAlgoAPI_Fuse(solid, other).Shape())
    return solid


def common(one: Any, other: Any) -> Any:
    """What two solids share."""
    return only_solid(BRepAlgoAPI_Common(one, other).Shape())


def turned(solid: Any, degrees: float, about: Vector = Z) -> Any:
    """The solid turned about an axis through the origin."""
    move = gp_Trsf()
    move.SetRotation(gp_Ax1(gp_Pnt(0, 0, 0), gp_Dir(*about)), math.radians(degrees))
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


def mirrored(solid: Any) -> Any:
    """The solid mirrored in the plane x = 0."""
    move = gp_Trsf()
    move.SetMirror(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0)))
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


def shifted(solid: Any, x: float, y: float, z: float) -> Any:
    """The solid at another place."""
    move = gp_Trsf()
    move.SetTranslation(gp_Vec(x, y, z))
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


def grown(solid: Any, factor: float) -> Any:
    """The solid scaled about the origin."""
    move = gp_Trsf()
    move.SetScale(gp_Pnt(0, 0, 0), factor)
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


def unsound(solid: Any, without: int = 0) -> Any:
    """The solid with one of its faces missing, although it says that it is closed."""
    builder, shell = BRep_Builder(), TopoDS_Shell()
    builder.MakeShell(shell)
    for number, face in enumerate(faces_of(solid)):
        if number != without:
            builder.Add(shell, face)
    shell.Closed(True)
    return BRepBuilderAPI_MakeSolid(shell).Solid()
