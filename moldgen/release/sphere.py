"""Pulls found by looking along every direction: a coarse grid over the half-sphere, then caps that shrink."""

from __future__ import annotations

import numpy as np

from moldgen.kernel.tracer import Tracer
from moldgen.release.candidates import PartFrame, same_axis
from moldgen.release.reach import Samples, lean_cost

GRID = 240
"""Directions over the half-sphere, about 9 deg apart."""

STARTS = 4
"""So many of the best directions of the grid are refined."""

APART = 0.94
"""Cosine (20 deg) of the angle that these starts keep from each other."""

FIRST_CAP, LAST_CAP = 6.0, 0.08
"""Radius [deg] of the first and of the last cap around a start."""

RING, MOST_STEPS = 6, 24
"""Directions on the rim of a cap; moves and shrinkings after which a start is left as it is."""


def free_directions(tracer: Tracer, rough: Samples, fine: Samples, frame: PartFrame) -> list[np.ndarray]:
    """Return directions, best first, along which locally the least of the surface is out of reach.

    The grid stands in the frame of the part, so that it turns with the part. It is judged by the `rough` samples, what
    is refined by the `fine` ones.
    """
    turn = np.arange(GRID)
    height = (turn + 0.5) / GRID
    ring, angle = np.sqrt(1.0 - height**2), turn * 2.399963229728653  # golden angle: even over the sphere
    grid = np.stack([ring * np.cos(angle), ring * np.sin(angle), height], axis=1) @ frame.rows
    costs = [lean_cost(tracer, rough, axis) for axis in grid]
    starts: list[int] = []
    for place in sorted(range(GRID), key=lambda i: (round(costs[i], 9), i)):
        if all(not same_axis(grid[place], grid[other], APART) for other in starts):
            starts.append(place)
        if len(starts) == STARTS:
            break
    refined = [_refined(tracer, fine, frame, grid[i]) for i in starts]
    refined.sort(key=lambda found: round(found[1], 9))
    return [axis for axis, _ in refined]


def _refined(tracer: Tracer, samples: Samples, frame: PartFrame, start: np.ndarray) -> tuple[np.ndarray, float]:
    """Move to the best direction on the rim of a cap, or shrink the cap when none is better."""
    axis, cost = start, lean_cost(tracer, samples, start)
    radius = FIRST_CAP
    turn = 0.0
    for _ in range(MOST_STEPS):
        angle = turn + np.arange(RING) * (2.0 * np.pi / RING)
        rim = np.stack([np.cos(angle), np.sin(angle)], axis=1) @ frame.across(axis)
        tried = np.cos(np.radians(radius)) * axis + np.sin(np.radians(radius)) * rim
        costs = [lean_cost(tracer, samples, way) for way in tried]
        best = int(np.argmin(np.round(costs, 9)))
        if costs[best] < cost:
            axis, cost = tried[best], costs[best]
            continue
        radius, turn = 0.5 * radius, turn + 0.5  # the next rim looks between the directions of this one
        if radius < LAST_CAP:
            break
    return axis, cost
