"""Round holes, bosses and pins of the part along the pull: what press fits, inserts and screws go into or are."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.round_faces import RoundFace, hollow_round_faces, standing_round_faces
from moldgen.layout.round_cores import COAXIAL, WHOLE_TURN, chains, coaxial
from moldgen.layout.steel_former import Ends
from moldgen.rules.steel_safe import BOSS_HOLE, BOSS_LEAST, BOSS_MOST, DEEP, PEG

BOSS_TURN: Final = 0.5
"""Share of the full circle that the outside of a boss must show: ribs may join it (our choice)."""

BOSS_OVERLAP: Final = 0.4
"""Share of the depth of a hole over which there must be a boss round it (our choice)."""


@dataclass(frozen=True)
class RoundFeature:
    """One round step of the part along the pull [mm, mold frame].

    faces : numbers in the real part; hollow : a hole, else a boss or pin
    x, y : axis; low, high : its ends; small, large : diameters at its ends; whole : it goes all the way round
    """

    faces: tuple[int, ...]
    hollow: bool
    x: float
    y: float
    low: float
    high: float
    small: float
    large: float
    whole: bool
    turn: float

    @property
    def diameter(self) -> float:
        """The diameter that decides a fit: the narrow end of a hole, the thick end of a pin [mm]."""
        return self.small if self.hollow else self.large

    @property
    def depth(self) -> float:
        """Height along the pull [mm]."""
        return self.high - self.low

    def ends(self) -> Ends:
        """Return its diameter in the mold, along x, at the end of that diameter."""
        centre = np.array([self.x, self.y, 0.5 * (self.low + self.high)])
        way = np.array([1.0, 0.0, 0.0])
        sign = -1.0 if self.hollow else 1.0
        reach = 0.5 * self.diameter * way
        return Ends(centre - reach, centre + reach, -sign * way, sign * way)


def round_features(body: Body) -> list[RoundFeature]:
    """Return the round steps of a part along the pull: holes first, each kind by place and height."""
    return [*_steps(body, hollow_round_faces, hollow=True), *_steps(body, standing_round_faces, hollow=False)]


def _steps(body: Body, find: Callable[[Body], list[RoundFace]], *, hollow: bool) -> list[RoundFeature]:
    found = []
    for axis in coaxial(find(body)):
        for chain in chains(axis):
            groups: list[list[RoundFace]] = []
            for face in chain:
                home = next((g for g in groups if _same(g[0], face)), None)
                if home is None:
                    groups.append([face])
                else:
                    home.append(face)
            found += [_feature(group, hollow=hollow) for group in groups]
    return sorted(found, key=lambda f: (round(f.x, 3), round(f.y, 3), f.low, f.faces))


def _same(one: RoundFace, other: RoundFace) -> bool:
    """Return whether two faces are parts of one step."""
    pairs = (
        (one.radius_low, other.radius_low),
        (one.radius_high, other.radius_high),
        (one.z_low, other.z_low),
        (one.z_high, other.z_high),
    )
    return all(abs(a - b) < COAXIAL for a, b in pairs)


def _feature(group: list[RoundFace], *, hollow: bool) -> RoundFeature:
    first, turn = group[0], sum(f.turn for f in group)
    radii = (first.radius_low, first.radius_high)
    return RoundFeature(
        faces=tuple(sorted(f.face for f in group)),
        hollow=hollow,
        x=first.x,
        y=first.y,
        low=first.z_low,
        high=first.z_high,
        small=2 * min(radii),
        large=2 * max(radii),
        whole=turn >= WHOLE_TURN * 2 * math.pi,
        turn=turn,
    )


def holes_in_bosses(features: list[RoundFeature]) -> list[RoundFeature]:
    """Return the holes that something may be pressed or screwed into: round, deep, with a round boss around them."""
    standing = [f for f in features if not f.hollow and f.turn >= BOSS_TURN * 2 * math.pi]
    found = []
    for hole in features:
        fits = hole.hollow and hole.whole and 0.0 < hole.diameter <= BOSS_HOLE.default
        if fits and hole.depth >= DEEP.default * hole.diameter and any(_around(hole, boss) for boss in standing):
            found.append(hole)
    return found


def _around(hole: RoundFeature, boss: RoundFeature) -> bool:
    if math.hypot(boss.x - hole.x, boss.y - hole.y) > COAXIAL:
        return False
    overlap = min(hole.high, boss.high) - max(hole.low, boss.low)
    ratio = boss.small / hole.large
    return overlap >= BOSS_OVERLAP * hole.depth and BOSS_LEAST.default <= ratio <= BOSS_MOST.default


def standing_pins(features: list[RoundFeature]) -> list[RoundFeature]:
    """Return the free-standing round pins without a hole that may be pressed into something."""
    holes = [f for f in features if f.hollow]
    found = []
    for pin in features:
        fits = not pin.hollow and pin.whole and 0.0 < pin.diameter <= PEG.default
        hollow = any(
            math.hypot(h.x - pin.x, h.y - pin.y) < COAXIAL and min(h.high, pin.high) > max(h.low, pin.low)
            for h in holes
        )
        if fits and not hollow and pin.depth >= DEEP.default * pin.diameter:
            found.append(pin)
    return found
