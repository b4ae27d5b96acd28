"""The core's surface under the part, asked by rays on the part's mesh: an answer that no boolean had a hand in."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from moldgen.kernel.probe import Probe
from moldgen.model.halves import Halves

OUTSIDE = 1.0
"""mm: how far outside the part's box a ray starts."""

RINGS, SPOKES = 5, 24
"""Places in a circle where a height is taken: rings of equal area, and on each."""


class Ground:
    """Heights [mm] of the part's surface over and under places in plan."""

    def __init__(self, halves: Halves) -> None:
        self._probe = Probe(halves.body.mesh)
        low, high = halves.body.box
        self._under, self._over = float(low[2]) - OUTSIDE, float(high[2]) + OUTSIDE

    def under_circle(self, x: float, y: float, radius: float, missing: float) -> np.ndarray:
        """Return the height of the core's surface at places of equal weight in a circle, (k,).

        missing : height where there is no part
        """
        rings = radius * np.sqrt((np.arange(RINGS) + 0.5) / RINGS)
        turn = 2 * np.pi * (np.arange(SPOKES) + 0.5) / SPOKES
        found = self.under([(x + r * math.cos(t), y + r * math.sin(t)) for r in rings for t in turn])
        return np.where(np.isfinite(found), found, missing)

    def under_ring(self, x: float, y: float, radius: float) -> np.ndarray:
        """Return the height of the core's surface on a circle's line, where there is part over it, (k,)."""
        found = self.under(_circle(x, y, radius))
        return np.asarray(found[np.isfinite(found)])

    def under(self, places: Sequence[tuple[float, float]]) -> np.ndarray:
        """Return the height of the first surface met from below over each place, inf where there is none, (k,)."""
        origins = np.column_stack([np.array(places), np.full(len(places), self._under)])
        return np.asarray(self._under + self._probe.first(origins, (0.0, 0.0, 1.0))[0])

    def over_circle(self, x: float, y: float, radius: float) -> np.ndarray:
        """Return the height of the first surface met from above in the middle and on a circle's line; -inf: none."""
        places = np.array([(x, y), *_circle(x, y, radius)])
        origins = np.column_stack([places, np.full(len(places), self._over)])
        return np.asarray(self._over - self._probe.first(origins, (0.0, 0.0, -1.0))[0])

    def ahead(self, origins: np.ndarray, direction: np.ndarray) -> np.ndarray:
        """Return how far it is from points (k, 3) along a unit vector (3,) to the part; inf: it is not met, (k,)."""
        return self._probe.first(origins, direction)[0]


def _circle(x: float, y: float, radius: float) -> list[tuple[float, float]]:
    turn = 2 * np.pi * np.arange(2 * SPOKES) / (2 * SPOKES)
    return [(x + radius * math.cos(t), y + radius * math.sin(t)) for t in turn]
