"""Before any side action is designed: how many a pull would need, estimated by rays from the trapped points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer
from moldgen.release.candidates import PartFrame
from moldgen.release.reach import WALL_SINE, Samples

WAYS = 24
"""Directions square to the pull in which steel may leave, besides the normals of flat walls."""

ONE_WAY = 0.9998
"""Cosine (1.1 deg) from which two directions count as one."""

NEIGHBOR = 2.5
"""Trapped points this many spacings apart belong together when their faces are the same or meet."""

FEWEST = 3
"""Points of a place below which it is taken for noise: less than this many samples of surface."""

WHOLE = 0.95
"""Share of a place's points that a direction must free to count as freeing the place: rays graze at its rims."""

LONG_WAY = 0.25
"""Share of the part's diagonal by which a side action may travel farther for a place than by the shortest way out.
Our choice: a window is opened from its own side, not through the opposite one."""

FEW = 0.02
"""Share of all trapped points that a direction must free to be worth a side action of its own."""

MOST_POINTS = 3000
"""Trapped points that are asked; of more, each so many-th is."""


@dataclass(frozen=True)
class SideEstimate:
    """How the surface that is out of reach along a pull could be reached.

    directions : (k, 3), the fewest directions square to the pull that free what can be freed along a line
    places : connected places out of reach
    unreleased_mm2 : area that no such direction frees: a lifter, a collapsing core or another part is needed
    """

    directions: np.ndarray
    places: int
    unreleased_mm2: float


def estimate_sides(
    part: Body, frame: PartFrame, tracer: Tracer, samples: Samples, pull: tuple[np.ndarray, np.ndarray]
) -> SideEstimate:
    """Return how many side actions a pull needs, and what they leave.

    pull : unit axis, and which samples are trapped along it, (n,) bool
    """
    axis, trapped = pull
    chosen = np.flatnonzero(trapped)
    step = -(-len(chosen) // MOST_POINTS) or 1
    place = _places(part, samples, chosen)
    chosen, place = chosen[::step], place[::step]
    large = np.bincount(place, minlength=1)[place] >= FEWEST
    chosen, place = chosen[large], place[large]
    if len(chosen) == 0:
        return SideEstimate(np.zeros((0, 3)), 0, 0.0)
    ways = _ways(frame, axis)
    freed = np.stack([_freed(tracer, samples, chosen, way) for way in ways], axis=1)
    used, left = _cover(freed, place, _opened(part, ways, samples.points[chosen], freed, place))
    each = samples.area_mm2 / len(samples.points) * step
    return SideEstimate(ways[used], len(np.unique(place)), float(left.sum()) * each)


def _places(part: Body, samples: Samples, chosen: np.ndarray) -> np.ndarray:
    """Return for each chosen sample the number of its connected place, (k,) int."""
    pairs = cKDTree(samples.points[chosen]).query_pairs(NEIGHBOR * samples.spacing, output_type="ndarray")
    count = len(part.faces)
    low, high = np.sort(part.edge_faces, axis=1).T
    meet = np.concatenate([low * count + high, np.arange(count) * (count + 1)])
    face = np.sort(samples.face[chosen][pairs], axis=1)
    pairs = pairs[np.isin(face[:, 0] * count + face[:, 1], meet)]
    links = coo_matrix((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(len(chosen), len(chosen)))
    return np.asarray(connected_components(links, directed=False)[1])


def _ways(frame: PartFrame, axis: np.ndarray) -> np.ndarray:
    """Return the directions square to the pull: first the normals of flat walls and the axes of bores, both ways."""
    level = [a - (a @ axis) * axis for a, _ in frame.flat + frame.round if abs(float(a @ axis)) < WALL_SINE]
    level = [a / np.linalg.norm(a) for a in level[:WAYS]]
    turn = np.arange(WAYS) * (2.0 * np.pi / WAYS)
    base = np.stack([level[0], np.cross(axis, level[0])]) if level else frame.across(axis)
    even = np.stack([np.cos(turn), np.sin(turn)], axis=1) @ base
    kept: list[np.ndarray] = []
    for way in [*(s * a for a in level for s in (1.0, -1.0)), *even]:
        if all(float(way @ other) < ONE_WAY for other in kept):
            kept.append(way)
    return np.stack(kept)


def _freed(tracer: Tracer, samples: Samples, chosen: np.ndarray, way: np.ndarray) -> np.ndarray:
    free: np.ndarray = samples.normals[chosen] @ way > -WALL_SINE
    asked = np.flatnonzero(free)
    free[asked] = ~tracer.blocked(samples.points[chosen[asked]], way)
    return free


def _opened(part: Body, ways: np.ndarray, points: np.ndarray, freed: np.ndarray, place: np.ndarray) -> np.ndarray:
    """Return which places are opened by which directions without a detour, (places, ways) bool."""
    size = np.bincount(place)
    share = np.stack([np.bincount(place, column, len(size)) for column in freed.T], axis=1)
    whole = share >= WHOLE * size[:, None]
    innermost = np.full(share.shape, np.inf)
    np.minimum.at(innermost, place, points @ ways.T)
    travel = np.where(whole, (part.mesh.vertices @ ways.T).max(axis=0) - innermost, np.inf)
    return np.asarray(whole & (travel <= travel.min(axis=1)[:, None] + LONG_WAY * part.diagonal))


def _cover(freed: np.ndarray, place: np.ndarray, opened: np.ndarray) -> tuple[list[int], np.ndarray]:
    """Return the directions taken, and which points are left.

    Whole places first, since one slide that opens a place is worth more than two that each open a part of two; then
    points, as round grooves need that are opened from two sides. Each time the direction that frees the most.
    """
    used: list[int] = []
    left = np.ones(len(place), dtype=bool)
    size = np.bincount(place)
    # the few points of an opened place that graze are freed with it
    for gain, fewest in ((opened[place], FEWEST), (freed, max(FEWEST, FEW * len(place)))):
        for way in used:  # what a side action of a whole place opens by the way
            left &= ~freed[:, way]
        while True:
            count = (gain & left[:, None]).sum(axis=0)
            best = int(np.argmax(count))
            if count[best] < fewest:
                break
            used.append(best)
            left &= ~gain[:, best]
    stray = np.bincount(place[left], minlength=len(size)) < np.maximum(FEWEST, (1.0 - WHOLE) * size)
    return used, left & ~stray[place]
