"""Split slides: steel around the part that parts in two along a plane through it, each half leaving its own way."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh_prism import split_level
from moldgen.kernel.meshsolid import MeshSolid, thick_pieces
from moldgen.release.side_front import Found, whole_front
from moldgen.release.side_space import View
from moldgen.release.trapped import TrapPiece

TOGETHER = 0.94
"""Share of rays that must be free one way or the other before a space is split between two ways: rays graze at rims."""

STRAY = 0.03
"""Share of a space's points that may be blocked on their own side of a splitting plane before it is tried in full."""

MOST_PAIRS = 3
"""Bound on the pairs of opposite ways tried for a space; each has at most three splitting planes."""

WIDEST = 1.0
"""How far [mm] from the splitting plane a flat face may lie where a slide ends instead (our choice)."""

MOST_FACES, MOST_MIDDLES, LEAST_RING, ON_CIRCLE = 12, 3, 6, 1e-4
"""Axes of round faces: faces of a piece that are asked, axes that are kept, vertices that tell a circle, and how far
[mm] they may lie off it."""

Blocked: TypeAlias = Callable[[np.ndarray, np.ndarray], np.ndarray]

APART = 0.05
"""Splitting planes nearer than this [mm] to each other count as one."""


def opposite_ways(ways: np.ndarray) -> np.ndarray:
    """Return one of each two opposite unit vectors, in their order, (k, 3)."""
    kept: list[np.ndarray] = []
    for way in ways:
        if all(abs(float(way @ other)) < 0.9998 for other in kept):
            kept.append(way)
    return np.array(kept)


Half: TypeAlias = tuple[Found, MeshSolid]


@dataclass(frozen=True)
class Splitting:
    """A way along which a space parts: what lies above `upper` leaves along it, what lies below `lower` against it.

    way : unit vector; upper, lower : heights along it [mm], the same but where flat faces of the part lie between
    """

    way: np.ndarray
    upper: float
    lower: float


def splits(points: np.ndarray, middles: np.ndarray, ways: np.ndarray, blocked: Blocked) -> list[Splitting]:
    """Return how a space may be parted, best first.

    points : of the space, (p, 3) [mm]; middles : points through which a plane would suit several spaces, (m, 3)
    ways : to try, (k, 3); blocked : which points meet plastic along a way, (p,) bool
    """
    ranked = []
    lines = opposite_ways(ways)
    for k, way in enumerate(lines):
        shut, back = blocked(points, way), blocked(points, -way)
        together = 1.0 - float((shut & back).mean())
        if together >= TOGETHER and min(shut.mean(), back.mean()) > STRAY:
            ranked.append((-round(together, 2), k, shut, back))
    found: list[Splitting] = []
    for _, k, shut, back in sorted(ranked, key=lambda r: r[:2])[:MOST_PAIRS]:
        planes = _planes(points @ lines[k], middles @ lines[k], shut, back)
        found += [Splitting(lines[k], level, level) for level in planes]
    return found


def _planes(along: np.ndarray, middles: np.ndarray, shut: np.ndarray, back: np.ndarray) -> Iterator[float]:
    """Yield heights above which few points are blocked along the way, and below which few are blocked against it."""
    between = 0.5 * float(np.quantile(along[shut], 1.0 - STRAY) + np.quantile(along[back], STRAY))
    tried: list[float] = []
    for level in (*(float(m) for m in middles), between):
        wrong = (shut ^ back) & (shut == (along > level))
        if wrong.mean() <= STRAY and all(abs(level - t) > APART for t in tried):
            tried.append(level)
            yield level + 0.0


def apart(ahead: View, split: Splitting) -> Splitting | None:
    """Return the splitting with a gap between the slides, up to flat faces beside the plane, as a slit's; or None."""
    beside = ahead.levels[np.abs(ahead.levels - split.upper) < WIDEST]
    if not (beside > split.upper).any() or not (beside < split.lower).any():
        return None
    upper, lower = float(beside[beside > split.upper].min()), float(beside[beside < split.lower].max())
    return Splitting(split.way, upper, lower)


def split_fronts(ahead: View, behind: View, solid: MeshSolid, split: Splitting) -> tuple[list[Half], list[MeshSolid]]:
    """Return two fronts that leave along the views, ahead and back, with the space of each, and what lies between them.

    Both lists are empty if either half cannot leave.
    """
    above, rest = split_level(ahead.seen(solid), split.upper)
    between, below = split_level(rest, split.lower)
    if not thick_pieces(above) or not thick_pieces(below):
        return [], []
    made: list[Half] = []
    for view, half, near in ((ahead, above, split.upper), (behind, below, -split.lower)):
        space = ahead.back(half)
        front = whole_front(view, space, near)
        if front is None:
            return [], []
        made.append((front, space))
    return made, [ahead.back(piece) for piece in thick_pieces(between)]


def middles_of(body: Body, pieces: Sequence[TrapPiece]) -> np.ndarray:
    """Return points on axes along the pull round which trapped faces run, those of most vertices first, (m, 3) [mm].

    Of each face the vertices at one height are held against a circle; the middle of the part comes last.
    """
    found: dict[tuple[float, float], int] = {}
    for face in sorted({face for piece in pieces for face, _ in piece.faces[:MOST_FACES]}):
        vertices = body.mesh.vertices[np.unique(body.mesh.triangles[body.mesh.face == face])]
        _, level = np.unique(np.round(vertices[:, 2], 5), return_inverse=True)
        for number in range(int(level.max()) + 1):
            ring = vertices[level == number, :2]
            middle = _circle(ring)
            if middle is not None:
                found[middle] = found.get(middle, 0) + len(ring)
    ranked = sorted(found, key=lambda m: (-found[m], m))[:MOST_MIDDLES]
    corner = 0.5 * (body.box[0] + body.box[1])
    return np.array([*((x, y, 0.0) for x, y in ranked), tuple(corner)])


def _circle(ring: np.ndarray) -> tuple[float, float] | None:
    """Return the middle of a circle through points (k, 2), rounded to 1e-6 mm, or None if they lie on none."""
    if len(ring) < LEAST_RING:
        return None
    from_here = ring - ring.mean(axis=0)
    system = np.c_[2.0 * from_here, np.ones(len(ring))]
    answer, _, rank, _ = np.linalg.lstsq(system, (from_here**2).sum(axis=1), rcond=None)
    if rank < 3:
        return None
    radius = np.linalg.norm(from_here - answer[:2], axis=1)
    if np.ptp(radius) > ON_CIRCLE or radius.mean() > 1e3:
        return None
    x, y = np.round(answer[:2] + ring.mean(axis=0), 6) + 0.0
    return float(x), float(y)
