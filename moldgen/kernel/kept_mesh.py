"""The content of a solid as a hash, and its mesh as bytes: what it takes to remember a mesh."""

from __future__ import annotations

import hashlib
import io
from dataclasses import fields, replace

import numpy as np
from OCP.BinTools import BinTools, BinTools_FormatVersion
from OCP.Message import Message_ProgressRange
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.mesh import SurfaceMesh, surface_mesh, tessellate
from moldgen.kernel.topology import faces_of


def bare(solid: TopoDS_Shape) -> TopoDS_Shape:
    """Return a solid where its definition was built: all that stand elsewhere share its faces, and their meshes."""
    return solid.Located(TopLoc_Location())


def content_sha256(solid: TopoDS_Shape) -> str:
    """Return a hash of all that a bare solid is, exact to the last digit; meshes that its faces have already count."""
    stream = io.BytesIO()
    version = BinTools_FormatVersion.BinTools_FormatVersion_CURRENT
    BinTools.Write_s(bare(solid), stream, True, True, version, Message_ProgressRange())
    return hashlib.sha256(stream.getvalue()).hexdigest()


def place_of(solid: TopoDS_Shape) -> tuple[float, ...]:
    """Return where a solid stands from where its definition was built: rows of rotation and shift [mm], (12,)."""
    where = solid.Location().Transformation()
    return tuple(where.Value(row, column) for row in range(1, 4) for column in range(1, 5))


def fine_mesh(solid: TopoDS_Shape, deflection: float, angle: float) -> SurfaceMesh:
    """Return the welded mesh of a solid at a deflection [mm] and an angle [rad]. Raises KernelError without one."""
    tessellate(solid, deflection, angle)
    return surface_mesh(faces_of(solid))


def placed_mesh(mesh: SurfaceMesh, solid: TopoDS_Shape) -> SurfaceMesh:
    """Return the mesh of a bare solid where the solid stands."""
    if solid.Location().IsIdentity():
        return mesh
    matrix = np.array(place_of(solid)).reshape(3, 4)
    turn = matrix[:, :3].T
    return replace(mesh, vertices=mesh.vertices @ turn + matrix[:, 3], normals=mesh.normals @ turn)


def mesh_to_bytes(mesh: SurfaceMesh) -> bytes:
    """Return the arrays of a mesh as bytes, exact."""
    stream = io.BytesIO()
    for field in fields(mesh):
        np.save(stream, getattr(mesh, field.name), allow_pickle=False)
    return stream.getvalue()


def mesh_from_bytes(data: bytes) -> SurfaceMesh:
    """Return the mesh that `mesh_to_bytes` wrote."""
    stream = io.BytesIO(data)
    return SurfaceMesh(**{field.name: np.load(stream, allow_pickle=False) for field in fields(SurfaceMesh)})
