"""Places on the outer parting line where an edge gate can enter, with what stands against each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.layout.gate_size import THICKEST
from moldgen.layout.keep_out import STEEL, weighed
from moldgen.layout.mouth import ACROSS, ENTRY, START, room_for_gates
from moldgen.layout.view import PartView
from moldgen.rules.layout_practice import EDGE_GATE_RUNNER, STEEL_TO_EDGE

SPACING: Final = 1.0
"""mm: distance of the places tried along the parting line; on long lines more."""

MOST_PLACES: Final = 240

NEAR_STEP: Final = 0.25
"""mm: distance of the places tried round one that is asked for (our choice)."""

ON_LEVEL: Final = 0.01
"""mm: the parting line counts as level within this."""

NEAR_PLANE: Final = 0.1
"""mm: height over or under the parting plane at which the wall at the parting line is measured."""

SMALLEST: Final = 0.3
"""mm: a gate that is narrower or shallower than this freezes at once."""

LEAST: Final = 0.12
"""Share of the mouth that the rules want, by area, from which a smaller gate is taken without being a failure."""

BESIDE: Final = 1.0
"""mm: free room on both sides of the runner, and behind the sprue."""

RUNNER_HALF: Final = 0.62
"""Half of a runner's width at the parting plane by its depth: round bottom, flanks of 10 deg, and a little."""

STEPS: Final = 7
"""Places along runner and sprue at which the plan is looked at."""


@dataclass(frozen=True)
class EdgeSites:
    """Places on the parting line, (k, 3) [mm].

    inward : (k, 2) unit vectors in plan into the part; wall : (k,) at the place [mm]
    wanted, room : (k, 2) width and depth of the mouth by the rules, and the largest up to it that meets the part [mm]
    above : (k,) the cavity half can hold the gate; False: the core half must
    runner : (k,) length that fits between gate and sprue [mm]
    reasons : what each rule is, with which places break it, (k,) bool
    """

    places: np.ndarray
    inward: np.ndarray
    wall: np.ndarray
    wanted: np.ndarray
    room: np.ndarray
    above: np.ndarray
    runner: np.ndarray
    reasons: tuple[tuple[str, np.ndarray], ...]

    @property
    def troubles(self) -> np.ndarray:
        """Number of rules that each place breaks, those about side actions counted manifold, (k,)."""
        return weighed(self.reasons)

    @property
    def fullness(self) -> np.ndarray:
        """Area of the mouth as a share of what the rules want, (k,)."""
        return np.asarray(self.room.prod(axis=1) / self.wanted.prod(axis=1))


@dataclass(frozen=True)
class Need:
    """What the gate needs.

    width, land, runner, foot : of the usual gate, its land, diameters of runner and sprue foot [mm]
    wanted : width and depth (k, 2) of the mouth into walls (k,) [mm]; fixed : whether the spec gives width and depth
    no_gate : faces to keep off; kept : length of the runner of an accepted gate [mm], 0 for none
    inward : unit vector in plan into the part, of an accepted gate, for all places; None: square to the parting line
    """

    width: float
    land: float
    runner: float
    foot: float
    wanted: Callable[[np.ndarray], np.ndarray]
    fixed: tuple[bool, bool]
    no_gate: frozenset[int]
    kept: float = 0.0
    inward: tuple[float, float] | None = None

    @property
    def lengths(self) -> tuple[float, ...]:
        """Lengths of the runner that are tried, the one that is wanted most comes last [mm]."""
        usual = (EDGE_GATE_RUNNER.low, EDGE_GATE_RUNNER.default)
        return (*usual, self.kept) if EDGE_GATE_RUNNER.low <= self.kept <= EDGE_GATE_RUNNER.high else usual


def find_edge_sites(view: PartView, need: Need, near: np.ndarray | None = None, within: float = 0.0) -> EdgeSites:
    """Return the places along the outer parting line.

    near : (3,) only the place nearest to this point in plan, first, and those up to `within` from it on the line [mm]
    """
    line = _Line(view)
    middle = line.places(view.middle) if near is None else line.around(near, within)
    places, inward = line.at(middle), line.inward(middle, need.width)
    if need.inward is not None:
        inward = np.tile(need.inward, (len(places), 1))
    wall, faces = _entry(view, places, inward)
    wanted = need.wanted(wall)
    level = line.level(middle, wanted[:, 0], view.level)
    room, above = room_for_gates(view, places, inward, wanted, level)
    runner, way, aside = _runners(view, places, inward, need, wanted)
    full = room >= wanted - 1e-9
    small = (room.min(axis=1) < SMALLEST) | (room.prod(axis=1) < LEAST * wanted.prod(axis=1))
    small |= (np.array(need.fixed) & ~full).any(axis=1)
    reasons = (
        ("the parting line is not level there", ~level[:, ACROSS // 2]),
        ("the side of the part is too low, too short or too curved for the mouth of the gate", small),
        ("no straight way for runner and sprue beside the part inside the block", ~way),
        ("the face is marked no_gate", np.isin(faces, sorted(need.no_gate))),
        *(((view.keep_out.why, aside),) if view.halves.sides else ()),
    )
    return EdgeSites(places, inward, wall, wanted, room, above, np.maximum(runner, EDGE_GATE_RUNNER.low), reasons)


class _Line:
    """The outer parting line by the way along it [mm]."""

    def __init__(self, view: PartView) -> None:
        loop = view.outline
        self._closed = np.vstack([loop, loop[:1]])
        self._way = np.r_[0.0, np.cumsum(np.linalg.norm(np.diff(self._closed, axis=0), axis=1))]
        self._total = float(self._way[-1])

    def at(self, way: np.ndarray) -> np.ndarray:
        """Return the points at ways of any shape, (..., 3) [mm]."""
        turned = way % self._total
        return np.stack([np.interp(turned, self._way, self._closed[:, k]) for k in range(3)], axis=-1)

    def places(self, middle: np.ndarray) -> np.ndarray:
        """Return evenly spread ways, and those where the line crosses the middle lines of the part, (k,) [mm]."""
        count = int(min(max(self._total / SPACING, 12), MOST_PLACES))
        even = (np.arange(count) + 0.5) / count * self._total
        return np.unique(np.r_[even, _crossings(self._closed, self._way, middle)])

    def around(self, point: np.ndarray, within: float) -> np.ndarray:
        """Return the way where the line is nearest to a point in plan, then ways up to `within` from it by distance."""
        start, along = self._closed[:-1, :2], np.diff(self._closed[:, :2], axis=0)
        length = np.maximum((along**2).sum(axis=1), 1e-18)
        share = np.clip(((point[:2] - start) * along).sum(axis=1) / length, 0.0, 1.0)
        gap = np.linalg.norm(start + share[:, None] * along - point[:2], axis=1)
        best = int(np.argmin(np.round(gap, 9)))
        way = self._way[best] + share[best] * (self._way[best + 1] - self._way[best])
        steps = np.arange(1, int(within / NEAR_STEP) + 1) * NEAR_STEP
        return np.asarray(way + np.r_[0.0, np.column_stack([steps, -steps]).ravel()])

    def inward(self, way: np.ndarray, width: float) -> np.ndarray:
        """Return the way into the part, across the chord over a width, (k, 2)."""
        half = 0.5 * width + 0.25
        chord = (self.at(way + half) - self.at(way - half))[:, :2]
        # the loop turns left, so the part lies to the left of its chord
        length = np.maximum(np.linalg.norm(chord, axis=1), 1e-9)
        return np.asarray(np.column_stack([-chord[:, 1], chord[:, 0]]) / length[:, None] + 0.0)

    def level(self, way: np.ndarray, widths: np.ndarray, level: float) -> np.ndarray:
        """Return where the line is on the parting plane at places over widths (k,) [mm], (k, ACROSS) bool."""
        share = np.linspace(-0.5, 0.5, ACROSS)
        height = self.at(way[:, None] + share * widths[:, None])[:, :, 2]
        return np.asarray(np.abs(height - level) < ON_LEVEL)


def _crossings(closed: np.ndarray, way: np.ndarray, middle: np.ndarray) -> np.ndarray:
    """Return where along the loop it crosses the middle lines of the part, (c,) [mm]."""
    found = []
    for axis in (0, 1):
        off = closed[:, axis] - middle[axis]
        at = np.flatnonzero((off[:-1] < 0.0) != (off[1:] < 0.0))
        found.append(way[at] + off[at] / (off[at] - off[at + 1]) * (way[at + 1] - way[at]))
    return np.concatenate(found)


def _entry(view: PartView, places: np.ndarray, inward: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the wall behind the places, (k,) [mm], and the face that a gate there would enter, -1 for none, (k,)."""
    way = np.column_stack([inward, np.zeros(len(inward))])
    found = []
    for sign in (1.0, -1.0):
        origin = places - START * way
        origin[:, 2] += sign * NEAR_PLANE
        found.append(view.probe.first(origin, way))
    above = np.abs(found[0][0] - START) < ENTRY
    distance = np.where(above, found[0][0], found[1][0])
    triangle = np.where(above, found[0][1], found[1][1])
    gap = np.where(np.abs(distance - START) < ENTRY, distance - START, 0.0)
    inside = places + way * (gap + 0.05)[:, None]
    inside[:, 2] += np.where(above, NEAR_PLANE, -NEAR_PLANE)
    # not at the very edge: it may be rounded
    deep = [_wall_at(view, inside + share * view.wall * way, way) for share in (0.4, 1.5)]
    wall = np.minimum(*deep)
    return wall, np.where(triangle >= 0, view.mesh.face[np.maximum(triangle, 0)], -1)


def _wall_at(view: PartView, inside: np.ndarray, way: np.ndarray) -> np.ndarray:
    """Return the smallest extent of the plastic round places in it: along the way in, across it, along the pull."""
    up = np.array([0.0, 0.0, 1.0])
    side = np.column_stack([way[:, 1], -way[:, 0], way[:, 2]])
    reach = [view.probe.first(inside, d)[0] for d in (way, -way, side, -side, up, -up)]
    wall = np.min([reach[0] + reach[1], reach[2] + reach[3], reach[4] + reach[5]], axis=0)
    # outside the plastic a ray finds no end, or the far side of a gap: then the usual wall stands
    return np.where(np.isfinite(wall), np.minimum(wall, THICKEST), view.wall)


def _runners(
    view: PartView, places: np.ndarray, inward: np.ndarray, need: Need, wanted: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return the length of the runner, 0 without room [mm]; whether it has a way; whether a side action is in it."""
    runner, way, aside = np.zeros(len(places)), np.zeros(len(places), bool), np.ones(len(places), bool)
    for length in need.lengths:
        free = _corridor(view, places, inward, need, length)
        clear = _side_steel(view, places, inward, need, length, wanted) >= STEEL
        runner[free & clear] = length
        way |= free
        aside &= ~clear
    return runner, way, aside | (way & (runner <= 0.0))


def _side_steel(
    view: PartView, places: np.ndarray, inward: np.ndarray, need: Need, length: float, wanted: np.ndarray
) -> np.ndarray:
    """Return the steel between gate, runner and sprue at each place and the ways of side actions, (k,) [mm]."""
    if not view.halves.sides:
        return np.full(len(places), np.inf)
    keep_out, half = view.keep_out, RUNNER_HALF * need.runner
    at, level = places[:, :2], view.level
    side = 0.5 * wanted[:, :1] * np.column_stack([inward[:, 1], -inward[:, 0]])
    mouth = keep_out.channel(at - side, at + side, 0.0, level - wanted[:, 1], level + wanted[:, 1])
    sprue = at - (need.land + length) * inward
    start = at - min(half, need.land + length) * inward  # its round end meets the part, it does not enter it
    runner = keep_out.channel(start, sprue, half, level - need.runner, level + need.runner)
    upright = keep_out.upright(sprue, need.foot / 2, level - need.runner, float(view.high[2]))
    return np.asarray(np.minimum(np.minimum(mouth.steel, runner.steel), upright.steel))


def _corridor(view: PartView, places: np.ndarray, inward: np.ndarray, need: Need, length: float) -> np.ndarray:
    """Return whether the strip from the part to behind the sprue is free of part and inside the block, (k,) bool."""
    radius = max(need.runner, need.foot) / 2
    end = need.land + length + radius
    side = np.column_stack([inward[:, 1], -inward[:, 0]])
    along = np.r_[np.linspace(0.3, end, STEPS), end + BESIDE]
    across = np.array([-1.0, 0.0, 1.0])
    # near the part only the gate itself must be free, farther out the runner with room beside it
    half = np.where(along < need.land + 0.5, need.width / 2, radius + BESIDE)
    points = (
        places[:, None, None, :2]
        - along[None, :, None, None] * inward[:, None, None]
        + (half[:, None] * across)[None, :, :, None] * side[:, None, None]
    )
    flat = points.reshape(-1, 2)
    free = ~np.isfinite(view.underside(flat)[0])
    free[free] = view.on_plane(flat[free])
    free = free.reshape(len(places), -1)
    sprue = places[:, :2] - (need.land + length) * inward
    edge = np.minimum(sprue - view.low[:2], view.high[:2] - sprue).min(axis=1)
    return np.asarray(free.all(axis=1) & (edge >= need.foot / 2 + STEEL_TO_EDGE.default))
