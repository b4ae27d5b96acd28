"""Which half of the mold touches a vertical face: seen by rays along the pull from points just off the face."""

from __future__ import annotations

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer
from moldgen.release.kinds import FaceKinds, Kind

SAMPLES = 4000
"""Sample points over all vertical faces of a body."""

FEWEST, MOST = 4, 300
"""Bounds on the sample points of one triangle."""

STEP_OFF = 0.02
"""Distance [mm] of the points from the face, to which 1e-4 of the body's diagonal is added: more than the sag with
which neighbouring facets may stand in front of each other, less than any gap that steel can fill."""


def vertical_contact(body: Body, kinds: FaceKinds) -> np.ndarray:
    """Return the share of each vertical face that has material below it and above it, (f, 2) float in 0..1.

    Where there is material below, only steel that comes from above can reach the face, so it belongs to the cavity;
    material above gives it to the core; neither leaves the choice free; both trap it. Other kinds of faces get 0.
    """
    count = len(body.faces)
    share = np.zeros((count, 2))
    vertical = (kinds.kind == Kind.VERTICAL)[body.mesh.face] & (body.triangle_areas > 1e-9)
    if not vertical.any():
        return share
    points, triangle, weight = sample_triangles(body, np.flatnonzero(vertical), SAMPLES)
    normal = body.mesh.normals[triangle]
    normal = normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)[:, None]
    points = points + (STEP_OFF + 1e-4 * body.diagonal) * normal
    face = body.mesh.face[triangle]
    total = np.maximum(np.bincount(face, weight, count), 1e-30)
    tracer = Tracer(body.mesh)
    for column, direction in enumerate(((0.0, 0.0, -1.0), (0.0, 0.0, 1.0))):
        hit = tracer.blocked(points, direction)
        share[:, column] = np.bincount(face, weight * hit, count) / total
    return share


def sample_triangles(body: Body, chosen: np.ndarray, samples: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return evenly spread points on the chosen triangles, always the same ones.

    Parameters
    ----------
    chosen : (k,) int, triangle numbers
    samples : about how many points over all of them

    Returns
    -------
    points (p, 3) [mm], the triangle of each point (p,), the area each point stands for (p,) [mm^2]. The points of a
    triangle follow the additive recurrence of the plastic number (spread of a grid, no random numbers).
    """
    area = body.triangle_areas[chosen]
    share = np.ceil(area * samples / max(float(area.sum()), 1e-30)).astype(int)
    many = np.clip(share, FEWEST, MOST)
    place = np.repeat(np.arange(len(chosen)), many)
    turn = np.arange(len(place)) - np.repeat(np.cumsum(many) - many, many)
    u = (0.5 + 0.7548776662466927 * (turn + 1)) % 1.0
    v = (0.5 + 0.5698402909980532 * (turn + 1)) % 1.0
    fold = u + v > 1.0
    u, v = np.where(fold, 1.0 - u, u), np.where(fold, 1.0 - v, v)
    corners = body.mesh.corners[chosen][place]
    points = corners[:, 0] + u[:, None] * (corners[:, 1] - corners[:, 0]) + v[:, None] * (corners[:, 2] - corners[:, 0])
    return points, chosen[place], (area / many)[place]
