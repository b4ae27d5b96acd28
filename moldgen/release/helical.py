"""Threads known by their shape: a face that a screw motion carries into itself."""

from __future__ import annotations

import math

import numpy as np

from moldgen.kernel.body import Body

FITS, ALONE, MOVES = 0.02, 3.0, 0.005
"""How far (root mean square of the normal speed, in radii of gyration) a face may leave a screw surface; how many times
worse, and by how much, every other motion must fit: a cylinder or a sphere is carried into itself by several (ours)."""

LEAST_LEAD, FEWEST = 0.2, 24
"""Advance [mm] for a turn below which a face is one of revolution; triangles that tell a surface."""

SECTORS, MOST_EMPTY = 12, 6
"""A thread goes at least half the way round its axis: of so many sectors no more may be empty (our choice)."""


def lead_of(body: Body, face: int) -> float:
    """Return the advance for a full turn [mm] of the screw motion that carries a face into itself, 0 if there is none.

    A motion with velocity a + b x p at p carries a surface into itself if that is square to its normal everywhere: the
    motion with the least normal velocity is the smallest singular vector of the rows (n, p x n).
    """
    own = body.mesh.face == face
    corners = body.mesh.corners[own]
    if len(corners) < FEWEST:
        return 0.0
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    double = np.linalg.norm(normal, axis=1)
    weight = np.sqrt(double / max(float(double.sum()), 1e-30))[:, None]
    normal = normal / np.maximum(double, 1e-30)[:, None]
    middle = corners.mean(axis=1)
    from_here = middle - np.average(middle, axis=0, weights=double)
    size = math.sqrt(float(np.average((from_here**2).sum(axis=1), weights=double)))
    rows = weight * np.c_[normal, np.cross(from_here / size, normal)]
    _, misfit, motions = np.linalg.svd(rows, full_matrices=False)
    along, turn = motions[5, :3] * size, motions[5, 3:]
    turning = float(turn @ turn)
    if misfit[5] > FITS or misfit[4] < max(ALONE * misfit[5], MOVES) or turning < 1e-3:
        return 0.0
    lead = 2.0 * math.pi * abs(float(along @ turn)) / turning
    return lead if lead > LEAST_LEAD and _goes_round(from_here, along, turn) else 0.0


def _goes_round(points: np.ndarray, along: np.ndarray, turn: np.ndarray) -> bool:
    """Return whether points (k, 3) go at least half the way round the axis of a motion."""
    axis = turn / np.linalg.norm(turn)
    beside = points - np.cross(turn, along) / float(turn @ turn)
    start = np.cross(axis, np.eye(3)[int(np.argmin(np.abs(axis)))])
    angle = np.arctan2(beside @ np.cross(axis, start), beside @ start)
    sector = np.floor((angle / (2.0 * math.pi) + 0.5) * SECTORS).astype(int) % SECTORS
    return len(np.unique(sector)) >= SECTORS - MOST_EMPTY
