"""The steel that two blocks share although one stands turned to the other."""

from __future__ import annotations

import math

import numpy as np

from moldgen.model.part import Box
from moldgen.revision.placing import Placing

ROUND_THE_PART = 2.0
"""mm of steel beside the part that the shared box must hold, or the blocks are not compared inside it (our choice)."""


def shared_upright(old: Box, new: Box, placing: Placing, part: Box) -> tuple[np.ndarray, np.ndarray] | None:
    """Return the largest box like the new block, about its middle, that lies in both blocks in plan.

    Parameters
    ----------
    old : block of the old mold, which `placing` turns about the pull; new, part : in the new mold [mm]

    Returns
    -------
    Lower and upper corner (2,) [mm], None if the box would not hold the part
    """
    low, high = (np.array(corner[:2]) for corner in new)
    old_low, old_high = (np.array(corner[:2]) for corner in old)
    turn = np.array(placing.rotation)[:2, :2]
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    start = turn.T @ (middle - np.array(placing.shift[:2]))
    share = 1.0
    for signs in ((1, 1), (1, -1), (-1, 1), (-1, -1)):
        way = turn.T @ (half * signs)
        for axis in range(2):
            room = (old_high if way[axis] > 0 else old_low)[axis] - start[axis]
            if abs(way[axis]) > 1e-12:
                share = min(share, float(room / way[axis]))
    box = middle - share * half, middle + share * half
    part_low, part_high = (np.array(corner[:2]) for corner in part)
    holds = (box[0] <= part_low - ROUND_THE_PART).all() and (box[1] >= part_high + ROUND_THE_PART).all()
    return box if holds else None


def turned_by_deg(placing: Placing) -> float:
    """Return how far a placing turns about the pull [deg]."""
    return math.degrees(math.atan2(placing.rotation[1][0], placing.rotation[0][0]))
