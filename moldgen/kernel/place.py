"""Moving and scaling solids; uniform scaling keeps planes, cylinders and cones what they are."""

from __future__ import annotations

from typing import Any

from OCP.BRepBuilderAPI import BRepBuilderAPI_GTransform, BRepBuilderAPI_Transform
from OCP.BRepTools import BRepTools
from OCP.gp import gp_GTrsf, gp_Mat, gp_Pnt, gp_Trsf, gp_Vec, gp_XYZ
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.guard import operation, present
from moldgen.model.part import UPRIGHT, MoldFrame, Rows, Vector


def to_mold(solid: TopoDS_Shape, frame: MoldFrame) -> TopoDS_Shape:
    """Return a part solid in mold coordinates."""
    with operation("bring the part into the mold", operands=(solid,)):
        scaled = _scaled(solid, frame)
        turn = gp_Trsf()
        (a, b, c), (d, e, f), (g, h, i) = frame.rotation
        turn.SetValues(a, b, c, 0.0, d, e, f, 0.0, g, h, i, 0.0)
        if frame.rotation == UPRIGHT:
            return scaled
        return present(BRepBuilderAPI_Transform(scaled, turn, True).Shape(), "turning the part")


def to_part(solid: TopoDS_Shape, frame: MoldFrame) -> TopoDS_Shape:
    """Return a solid of the mold in part coordinates: `to_mold` undone."""
    (a, b, c), (d, e, f), (g, h, i) = frame.rotation
    back = turned(solid, ((a, d, g), (b, e, h), (c, f, i)))
    kx, ky, kz = frame.factors
    with operation("bring the part out of the mold", operands=(solid,)):
        return _scaled(back, MoldFrame((1.0 / kx, 1.0 / ky, 1.0 / kz), frame.fixed_point, UPRIGHT))


def turned(shape: TopoDS_Shape, rows: Rows, by: Vector = (0.0, 0.0, 0.0)) -> TopoDS_Shape:
    """Return a copy of a shape, turned about the origin by a rotation given by its rows, then moved [mm]."""
    motion = gp_Trsf()
    (a, b, c), (d, e, f), (g, h, i) = rows
    motion.SetValues(a, b, c, by[0], d, e, f, by[1], g, h, i, by[2])
    with operation("turn a solid", operands=(shape,)):
        return present(BRepBuilderAPI_Transform(shape, motion, True).Shape(), "turning a solid")


def moved(shape: TopoDS_Shape, by: Vector) -> TopoDS_Shape:
    """Return a shape at another place; geometry is shared with the original."""
    shift = gp_Trsf()
    shift.SetTranslation(gp_Vec(*by))
    return BRepBuilderAPI_Transform(shape, shift, False).Shape()


def standing_at(shape: TopoDS_Shape) -> Vector:
    """Return how far [mm] a located shape stands from where its definition was built."""
    shift = shape.Location().Transformation().TranslationPart()
    return (shift.X(), shift.Y(), shift.Z())


def _scaled(solid: TopoDS_Shape, frame: MoldFrame) -> Any:
    kx, ky, kz = frame.factors
    if kx == ky == kz:
        scale = gp_Trsf()
        scale.SetScale(gp_Pnt(*frame.fixed_point), kx)
        return present(BRepBuilderAPI_Transform(solid, scale, True).Shape(), "scaling the part")
    fx, fy, fz = frame.fixed_point
    stretch = gp_GTrsf(gp_Mat(kx, 0, 0, 0, ky, 0, 0, 0, kz), gp_XYZ(fx * (1 - kx), fy * (1 - ky), fz * (1 - kz)))
    stretched = present(BRepBuilderAPI_GTransform(solid, stretch, True).Shape(), "stretching the part")
    BRepTools.Clean_s(stretched)  # it would keep the triangles of the part, half stretched
    return stretched
