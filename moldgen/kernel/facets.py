"""A mesh solid as a kernel solid of plane facets: for what the kernel cannot make from its own surfaces."""

from __future__ import annotations

import numpy as np
from OCP.BRep import BRep_Builder
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeShapeOnMesh, BRepBuilderAPI_MakeSolid
from OCP.gp import gp_Pnt
from OCP.Poly import Poly_Triangle, Poly_Triangulation
from OCP.ShapeUpgrade import ShapeUpgrade_UnifySameDomain
from OCP.TopAbs import TopAbs_FACE
from OCP.TopoDS import TopoDS_Shape, TopoDS_Shell

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation
from moldgen.kernel.measure import volume
from moldgen.kernel.meshsolid import MeshSolid, piece_mesh
from moldgen.kernel.topology import only_solid, solids_of, walk

MOST_FACETS = 20_000
"""More triangles than this are thinned out first: a STEP file of them takes 30 MB (our choice)."""

THINNED = 0.0025
"""mm by which thinning may move the surface, doubled until the facets are few enough (our choice)."""

SAME_VOLUME = 1e-6
"""Relative difference between the volumes of the mesh and of the solid made of it that is accepted."""


def facet_solid(piece: MeshSolid) -> TopoDS_Shape:
    """Return one kernel solid whose faces are the triangles of a mesh solid, joined where they lie in one plane.

    Raises
    ------
    KernelError : the facets do not close, or hold another volume than the mesh
    """
    tolerance = THINNED
    while piece.num_tri() > MOST_FACETS and tolerance < 1.0:
        piece, tolerance = piece.simplify(tolerance), 2.0 * tolerance
    mesh = piece_mesh(piece)
    with operation("make a solid of facets", facets=len(mesh.triangles)):
        data = Poly_Triangulation(len(mesh.vertices), len(mesh.triangles), False, False)
        for number, point in enumerate(mesh.vertices, start=1):
            data.SetNode(number, gp_Pnt(*map(float, point)))
        for number, (a, b, c) in enumerate(mesh.triangles + 1, start=1):
            data.SetTriangle(number, Poly_Triangle(int(a), int(b), int(c)))
        maker = BRepBuilderAPI_MakeShapeOnMesh(data)
        maker.Build()
        plain = _solid(maker.Shape())
        joining = ShapeUpgrade_UnifySameDomain(plain, True, True, False)
        joining.Build()
        joined = joining.Shape()
    for solid in (joined, plain):
        if len(solids_of(solid)) == 1 and np.isclose(volume(solid), piece.volume(), rtol=SAME_VOLUME, atol=1e-9):
            return only_solid(solid)
    raise KernelError("the facets of a piece do not hold the volume of its mesh")


def _solid(shape: TopoDS_Shape) -> TopoDS_Shape:
    """Return the solid inside facets that share their edges and look outward; a hollow is part of the same shell."""
    builder, shell = BRep_Builder(), TopoDS_Shell()
    builder.MakeShell(shell)
    for face in walk(shape, TopAbs_FACE):
        builder.Add(shell, face)
    shell.Closed(True)
    return BRepBuilderAPI_MakeSolid(shell).Solid()
