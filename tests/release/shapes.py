"""Rigid motions that keep the pull: what release must not notice."""

import math

from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf


def turned(solid, degrees):
    """Return the solid turned about an axis along the pull that does not pass through it."""
    move = gp_Trsf()
    move.SetRotation(gp_Ax1(gp_Pnt(50, -20, 0), gp_Dir(0, 0, 1)), math.radians(degrees))
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


def mirrored(solid):
    """Return the solid mirrored in a plane that holds the pull."""
    move = gp_Trsf()
    move.SetMirror(gp_Ax2(gp_Pnt(5, 0, 0), gp_Dir(1, 0, 0)))
    return BRepBuilderAPI_Transform(solid, move, True).Shape()
