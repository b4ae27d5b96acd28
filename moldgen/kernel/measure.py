"""Volume, area, extent and validity of kernel shapes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.Bnd import Bnd_Box
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepCheck import BRepCheck_Analyzer
from OCP.BRepGProp import BRepGProp
from OCP.GProp import GProp_GProps
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.topology import compound_of


def volume(shape: TopoDS_Shape) -> float:
    """Return the volume [mm^3] by the kernel's default integration (up to 3e-3 off on some spline faces)."""
    properties = GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, properties)
    return float(properties.Mass())


def joint_volume(shapes: Sequence[TopoDS_Shape]) -> float:
    """Return the summed volume [mm^3] of solids that share walls, integrated about one common point.

    The default integration errs on spline faces, but by the same amount from both sides of a shared wall when the
    reference point is the same: in the sum of solids that fill a block the errors cancel.
    """
    return volume(compound_of(shapes))


def volume_adaptive(shape: TopoDS_Shape, relative: float = 1e-9) -> float:
    """Return the volume [mm^3] by adaptive Gauss-Kronrod integration: exact on splines, but up to a minute slow."""
    properties = GProp_GProps()
    BRepGProp.VolumePropertiesGK_s(shape, properties, relative, False, True, False, False, False)
    return float(properties.Mass())


def area(shape: TopoDS_Shape) -> float:
    """Return the surface area [mm^2]."""
    properties = GProp_GProps()
    BRepGProp.SurfaceProperties_s(shape, properties)
    return float(properties.Mass())


def centroid(shape: TopoDS_Shape) -> tuple[float, float, float]:
    """Return the centre of volume [mm]."""
    properties = GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, properties)
    x, y, z = properties.CentreOfMass().Coord()
    return float(x), float(y), float(z)


def bounding_box(shape: TopoDS_Shape) -> tuple[np.ndarray, np.ndarray]:
    """Return the tight axis-parallel box, lower and upper corner, (3,), (3,) [mm]."""
    box = Bnd_Box()
    BRepBndLib.AddOptimal_s(shape, box, False, False)
    return np.array(box.CornerMin().Coord()), np.array(box.CornerMax().Coord())


def is_valid(shape: TopoDS_Shape) -> bool:
    """True when the kernel finds nothing wrong. It does not see faces that cross: never the only check."""
    return bool(BRepCheck_Analyzer(shape).IsValid())
