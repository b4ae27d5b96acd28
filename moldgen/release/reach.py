"""Which points of the surface steel can reach along a direction, by rays from points spread over the surface."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer

WALL_SINE = 0.0087
"""|n.d| below which a point lies on a wall that either half can form (half a degree)."""

LEAN = 0.2
"""Sine (11.5 deg) of the lean that costs as much as being out of reach, see `lean_cost`. Our choice: wider than the
distance between neighbors of the coarse grid, so that some grid direction lies in the funnel of every good pull."""

STEP = 0.25
"""What a point that leans the wrong way costs at once; the rest grows with its lean. Our choice: most of the cost must
lead the search, but one point out of reach must outweigh the taper of all others."""

TAPER_WEIGHT = 0.001
"""What taper is worth in `lean_cost`: enough to center a direction in the play that drafted walls leave it."""


@dataclass(frozen=True)
class Samples:
    """Points spread over the surface, each for the same area.

    points : (n, 3) [mm], lifted off the surface a little; normals : (n, 3) unit; face : (n,) face numbers
    faced : (n,) bool, whether plastic stands before the point, as on the walls of a pocket
    area_mm2 : of the whole surface
    """

    points: np.ndarray
    normals: np.ndarray
    face: np.ndarray
    faced: np.ndarray
    area_mm2: float

    @property
    def spacing(self) -> float:
        """Mean distance [mm] between neighbors."""
        return float(np.sqrt(self.area_mm2 / len(self.points)))


def surface_samples(part: Body, tracer: Tracer, count: int) -> Samples:
    """Return `count` points spread evenly over the surface of a part; they turn with its mesh."""
    total = np.cumsum(part.triangle_areas)
    place = (np.arange(count) + 0.5) * (total[-1] / count)
    triangle = np.minimum(np.searchsorted(total, place), len(total) - 1)
    turn = np.arange(1, count + 1)
    u, v = (0.5 + 0.7548776662466927 * turn) % 1.0, (0.5 + 0.5698402909980532 * turn) % 1.0
    fold = u + v > 1.0
    u, v = np.where(fold, 1.0 - u, u)[:, None], np.where(fold, 1.0 - v, v)[:, None]
    corners = part.mesh.corners[triangle]
    points = corners[:, 0] + u * (corners[:, 1] - corners[:, 0]) + v * (corners[:, 2] - corners[:, 0])
    normals = part.mesh.normals[triangle]
    normals = normals / np.maximum(np.linalg.norm(normals, axis=1), 1e-30)[:, None]
    lift = 0.02 + 1e-4 * part.diagonal
    points = points + lift * normals
    return Samples(points, normals, part.mesh.face[triangle], tracer.blocked(points, normals), float(total[-1]))


def trapped_points(tracer: Tracer, samples: Samples, axis: np.ndarray) -> np.ndarray:
    """Return which points cannot be left along +axis or -axis, whichever way they look, (n,) bool."""
    sine = samples.normals @ axis
    trapped = np.ones(len(sine), dtype=bool)
    for sign in (1.0, -1.0):
        asked = np.flatnonzero(sign * sine > -WALL_SINE)
        asked = asked[trapped[asked]]
        trapped[asked] = tracer.blocked(samples.points[asked], sign * axis)
    return trapped


def trapped_room(part: Body, tracer: Tracer, samples: Samples, axis: np.ndarray) -> float:
    """Return the volume [mm^3] of the spaces that no steel moving along an axis can leave, estimated by rays.

    Such a space is a column between a face and the face that looks back at it along the axis. Both ends are sampled,
    so the sum over the faces that look either way holds each column twice.
    """
    sine = samples.normals @ axis
    asked = np.flatnonzero(np.abs(sine) > WALL_SINE)
    way = np.sign(sine[asked])[:, None] * axis
    hit = tracer.first_triangle(samples.points[asked], way)
    met = hit >= 0
    asked, way, hit = asked[met], way[met], hit[met]
    corner, normal = part.mesh.corners[hit, 0], part.mesh.normals[hit]
    against = -(normal * way).sum(axis=1)
    closed = against > 1e-9  # else the ray came through an edge
    rise = ((samples.points[asked] - corner) * normal).sum(axis=1)[closed] / against[closed]
    each = samples.area_mm2 / len(samples.points)
    return 0.5 * each * float((np.maximum(rise, 0.0) * np.abs(sine[asked][closed])).sum())


def lean_cost(tracer: Tracer, samples: Samples, axis: np.ndarray) -> float:
    """Return a soft form of the trapped share, 0 to 1, that leads a search to a pull from several degrees away.

    A wall without draft is out of reach as soon as the pull leans off it, so the trapped share itself has narrow
    valleys between flat plateaus. Here a point that could be left the other way, if only its wall did not lean, costs
    in proportion to the lean. Walls of pockets that taper earn a little, with decreasing returns: best in the middle
    of the play. Outer walls may taper as they like.
    """
    sine = samples.normals @ axis
    lean = np.clip(np.abs(sine) / LEAN, 0.0, 1.0)
    way = np.where(sine >= 0.0, 1.0, -1.0)[:, None] * axis
    shut = tracer.blocked(samples.points, way)
    asked = np.flatnonzero(shut & (lean < 1.0))
    upright = (np.abs(sine[asked]) < WALL_SINE)[:, None]
    along = -way[asked] + np.abs(sine[asked])[:, None] * samples.normals[asked]  # back, along the wall
    along = along / np.linalg.norm(along, axis=1)[:, None] + WALL_SINE * samples.normals[asked]
    along = np.where(upright, -way[asked], along)
    cost = shut.astype(float)
    free = ~tracer.blocked(samples.points[asked], along)
    cost[asked[free]] = np.where(upright[:, 0], 0.0, STEP + (1.0 - STEP) * lean[asked])[free]
    taper = np.sqrt(np.maximum(lean - WALL_SINE / LEAN, 0.0))
    return float(cost.mean() - TAPER_WEIGHT * np.where(shut | ~samples.faced, 0.0, taper).mean())
