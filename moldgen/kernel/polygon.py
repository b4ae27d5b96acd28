"""Closed polygons in a plane."""

from __future__ import annotations

import numpy as np


def signed_area(polygon: np.ndarray) -> float:
    """Return the area of a closed polygon (n, 2 or more) in its first two columns, positive counterclockwise."""
    x, y = polygon[:, 0], polygon[:, 1]
    return float(0.5 * (x * np.roll(y, -1) - y * np.roll(x, -1)).sum())


def contains(polygon: np.ndarray, places: np.ndarray) -> np.ndarray:
    """Return which places (k, 2) lie inside a closed polygon (n, 2), by counting edges to their right, (k,) bool."""
    one, two = polygon, np.roll(polygon, -1, axis=0)
    x, y = places[:, :1], places[:, 1:]
    spans = (one[:, 1] > y) != (two[:, 1] > y)
    rise = np.where(two[:, 1] == one[:, 1], 1.0, two[:, 1] - one[:, 1])
    beyond = one[:, 0] + (y - one[:, 1]) * (two[:, 0] - one[:, 0]) / rise > x
    return np.asarray((spans & beyond).sum(axis=1) % 2 == 1)
