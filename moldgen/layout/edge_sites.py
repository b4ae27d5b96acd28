"""Places on the outer parting line where an edge gate can enter, with what stands against each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.layout.gate_size import THICKEST
from moldgen.layout.view import PartView
from moldgen.rules.layout_practice import EDGE_GATE_RUNNER, STEEL_TO_EDGE

SPACING: Final = 1.0
"""mm: distance of the places tried along the parting line; on long lines more."""

MOST_PLACES: Final = 240

ON_LEVEL: Final = 0.01
"""mm: the parting line counts as level within this."""

STRAIGHT: Final = 0.2
"""mm: the parting line may bend this much over the width of the gate."""

ENTRY: Final = 0.4
"""mm: the part's side may lean back this much over the depth of the gate."""

BESIDE: Final = 1.0
"""mm: free room on both sides of the runner, and behind the sprue."""

STEPS: Final = 7
"""Places along runner and sprue at which the plan is looked at."""


@dataclass(frozen=True)
class EdgeSites:
    """Places on the parting line, (k, 3) [mm].

    inward : (k, 2) unit vectors in plan into the part; wall : (k,) at the place [mm]
    above : (k,) the part stands over the parting plane there, so the cavity half can hold the gate
    runner : (k,) length that fits between gate and sprue [mm]
    troubles : (k,) number of rules broken; reasons : what each rule is, with which places break it, (k,) bool
    """

    places: np.ndarray
    inward: np.ndarray
    wall: np.ndarray
    above: np.ndarray
    runner: np.ndarray
    faces: np.ndarray
    reasons: tuple[tuple[str, np.ndarray], ...]

    @property
    def troubles(self) -> np.ndarray:
        """Number of rules that each place breaks, (k,)."""
        return np.asarray(np.sum([broken for _, broken in self.reasons], axis=0))


@dataclass(frozen=True)
class Need:
    """What the gate needs: its width, depth and land, diameters of runner and sprue foot [mm], faces to keep off."""

    width: float
    depth: float
    land: float
    runner: float
    foot: float
    no_gate: frozenset[int]


def find_edge_sites(view: PartView, need: Need) -> EdgeSites:
    """Return the places along the outer parting line."""
    places, inward, level, straight = _along(view, need.width)
    above, below, wall, faces = _entry(view, places, inward, need.depth)
    runner = np.zeros(len(places))
    for length in (EDGE_GATE_RUNNER.low, EDGE_GATE_RUNNER.default):
        fits = _corridor(view, places, inward, need, length)
        runner[fits] = length
    reasons = (
        ("the parting line is not level there", ~level),
        ("the parting line bends too much over the width of the gate", ~straight),
        ("the side of the part is lower than the gate is deep", ~(above | below)),
        ("no straight way for runner and sprue beside the part inside the block", runner <= 0.0),
        ("the face is marked no_gate", np.isin(faces, sorted(need.no_gate))),
    )
    return EdgeSites(places, inward, wall, above, np.maximum(runner, EDGE_GATE_RUNNER.low), faces, reasons)


def _along(view: PartView, width: float) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Return places along the loop, the way in, and whether the line is level and straight over the width there."""
    loop = view.outline
    closed = np.vstack([loop, loop[:1]])
    way = np.r_[0.0, np.cumsum(np.linalg.norm(np.diff(closed, axis=0), axis=1))]
    total = float(way[-1])
    count = int(min(max(total / SPACING, 12), MOST_PLACES))
    middle = np.unique(np.r_[(np.arange(count) + 0.5) / count * total, _crossings(closed, way, view.middle)])
    offsets = np.linspace(-0.5, 0.5, 7) * (width + 2 * 0.25)
    at = (middle[:, None] + offsets) % total
    points = np.stack([np.interp(at, way, closed[:, k]) for k in range(3)], axis=-1)
    chord = points[:, -1, :2] - points[:, 0, :2]
    length = np.maximum(np.linalg.norm(chord, axis=1), 1e-9)
    # the loop turns left, so the part lies to the left of its chord
    inward = np.column_stack([-chord[:, 1], chord[:, 0]]) / length[:, None] + 0.0
    off = ((points[:, :, :2] - points[:, 3:4, :2]) * inward[:, None]).sum(axis=2)
    level = np.abs(points[:, :, 2] - view.level).max(axis=1) < ON_LEVEL
    return points[:, 3], inward, level, np.ptp(off, axis=1) < STRAIGHT


def _crossings(closed: np.ndarray, way: np.ndarray, middle: np.ndarray) -> np.ndarray:
    """Return where along the loop it crosses the middle lines of the part, (c,) [mm]."""
    found = []
    for axis in (0, 1):
        off = closed[:, axis] - middle[axis]
        at = np.flatnonzero((off[:-1] < 0.0) != (off[1:] < 0.0))
        found.append(way[at] + off[at] / (off[at] - off[at + 1]) * (way[at + 1] - way[at]))
    return np.concatenate(found)


def _entry(
    view: PartView, places: np.ndarray, inward: np.ndarray, depth: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Return whether the part's side stands over / under the plane by the gate's depth, the wall, and the face met."""
    start = 0.5
    found = []
    way = np.column_stack([inward, np.zeros(len(inward))])
    for sign in (1.0, -1.0):
        whole = np.ones(len(places), dtype=bool)
        for share in (0.1, 0.5, 0.95):
            origin = places - start * way
            origin[:, 2] = view.level + sign * share * depth
            distance, triangle = view.probe.first(origin, way)
            whole &= np.abs(distance - start) < ENTRY
            if share == 0.5:
                found.append((distance, triangle, whole))
    above, below = found[0][2], found[1][2]
    distance = np.where(above, found[0][0], found[1][0])
    triangle = np.where(above, found[0][1], found[1][1])
    gap = np.where(np.isfinite(distance), distance, start) - start
    inside = places + way * (gap + 0.05)[:, None]
    inside[:, 2] = view.level + np.where(above, 0.5, -0.5) * depth
    wall = np.minimum(_wall_at(view, inside, way), _wall_at(view, inside + 1.5 * view.wall * way, way))
    return above, below, wall, np.where(triangle >= 0, view.mesh.face[np.maximum(triangle, 0)], -1)


def _wall_at(view: PartView, inside: np.ndarray, way: np.ndarray) -> np.ndarray:
    """Return the smallest extent of the plastic round places in it: along the way in, across it, along the pull."""
    up = np.array([0.0, 0.0, 1.0])
    side = np.column_stack([way[:, 1], -way[:, 0], way[:, 2]])
    reach = [view.probe.first(inside, d)[0] for d in (way, side, -side, up, -up)]
    wall = np.minimum(reach[0] + 0.05, np.minimum(reach[1] + reach[2], reach[3] + reach[4]))
    # outside the plastic a ray finds no end, or the far side of a gap: then the usual wall stands
    return np.where(np.isfinite(wall), np.minimum(wall, THICKEST), view.wall)


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
    free = ~np.isfinite(view.underside(flat)[0]).reshape(len(places), -1)
    sprue = places[:, :2] - (need.land + length) * inward
    edge = np.minimum(sprue - view.low[:2], view.high[:2] - sprue).min(axis=1)
    return np.asarray(free.all(axis=1) & (edge >= need.foot / 2 + STEEL_TO_EDGE.default))
