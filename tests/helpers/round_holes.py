"""The round walls of a solid in a STEP file that stand along z."""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path

from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.GeomAbs import GeomAbs_Cone, GeomAbs_Cylinder

from moldgen.kernel.measure import bounding_box
from moldgen.kernel.step_read import read_assembly
from moldgen.kernel.topology import faces_of


@dataclass(frozen=True)
class RoundWall:
    """A cylinder (taper 0) or cone about an upright axis: radius at z = 0 and its growth with z; extent in z [mm]."""

    x: float
    y: float
    radius: float
    taper: float
    low: float
    high: float

    def has_diameter(self, diameter: float, z: float) -> bool:
        """True if the wall has this diameter at height z, to the digits of the table."""
        return abs(2 * (self.radius + self.taper * z) - diameter) < 2e-4


def round_walls(path: Path) -> list[RoundWall]:
    """Return the round walls along z of the one solid in a file."""
    ((_, solid),) = read_assembly(path)
    return [wall for wall in map(_wall, faces_of(solid)) if wall is not None]


def _wall(face) -> RoundWall | None:
    surface = BRepAdaptor_Surface(face)
    if surface.GetType() == GeomAbs_Cylinder:
        shape = surface.Cylinder()
        radius, taper = shape.Radius(), 0.0
    elif surface.GetType() == GeomAbs_Cone:
        shape = surface.Cone()
        taper = math.tan(shape.SemiAngle()) / shape.Axis().Direction().Z() if shape.Axis().Direction().Z() else 0.0
        radius = shape.RefRadius() - taper * shape.Location().Z()
    else:
        return None
    axis = shape.Axis()
    if abs(abs(axis.Direction().Z()) - 1.0) > 1e-9:
        return None
    low, high = bounding_box(face)
    return RoundWall(axis.Location().X(), axis.Location().Y(), radius, taper, float(low[2]), float(high[2]))


@dataclass(frozen=True)
class LeaningWall:
    """A cylinder whose axis leans: a point of the axis, its direction upward (unit vector), diameter [mm]."""

    at: tuple[float, float, float]
    along: tuple[float, float, float]
    diameter: float

    def place(self, z: float) -> tuple[float, float]:
        """Where the axis crosses the height z."""
        way = (z - self.at[2]) / self.along[2]
        return self.at[0] + way * self.along[0], self.at[1] + way * self.along[1]

    @property
    def lean_deg(self) -> float:
        """Angle between the axis and the pull."""
        return math.degrees(math.acos(self.along[2]))


def leaning_walls(path: Path) -> list[LeaningWall]:
    """Return the cylinders of the one solid in a file whose axis is neither upright nor level."""
    ((_, solid),) = read_assembly(path)
    found = []
    for face in faces_of(solid):
        surface = BRepAdaptor_Surface(face)
        if surface.GetType() != GeomAbs_Cylinder:
            continue
        shape = surface.Cylinder()
        at, way = shape.Axis().Location(), shape.Axis().Direction()
        if 0.01 < abs(way.Z()) < 0.999999:
            up = math.copysign(1.0, way.Z())
            along = (up * way.X(), up * way.Y(), up * way.Z())
            found.append(LeaningWall((at.X(), at.Y(), at.Z()), along, 2 * shape.Radius()))
    return found
