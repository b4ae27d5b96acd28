"""Where the steel of the old tool stands in the new tool's mold frame.

A point goes the way old mold, old part, alignment, new part, new mold. Steel does not shrink: where the resin changed,
the two shrink factors differ, and the way would scale it. So the steel is moved rigidly: by the turn of the way, and to
the place that the way gives to the old tool's fixed point (the point that does not move as the part shrinks). With
equal shrink this is the way itself.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.kernel.place import turned
from moldgen.model.part import UPRIGHT, Box, MoldFrame, Rows, Vector, vector
from moldgen.model.revision import Alignment

STILL = 1e-7
"""A turn by less than this [rad] and a move by less [mm] are none: the coordinates then stay to the last digit."""


@dataclass(frozen=True)
class Placing:
    """A rigid motion of the old tool: new mold = rotation @ old mold + shift [mm]."""

    rotation: Rows = UPRIGHT
    shift: Vector = (0.0, 0.0, 0.0)

    @property
    def still(self) -> bool:
        """True when the old tool stays where it was drawn."""
        return self.rotation == UPRIGHT and self.shift == (0.0, 0.0, 0.0)

    @property
    def upright(self) -> bool:
        """True when both tools open the same way: +z stays +z."""
        return abs(self.rotation[2][2] - 1.0) < 1e-9

    @property
    def square(self) -> bool:
        """True when the turn is by quarters, so that a box stays a box."""
        return all(min(abs(v), abs(abs(v) - 1.0)) < 1e-9 for row in self.rotation for v in row)

    def point(self, old: Vector) -> Vector:
        """Return where a point of the old mold stands [mm]."""
        return vector(np.array(self.rotation) @ old + np.array(self.shift))

    def way(self, old: Vector) -> Vector:
        """Return where a direction of the old mold looks."""
        return vector(np.array(self.rotation) @ old)

    def box(self, old: Box) -> Box:
        """Return the box around a box of the old mold [mm]."""
        corners = np.array([self.point((x, y, z)) for x in _ends(old, 0) for y in _ends(old, 1) for z in _ends(old, 2)])
        return vector(corners.min(axis=0)), vector(corners.max(axis=0))

    def solid(self, old: Any) -> Any:
        """Return a solid of the old mold where it stands; unchanged if the tool stays."""
        return old if self.still else turned(old, self.rotation, self.shift)


def place_old(old: MoldFrame, new: MoldFrame, alignment: Alignment) -> Placing:
    """Return how the steel of the old tool stands in the mold frame of the new one."""
    turn = np.array(alignment.rotation)
    rotation = np.array(new.rotation) @ turn @ np.array(old.rotation).T
    x, y, z = turn @ np.array(old.fixed_point) + np.array(alignment.translation)
    fixed = np.array(new.to_mold((float(x), float(y), float(z))))
    rows = np.round(rotation)
    if np.abs(rotation - rows).max() > STILL:
        rows = rotation
    shift = fixed - rows @ np.array(old.to_mold(old.fixed_point))
    if np.abs(shift).max() < STILL:
        shift = np.zeros(3)
    a, b, c = (vector(row) for row in rows)
    return Placing((a, b, c), vector(shift))


def _ends(box: Box, axis: int) -> tuple[float, float]:
    return box[0][axis], box[1][axis]
