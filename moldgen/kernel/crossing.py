"""Faces of one solid that pass through each other: the kernel calls such a solid valid."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from embreex.mesh_construction import TriangleMesh
from embreex.rtcore_scene import EmbreeScene

from moldgen.finding import Point
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.tolerances import MESH_DEFLECTION

DEPTH: Final = 2.0 * MESH_DEFLECTION
"""Crossings less deep than this are not told from tessellation noise [mm]; none was found on 49 real parts."""

_MOST_HITS: Final = 8
"""An edge is followed through at most this many triangles that it only touches."""


@dataclass(frozen=True)
class Crossing:
    """An edge of the mesh that passes through the inside of a triangle it does not belong to."""

    at: Point
    faces: tuple[int, int]
    depth_mm: float


def crossings(mesh: SurfaceMesh) -> tuple[Crossing, ...]:
    """Return the places where the mesh passes through itself, deepest first, one for each pair of faces.

    Each mesh edge is a ray from end to end against all triangles; where two surfaces cross, an edge of one of them
    passes through a triangle of the other. Ends are spared by `DEPTH`, so shallower crossings are not seen.
    """
    vertices, triangles = mesh.vertices - mesh.vertices.mean(axis=0), mesh.triangles
    edges, owner = _edges(mesh)
    along = vertices[edges[:, 1]] - vertices[edges[:, 0]]
    length = np.linalg.norm(along, axis=1)
    long_enough = length > 2.5 * DEPTH
    edges, owner, length = edges[long_enough], owner[long_enough], length[long_enough]
    along = along[long_enough] / length[:, None]
    scene = EmbreeScene()
    TriangleMesh(scene, vertices[triangles].astype(np.float32))
    deepest: dict[tuple[int, int], Crossing] = {}
    travelled = np.full(len(edges), DEPTH)
    alive = np.arange(len(edges))
    for _ in range(_MOST_HITS):
        alive = alive[length[alive] - DEPTH > travelled[alive]]
        if len(alive) == 0:
            break
        origins = vertices[edges[alive, 0]] + along[alive] * travelled[alive, None]
        reach = (length[alive] - DEPTH - travelled[alive]).astype(np.float32)
        answer = scene.run(
            origins.astype(np.float32),
            along[alive].astype(np.float32),
            dists=reach.copy(),  # the tracer overwrites it with the distance of the hit
            query="INTERSECT",
            output=True,
        )
        hit = (answer["primID"] >= 0) & (answer["tfar"] < reach)
        alive, struck = alive[hit], answer["primID"][hit]
        travelled[alive] += answer["tfar"][hit]
        depth = _depth(vertices, triangles[struck], edges[alive])
        for k in np.flatnonzero(depth > DEPTH):
            place = mesh.vertices[edges[alive[k], 0]] + along[alive[k]] * travelled[alive[k]]
            _keep(deepest, place, (int(owner[alive[k]]), int(mesh.face[struck[k]])), float(depth[k]))
        travelled[alive] += 0.01 * DEPTH
    return tuple(sorted(deepest.values(), key=lambda c: (-c.depth_mm, c.faces)))


def _edges(mesh: SurfaceMesh) -> tuple[np.ndarray, np.ndarray]:
    """Return the distinct edges (k, 2) and for each the face of one of its triangles (k,)."""
    t = mesh.triangles
    pairs = np.sort(np.vstack([t[:, [0, 1]], t[:, [1, 2]], t[:, [2, 0]]]), axis=1)
    edges, first = np.unique(pairs, axis=0, return_index=True)
    return edges, np.tile(mesh.face, 3)[first]


def _depth(vertices: np.ndarray, struck: np.ndarray, edges: np.ndarray) -> np.ndarray:
    """Return how far each edge reaches through the plane of the triangle it struck, on the shorter side (0: own)."""
    a = vertices[struck[:, 0]]
    normal = np.cross(vertices[struck[:, 1]] - a, vertices[struck[:, 2]] - a)
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    start = ((vertices[edges[:, 0]] - a) * normal).sum(axis=1)
    end = ((vertices[edges[:, 1]] - a) * normal).sum(axis=1)
    related = ((struck == edges[:, :1]) | (struck == edges[:, 1:])).any(axis=1)
    return np.where(related | (start * end >= 0), 0.0, np.minimum(np.abs(start), np.abs(end)))


def _keep(deepest: dict[tuple[int, int], Crossing], place: np.ndarray, faces: tuple[int, int], depth: float) -> None:
    key = (min(faces), max(faces))
    if key not in deepest or deepest[key].depth_mm < depth:
        x, y, z = (float(v) for v in place)
        deepest[key] = Crossing((x, y, z), key, depth)
