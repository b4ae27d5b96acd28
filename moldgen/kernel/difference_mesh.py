"""Where two nearly equal solids differ, as meshes: these propose the pieces, the kernel then makes them.

Faces that did not change are meshed with other triangles when their edges changed, so that meshes of equal surfaces lie
up to their sag apart. A place counts only where one solid reaches more than `DIFFERENCE_NOISE` out of the other.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from scipy.spatial import cKDTree

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.meshsolid import MeshSolid, eroded, make_solid, without
from moldgen.tolerances import SMALL_VOLUME

FINE = 0.01
"""Sag of the meshes that are compared [mm] (our choice: below it, no toolmaker sees a step)."""

FINE_ANGLE = 0.2
"""Angle between neighboring segments [rad]; only radii under 0.5 mm are meshed finer by it than by the sag."""

DIFFERENCE_NOISE = 0.012
"""mm: one solid must reach farther than this out of the other to count. Our choice: just over the sag of the meshes,
and half of what a good milling machine keeps to over a cavity block (0.02 mm, common practice)."""

SAME_POINT = 1e-5
"""Corners of two meshes this close [mm] are made one, so that equal faces coincide to the last digit."""

Corners = tuple[np.ndarray, np.ndarray]


@dataclass(frozen=True, eq=False)
class MeshDifference:
    """Pieces of the old solid that the new one lacks (`cut`), and of the new one that the old one lacks (`weld`)."""

    cut: list[MeshSolid] = field(default_factory=list)
    weld: list[MeshSolid] = field(default_factory=list)

    @property
    def none(self) -> bool:
        """True when the solids are equal but for noise."""
        return not self.cut and not self.weld


def mesh_difference(
    old: Body, new: Body, clip: Corners | None = None, noise: float = DIFFERENCE_NOISE
) -> MeshDifference:
    """Return where one solid reaches out of the other by more than `noise`, inside the box `clip` if one is given [mm].

    Raises
    ------
    KernelError : a mesh does not close
    """
    new_mesh = snapped(new.mesh, old.mesh)
    if same_triangles(old.mesh, new_mesh):
        return MeshDifference()
    pairs = ((old.mesh, new_mesh), (new_mesh, old.mesh))
    return MeshDifference(*(_reaching_out(one, other, clip, noise) for one, other in pairs))


def snapped(mesh: SurfaceMesh, onto: SurfaceMesh) -> SurfaceMesh:
    """Return `mesh` with each vertex that lies on one of `onto` put there exactly, at most one on each."""
    distance, target = cKDTree(onto.vertices).query(mesh.vertices, distance_upper_bound=SAME_POINT)
    near = np.flatnonzero(np.isfinite(distance))
    order = near[np.lexsort((near, distance[near], target[near]))]
    first = np.r_[True, np.diff(target[order]) > 0] if len(order) else np.zeros(0, bool)
    chosen = order[first]
    vertices = mesh.vertices.copy()
    vertices[chosen] = onto.vertices[target[chosen]]
    return SurfaceMesh(vertices, mesh.triangles, mesh.face, mesh.normals, mesh.bulge)


def same_triangles(one: SurfaceMesh, other: SurfaceMesh) -> bool:
    """True when two meshes consist of the same triangles, whatever their order."""
    if len(one.triangles) != len(other.triangles):
        return False
    return bool((_sorted_corners(one) == _sorted_corners(other)).all())


def _sorted_corners(mesh: SurfaceMesh) -> np.ndarray:
    """Return the corners of all triangles, each turned to begin with its least corner, in order, (t, 9)."""
    corners = mesh.corners
    rank = np.empty(len(mesh.vertices), int)
    rank[np.lexsort(mesh.vertices.T[::-1])] = np.arange(len(mesh.vertices))
    begin = np.argmin(rank[mesh.triangles], axis=1)
    turned = np.take_along_axis(corners, ((begin[:, None] + np.arange(3)) % 3)[:, :, None], axis=1)
    flat = turned.reshape(-1, 9)
    return np.asarray(flat[np.lexsort(flat.T[::-1])])


def _reaching_out(mesh: SurfaceMesh, other: SurfaceMesh, clip: Corners | None, noise: float) -> list[MeshSolid]:
    """Return the pieces of one solid that reach out of the other by more than noise, largest first."""
    whole, rest = _solid(mesh), _solid(other)
    grown = eroded(other, -noise)
    if grown is None:
        raise KernelError("the mesh of the solid is not closed")
    seeds = [s for s in clipped(whole - grown, clip).decompose() if s.volume() > SMALL_VOLUME]
    if not seeds:
        return []
    pieces = [p for p in clipped(without(whole, rest), clip).decompose() if _holds_any(p, seeds)]
    return sorted(pieces, key=_rank)


def _solid(mesh: SurfaceMesh) -> MeshSolid:
    solid = make_solid(mesh.vertices, mesh.triangles, mesh.face)
    if solid is None:
        raise KernelError("the mesh of the solid is not closed")
    return solid


def clipped(solid: MeshSolid, clip: Corners | None) -> MeshSolid:
    """Return what lies inside a box; a side at infinity does not clip."""
    if clip is None:
        return solid
    for axis in range(3):
        normal = [0.0, 0.0, 0.0]
        for sign, corner in ((1.0, clip[0]), (-1.0, clip[1])):
            if np.isfinite(corner[axis]):
                normal[axis] = sign
                solid = solid.trim_by_plane(normal, sign * float(corner[axis]))
    return solid


def corners_of(solid: MeshSolid) -> Corners:
    """Return lower and upper corner of a mesh solid [mm]."""
    box = np.array(solid.bounding_box())
    return box[:3], box[3:]


def _holds_any(piece: MeshSolid, seeds: Sequence[MeshSolid]) -> bool:
    low, high = corners_of(piece)
    for seed in seeds:
        seed_low, seed_high = corners_of(seed)
        if (seed_low > low - 1e-6).all() and (seed_high < high + 1e-6).all() and (piece ^ seed).volume() > 0.0:
            return True
    return False


def _rank(piece: MeshSolid) -> tuple[float, ...]:
    low, _ = corners_of(piece)
    return (-round(float(piece.volume()), 9), *np.round(low, 6))
