"""The part as read, and as it stands in the mold."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

Solid = Any
"""A kernel solid (opaque above `moldgen.kernel`)."""

Vector = tuple[float, float, float]
Box = tuple[Vector, Vector]
"""Lower and upper corner [mm]."""

Rows = tuple[Vector, Vector, Vector]
"""A rotation by its rows."""

UPRIGHT: Rows = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
"""No rotation at all."""


def vector(values: Iterable[Any]) -> Vector:
    """Return three numbers, such as a row of an array, as a plain vector without minus zeros.

    Raises
    ------
    TypeError, ValueError : these are not three numbers
    """
    x, y, z = (float(v) + 0.0 for v in values)
    return x, y, z


@dataclass(frozen=True)
class HealNote:
    """One thing that healing changed, with its effect on the volume [mm^3]."""

    what: str
    count: int
    volume_change_mm3: float


@dataclass(frozen=True)
class Part:
    """The plastic part in its own coordinates, before shrink [mm].

    bounding_box_mm : None until the part was meshed (see `moldgen.flow.review`)
    """

    name: str
    solid: Solid
    source_sha256: str
    volume_mm3: float
    area_mm2: float
    face_count: int
    bounding_box_mm: Box | None = None
    healed: tuple[HealNote, ...] = ()


@dataclass(frozen=True)
class Pull:
    """Opening direction: unit vector in part coordinates, along which the cavity half leaves the part."""

    direction: Vector
    how_chosen: str


@dataclass(frozen=True)
class MoldFrame:
    """How a point of the part becomes a point of the mold: scale about the fixed point, then rotate pull to +z.

    mold = rotation @ (fixed + factors * (part - fixed)); `rotation` is row-major.
    """

    factors: Vector
    fixed_point: Vector
    rotation: Rows

    def to_mold(self, point: Vector) -> Vector:
        """Return a part point [mm] in mold coordinates [mm]."""
        scaled = [f + k * (p - f) for p, f, k in zip(point, self.fixed_point, self.factors, strict=True)]
        return _apply(self.rotation, scaled)

    def to_part(self, point: Vector) -> Vector:
        """Return a mold point [mm] in part coordinates [mm]."""
        columns = tuple(zip(*self.rotation, strict=True))
        scaled = _apply(columns, point)
        return tuple(f + (p - f) / k for p, f, k in zip(scaled, self.fixed_point, self.factors, strict=True))  # type: ignore[return-value]

    def mold_height(self, pull: Vector, height: float) -> float:
        """Return the mold z [mm] of a part coordinate [mm] along the pull, a unit vector turned to +z here."""
        base, unit = self._heights(pull)
        return base + height * (unit - base)

    def part_height(self, pull: Vector, level: float) -> float:
        """Return the part coordinate along the pull [mm] of a mold z [mm]."""
        base, unit = self._heights(pull)
        return (level - base) / (unit - base)

    def _heights(self, pull: Vector) -> tuple[float, float]:
        """Return the mold z of the part coordinates 0 and 1 mm along the pull."""
        return self.to_mold((0.0, 0.0, 0.0))[2], self.to_mold(pull)[2]


def _apply(rows: Any, point: Any) -> Vector:
    return tuple(sum(a * b for a, b in zip(row, point, strict=True)) for row in rows)  # type: ignore[return-value]
