"""Rigid motions that may lay one part onto another, found from faces of the same form: rare and large ones first."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations
from typing import Final

import numpy as np

from moldgen.revision.congruent import Faces, Motion, Pairs

SEEDS: Final = 10
"""So many old faces are paired with each other to find motions (our choice: about 100 pairs; one must be unchanged)."""

MOST_MOTIONS: Final = 4000
"""Motions tried at most (our choice: 2 to 4 s where faces have many equals)."""

GOOD: Final = 0.9
"""Share of the faces that may end the search: no better motion is likely, and equal ones come with the same seeds."""

LEAST_SINE: Final = 0.02
"""Sine of the angle between two directions that give a frame (our choice)."""

LOOSE: Final = 20.0
"""A motion made from two faces is judged with so many times the tolerance, before it is refined with all."""


@dataclass(frozen=True)
class Candidate:
    """A motion, refined, and the share of the faces that it lays onto each other.

    free : True when it may also turn about an axis, since all that it was made from is round about it
    """

    motion: Motion
    share: float
    free: bool


def best_motions(pairs: Pairs) -> list[Candidate]:
    """Return the motions that match most, equally good ones all, the one nearest to no motion first; [] if none."""
    found: list[Candidate] = []
    best, tried = 0.0, 0
    for seeds in _seed_pairs(pairs):
        for motion, free in _motions(pairs, *seeds):
            tried += 1
            if tried > MOST_MOTIONS:
                break
            if pairs.share(pairs.hits(motion, LOOSE)) < best - 1e-9:
                continue
            exact = pairs.refined(motion)
            share = pairs.share(pairs.hits(exact))
            if share >= best - 1e-9 and not _known(exact, found, pairs):
                best = max(best, share)
                found = [c for c in found if c.share >= best - 1e-9] + [Candidate(exact, share, free)]
        if tried > MOST_MOTIONS or best >= GOOD:
            break
    corners = pairs.old.corners
    return sorted(found, key=lambda c: (round(moved_by(c.motion, corners), 6), tuple(np.round(c.motion.shift, 6))))


def moved_by(motion: Motion, corners: np.ndarray) -> float:
    """Return how far a motion moves some points, root of the mean square [mm]."""
    return float(np.sqrt(((motion.of(corners) - corners) ** 2).sum(axis=1).mean()))


def _known(motion: Motion, found: list[Candidate], pairs: Pairs) -> bool:
    corners = pairs.old.corners
    there = motion.of(corners)
    return any(np.abs(there - c.motion.of(corners)).max() <= 2.0 * pairs.tolerance for c in found)


def _seed_pairs(pairs: Pairs) -> list[tuple[int, int]]:
    """Return pairs of old faces, those with the fewest possible images first, then the largest.

    Pairs that leave a turn about an axis open come last: if there is no other, the part is a round body.
    """
    counts = np.bincount(pairs.first, minlength=len(pairs.old.size))
    usable = np.flatnonzero(counts)
    order: list[int] = usable[np.lexsort((usable, -pairs.old.size[usable], counts[usable]))].tolist()
    large: list[int] = usable[np.lexsort((usable, -pairs.old.size[usable]))].tolist()
    rank = {f: n for n, f in enumerate(order)}

    def cost(pair: tuple[int, int]) -> tuple[bool, int, float]:
        a, b = pair
        open_turn = _frame(_directions(pairs.old, a, b))[1] is None
        return open_turn, int(counts[a] * counts[b]), -float(pairs.old.size[a] * pairs.old.size[b])

    seeds = sorted({*order[:SEEDS], *large[: SEEDS // 2]}, key=lambda f: rank[f])
    return sorted(combinations(seeds, 2), key=lambda p: (*cost(p), rank[p[0]], rank[p[1]]))


_Direction = tuple[np.ndarray, bool]
"""A vector with a length [mm], and whether its sense means something."""


def _directions(faces: Faces, a: int, b: int) -> list[_Direction]:
    """Return vectors that two faces fix, in an order that is the same for two faces of the same forms."""
    found: list[_Direction] = [(faces.center[b] - faces.center[a], True)]
    for f in (a, b):
        reach = float(faces.reach[f])
        found += [(faces.rim[f] - faces.center[f], True), (faces.foot[f], True)]
        found.append((reach * faces.axis[f], bool(faces.signed[f])))
    for f in (a, b):
        values, vectors = np.linalg.eigh(faces.spread[f])
        apart = np.diff(np.sqrt(np.maximum(values, 0.0)))
        found += [
            (vectors[:, 0] * min(float(apart[0]), 1.0), False),
            (vectors[:, 2] * min(float(apart[1]), 1.0), False),
        ]
    return found


def _frame(directions: list[_Direction]) -> tuple[int, int | None]:
    """Return which directions give a frame: the first of some length, and the first across it (None: there is none)."""
    vectors = [v for v, _ in directions]
    lengths = [float(np.linalg.norm(v)) for v in vectors]
    first = next((k for k, length in enumerate(lengths) if length > 0.5), int(np.argmax(lengths)))
    along = vectors[first] / max(lengths[first], 1e-12)
    for k, vector in enumerate(vectors):
        across = float(np.linalg.norm(vector - (vector @ along) * along))
        if k != first and across > max(0.05, LEAST_SINE * lengths[k]):
            return first, k
    return first, None


def _motions(pairs: Pairs, a: int, b: int) -> Iterator[tuple[Motion, bool]]:
    """Yield the motions that bring two old faces to two new ones of their forms, as far apart as they are."""
    old, new = pairs.old, pairs.new
    before = _directions(old, a, b)
    first, second = _frame(before)
    apart = float(np.linalg.norm(before[0][0]))
    to_a, to_b = pairs.partners(a), pairs.partners(b)
    gaps = np.linalg.norm(new.center[to_b][None] - new.center[to_a][:, None], axis=2)
    middle = 0.5 * (old.center[a] + old.center[b])
    for m, n in np.argwhere(np.abs(gaps - apart) <= 2.0 * pairs.tolerance):
        c, d = int(to_a[m]), int(to_b[n])
        if c == d:
            continue
        after = _directions(new, c, d)
        center = 0.5 * (new.center[c] + new.center[d])
        for turn in _turns(before, after, first, second):
            yield Motion(turn, center - turn @ middle), second is None


def _turns(before: list[_Direction], after: list[_Direction], first: int, second: int | None) -> Iterator[np.ndarray]:
    """Yield the rotations that carry one or two directions into others; both senses where they have none."""
    u, fixed = before[first]
    for sense in (1.0,) if fixed else (1.0, -1.0):
        to = sense * after[first][0]
        if second is None:
            yield least_turn(u, to)
            continue
        v, fixed_too = before[second]
        for other in (1.0,) if fixed_too else (1.0, -1.0):
            axes = [_axes(*those) for those in ((u, v), (to, other * after[second][0]))]
            if axes[0] is not None and axes[1] is not None:
                yield axes[1].T @ axes[0]


def _axes(along: np.ndarray, beside: np.ndarray) -> np.ndarray | None:
    """Return the rows of a right-handed frame, (3, 3), None where the two are parallel."""
    x = along / max(float(np.linalg.norm(along)), 1e-300)
    y = beside - (beside @ x) * x
    size = float(np.linalg.norm(y))
    if size < 1e-3 * max(float(np.linalg.norm(beside)), 1e-300):
        return None
    y = y / size
    return np.array([x, y, np.cross(x, y)])


def least_turn(u: np.ndarray, v: np.ndarray) -> np.ndarray:
    """Return the smallest rotation that carries the direction u into v, (3, 3)."""
    u, v = u / max(float(np.linalg.norm(u)), 1e-300), v / max(float(np.linalg.norm(v)), 1e-300)
    cosine = float(u @ v)
    if cosine < -1.0 + 1e-12:  # half a turn about any axis across
        across = np.eye(3)[int(np.argmin(np.abs(u)))]
        across = across - (across @ u) * u
        across = across / np.linalg.norm(across)
        return np.asarray(2.0 * np.outer(across, across) - np.eye(3))
    x, y, z = np.cross(u, v)
    cross = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    return np.asarray(np.eye(3) + cross + cross @ cross / (1.0 + cosine))
