"""Which steel forms which piece of the surface of a part that side actions release."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.tracer import Tracer
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.side_action import SideKind, across
from moldgen.output.scene import BY_LIFTER, BY_SLIDE

BESIDE = 0.03
"""mm: how far in front of the plastic it is asked whose steel is there; less than the least land of a front."""

FINE = 0.3
"""mm: sides of triangles below this are not halved any more; a pixel of the part's picture is about 0.1 mm."""

COARSE = 3.0
"""mm: triangles beside a front are halved down to this in any case, so that no front falls between their corners."""

INWARD = 0.02
"""Share of the way to the middle of a triangle at which its corners are asked, so that neighbours do not decide."""


def formed_by(mesh: SurfaceMesh, halves: Halves) -> tuple[SurfaceMesh, np.ndarray]:
    """Return the mesh of the molded part and what forms each triangle, (t,) int: +1 cavity, -1 core, or a side action.

    A side action (`BY_SLIDE`, `BY_LIFTER`) forms what borders on its front, the straight prism; triangles over which
    the border runs are halved until they are small. The rest is looked up on the part whose undercuts are filled, of
    which the halves were made: it is the same there.
    """
    mesh = _halved(mesh, halves.sides)
    middle, normal = mesh.corners.mean(axis=1), _normals(mesh)
    before = middle + BESIDE * normal
    filled = halves.body.mesh
    met = Tracer(filled).first_triangle(before, -normal)
    by = np.where(halves.cavity_side[filled.face[met]] & (met >= 0), 1, -1)
    side = _owner(before, halves.sides)
    return mesh, np.where(side != 0, side, by)


def inside(outline: Sequence[np.ndarray], points: np.ndarray) -> np.ndarray:
    """Return which points (k, 2) lie inside closed polygons (n, 2), holes being polygons too (even-odd rule), (k,)."""
    crossings = np.zeros(len(points), dtype=int)
    x, y = points.T
    for polygon in outline:
        for (x0, y0), (x1, y1) in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
            spans = (y0 <= y) != (y1 <= y)
            crossings += spans & (x < x0 + (y - y0) / (y1 - y0 if y1 != y0 else 1.0) * (x1 - x0))
    return np.asarray(crossings % 2 == 1)


def _owner(points: np.ndarray, sides: Sequence[SideSteel]) -> np.ndarray:
    """Return which kind of side action has its front at each point (k, 3), 0 for none, (k,)."""
    owner = np.zeros(len(points), dtype=int)
    for side in reversed(sides):  # what two fronts share belongs to the first
        front = side.front
        seen = points @ across(front.axis).T
        within = inside(front.outline, seen[:, :2]) & (seen[:, 2] > front.near) & (seen[:, 2] < front.far)
        owner[within] = BY_SLIDE if front.kind is SideKind.SLIDE else BY_LIFTER
    return owner


def _halved(mesh: SurfaceMesh, sides: Sequence[SideSteel]) -> SurfaceMesh:
    """Return the mesh with its triangles halved at their longest side where the border of a front runs over them."""
    corners, face, normals = mesh.corners, mesh.face, mesh.normals
    done: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
    while len(corners):
        length = np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2)
        longest_side = length.max(axis=1)
        split = (longest_side > COARSE) & _beside(corners, sides)
        split |= (longest_side > FINE) & _mixed(corners, sides)
        done.append((corners[~split], face[~split], normals[~split]))
        corners, face, normals, longest = corners[split], face[split], normals[split], length[split].argmax(axis=1)
        row = np.arange(len(corners))
        a, b, c = (corners[row, (longest + k) % 3] for k in range(3))
        half = (a + b) / 2.0
        corners = np.concatenate([np.stack([a, half, c], axis=1), np.stack([half, b, c], axis=1)])
        face, normals = np.tile(face, 2), np.tile(normals, (2, 1))
    all_corners, all_faces, all_normals = (np.concatenate([d[k] for d in done]) for k in range(3))
    vertices, number = np.unique(all_corners.reshape(-1, 3), axis=0, return_inverse=True)
    triangles = number.reshape(-1, 3)
    return replace(
        mesh,
        vertices=vertices,
        triangles=triangles,
        face=all_faces,
        normals=all_normals,
        bulge=np.zeros_like(all_normals),
    )


def _beside(corners: np.ndarray, sides: Sequence[SideSteel]) -> np.ndarray:
    """Return which triangles (t, 3, 3) have a box, across the axis of some front, that meets the box of the front."""
    beside = np.zeros(len(corners), dtype=bool)
    for front in [side.front for side in sides]:
        seen = corners @ across(front.axis).T
        rim = np.concatenate(front.outline)
        low, high = np.array([*rim.min(axis=0), front.near]), np.array([*rim.max(axis=0), front.far])
        beside |= ((seen.min(axis=1) <= high + BESIDE) & (seen.max(axis=1) >= low - BESIDE)).all(axis=1)
    return beside


def _mixed(corners: np.ndarray, sides: Sequence[SideSteel]) -> np.ndarray:
    """Return which triangles (t, 3, 3) lie partly on the front of a side action."""
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    middle = corners.mean(axis=1)
    own = _owner(middle + BESIDE * normal, sides)
    mixed = np.zeros(len(corners), dtype=bool)
    for k in range(3):
        asked = corners[:, k] + INWARD * (middle - corners[:, k]) + BESIDE * normal
        mixed |= _owner(asked, sides) != own
    return mixed


def _normals(mesh: SurfaceMesh) -> np.ndarray:
    corners = mesh.corners
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return np.asarray(normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None])
