"""Where a level land around a parting line lies, seen along the pull.

From each vertex of the line a spoke runs to the rim of the land and on to the foot of the wall beyond it. Spokes stand
square to the line; at corners they are mitred, so the land is nowhere narrower. Beside a step along the pull they
spread, so that only the step itself stands upright; what lies in an inside corner tighter than the land shares one
narrow piece of the rim.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from moldgen.errors import KernelError

MOST_MITRE = math.radians(100.0)
"""Convex turn of the line beyond which two spokes leave the corner: a mitre there would be half as long again."""

TIGHTEST = math.radians(150.0)
"""Inside turn of the line beyond which no land fits into the corner."""

FAN_LEAN = math.radians(10.0)
"""Angle to the pull that the land beside a step has reached at its outer rim (5 to 15 is usual, our choice)."""

LEAST_FAN, MOST_FAN = math.radians(6.0), math.radians(30.0)
"""Bounds of half the angle between the spokes below and above a step (our choice)."""

CLEAR_FAN = math.radians(3.0)
"""Angle between a step that leans into the part and the first spoke beside it (our choice)."""

CRUMB = 0.3
"""mm of rim left in front of an inside corner tighter than the land: an edge of no length has no place in a face."""

CRUMB_LEAN = math.tan(math.radians(15.0))
"""Run over rise of that piece of rim where the line is higher on one side of the corner than on the other."""

ROWS = 256
"""Sides of a polygon that are compared with all others at a time: memory, nothing else."""

MOST_ROUNDS = 12
"""Times that inside corners are widened until nothing folds."""


class Lie(StrEnum):
    """How an edge of the line lies."""

    LEVEL = "on the parting plane"
    STEP = "along the pull, or nearly"
    FREE = "off the parting plane"


@dataclass(frozen=True)
class PlanEdge:
    """One edge of a line that is counter-clockwise seen along -z.

    points : (n, 3) places along it [mm]; leaves, arrives : unit plan tangents (2,) at its ends
    """

    lie: Lie
    points: np.ndarray
    leaves: np.ndarray
    arrives: np.ndarray


@dataclass(frozen=True)
class Spoke:
    """What leads from a vertex of the line outward: its end on the rim of the land (3,) and at the foot (2,) [mm]."""

    vertex: int
    rim: np.ndarray
    foot: np.ndarray


@dataclass(frozen=True)
class Patch:
    """One piece of land, over an edge of the line or over a corner (edge -1), between two spokes.

    rim, foot : (n, 2) plan places along it, as many as the edge has points
    """

    edge: int
    start: Spoke
    end: Spoke
    rim: np.ndarray
    foot: np.ndarray


@dataclass(frozen=True)
class LandPlan:
    """All pieces of the land in order, and the edges (numbers) from which the flat parting plane begins at once."""

    patches: tuple[Patch, ...]
    plain: tuple[int, ...]


def plan_land(edges: Sequence[PlanEdge], width: float, run: float) -> LandPlan:
    """Return the land of that width [mm] and its wall (plan width `run` [mm]) around a closed line.

    Vertex k is the start of edge k. Edges on the parting plane need none, except inside corners tighter than the land.

    Raises
    ------
    KernelError : the line crosses itself in projection, or the land does not fit, with the place in plan
    """
    at = self_crossing(np.vstack([e.points[:-1, :2] for e in edges]))
    if at is not None:
        raise KernelError(f"the parting line crosses itself in projection near {at[0]:.2f}, {at[1]:.2f}")
    tight: frozenset[int] = frozenset()
    fan = MOST_FAN
    for _ in range(MOST_ROUNDS):
        plan = _Planner(edges, tight, (width, run), fan).plan()
        folded = _folded(edges, plan)
        if folded and fan > LEAST_FAN and any(e.lie is Lie.STEP for e in edges):
            fan = LEAST_FAN  # steps too close to each other to spread more
            continue
        if not folded:
            _refuse_meeting(edges, plan, width)
            return plan
        count = len(edges)
        wider = {k for f in folded for k in ((f,) if f not in tight else ((f - 1) % count, f, (f + 1) % count))}
        tight = tight | wider
        if len(tight) > count - 2:
            break
    x, y = edges[min(folded)].points[0][:2]
    raise KernelError(f"a land {width:g} mm wide folds at the inside corner near {x:.2f}, {y:.2f}")


class _Planner:
    def __init__(
        self, edges: Sequence[PlanEdge], tight: frozenset[int], size: tuple[float, float], most_fan: float
    ) -> None:
        self.edges, self.tight, self.most_fan = edges, tight, most_fan
        self.width, self.run = size
        self.distances = self.width, self.width + self.run
        self.count = len(edges)
        self.joins = [k in tight or edges[k].lie is Lie.STEP for k in range(self.count)]
        self.plain = [edges[k].lie is Lie.LEVEL and k not in tight for k in range(self.count)]

    def plan(self) -> LandPlan:
        spokes: dict[int, tuple[Spoke, Spoke]] = {}
        for k in range(self.count):
            if not self.joins[k - 1]:
                members = [k]
                while self.joins[members[-1]]:
                    members.append((members[-1] + 1) % self.count)
                spokes.update(zip(members, self._corner(members), strict=True))
        patches = []
        for k in range(self.count):
            arriving, leaving = spokes[k]
            if arriving is not leaving:
                ends = np.array([[s.rim[:2], s.foot] for s in (arriving, leaving)])
                patches.append(Patch(-1, arriving, leaving, ends[:, 0], ends[:, 1]))
            if not self.plain[k]:
                patches.append(self._along(k, leaving, spokes[(k + 1) % self.count][0]))
        return LandPlan(tuple(patches), tuple(k for k in range(self.count) if self.plain[k]))

    def _corner(self, members: list[int]) -> list[tuple[Spoke, Spoke]]:
        """Return the arriving and the leaving spoke of each vertex of one corner, joined by steps or tight edges."""
        before, after = self.edges[members[0] - 1], self.edges[members[-1]]
        one, two = _normal(before.arrives), _normal(after.leaves)
        turn = math.atan2(one[0] * two[1] - one[1] * two[0], float(one @ two))
        if any(k in self.tight for k in members[:-1]):
            return self._gathered(members, one, two)
        if turn < -TIGHTEST:
            x, y = after.points[0][:2]
            raise KernelError(f"no land fits into the inside corner at {x:.2f}, {y:.2f}")
        if turn > 0.0 and self.plain[members[0] - 1]:
            one, turn = two, 0.0
        elif turn > 0.0 and self.plain[members[-1]]:
            turn = 0.0
        if len(members) > 1:
            return [(s, s) for s in self._fan(members, one, turn)]
        if turn > MOST_MITRE:
            long = 1.0 / math.cos(turn / 4.0)
            pair = long * rotated(one, turn / 4.0), long * rotated(two, -turn / 4.0)
            return [(self._straight(members[0], pair[0]), self._straight(members[0], pair[1]))]
        mitre = self._straight(members[0], rotated(one, turn / 2.0) / math.cos(turn / 2.0))
        return [(mitre, mitre)]

    def _straight(self, vertex: int, vector: np.ndarray) -> Spoke:
        at = self.edges[vertex].points[0]
        rim, foot = (at[:2] + d * vector for d in self.distances)
        return Spoke(vertex, np.append(rim, at[2]), foot)

    def _fan(self, members: list[int], first: np.ndarray, turn: float) -> list[Spoke]:
        """Return spokes that spread below and above a step; beyond the land they go on side by side."""
        places = np.array([self.edges[k].points[0] for k in members])
        steps = np.diff(places[:, 2])
        if not ((steps > 0.0).all() or (steps < 0.0).all()):
            raise KernelError("a step of the parting line goes up and down again")
        rise = abs(float(places[-1, 2] - places[0, 2]))
        half = math.atan(rise * math.tan(FAN_LEAN) / (2.0 * self.width))
        half = max(min(max(half, LEAST_FAN), self.most_fan), turn / 2.0)
        travel = float((places[-1, :2] - places[0, :2]) @ rotated(first, turn / 2.0))
        shift = 0.0 if abs(travel) < 1e-5 else math.copysign(half + CLEAR_FAN, -travel)
        share = (places[:, 2] - places[0, 2]) / (places[-1, 2] - places[0, 2])
        long = 1.0 / math.cos(min(turn, 0.0) / 2.0)
        found = []
        for vertex, s in zip(members, share, strict=True):
            angle = turn / 2.0 + (2.0 * s - 1.0) * half
            rim = self.edges[vertex].points[0, :2] + self.width * long * rotated(first, angle + shift)
            # the wall need not spread as the land does, except round a convex corner
            onward = rotated(first, angle if turn > 0.0 else turn / 2.0)
            found.append(Spoke(vertex, np.append(rim, self.edges[vertex].points[0, 2]), rim + self.run * long * onward))
        return found

    def _gathered(self, members: list[int], one: np.ndarray, two: np.ndarray) -> list[tuple[Spoke, Spoke]]:
        """Return spokes from everything in an inside corner to one short piece of the rim in front of it."""
        first, last = self.edges[members[0]].points[0], self.edges[members[-1]].points[0]
        length = [float(np.linalg.norm(np.diff(self.edges[k].points, axis=0), axis=1).sum()) for k in members[:-1]]
        share = np.concatenate([[0.0], np.cumsum(length)]) / sum(length)
        gap = max(CRUMB, CRUMB_LEAN * abs(float(last[2] - first[2])))
        ends = []
        for distance in self.distances:
            a, b = first[:2] + distance * one, last[:2] + distance * two
            ends.append(_short_of_crossing(a, b, one, two, gap))
        found = []
        for vertex, s in zip(members, share, strict=True):
            (rim, foot) = (a + s * (b - a) for a, b in ends)
            spoke = Spoke(vertex, np.append(rim, first[2] + s * (last[2] - first[2])), foot)
            found.append((spoke, spoke))
        return found

    def _along(self, k: int, start: Spoke, end: Spoke) -> Patch:
        edge = self.edges[k]
        count = len(edge.points)
        if self.joins[k] or count == 2:
            share = np.linspace(0.0, 1.0, count)[:, None]
            rim = (1.0 - share) * start.rim[:2] + share * end.rim[:2]
            return Patch(k, start, end, rim, (1.0 - share) * start.foot + share * end.foot)
        normals, share = _normals(edge)
        plan = edge.points[:, :2]
        rows = []
        for distance, a, b in (
            (self.distances[0], start.rim[:2], end.rim[:2]),
            (self.distances[1], start.foot, end.foot),
        ):
            line = plan + distance * normals
            rows.append(line + (1.0 - share) * (a - line[0]) + share * (b - line[-1]))
        return Patch(k, start, end, rows[0], rows[1])


def _short_of_crossing(
    a: np.ndarray, b: np.ndarray, one: np.ndarray, two: np.ndarray, gap: float
) -> tuple[np.ndarray, np.ndarray]:
    """Return the ends of a piece of rim from a to b, drawn together to where the two offset lines cross.

    one, two : unit normals of those lines, which run to a and from b
    """
    mean = one + two
    size = float(np.linalg.norm(mean))
    if size < 0.3:
        raise KernelError(f"the line doubles back near {a[0]:.2f}, {a[1]:.2f}")
    travel = np.array([-mean[1], mean[0]]) / size
    if float((b - a) @ travel) >= gap:
        return a, b
    if abs(one[0] * two[1] - one[1] * two[0]) > 0.05:
        middle = np.linalg.solve(np.array([one, two]), np.array([one @ a, two @ b]))
    else:
        middle = 0.5 * (a + b)
    return middle - 0.5 * gap * travel, middle + 0.5 * gap * travel


def _normal(tangent: np.ndarray) -> np.ndarray:
    return np.array([tangent[1], -tangent[0]])


def rotated(vector: np.ndarray, angle: float) -> np.ndarray:
    """Return a plan vector turned counter-clockwise by an angle [rad]."""
    c, s = math.cos(angle), math.sin(angle)
    return np.array([c * vector[0] - s * vector[1], s * vector[0] + c * vector[1]])


def _normals(edge: PlanEdge) -> tuple[np.ndarray, np.ndarray]:
    """Return unit normals along an edge (n, 2) and the share of its plan length at each point (n, 1)."""
    chords = np.diff(edge.points[:, :2], axis=0)
    tangents = np.vstack([edge.leaves, chords[:-1] + chords[1:], edge.arrives])
    length = np.maximum(np.linalg.norm(tangents, axis=1), 1e-12)
    way = np.concatenate([[0.0], np.cumsum(np.linalg.norm(chords, axis=1))])
    return np.column_stack([tangents[:, 1], -tangents[:, 0]]) / length[:, None], (way / way[-1])[:, None]


def _folded(edges: Sequence[PlanEdge], plan: LandPlan) -> list[int]:
    """Return the edges over which the land or the wall folds: where it is not on the outer side of the line."""
    found = []
    for patch in plan.patches:
        if patch.edge < 0:
            continue
        lines = [edges[patch.edge].points[:, :2], patch.rim, patch.foot]
        for inner, outer in ((lines[0], lines[1]), (lines[1], lines[2])):
            spokes = outer - inner
            for travel in (np.diff(inner, axis=0), np.diff(outer, axis=0)):
                turns = [travel[:, 0] * s[:, 1] - travel[:, 1] * s[:, 0] for s in (spokes[:-1], spokes[1:])]
                moved = np.linalg.norm(travel, axis=1) > 1e-5
                if any((t[moved] >= 0.0).any() for t in turns):
                    found.append(patch.edge)
    return sorted(set(found))


def _refuse_meeting(edges: Sequence[PlanEdge], plan: LandPlan, width: float) -> None:
    for outline in (outline_of(edges, plan, foot=False), outline_of(edges, plan, foot=True)):
        at = self_crossing(outline)
        if at is not None:
            raise KernelError(
                f"a land {width:g} mm wide meets itself near {at[0]:.2f}, {at[1]:.2f}: the line doubles back there"
            )


def outline_of(edges: Sequence[PlanEdge], plan: LandPlan, *, foot: bool) -> np.ndarray:
    """Return the plan polygon (n, 2) of all that lies within the rim of the land, or within the foot of its wall."""
    pieces: dict[int, list[np.ndarray]] = {}
    for patch in plan.patches:
        pieces.setdefault(patch.start.vertex, []).append(patch.foot if foot else patch.rim)
    for k in plan.plain:
        pieces.setdefault(k, []).append(edges[k].points[:, :2])
    outline = np.vstack([line for k in sorted(pieces) for line in pieces[k]])
    return np.asarray(outline[np.linalg.norm(outline - np.roll(outline, 1, axis=0), axis=1) > 1e-9])


def self_crossing(polygon: np.ndarray) -> np.ndarray | None:
    """Return a place where two sides of a closed plan polygon (n, 2) cross each other, None if none do."""
    start, end = polygon, np.roll(polygon, -1, axis=0)
    low, high = np.minimum(start, end), np.maximum(start, end)
    for first in range(0, len(polygon), ROWS):
        rows = slice(first, first + ROWS)
        near = (low[rows, None] <= high[None]).all(axis=2) & (high[rows, None] >= low[None]).all(axis=2)
        i, j = np.nonzero(near)
        i = i + first
        parted = [_side(start[a], end[a], start[b]) * _side(start[a], end[a], end[b]) for a, b in ((i, j), (j, i))]
        found = np.flatnonzero((parted[0] < -1e-12) & (parted[1] < -1e-12))
        if len(found):
            return np.asarray(start[i[found[0]]])
    return None


def _side(start: np.ndarray, end: np.ndarray, place: np.ndarray) -> np.ndarray:
    """Return on which side of the line from start to end each place lies, (n,): positive on its left."""
    along, offset = end - start, place - start
    return np.asarray(along[:, 0] * offset[:, 1] - along[:, 1] * offset[:, 0])
