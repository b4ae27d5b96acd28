"""Round solids that stand along the pull: pins, the bores they sit in, sprues."""

from __future__ import annotations

import math
from collections.abc import Sequence

from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakePolygon
from OCP.BRepPrimAPI import BRepPrimAPI_MakeRevol
from OCP.gp import gp_Ax1, gp_Dir, gp_Pnt
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.guard import operation
from moldgen.kernel.topology import only_solid

Place = tuple[float, float]
"""x and y of an axis along the pull [mm]."""


def turned_solid(axis: Place, outline: Sequence[tuple[float, float]], seam: float = 0.0) -> TopoDS_Shape:
    """Return the solid that an outline makes when turned once about an axis along z.

    With the same seam, two solids of the same diameter on the same axis get the same mesh.

    Parameters
    ----------
    axis : x, y [mm]
    outline : (radius, z) of its corners from the lowest to the highest [mm]; the axis closes it
    seam : direction in which the seam looks, from +x [deg]

    Raises
    ------
    KernelError : the outline does not bound a solid
    """
    x, y = axis
    corners = [(0.0, outline[0][1]), *outline, (0.0, outline[-1][1])]
    kept = [c for i, c in enumerate(corners) if i == 0 or c != corners[i - 1]]
    across, along = math.cos(math.radians(seam)), math.sin(math.radians(seam))
    with operation("turn a round solid"):
        polygon = BRepBuilderAPI_MakePolygon()
        for radius, z in kept:
            polygon.Add(gp_Pnt(x + radius * across, y + radius * along, z))
        polygon.Close()
        face = BRepBuilderAPI_MakeFace(polygon.Wire(), True).Face()
        about = gp_Ax1(gp_Pnt(x, y, 0.0), gp_Dir(0.0, 0.0, 1.0))
        return only_solid(BRepPrimAPI_MakeRevol(face, about).Shape())


def stepped_solid(axis: Place, steps: Sequence[tuple[float, float, float]], seam: float = 0.0) -> TopoDS_Shape:
    """Return coaxial cylinders (radius, from z, to z) one on the other, lowest first, as one solid [mm]."""
    corners = [corner for radius, low, high in steps for corner in ((radius, low), (radius, high))]
    return turned_solid(axis, corners, seam)
