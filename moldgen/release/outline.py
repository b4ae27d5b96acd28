"""How far the outline of a part, seen along a pull, is from lying in one plane."""

from __future__ import annotations

import numpy as np

OUTLINE_WAYS = 90
"""Directions in which the outline of the part is looked at for the height of its parting line."""


def unevenness(corners: np.ndarray, axis: np.ndarray, across: np.ndarray, diagonal: float) -> tuple[float, float]:
    """Return the mean distance [mm] of the outline from the level plane that suits it best, and that plane's height.

    In each direction square to the axis the outermost corners leave the parting line a range of heights; a plane
    inside the range costs nothing there. The height is the coordinate along the axis [mm].

    Parameters
    ----------
    corners : corners of the convex hull, (n, 3) [mm]
    across : two unit vectors square to the axis, (2, 3)
    diagonal : of the part's box [mm]
    """
    height = corners @ axis
    angle = np.arange(OUTLINE_WAYS) * (2.0 * np.pi / OUTLINE_WAYS)
    reach = corners @ (np.outer(np.cos(angle), across[0]) + np.outer(np.sin(angle), across[1])).T
    outer = reach > reach.max(axis=0) - 1e-3 * diagonal
    low = np.where(outer, height[:, None], np.inf).min(axis=0)
    high = np.where(outer, height[:, None], -np.inf).max(axis=0)
    levels = np.unique(np.round(np.concatenate([low, high]), 6))
    miss = np.maximum(low - levels[:, None], 0.0) + np.maximum(levels[:, None] - high, 0.0)
    mean = miss.mean(axis=1)
    best = int(np.argmin(np.round(mean, 9)))
    return float(mean[best]), float(levels[best])
