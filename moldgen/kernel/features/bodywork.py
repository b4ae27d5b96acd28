"""Features that change the whole body: shell, and draft on walls."""

from __future__ import annotations

import math
from collections.abc import Sequence

from OCP.BRepAlgoAPI import BRepAlgoAPI_Check
from OCP.BRepOffset import BRepOffset_Skin
from OCP.BRepOffsetAPI import BRepOffsetAPI_DraftAngle, BRepOffsetAPI_MakeThickSolid
from OCP.GeomAbs import GeomAbs_Arc, GeomAbs_Intersection
from OCP.gp import gp_Pln
from OCP.TopoDS import TopoDS_Face, TopoDS_Shape

from moldgen.errors import KernelError, PartError
from moldgen.kernel.features.frame import direction, pnt, unit
from moldgen.kernel.features.shapes import checked_solid
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import volume
from moldgen.kernel.topology import shape_list


def shell(body: TopoDS_Shape, thickness: float, opened: Sequence[TopoDS_Face]) -> TopoDS_Shape:
    """Return the body hollowed out to a wall inside its outer faces, open at the given faces.

    Raises
    ------
    PartError : the wall does not fit
    """
    for join in (GeomAbs_Intersection, GeomAbs_Arc):
        try:
            with operation("hollow out a body", operands=(body,)):
                maker = BRepOffsetAPI_MakeThickSolid()
                maker.MakeThickSolidByJoin(
                    body, shape_list(opened), -thickness, 1e-4, BRepOffset_Skin, False, False, join, False
                )
                maker.Build()
                shape = maker.Shape()
            solid = checked_solid(shape, "hollowing")
        except (KernelError, PartError):
            continue
        if volume(solid) < volume(body) and not _crosses_itself(solid):
            return solid
    raise PartError(
        f"a wall of {thickness:g} mm cannot be made inside the body",
        remedy="use a thinner wall, or give edges that were rounded before a radius larger than the wall",
    )


def _crosses_itself(solid: TopoDS_Shape) -> bool:
    """True when faces of the solid meet where they should not: an offset does this and still counts as valid."""
    with operation("look for faces that cross", operands=(solid,)):
        return not BRepAlgoAPI_Check(solid, False, True).IsValid()


def draft(
    body: TopoDS_Shape, faces: Sequence[TopoDS_Face], angle: float, pull: str | Sequence[float], neutral: float
) -> TopoDS_Shape:
    """Return the body with walls sloped about a neutral plane.

    Parameters
    ----------
    body, faces : solid, and its walls to slope (planes, cylinders or cones along the pull)
    angle : slope [deg]: the walls lean toward the material along the pull
    pull : direction
    neutral : place of the neutral plane along the pull [mm]

    Raises
    ------
    PartError : the kernel cannot slope one of the walls
    """
    along = unit(pull)
    plane = gp_Pln(pnt(neutral * along), direction(along))
    with operation(f"slope {len(faces)} walls by {angle:g} deg", operands=(body,)):
        maker = BRepOffsetAPI_DraftAngle(body)
        for face in faces:
            maker.Add(face, direction(along), math.radians(angle), plane)
            if not maker.AddDone():
                raise PartError(
                    "one of the walls cannot be sloped: it is neither plane nor round, or a fillet joins it",
                    remedy="make the draft before fillets, and choose plane or round walls along the pull",
                )
        maker.Build()
        shape = maker.Shape() if maker.IsDone() else None
    return checked_solid(shape, "sloping walls")
