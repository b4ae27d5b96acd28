"""Round solids about an axis in any direction: angled pins and what they sit in."""

from __future__ import annotations

from collections.abc import Sequence

from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.gp import gp_Ax3, gp_Dir, gp_Pnt, gp_Trsf
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.guard import operation, present
from moldgen.kernel.turned import turned_solid
from moldgen.model.part import Vector


def inclined_solid(
    at: Vector, along: Vector, outline: Sequence[tuple[float, float]], seam: float = 0.0
) -> TopoDS_Shape:
    """Return the solid that an outline makes when turned once about an axis.

    Parameters
    ----------
    at : a point of the axis [mm]
    along : unit vector of the axis
    outline : (radius, way along the axis from `at`) of its corners, in the order of the way [mm]
    seam : turns the seam of its round faces [deg]

    Raises
    ------
    KernelError : the outline does not bound a solid
    """
    upright = turned_solid((0.0, 0.0), outline, seam)
    place = gp_Trsf()
    place.SetTransformation(gp_Ax3(gp_Pnt(*at), gp_Dir(*along)), gp_Ax3())
    with operation("incline a round solid"):
        return present(BRepBuilderAPI_Transform(upright, place, True).Shape(), "inclining a round solid")
