"""The place of a mesh nearest to a point."""

from __future__ import annotations

import numpy as np

from moldgen.kernel.mesh import SurfaceMesh

NO_AREA = 1e-12
"""Twice the area of a triangle over the square of its length below which it has no plane to stand over."""


def nearest_triangle(mesh: SurfaceMesh, point: np.ndarray) -> tuple[int, float]:
    """Return the triangle nearest to a point and the distance [mm].

    The nearest point of a triangle is its foot of the perpendicular where that lies inside, else a point of one side.
    A triangle without area has only sides.
    """
    a, b, c = (mesh.corners[:, k] for k in range(3))
    distance = np.minimum.reduce([_to_segment(point, a, b), _to_segment(point, b, c), _to_segment(point, c, a)])
    normal = np.cross(b - a, c - a)
    size = np.maximum(np.linalg.norm(normal, axis=1), 1e-300)
    inside = size > NO_AREA * np.maximum(((b - a) ** 2).sum(axis=1), ((c - a) ** 2).sum(axis=1))
    for start, end in ((a, b), (b, c), (c, a)):
        inside &= (np.cross(end - start, point - start) * normal).sum(axis=1) >= 0.0
    height = np.abs(((point - a) * normal).sum(axis=1)) / size
    distance = np.where(inside, np.minimum(distance, height), distance)
    triangle = int(np.argmin(distance))
    return triangle, float(distance[triangle])


def _to_segment(point: np.ndarray, start: np.ndarray, end: np.ndarray) -> np.ndarray:
    along = end - start
    length = np.maximum((along * along).sum(axis=1), 1e-300)
    share = np.clip(((point - start) * along).sum(axis=1) / length, 0.0, 1.0)
    return np.asarray(np.linalg.norm(start + share[:, None] * along - point, axis=1))
