"""Where along the pull something looks up below something that looks down: the only columns that can trap steel."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

CELLS = 160
"""Columns along the longer side of the part: more find less that matters, and take longer to fill."""

SLACK = 1e-6
"""Share of a column by which a triangle may miss it and still count."""

NEAR = 1e-6
"""Heights [mm] that differ by less count as equal: a sheet between them would be noise."""


@dataclass(frozen=True)
class _Pairs:
    """Which triangle reaches which column, and between which heights it may lie there."""

    triangle: np.ndarray
    column: np.ndarray
    low: np.ndarray
    high: np.ndarray


def contested(upper: np.ndarray, lower: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return which upward triangles (u, 3, 3) and downward triangles (l, 3, 3) may bound a trapped space, two masks.

    Conservative: a triangle is dropped only if in every column that it reaches no triangle of the other kind lies on
    the far side of it. Most parts that leave two halves keep next to nothing.
    """
    keep_up, keep_down = np.zeros(len(upper), dtype=bool), np.zeros(len(lower), dtype=bool)
    if len(upper) == 0 or len(lower) == 0:
        return keep_up, keep_down
    both = np.concatenate([upper[:, :, :2].reshape(-1, 2), lower[:, :, :2].reshape(-1, 2)])
    origin, size = both.min(axis=0), np.ptp(both, axis=0)
    cell = max(float(size.max()), 1e-9) / CELLS
    rows = int(size[1] / cell) + 2
    up, down = _reached(upper, origin, cell, rows), _reached(lower, origin, cell, rows)
    columns = (int(size[0] / cell) + 2) * rows
    lowest, highest = np.full(columns, np.inf), np.full(columns, -np.inf)
    np.minimum.at(lowest, up.column, up.low)
    np.maximum.at(highest, down.column, down.high)
    keep_up[up.triangle[highest[up.column] > up.low + NEAR]] = True
    keep_down[down.triangle[lowest[down.column] < down.high - NEAR]] = True
    return keep_up, keep_down


def _reached(triangles: np.ndarray, origin: np.ndarray, cell: float, rows: int) -> _Pairs:
    """Return the columns that each triangle reaches: strip by strip along x, then cell by cell along y."""
    flat = (triangles[:, :, :2] - origin) / cell
    first = np.maximum(np.floor(flat[:, :, 0].min(axis=1) - SLACK).astype(int), 0)
    last = np.floor(flat[:, :, 0].max(axis=1) + SLACK).astype(int)
    owner, turn = _spread(last - first + 1)
    x = first[owner] + turn
    low, high = _strip(flat[owner], x)
    bottom = np.maximum(np.floor(low - SLACK).astype(int), 0)
    strip, turn = _spread(np.floor(high + SLACK).astype(int) - bottom + 1)
    triangle, x, y = owner[strip], x[strip], bottom[strip] + turn
    heights = _heights(triangles, flat, triangle, np.stack([x + 0.5, y + 0.5], axis=1))
    return _Pairs(triangle, x * rows + y, *heights)


def _spread(count: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return for counts 2, 3 the owners 0 0 1 1 1 and the turns 0 1 0 1 2."""
    count = np.maximum(count, 0)
    owner = np.repeat(np.arange(len(count)), count)
    return owner, np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)


def _strip(corner: np.ndarray, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the least and greatest y of each triangle (k, 3, 2) between x and x + 1; reversed if it is not there."""
    low, high = np.full(len(x), np.inf), np.full(len(x), -np.inf)
    left, right = x - SLACK, x + 1.0 + SLACK
    for k in range(3):
        start, way = corner[:, k], corner[:, (k + 1) % 3] - corner[:, k]
        upright = np.abs(way[:, 0]) < 1e-12
        run = np.where(upright, 1.0, way[:, 0])
        one, two = (left - start[:, 0]) / run, (right - start[:, 0]) / run
        near, far = np.maximum(np.minimum(one, two), 0.0), np.minimum(np.maximum(one, two), 1.0)
        near, far = np.where(upright, 0.0, near), np.where(upright, 1.0, far)
        beside = np.where(upright, (start[:, 0] < left) | (start[:, 0] > right), near > far)
        ends = start[:, 1] + np.stack([near, far]) * way[:, 1]
        low = np.minimum(low, np.where(beside, np.inf, ends.min(axis=0)))
        high = np.maximum(high, np.where(beside, -np.inf, ends.max(axis=0)))
    empty = low > high
    return np.where(empty, 0.0, low), np.where(empty, -1.0, high)


def _heights(
    triangles: np.ndarray, flat: np.ndarray, triangle: np.ndarray, middle: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    one, two = flat[:, 1] - flat[:, 0], flat[:, 2] - flat[:, 0]
    z = triangles[:, :, 2]
    rise_one, rise_two = z[:, 1] - z[:, 0], z[:, 2] - z[:, 0]
    turn = _cross(one, two)
    turn = np.where(np.abs(turn) < 1e-12, 1e-12, turn)
    slope = np.stack([rise_one * two[:, 1] - rise_two * one[:, 1], rise_two * one[:, 0] - rise_one * two[:, 0]], axis=1)
    slope = slope / turn[:, None]
    height = z[triangle, 0] + ((middle - flat[triangle, 0]) * slope[triangle]).sum(axis=1)
    spread = 0.5 * np.abs(slope).sum(axis=1)[triangle]
    least, most = z.min(axis=1)[triangle], z.max(axis=1)[triangle]
    return np.clip(height - spread, least, most), np.clip(height + spread, least, most)


def _cross(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    return np.asarray(a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0])
