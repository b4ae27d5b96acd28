"""Mesh solids: fast, exact-in-topology booleans that propose and check what the kernel then makes once."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import manifold3d
import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.tolerances import EROSION, NOISE_THICKNESS, SMALL_VOLUME

MeshSolid: TypeAlias = manifold3d.Manifold

SHIFTS = (0.0, 1e-8, -1e-8, 1e-7, -1e-7, 1e-6)
"""Shifts [mm] of a solid that is taken out of another, tried in turn until the volumes agree. Our choice: far below
`NOISE_THICKNESS`, so that no sheet they leave is taken for a piece."""

SAME_VOLUME = 1e-6
"""Relative difference of volumes from which a difference of meshes is not believed."""


def mesh_solid(mesh: SurfaceMesh) -> MeshSolid:
    """Return the mesh as a solid whose triangles remember their face through every boolean.

    Raises
    ------
    KernelError : the mesh is not the boundary of a solid
    """
    solid = make_solid(mesh.vertices, mesh.triangles, mesh.face)
    if solid is None:
        raise KernelError("the mesh of the solid is not closed")
    return solid


def make_solid(vertices: np.ndarray, triangles: np.ndarray, face: np.ndarray) -> MeshSolid | None:
    """Return a mesh solid from arrays, or None when they do not bound one."""
    data = manifold3d.Mesh64(
        np.ascontiguousarray(vertices, np.float64),
        np.ascontiguousarray(triangles, np.uint64),
        face_id=np.ascontiguousarray(face, np.uint64),
    )
    data.merge()
    solid = manifold3d.Manifold(data)
    return solid if solid.status() == manifold3d.Error.NoError and solid.num_tri() > 0 else None


def union(solids: list[MeshSolid]) -> MeshSolid:
    """Return the union of any number of mesh solids."""
    return manifold3d.Manifold.batch_boolean(solids, manifold3d.OpType.Add) if solids else manifold3d.Manifold()


def without(solid: MeshSolid, other: MeshSolid) -> MeshSolid:
    """Return one solid without another, held against the volume of what they share.

    Where many sheets coincide the mesh boolean once left out a twentieth of a trapped space, another time gave back
    five times what was shared, and said that all was well. Shifted by nothing that matters the sheets do not coincide.

    Raises
    ------
    KernelError : the volumes disagree however the other solid is shifted
    """
    size = float(solid.volume())
    miss = 0.0
    for shift in SHIFTS:
        moved = other.translate((shift, 2.0 * shift, 3.0 * shift)) if shift else other
        left = solid - moved
        miss = float(left.volume()) + float((solid ^ moved).volume()) - size
        if abs(miss) <= SAME_VOLUME * size + SMALL_VOLUME:
            return left
    raise KernelError(
        f"what a mesh boolean leaves and what it takes away differ from {size:.6g} mm^3 by {miss:.3g} mm^3",
        remedy="turn the pull a little, or repair the faces in the CAD system that wrote the part",
    )


def thickness(piece: MeshSolid) -> float:
    """Return 2 V / A [mm]: the thickness of a sheet, two thirds of the radius of a ball."""
    return 2.0 * float(piece.volume()) / max(float(piece.surface_area()), 1e-12)


def thick_pieces(solid: MeshSolid, least: float = NOISE_THICKNESS) -> list[MeshSolid]:
    """Return the connected pieces at least that thick [mm], largest first."""
    if solid.num_tri() == 0:
        return []
    found = [p for p in solid.decompose() if p.volume() > SMALL_VOLUME and thickness(p) >= least]
    return sorted(found, key=lambda p: -p.volume())


def eroded(mesh: SurfaceMesh, by: float = EROSION) -> MeshSolid | None:
    """Return the mesh with every vertex moved inward so that each face around it gives way by `by` [mm] or more.

    The faces around a vertex count by their angle there, not by how many triangles happen to meet in it: the corner of
    a block moves by the same along each of its three faces. Very sharp corners (under 35 deg) give way by less.

    Bodies of a tool touch everywhere, and a boolean of coincident sheets makes thousands of slivers. One that was
    eroded touches nothing: overlaps deeper than that remain, and the boolean is tens of times faster (measured).
    """
    corners = mesh.corners
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normal = normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    at = mesh.triangles.ravel()
    count = len(mesh.vertices)
    each = np.repeat(normal, 3, axis=0)
    angle = _corner_angles(corners).ravel()
    mean = np.stack([np.bincount(at, angle * each[:, k], count) for k in range(3)], axis=1)
    mean = mean / np.maximum(np.linalg.norm(mean, axis=1), 1e-300)[:, None]
    least = np.ones(count)
    np.minimum.at(least, at, (each * mean[at]).sum(axis=1))
    moved = mesh.vertices - mean * (by / np.maximum(least, 0.3))[:, None]
    return make_solid(moved, mesh.triangles, mesh.face)


def _corner_angles(corners: np.ndarray) -> np.ndarray:
    """Return the angle of each triangle at each of its corners, (t, 3) [rad]."""
    onward, back = np.roll(corners, -1, axis=1) - corners, np.roll(corners, 1, axis=1) - corners
    across = np.linalg.norm(np.cross(onward, back), axis=2)
    return np.asarray(np.arctan2(across, (onward * back).sum(axis=2)))


def overlap_depth(one: MeshSolid, eroded_other: MeshSolid) -> float:
    """Return how deep a solid reaches into another, given eroded: 0 when by no more than `EROSION` [mm]."""
    common = one ^ eroded_other
    if common.num_tri() == 0:
        return 0.0
    thick = max((thickness(p) for p in common.decompose() if p.volume() > SMALL_VOLUME), default=0.0)
    return thick + EROSION if thick else 0.0


@dataclass(frozen=True)
class PieceMesh:
    """A mesh solid as arrays: vertices (n, 3) [mm], triangles (t, 3), face number of each triangle (t,)."""

    vertices: np.ndarray
    triangles: np.ndarray
    face: np.ndarray


def piece_mesh(piece: MeshSolid) -> PieceMesh:
    """Return the arrays of a mesh solid; `face` holds what `mesh_solid` was given."""
    data = piece.to_mesh64()
    return PieceMesh(
        np.asarray(data.vert_properties)[:, :3],
        np.asarray(data.tri_verts).astype(np.int64),
        np.asarray(data.face_id).astype(np.int64),
    )


def face_areas(piece: MeshSolid, face_count: int) -> np.ndarray:
    """Return the area of a piece's boundary that comes from each face, (face_count,) [mm^2]."""
    mesh = piece_mesh(piece)
    p = mesh.vertices[mesh.triangles]
    area = 0.5 * np.linalg.norm(np.cross(p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]), axis=1)
    own = mesh.face < face_count
    return np.bincount(mesh.face[own], area[own], face_count)
