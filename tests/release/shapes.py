"""Simple solids, and the motions that release must not notice."""

import math

from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf

from moldgen.kernel.topology import only_solid


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


def box(low, high):
    """Return the box between two corners."""
    return BRepPrimAPI_MakeBox(gp_Pnt(*low), gp_Pnt(*high)).Solid()


def cylinder(radius, z0, z1):
    """Return an upright cylinder about the z axis."""
    return BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(0, 0, z0), gp_Dir(0, 0, 1)), radius, z1 - z0).Solid()


def cut(one, other):
    """Return one without the other."""
    return only_solid(BRepAlgoAPI_Cut(one, other).Shape())


def fuse(one, other):
    """Return both as one solid."""
    return only_solid(BRepAlgoAPI_Fuse(one, other).Shape())


def tilted(shape, degrees, about=(1.0, 0.3, 0.0)):
    """Return the shape turned about an axis that is not the pull."""
    move = gp_Trsf()
    move.SetRotation(gp_Ax1(gp_Pnt(1, 2, 3), gp_Dir(*about)), math.radians(degrees))
    return BRepBuilderAPI_Transform(shape, move, True).Shape()


def tilted_pull(degrees, about):
    """Return where `tilted` turns the +z direction."""
    up = gp_Dir(0, 0, 1).Rotated(gp_Ax1(gp_Pnt(1, 2, 3), gp_Dir(*about)), math.radians(degrees))
    return up.X(), up.Y(), up.Z()
