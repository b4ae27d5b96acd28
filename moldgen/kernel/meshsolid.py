"""Mesh solids: fast, exact-in-topology booleans that propose and check what the kernel then makes once."""

from __future__ import annotations

from dataclasses import dataclass

import manifold3d
import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.tolerances import NOISE_THICKNESS, SMALL_VOLUME

MeshSolid = manifold3d.Manifold


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


def thickness(piece: MeshSolid) -> float:
    """Return 2 V / A [mm]: the thickness of a sheet, two thirds of the radius of a ball."""
    return 2.0 * float(piece.volume()) / max(float(piece.surface_area()), 1e-12)


def thick_pieces(solid: MeshSolid, least: float = NOISE_THICKNESS) -> list[MeshSolid]:
    """Return the connected pieces at least that thick [mm], largest first."""
    if solid.num_tri() == 0:
        return []
    found = [p for p in solid.decompose() if p.volume() > SMALL_VOLUME and thickness(p) >= least]
    return sorted(found, key=lambda p: -p.volume())


def thickest_overlap(one: MeshSolid, other: MeshSolid) -> float:
    """Return the thickness [mm] of the thickest connected piece that two solids share, 0 when they do not meet."""
    common = one ^ other
    if common.num_tri() == 0:
        return 0.0
    return max((thickness(p) for p in common.decompose() if p.volume() > SMALL_VOLUME), default=0.0)


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
