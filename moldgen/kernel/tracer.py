"""Many rays against one mesh, straight through the ray library."""

from __future__ import annotations

import numpy as np
from embreex import rtcore_scene
from embreex.mesh_construction import TriangleMesh

from moldgen.kernel.mesh import SurfaceMesh

Direction = tuple[float, float, float] | np.ndarray


class Tracer:
    """A mesh made ready for rays. The ray library counts in single precision, about 1e-7 of the mesh's size."""

    def __init__(self, mesh: SurfaceMesh) -> None:
        self._origin = mesh.vertices.min(axis=0)
        self._scale = 1.0 / max(float(np.ptp(mesh.vertices, axis=0).max()), 1e-12)
        self._scene = rtcore_scene.EmbreeScene()
        # the scene keeps no reference of its own
        self._kept = TriangleMesh(self._scene, self._scaled(mesh.vertices), mesh.triangles.astype(np.int32))

    def first_triangle(self, origins: np.ndarray, direction: Direction) -> np.ndarray:
        """Return for each ray (k, 3) the first triangle that it meets, -1 for none, (k,) int.

        `direction` is one vector for all rays or one for each, (k, 3).
        """
        if len(origins) == 0:
            return np.zeros(0, dtype=int)
        way = np.broadcast_to(np.asarray(direction, dtype=np.float32), (len(origins), 3))
        return np.asarray(self._scene.run(self._scaled(origins), np.ascontiguousarray(way)), dtype=int)

    def blocked(self, origins: np.ndarray, direction: Direction) -> np.ndarray:
        """Return for each ray whether it meets the mesh, (k,) bool."""
        return self.first_triangle(origins, direction) >= 0

    def _scaled(self, points: np.ndarray) -> np.ndarray:
        return np.ascontiguousarray((points - self._origin) * self._scale, dtype=np.float32)
