"""Faces of two parts that have the same form, and how many of them a motion lays onto each other."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import same_form
from moldgen.model.face_sign import FaceSign, SurfaceKind

MOST_PAIRS: Final = 20000
"""So many pairs of equal faces are looked at (our choice: a motion is judged in a millisecond then). Faces with few
equals come first, so that a grille of a thousand equal holes does not crowd out the rest."""

_SIGNED: Final = (SurfaceKind.PLANE, SurfaceKind.CONE)


@dataclass(frozen=True)
class Motion:
    """new = rotation @ old + shift; rotation (3, 3), shift (3,) [mm]."""

    rotation: np.ndarray
    shift: np.ndarray

    def of(self, points: np.ndarray) -> np.ndarray:
        """Return points at their new places, (..., 3) [mm]."""
        return np.asarray(points @ self.rotation.T + self.shift)


STAY: Final = Motion(np.eye(3), np.zeros(3))


@dataclass(frozen=True, eq=False)
class Faces:
    """The signs of a part as arrays.

    center, rim, axis, foot : (n, 3), foot from the axis to the center; spread : (n, 3, 3); reach, size : (n,) [mm],
    size is the root of the area; signed : (n,) bool, whether the axis has a sense
    """

    signs: Sequence[FaceSign]
    center: np.ndarray
    rim: np.ndarray
    axis: np.ndarray
    foot: np.ndarray
    spread: np.ndarray
    reach: np.ndarray
    size: np.ndarray
    signed: np.ndarray

    @classmethod
    def of(cls, signs: Sequence[FaceSign]) -> Faces:
        """Return the arrays of some signs."""
        center = np.array([s.center for s in signs]).reshape(-1, 3)
        return cls(
            signs,
            center,
            np.array([s.rim for s in signs]).reshape(-1, 3),
            np.array([s.axis for s in signs]).reshape(-1, 3),
            center - np.array([s.at for s in signs]).reshape(-1, 3),
            np.array([s.spread_rows for s in signs]).reshape(-1, 3, 3),
            np.array([s.reach_mm for s in signs]),
            np.sqrt(np.array([s.area_mm2 for s in signs])),
            np.array([s.kind in _SIGNED for s in signs], dtype=bool),
        )

    @property
    def corners(self) -> np.ndarray:
        """Corners of the box about the centers of all faces, (8, 3) [mm]."""
        low, high = self.center.min(axis=0), self.center.max(axis=0)
        choose = np.array(list(np.ndindex(2, 2, 2)), dtype=bool)
        return np.asarray(np.where(choose, high, low))


@dataclass(frozen=True, eq=False)
class Pairs:
    """Faces of two parts that have the same form: first[k] of `old` and second[k] of `new`, (p,) int each.

    tolerance : in which forms agree and faces lie on each other [mm]; left_out : size of old faces not looked at [mm]
    """

    old: Faces
    new: Faces
    first: np.ndarray
    second: np.ndarray
    tolerance: float
    left_out: float = 0.0

    @classmethod
    def of(cls, old: Faces, new: Faces, tolerance: float) -> Pairs:
        """Return all pairs of faces whose sizes agree within a tolerance [mm]."""
        first, second = np.nonzero(same_form(old.signs, new.signs, tolerance))
        return cls(old, new, first, second, tolerance)

    def rare(self) -> Pairs:
        """Return the pairs of the old faces with the fewest equals, `MOST_PAIRS` at most; all if they are no more."""
        if len(self.first) <= MOST_PAIRS:
            return self
        counts = np.bincount(self.first, minlength=len(self.old.size))
        order = np.lexsort((-self.old.size, counts))
        out = order[np.cumsum(counts[order]) > MOST_PAIRS]
        kept = ~np.isin(self.first, out)
        return replace(self, first=self.first[kept], second=self.second[kept], left_out=float(self.old.size[out].sum()))

    def partners(self, face: int) -> np.ndarray:
        """Return the new faces of the same form as an old one."""
        return np.asarray(self.second[self.first == face])

    def hits(self, motion: Motion, slack: float = 1.0) -> np.ndarray:
        """Return which pairs a motion lays onto each other, (p,) bool, within `slack` times the tolerance."""
        limit, i, j = slack * self.tolerance, self.first, self.second
        old, new = self.old, self.new
        found = np.linalg.norm(motion.of(old.center)[i] - new.center[j], axis=1) <= limit
        k = np.flatnonzero(found)  # few are left: the rest is asked of them only
        i, j = i[k], j[k]
        fits = np.linalg.norm(motion.of(old.rim[i]) - new.rim[j], axis=1) <= 2.0 * limit
        axis = old.axis[i] @ motion.rotation.T
        off = np.linalg.norm(axis - new.axis[j], axis=1)
        off = np.where(old.signed[i], off, np.minimum(off, np.linalg.norm(axis + new.axis[j], axis=1)))
        fits &= off * old.reach[i] <= 4.0 * limit
        spread = motion.rotation @ old.spread[i] @ motion.rotation.T
        gap = np.abs(spread - new.spread[j]).max(axis=(1, 2), initial=0.0)
        fits &= gap <= 4.0 * limit * np.maximum(old.reach[i], limit)
        found[k] = fits
        return np.asarray(found)

    def share(self, hits: np.ndarray) -> float:
        """Return how much of the smaller part the faces make up that lie on each other, by the root of their areas."""
        sides = ((self.old.size, self.first), (self.new.size, self.second))
        met = min(float(size[np.unique(own[hits])].sum()) for size, own in sides)
        whole = min(float(self.old.size.sum()), float(self.new.size.sum())) - self.left_out
        return met / max(whole, 1e-9)

    def refined(self, motion: Motion) -> Motion:
        """Return the motion that lays the pairs it meets onto each other best, by least squares."""
        for slack in (10.0, 2.0, 1.0, 1.0):
            hits = self.hits(motion, slack)
            if not hits.any():
                break
            i, j = self.first[hits], self.second[hits]
            axis = self.old.axis[i] @ motion.rotation.T
            sense = np.where((axis * self.new.axis[j]).sum(axis=1) < 0.0, -1.0, 1.0)[:, None]
            reach = self.old.reach[i][:, None]
            before = [self.old.center[i], self.old.rim[i], self.old.center[i] + reach * self.old.axis[i]]
            after = [self.new.center[j], self.new.rim[j], self.new.center[j] + sense * reach * self.new.axis[j]]
            motion = _least_squares(motion, np.vstack(before), np.vstack(after))
        return motion

    def residual(self, motion: Motion, hits: np.ndarray) -> float:
        """Return how far the centers of the faces that match, and of their boundaries, are apart at most [mm]."""
        i, j = self.first[hits], self.second[hits]
        gaps = [motion.of(self.old.center[i]) - self.new.center[j], motion.of(self.old.rim[i]) - self.new.rim[j]]
        return float(np.linalg.norm(np.vstack(gaps), axis=1).max(initial=0.0))


def _least_squares(motion: Motion, before: np.ndarray, after: np.ndarray) -> Motion:
    """Return the motion of points (n, 3) to points (n, 3) by least squares, as near to the given one as they allow.

    The covariance of turned points about a line leaves the turn about it open: a weak pull to no turn decides.
    """
    turned = before @ motion.rotation.T
    middle, to = turned.mean(axis=0), after.mean(axis=0)
    covariance = (turned - middle).T @ (after - to)
    covariance += max(1e-9 * float(np.trace(covariance)), 1e-12) * np.eye(3)
    u, _, vt = np.linalg.svd(covariance)
    flip = np.diag([1.0, 1.0, np.sign(np.linalg.det(vt.T @ u.T))])
    more = vt.T @ flip @ u.T
    return Motion(more @ motion.rotation, to - more @ middle)
