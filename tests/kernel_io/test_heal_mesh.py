"""Faces that the kernel's mesher leaves without a mesh, or with a torn one, are meshed again."""

from __future__ import annotations

import math

import pytest
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeCone, BRepPrimAPI_MakeCylinder, BRepPrimAPI_MakeSphere
from OCP.BRepTools import BRepTools
from OCP.Geom2d import Geom2d_Line
from OCP.gp import gp_Ax2, gp_Dir, gp_Dir2d, gp_Pnt
from OCP.Poly import Poly_Triangulation
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.heal_mesh import is_torn, remesh
from moldgen.kernel.heal_seams import straighten_seams
from moldgen.kernel.mesh import _welded, surface_mesh, tessellate
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.topology import faces_of, only_solid, walk


def holed_block():
    """A block 20 x 20 x 5 with a through hole of radius 4: 2000 - 80 pi mm^3."""
    drill = BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(10, 10, -1), gp_Dir(0, 0, 1)), 4, 7).Solid()
    return only_solid(BRepAlgoAPI_Cut(BRepPrimAPI_MakeBox(20, 20, 5).Solid(), drill).Shape())


SOLIDS = {
    "planes with a hole, and a full cylinder": (holed_block, 2000 - 80 * math.pi),
    "a full cone": (lambda: BRepPrimAPI_MakeCone(6, 3, 12).Solid(), math.pi * 4 * (36 + 18 + 9)),
}


@pytest.mark.parametrize("name", SOLIDS)
def test_any_face_can_be_meshed_from_its_edges(name):
    make, expected = SOLIDS[name]
    solid = make()
    tessellate(solid)
    for face in faces_of(solid):
        BRepTools.Clean_s(face)
        assert is_torn(face)
        remesh(faces_of(solid), [face])
        assert not is_torn(face)
        mesh = surface_mesh(faces_of(solid))
        assert mesh_solid(mesh).volume() == pytest.approx(expected, rel=0.03)  # facets: sag of the working mesh
        assert mesh.volume() == pytest.approx(expected, rel=2e-3)
        tessellate(solid)
        assert not is_torn(face)  # the kernel takes the mesh for its own and keeps it


def test_a_face_that_cannot_be_followed_from_its_edges_is_left_without_a_mesh_and_named():
    solid = BRepPrimAPI_MakeSphere(7).Solid()
    tessellate(solid)
    BRepTools.Clean_s(solid)
    with pytest.raises(KernelError, match="face 0 of 1 has no triangles"):
        surface_mesh(faces_of(solid))


def test_a_torn_mesh_is_found_and_replaced():
    solid = holed_block()
    tessellate(solid)
    faces = faces_of(solid)
    holed = next(f for f in faces if len(list(walk(f, TopAbs_EDGE))) == 5)
    whole = BRep_Tool.Triangulation_s(holed, TopLoc_Location())
    _tear(holed, whole)
    assert [is_torn(f) for f in faces] == [f.IsSame(holed) for f in faces]
    assert mesh_solid(surface_mesh(faces)).volume() == pytest.approx(2000 - 80 * math.pi, rel=0.01)


def _tear(face, whole: Poly_Triangulation) -> None:
    """Take the last triangle out of a face's mesh."""
    whole.ResizeTriangles(whole.NbTriangles() - 1, True)
    BRep_Builder().UpdateFace(face, whole)


def test_a_seam_that_leans_by_rounding_is_straightened_and_the_kernel_meshes_the_cone():
    solid = BRepPrimAPI_MakeCone(6, 3, 12).Solid()
    cone = max(faces_of(solid), key=lambda f: len(list(walk(f, TopAbs_EDGE))))
    leaning = 0
    for occurrence in walk(cone, TopAbs_EDGE):
        line = BRep_Tool.CurveOnSurface_s(TopoDS.Edge_s(occurrence), cone, 0.0, 0.0)
        if isinstance(line, Geom2d_Line) and abs(line.Direction().X()) < 0.5:
            line.SetDirection(gp_Dir2d(-2e-15, line.Direction().Y()))
            leaning += 1
    assert leaning == 2
    assert straighten_seams(cone) == 2
    assert straighten_seams(cone) == 0
    body = Body(solid)
    assert mesh_solid(body.mesh).volume() == pytest.approx(math.pi * 4 * (36 + 18 + 9), rel=0.01)


def test_a_line_that_leans_on_purpose_is_left_alone():
    solid = BRepPrimAPI_MakeCone(6, 3, 12).Solid()
    cone = max(faces_of(solid), key=lambda f: len(list(walk(f, TopAbs_EDGE))))
    for occurrence in walk(cone, TopAbs_EDGE):
        line = BRep_Tool.CurveOnSurface_s(TopoDS.Edge_s(occurrence), cone, 0.0, 0.0)
        if isinstance(line, Geom2d_Line) and abs(line.Direction().X()) < 0.5:
            line.SetDirection(gp_Dir2d(1e-6, line.Direction().Y()))
    assert straighten_seams(cone) == 0


def test_faces_that_divide_their_common_edge_unequally_are_meshed_again():
    faces = faces_of(BRepPrimAPI_MakeCylinder(5, 20).Solid())
    tessellate(faces[0], 0.001, 0.05)  # each alone, the wall finer than the ends: as splits leave them on real parts
    for face in faces[1:]:
        tessellate(face, 0.05, 0.3)
    assert not any(is_torn(f) for f in faces)
    with pytest.raises(KernelError, match="not closed"):
        mesh_solid(_welded(faces))
    assert mesh_solid(surface_mesh(faces)).volume() == pytest.approx(500 * math.pi, rel=5e-3)
