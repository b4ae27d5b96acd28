"""Rays that tell how far it is to what they meet, in double precision."""

from __future__ import annotations

from typing import Final

import numpy as np

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.tracer import Direction, Tracer

FLAT: Final = 1e-7
"""Sine below which a ray runs along the triangle that it meets: then the distance to its middle is taken."""


class Probe:
    """Distances from points to a mesh along given directions."""

    def __init__(self, mesh: SurfaceMesh) -> None:
        self._corners = mesh.corners
        self._normals = np.cross(self._corners[:, 1] - self._corners[:, 0], self._corners[:, 2] - self._corners[:, 0])
        self._normals /= np.maximum(np.linalg.norm(self._normals, axis=1), 1e-30)[:, None]
        self._tracer = Tracer(mesh)

    def first(self, origins: np.ndarray, direction: Direction) -> tuple[np.ndarray, np.ndarray]:
        """Return for each ray the distance [mm] to its first hit (inf: none) and the triangle met (-1: none).

        Parameters
        ----------
        origins : (k, 3) [mm]
        direction : one unit vector for all rays, or one for each, (k, 3)
        """
        triangle = self._tracer.first_triangle(origins, direction)
        distance = np.full(len(origins), np.inf)
        hit = np.flatnonzero(triangle >= 0)
        if len(hit):
            along = np.broadcast_to(np.asarray(direction, float), (len(origins), 3))[hit]
            met = triangle[hit]
            rise = (self._normals[met] * along).sum(axis=1)
            gap = self._corners[met, 0] - origins[hit]
            flat = np.abs(rise) < FLAT
            middle = ((self._corners[met].mean(axis=1) - origins[hit]) * along).sum(axis=1)
            exact = (gap * self._normals[met]).sum(axis=1) / np.where(flat, 1.0, rise)
            distance[hit] = np.maximum(np.where(flat, middle, exact), 0.0)
        return distance, triangle

    def free(self, starts: np.ndarray, ends: np.ndarray) -> np.ndarray:
        """Return for each straight line from start to end (k, 3) whether it meets no triangle, (k,) bool."""
        way = ends - starts
        length = np.linalg.norm(way, axis=1)
        distance, _ = self.first(starts, way / np.maximum(length, 1e-12)[:, None])
        return np.asarray(distance > length)
