"""The axis that a surface was drawn about or along, where it has one."""

from __future__ import annotations

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.GeomAbs import (
    GeomAbs_Cone,
    GeomAbs_Cylinder,
    GeomAbs_SurfaceOfExtrusion,
    GeomAbs_SurfaceOfRevolution,
    GeomAbs_Torus,
)

from moldgen.kernel.body import Body


def face_axis(body: Body, number: int) -> np.ndarray | None:
    """Return the unit axis of a cylinder, cone, torus or turned face, or the direction of an extruded one, (3,).

    None for planes, spheres and free surfaces. The sense of the axis means nothing.
    """
    surface = BRepAdaptor_Surface(body.faces[number])
    kind = surface.GetType()
    if kind == GeomAbs_Cylinder:
        along = surface.Cylinder().Axis().Direction()
    elif kind == GeomAbs_Cone:
        along = surface.Cone().Axis().Direction()
    elif kind == GeomAbs_Torus:
        along = surface.Torus().Axis().Direction()
    elif kind == GeomAbs_SurfaceOfRevolution:
        along = surface.AxeOfRevolution().Direction()
    elif kind == GeomAbs_SurfaceOfExtrusion:
        along = surface.Direction()
    else:
        return None
    return np.array([along.X(), along.Y(), along.Z()])
