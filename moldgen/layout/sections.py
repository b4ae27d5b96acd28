"""Level sections through a mesh: oriented segments, joined to closed loops, all heights at once."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from moldgen.layout.view import PartView

FEWEST_LAYERS, MOST_LAYERS = 12, 48
LAYER = 1.0
"""mm: usual distance of two sections."""

PHASE = 0.381966
"""Where in its layer a section lies: not the middle, so that it misses the heights that designers choose."""


@dataclass(frozen=True)
class Sections:
    """Segments of all sections [mm]. The plastic lies to the left of each segment: loops round plastic turn left.

    start, end : (s, 2) ends in plan; triangle, layer, loop : (s,) where each belongs
    heights : (k,) of the sections; step : height that each section stands for
    """

    start: np.ndarray
    end: np.ndarray
    triangle: np.ndarray
    layer: np.ndarray
    loop: np.ndarray
    heights: np.ndarray
    step: float
    _follower: np.ndarray

    @property
    def loops(self) -> int:
        """Number of loops."""
        return int(self.loop.max()) + 1 if len(self.loop) else 0

    @cached_property
    def lengths(self) -> np.ndarray:
        """Length of each segment, (s,) [mm]."""
        return np.asarray(np.linalg.norm(self.end - self.start, axis=1))

    @cached_property
    def middles(self) -> np.ndarray:
        """Middle of each segment, (s, 2) [mm]."""
        return np.asarray(0.5 * (self.start + self.end))

    @cached_property
    def outward(self) -> np.ndarray:
        """Unit vector in plan out of the plastic, to the right of each segment, (s, 2)."""
        way = (self.end - self.start) / np.maximum(self.lengths, 1e-12)[:, None]
        return np.column_stack([way[:, 1], -way[:, 0]])

    @cached_property
    def areas(self) -> np.ndarray:
        """Signed area of each loop, positive round plastic, negative round a hole, (l,) [mm^2]."""
        cross = self.start[:, 0] * self.end[:, 1] - self.start[:, 1] * self.end[:, 0]
        return np.bincount(self.loop, 0.5 * cross, self.loops)

    @cached_property
    def loop_lengths(self) -> np.ndarray:
        """Length of each loop, (l,) [mm]."""
        return np.bincount(self.loop, self.lengths, self.loops)

    @cached_property
    def loop_layers(self) -> np.ndarray:
        """Layer of each loop, (l,)."""
        layers = np.zeros(self.loops, dtype=int)
        layers[self.loop] = self.layer
        return layers

    @cached_property
    def grip(self) -> np.ndarray:
        """Sum over each loop of the normal forces that a tight band of unit tension presses with, (l,).

        At a corner of turning angle t the band presses 2 tan(t/2) on its two sides: together 2 pi for a circle and 8
        for a rectangle, as in the formulas for a sleeve and for a box.
        """
        way = np.arctan2(self.end[:, 1] - self.start[:, 1], self.end[:, 0] - self.start[:, 0])
        turn = np.angle(np.exp(1j * (way[self._follower] - way)))
        press = 2.0 * np.tan(np.clip(turn, -0.75 * np.pi, 0.75 * np.pi) / 2.0)
        total = np.abs(np.bincount(self.loop, press, self.loops))
        return np.asarray(np.clip(total, 2.0 * np.pi, 8.0))

    def mean(self, values: np.ndarray) -> np.ndarray:
        """Return the mean of a value of the segments (s,) over each loop, by length, (l,)."""
        return np.asarray(
            np.bincount(self.loop, values * self.lengths, self.loops) / np.maximum(self.loop_lengths, 1e-12)
        )

    def inside(self, points: np.ndarray, layer: int, only: np.ndarray | None = None) -> np.ndarray:
        """Return which loops of a layer hold which plan points (p, 2): (p, l) bool, False for loops of other layers.

        `only` names the loops that are asked for.
        """
        own = np.flatnonzero(self.layer == layer)
        if only is not None:
            own = own[np.isin(self.loop[own], only)]
        held = np.zeros((len(points), self.loops), dtype=bool)
        if len(own) == 0 or len(points) == 0:
            return held
        own = own[np.argsort(self.loop[own], kind="stable")]
        a, b = self.start[own], self.end[own]
        x, y = points[:, :1], points[:, 1:]
        spans = (a[:, 1] > y) != (b[:, 1] > y)
        rise = b[:, 1] - a[:, 1]
        at = a[:, 0] + (y - a[:, 1]) / np.where(rise == 0.0, 1.0, rise) * (b[:, 0] - a[:, 0])
        first = np.flatnonzero(np.r_[True, np.diff(self.loop[own]) > 0])
        crossings = np.add.reduceat((spans & (at > x)).astype(np.int32), first, axis=1)
        held[:, self.loop[own][first]] = crossings % 2 == 1
        return held


def cut_sections(view: PartView, chosen: np.ndarray) -> Sections:
    """Return level sections over the height of the walls among the chosen triangles (t,) bool; none without walls."""
    z = view.mesh.corners[:, :, 2]
    steep = chosen & (np.abs(view.normals[:, 2]) < 0.9)
    if not steep.any():
        return _joined(view, [], np.zeros(0), 0.0)
    bottom, top = float(z[steep].min()), float(z[steep].max())
    count = int(np.clip(round((top - bottom) / LAYER), FEWEST_LAYERS, MOST_LAYERS))
    step = (top - bottom) / count
    heights = bottom + step * (np.arange(count) + PHASE)
    low, high = z.min(axis=1), z.max(axis=1)
    return _joined(view, [np.flatnonzero((low <= h) & (high > h)) for h in heights], heights, step)


def _joined(view: PartView, crossing: list[np.ndarray], heights: np.ndarray, step: float) -> Sections:
    triangle = np.concatenate(crossing).astype(int) if crossing else np.zeros(0, dtype=int)
    layer = np.repeat(np.arange(len(crossing)), [len(c) for c in crossing]) if crossing else np.zeros(0, dtype=int)
    if len(triangle) == 0:
        none = np.zeros((0, 2))
        return Sections(none, none, triangle, layer, triangle, heights, step, triangle)
    points, edges = _cut_triangles(view, triangle, heights[layer])
    flip = _runs_backwards(points, view.normals[triangle])
    points[flip], edges[flip] = points[flip][:, ::-1], edges[flip][:, ::-1]
    nodes = edges + (layer * (view.triangle_edges.max() + 1))[:, None]
    _, numbers = np.unique(nodes.ravel(), return_inverse=True)
    numbers = numbers.reshape(-1, 2)
    size = int(numbers.max()) + 1
    ones = np.ones(len(numbers), dtype=np.int8)
    part = connected_components(coo_matrix((ones, (numbers[:, 0], numbers[:, 1])), shape=(size, size)), directed=False)[
        1
    ]
    leaving = np.zeros(size, dtype=int)
    leaving[numbers[:, 0]] = np.arange(len(numbers))
    return Sections(
        points[:, 0], points[:, 1], triangle, layer, part[numbers[:, 0]], heights, step, leaving[numbers[:, 1]]
    )


def _cut_triangles(view: PartView, triangle: np.ndarray, height: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return where two edges of each triangle meet its height, (s, 2, 2) in plan, and the numbers of those edges."""
    corner = view.mesh.corners[triangle]
    above = corner[:, :, 2] > height[:, None]
    # the corner that is alone on its side: both cut edges end there
    alone = np.where(above.sum(axis=1) == 1, above.argmax(axis=1), (~above).argmax(axis=1))
    rows = np.arange(len(triangle))
    tip = corner[rows, alone]
    ends = np.stack([corner[rows, (alone + 1) % 3], corner[rows, (alone + 2) % 3]], axis=1)
    share = (height[:, None] - tip[:, None, 2]) / (ends[:, :, 2] - tip[:, None, 2])
    points = tip[:, None, :2] + share[:, :, None] * (ends - tip[:, None])[:, :, :2]
    # the edge to the next corner is opposite to the one after it
    edges = np.stack(
        [view.triangle_edges[triangle, (alone + 2) % 3], view.triangle_edges[triangle, (alone + 1) % 3]], axis=1
    )
    return points, edges


def _runs_backwards(points: np.ndarray, normals: np.ndarray) -> np.ndarray:
    way = points[:, 1] - points[:, 0]
    return np.asarray(way[:, 0] * -normals[:, 1] + way[:, 1] * normals[:, 0] < 0.0)
