"""The convex hull of a part, and on which side of an axis the room between the two lies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import ConvexHull, QhullError

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer

WAYS = 500
"""Directions in which the outermost corners are kept for the coarser hull."""

GRID = 40
"""Lines of sight along each side of the part's box."""


@dataclass(frozen=True)
class Hull:
    """Convex hull of a part.

    corners : (n, 3) [mm], its vertices
    planes : (p, 4), outward unit normal and offset of the planes of a coarser hull, inside the true one by less than
        a percent of its size: n.x + d <= 0 inside
    """

    corners: np.ndarray
    planes: np.ndarray


def convex_hull(part: Body, frame: np.ndarray) -> Hull:
    """Return the hull of the part's mesh; without planes if the part is flat.

    frame : rows of a frame that turns with the part, (3, 3), in which the coarser hull is made
    """
    vertices = part.mesh.vertices
    try:
        corners = vertices[ConvexHull(vertices).vertices]
        turn = np.arange(WAYS)
        height = 1.0 - (2.0 * turn + 1.0) / WAYS
        ring, angle = np.sqrt(1.0 - height**2), turn * 2.399963229728653  # golden angle: even over the sphere
        ways = np.stack([ring * np.cos(angle), ring * np.sin(angle), height])
        outward = frame.T @ np.hstack([ways, np.eye(3), -np.eye(3)])
        outermost = np.unique(np.argmax(corners @ outward, axis=0))
        planes = np.unique(np.round(ConvexHull(corners[outermost]).equations, 9), axis=0)
    except QhullError:
        return Hull(vertices, np.zeros((0, 4)))
    return Hull(corners, planes)


def hollows(part: Body, hull: Hull, tracer: Tracer, frame: np.ndarray) -> tuple[float, float]:
    """Return the room inside the convex hull of a part that is open towards +z and towards -z of a frame [mm^3].

    frame : rows x, y, z, (3, 3). Lines of sight that pass through the part without meeting it belong to neither side.
    """
    if len(hull.planes) == 0:
        return 0.0, 0.0
    local = part.mesh.vertices @ frame.T
    low, high = local.min(axis=0), local.max(axis=0)
    step = np.maximum(high[:2] - low[:2], 1e-9) / GRID
    u, v = (low[k] + (np.arange(GRID) + 0.5) * step[k] for k in range(2))
    places = np.stack(np.meshgrid(u, v, indexing="ij"), axis=-1).reshape(-1, 2)
    top, bottom = _hull_heights(hull.planes @ _turned(frame), places)
    cell = float(step[0] * step[1])
    found = []
    for sign, limit in ((1.0, top), (-1.0, bottom)):
        start = np.column_stack([places, np.full(len(places), high[2] + 1.0 if sign > 0 else low[2] - 1.0)])
        hit = tracer.first_triangle(start @ frame, -sign * frame[2])
        seen = hit >= 0
        height = _height_on(local[part.mesh.triangles[hit[seen]]], places[seen])
        found.append(cell * float(np.maximum(sign * (limit[seen] - height), 0.0).sum()))
    return found[0], found[1]


def _turned(frame: np.ndarray) -> np.ndarray:
    turn = np.eye(4)
    turn[:3, :3] = frame.T
    return turn


def _hull_heights(planes: np.ndarray, places: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the highest and lowest z inside the planes over each place (k, 2)."""
    found = []
    for chosen, choose in ((planes[:, 2] > 1e-9, np.min), (planes[:, 2] < -1e-9, np.max)):
        a, b, c, d = planes[chosen].T
        found.append(choose(-(np.outer(places[:, 0], a / c) + np.outer(places[:, 1], b / c) + d / c), axis=1))
    return found[0], found[1]


def _height_on(corners: np.ndarray, places: np.ndarray) -> np.ndarray:
    """Return z on the plane of each triangle at its place; the mean height of a triangle that stands upright."""
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    steep = np.abs(normal[:, 2]) < 1e-9 * np.linalg.norm(normal, axis=1)
    offset = corners[:, 0, :2] - places
    rise = (normal[:, :2] * offset).sum(axis=1) / np.where(steep, 1.0, normal[:, 2])
    inside = np.clip(corners[:, 0, 2] + rise, corners[:, :, 2].min(axis=1), corners[:, :, 2].max(axis=1))
    return np.asarray(np.where(steep, corners[:, :, 2].mean(axis=1), inside))
