"""Pairs of an old and a new face that are one feature, changed: another size, draft, or place along the normal."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import SAME_PLACE, coaxial
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.part import Vector, vector
from moldgen.revision.pairing import nearest_pairs

LARGEST_STEP: Final = 10.0
"""mm: a plane or a round face that moved further is another one (our choice)."""

LARGEST_TILT: Final = 20.0
"""deg: a plane that leans by more is another one (our choice: far beyond any draft)."""

SAME_LEAN: Final = 1e-3
"""deg: half angles and tilts that differ by less are equal: 1e-3 mm over 60 mm."""


class Way(StrEnum):
    """How a face differs from its partner."""

    SHIFTED = "shifted"
    RADIUS = "other radius"
    LEANING = "leans otherwise"
    OTHER = "other form"


@dataclass(frozen=True)
class Partner:
    """An old and a new face, by the numbers of their signs; shift : for SHIFTED [mm]."""

    old: int
    new: int
    way: Way
    shift: Vector = (0.0, 0.0, 0.0)


_ROUND: Final = (SurfaceKind.CYLINDER, SurfaceKind.CONE)
_Rated = tuple[float, Way, Vector]
_NONE: Final = (0.0, 0.0, 0.0)


def partners(before: Sequence[FaceSign], after: Sequence[FaceSign], old: list[int], new: list[int]) -> list[Partner]:
    """Return the pairs among some old and new faces, the nearest first; each face has one partner at most."""
    rated: dict[tuple[int, int], _Rated] = {}
    for i in old:
        for j in new:
            one = _rated(before[i], after[j])
            if one is not None:
                rated[i, j] = one
    pairs = nearest_pairs((round(cost, 6), i, j) for (i, j), (cost, _, _) in rated.items())
    return [Partner(i, j, *rated[i, j][1:]) for i, j in sorted(pairs)]


def _rated(a: FaceSign, b: FaceSign) -> _Rated | None:
    """Return how far two faces are from each other [mm], and in which way; None where they are no pair."""
    if a.side != b.side:
        return None
    if a.kind in _ROUND and b.kind in _ROUND:
        return _round(a, b)
    if a.kind is not b.kind:
        return None
    if a.kind is SurfaceKind.PLANE:
        return _plane(a, b)
    return _curved(a, b)


def _plane(a: FaceSign, b: FaceSign) -> _Rated | None:
    normal, other = np.array(a.axis), np.array(b.axis)
    apart = np.array(b.center) - np.array(a.center)
    along = float(apart @ normal)
    beside = float(np.linalg.norm(apart - along * normal))
    tilt = float(np.degrees(np.arctan2(np.linalg.norm(np.cross(normal, other)), normal @ other)))
    reach = min(a.reach_mm, b.reach_mm)
    if beside > 0.5 * max(a.reach_mm, b.reach_mm) or tilt > LARGEST_TILT or abs(along) > LARGEST_STEP:
        return None
    if tilt <= SAME_LEAN or np.radians(tilt) * reach <= SAME_PLACE:
        return abs(along) + 0.3 * beside, Way.SHIFTED, vector(along * normal)
    if abs(along) > max(0.5 * reach, 1.0):
        return None
    return abs(along) + 0.3 * beside + 0.1 * float(np.radians(tilt)) * reach, Way.LEANING, _NONE


def _round(a: FaceSign, b: FaceSign) -> _Rated | None:
    axis, other = np.array(a.axis), np.array(b.axis)
    apart = np.array(b.at) - np.array(a.at)
    along = float(apart @ axis)
    beside = apart - along * axis
    gap = float(np.linalg.norm(beside))
    lean = float(np.degrees(np.arctan2(np.linalg.norm(np.cross(axis, other)), abs(float(axis @ other)))))
    if abs(along) > a.reach_mm + b.reach_mm or gap > min(LARGEST_STEP, 2.0 * (a.radius + b.radius)):
        return None
    radius = abs(a.radius + along * float(np.tan(np.radians(a.angle_deg))) - b.radius)
    if lean > LARGEST_TILT or radius > 0.6 * max(a.radius, b.radius):
        return None
    cost = 0.3 * abs(along) + gap + radius
    if coaxial(a, b):
        turned_over = a.kind is b.kind is SurfaceKind.CONE and float(axis @ other) < 0.0
        leans = abs(a.angle_deg - b.angle_deg) > SAME_LEAN or turned_over
        return cost, Way.LEANING if leans else Way.RADIUS, _NONE
    if lean * np.pi / 180.0 * (a.reach_mm + b.reach_mm) > 2.0 * SAME_PLACE or a.kind is not b.kind:
        return cost + 1.0, Way.OTHER, _NONE
    if radius <= SAME_PLACE and abs(a.angle_deg - b.angle_deg) <= SAME_LEAN:
        return cost, Way.SHIFTED, vector(beside)
    return cost + 0.5, Way.RADIUS, _NONE


def _curved(a: FaceSign, b: FaceSign) -> _Rated | None:
    gap = float(np.linalg.norm(np.array(b.center) - np.array(a.center)))
    reach = max(a.reach_mm, b.reach_mm)
    if gap > 0.5 * reach or not 0.5 < a.area_mm2 / b.area_mm2 < 2.0:
        return None
    sizes = abs(a.radius - b.radius) + abs(a.minor - b.minor)
    if a.kind is SurfaceKind.FREE or sizes <= SAME_PLACE:
        return gap + 0.5, Way.OTHER, _NONE
    return gap + sizes, Way.RADIUS, _NONE
