"""From where the steel to cut and to weld is seen: the view in which most of it lies open."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.output.picture_geometry import View, area_normals, look_from
from moldgen.output.scene import Points, SceneBody

SAMPLES = 96
"""So many points on all pieces together are tested in each view (our choice: a tenth of a second on 20 000 facets)."""

FEWEST = 4
"""So many points of each piece at least."""

NEAR = 0.01
"""mm: what stands less than this in front of a point touches it."""

GRAZING = 0.02
"""Cosine under which a surface is seen edge-on."""

AZIMUTHS = 8
ELEVATIONS = ((35.0, 1.0), (65.0, 0.9))
"""Elevations of the views [deg], and the worth of what they show: the steeper, the less depth one sees."""

STRAIGHT_WORTH = 0.7
"""The same for a view along the pull."""


@dataclass(frozen=True)
class Sight:
    """A view, and what it shows.

    share : how much of the pieces lies open in it, 0 to 1
    anchors : for each piece a point (3,) on it [mm], open to the viewer if any is
    """

    view: View
    share: float
    anchors: tuple[Points, ...]


@dataclass(frozen=True)
class _Samples:
    """Points (n, 3) on the pieces, outward normals (n, 3), and the number (n,) of the piece of each."""

    points: Points
    normals: Points
    owner: np.ndarray


def choose_sight(steel: SceneBody, pieces: Sequence[SceneBody]) -> Sight:
    """Return the view, of some thirty, in which most of the surface of `pieces` faces the viewer and is not hidden.

    Each piece counts with the root of its surface, so that a large one does not turn the small ones away.
    """
    samples = _sample(pieces)
    roots = np.sqrt([max(float(_areas(p).sum()), 1e-12) for p in pieces])
    found: list[tuple[float, View, np.ndarray]] = []
    for view, worth in candidate_views():
        facing = np.clip(samples.normals @ view.toward, 0.0, None)
        opened = facing * ~hidden(samples.points, steel, view, facing > GRAZING)
        shares = np.bincount(samples.owner, opened, len(pieces)) / np.bincount(samples.owner, minlength=len(pieces))
        found.append((round(worth * float(shares @ roots / roots.sum()), 9), view, opened))
    score, view, opened = max(found, key=lambda f: f[0])  # the first of equals
    return Sight(view, score, tuple(_anchor(samples, opened, k) for k in range(len(pieces))))


def candidate_views() -> Iterator[tuple[View, float]]:
    """Yield views and what they are worth: from above and below, all around, and along the pull."""
    start = np.arctan2(-0.80, 0.62)  # as the other pictures
    for elevation, worth in ELEVATIONS:
        for sign in (1.0, -1.0):
            for k in range(AZIMUTHS):
                turn, rise = start + 2.0 * np.pi * k / AZIMUTHS, sign * np.radians(elevation)
                x, y, z = np.cos(turn) * np.cos(rise), np.sin(turn) * np.cos(rise), np.sin(rise)
                yield look_from((float(x), float(y), float(z))), worth
    for z in (1.0, -1.0):
        yield look_from((0.0, 0.0, z), up=(0.0, 1.0, 0.0)), STRAIGHT_WORTH


def view_words(view: View) -> str:
    """Return from where one looks, in words: the cavity half stands above the parting plane."""
    z = float(view.toward[2])
    side = "above" if z > 0.0 else "below"
    return f"seen straight from {side}" if abs(z) > 0.99 else f"seen from {side}"


def hidden(points: Points, steel: SceneBody, view: View, asked: np.ndarray) -> np.ndarray:
    """Return for each of `points` (n, 3) whether `steel` stands in front of it; True where not `asked` (n,)."""
    answer = ~asked
    if not asked.any():
        return answer
    places, heights = view.flat(points), points @ view.toward
    flat, depth = view.flat(steel.vertices), steel.vertices @ view.toward
    corners, depths = flat[steel.triangles], depth[steel.triangles]
    p, q, r = (corners[:, k] for k in range(3))  # far faster than reducing an axis of three
    low, high = np.minimum(np.minimum(p, q), r), np.maximum(np.maximum(p, q), r)
    (x0, y0), (x1, y1) = places[asked].min(axis=0), places[asked].max(axis=0)
    near = (low[:, 0] <= x1) & (low[:, 1] <= y1) & (high[:, 0] >= x0) & (high[:, 1] >= y0)
    corners, depths, low, high = corners[near], depths[near], low[near], high[near]
    for i in np.flatnonzero(asked):
        x, y = places[i]
        over = (low[:, 0] <= x) & (high[:, 0] >= x) & (low[:, 1] <= y) & (high[:, 1] >= y)
        over = np.flatnonzero(over)
        over = over[depths[over].max(axis=1) > heights[i] + NEAR]
        answer[i] = _covers(corners[over] - places[i], depths[over], float(heights[i]) + NEAR)
    return answer


def _covers(corners: Points, depths: Points, height: float) -> bool:
    """Return whether a triangle (m, 3, 2) about the origin lies over it, nearer to the viewer than `height`."""
    p, q, r = (corners[:, k] for k in range(3))
    weights = np.stack([_cross(q, r), _cross(r, p), _cross(p, q)], axis=1)
    total = weights.sum(axis=1)
    inside = ((weights >= 0.0).all(axis=1) | (weights <= 0.0).all(axis=1)) & (np.abs(total) > 1e-12)
    return bool(((weights[inside] * depths[inside]).sum(axis=1) / total[inside] > height).any())


def _cross(p: Points, q: Points) -> Points:
    return np.asarray(p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0])


def _sample(pieces: Sequence[SceneBody]) -> _Samples:
    """Return centers of triangles, spread evenly over the surface of each piece: no chance is in it."""
    each = max(FEWEST, SAMPLES // max(len(pieces), 1))
    points, normals, owner = [], [], []
    for k, piece in enumerate(pieces):
        corners = piece.vertices[piece.triangles]
        across = area_normals(piece.vertices, piece.triangles)
        length = np.linalg.norm(across, axis=1)
        reached = np.cumsum(length)
        chosen = np.searchsorted(reached, (np.arange(each) + 0.5) / each * reached[-1])
        points.append(corners[chosen].mean(axis=1))
        normals.append(across[chosen] / np.maximum(length[chosen], 1e-300)[:, None])
        owner.append(np.full(each, k))
    return _Samples(np.concatenate(points), np.concatenate(normals), np.concatenate(owner))


def _areas(piece: SceneBody) -> Points:
    return np.asarray(np.linalg.norm(area_normals(piece.vertices, piece.triangles), axis=1) / 2.0)


def _anchor(samples: _Samples, opened: np.ndarray, piece: int) -> Points:
    """Return the open point of a piece that is nearest to the middle of all its open points."""
    mine = np.flatnonzero(samples.owner == piece)
    clear = mine[opened[mine] > 0.0]
    points = samples.points[clear if len(clear) else mine]
    return np.asarray(points[np.linalg.norm(points - points.mean(axis=0), axis=1).argmin()])
