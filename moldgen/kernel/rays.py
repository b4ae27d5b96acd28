"""Questions that rays and distances answer on a mesh."""

from __future__ import annotations

import numpy as np
import trimesh
from trimesh.ray.ray_pyembree import RayMeshIntersector

from moldgen.kernel.mesh import SurfaceMesh


def blocked(mesh: SurfaceMesh, origins: np.ndarray, direction: tuple[float, float, float]) -> np.ndarray:
    """Return for each origin (k, 3) whether a ray along `direction` meets the mesh, (k,) bool."""
    if len(origins) == 0:
        return np.zeros(0, dtype=bool)
    tracer = RayMeshIntersector(trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False))
    return np.asarray(tracer.intersects_any(origins, np.tile(np.asarray(direction, float), (len(origins), 1))))


def first_hits(
    mesh: SurfaceMesh, origins: np.ndarray, direction: tuple[float, float, float]
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return (ray number, triangle, point) of the first hit of each ray that hits, (h,), (h,), (h, 3)."""
    tracer = RayMeshIntersector(trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False))
    directions = np.tile(np.asarray(direction, float), (len(origins), 1))
    points, rays, triangles = tracer.intersects_location(origins, directions, multiple_hits=False)
    return rays, triangles, points


def nearest_triangle(mesh: SurfaceMesh, point: np.ndarray) -> tuple[int, float]:
    """Return the triangle nearest to a point and the distance [mm]."""
    corners = mesh.corners
    closest = trimesh.triangles.closest_point(corners, np.tile(point, (len(corners), 1)))
    distance = np.linalg.norm(closest - point, axis=1)
    triangle = int(np.argmin(distance))
    return triangle, float(distance[triangle])
