"""Welded meshes: closed, outward, true to the surface and to an independent library; bodies and their numbering."""

import math
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import trimesh
from helpers import solids
from OCP.BRepTools import BRepTools
from OCP.gp import gp_Trsf, gp_Vec
from OCP.TopAbs import TopAbs_SHELL
from OCP.TopLoc import TopLoc_Location

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.features import build_recipe
from moldgen.kernel.measure import area, volume
from moldgen.kernel.mesh import SurfaceMesh, surface_mesh, tessellate
from moldgen.kernel.nearest import nearest_triangle
from moldgen.kernel.topology import compound_of, edges_of, explore, faces_of, only_solid, vertices_of
from moldgen.spec.load import load_spec

SPECS = Path(__file__).resolve().parents[2] / "specs"
DEMOS = (pytest.param("sensor-lid", marks=pytest.mark.slow),)

SIMPLE = {
    "block": solids.box((0, 0, 0), (30, 20, 10)),
    "cup": solids.cut(solids.cone(20, 18, 25), solids.cone(18, 16, 23)),
    "ball": solids.sphere(10),
    "ring": solids.torus(20, 6),
    "spline": solids.under_curve([8, 14, 21, 12, 17, 9], 60, 30),
    "cone to a point": solids.cone(3, 0, 4),
}


@cache
def body_of(name):
    if name in SIMPLE:
        return Body(SIMPLE[name])
    return Body(build_recipe(load_spec(SPECS / name / "spec.yaml").spec.part.recipe.resolve()))


def outside(mesh):
    return trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False)


@pytest.mark.parametrize("name", [*SIMPLE, *DEMOS])
def test_meshes_are_closed_and_look_outward(name):
    mesh = body_of(name).mesh
    reference = outside(mesh)
    assert reference.is_watertight
    assert reference.is_winding_consistent
    assert reference.volume > 0
    assert reference.euler_number % 2 == 0
    assert len(np.unique(mesh.triangles)) == len(mesh.vertices)  # no vertex without a triangle


@pytest.mark.parametrize("name", [*SIMPLE, *DEMOS])
def test_mesh_volume_and_area_miss_the_surface_by_no_more_than_the_sag(name):
    body = body_of(name)
    reference = outside(body.mesh)
    # facets lie within the deflection of the surface: their volume within deflection x area
    assert abs(reference.volume - volume(body.solid)) <= 0.05 * area(body.solid)
    assert reference.area == pytest.approx(area(body.solid), rel=0.02)
    assert float(body.mesh.areas().sum()) == pytest.approx(reference.area, rel=1e-12)


@pytest.mark.parametrize(("name", "euler"), [("ball", 2), ("ring", 0), ("cup", 2), ("block", 2)])
def test_meshes_have_the_euler_number_of_their_solid(name, euler):
    assert outside(body_of(name).mesh).euler_number == euler


def test_a_finer_mesh_halves_the_sag_of_a_ball():
    # sag of a chord: r (1 - cos(angle / 2)); every vertex lies on the ball
    for deflection in (0.1, 0.02):
        mesh = Body(solids.sphere(10), deflection, 0.5).mesh
        assert np.linalg.norm(mesh.vertices, axis=1) == pytest.approx(10.0, abs=1e-9)
        assert 10.0 - np.linalg.norm(mesh.corners.mean(axis=1), axis=1).min() < 2 * deflection


def test_normals_are_the_exact_ones_of_the_surface():
    mesh = body_of("ball").mesh
    unit = mesh.normals / np.linalg.norm(mesh.normals, axis=1)[:, None]
    radial = mesh.corners.mean(axis=1)
    radial /= np.linalg.norm(radial, axis=1)[:, None]
    assert (unit * radial).sum(axis=1).min() > 0.999
    block = body_of("block").mesh
    facet = np.cross(block.corners[:, 1] - block.corners[:, 0], block.corners[:, 2] - block.corners[:, 0])
    facet /= np.linalg.norm(facet, axis=1)[:, None]
    assert block.normals == pytest.approx(facet, abs=1e-6)


def test_a_moved_or_reversed_solid_meshes_where_it_stands():
    moved = SIMPLE["cup"].Moved(_shift(7, -3, 2))  # a location, not a new geometry
    here, there = body_of("cup").mesh, Body(moved).mesh
    assert outside(there).volume == pytest.approx(outside(here).volume, rel=1e-9)
    assert there.vertices.mean(axis=0) - here.vertices.mean(axis=0) == pytest.approx([7, -3, 2], abs=1e-9)
    assert outside(Body(SIMPLE["cup"].Reversed()).mesh).volume == pytest.approx(-outside(here).volume, rel=1e-9)


def _shift(x, y, z):
    move = gp_Trsf()
    move.SetTranslation(gp_Vec(x, y, z))
    return TopLoc_Location(move)


def test_features_smaller_than_a_rounding_keep_the_mesh_closed():
    # two vertical walls 1e-4 mm apart: welding by rounded coordinates would glue them
    slot = solids.cut(solids.box((0, 0, 0), (10, 10, 10)), solids.box((5, -1, 3), (5.0001, 11, 11)))
    reference = outside(Body(slot).mesh)
    assert reference.is_watertight
    assert reference.volume == pytest.approx(1000 - 1e-4 * 10 * 7, abs=1e-9)


def test_a_face_without_triangles_is_named_by_its_place():
    """A whole ball whose mesh was thrown away: it has no edges to be meshed from either."""
    ball = solids.sphere(7.0, at=(40, 20, 10))
    tessellate(ball)
    BRepTools.Clean_s(ball)
    with pytest.raises(KernelError) as caught:
        surface_mesh(faces_of(ball))
    where = caught.value.where
    assert where.startswith("face at ")
    place = [float(v) for v in where.removeprefix("face at ").split(", ")]
    assert np.linalg.norm(np.array(place) - (40, 20, 10)) <= 7.1


@pytest.mark.parametrize("name", ["cup", "ring", *DEMOS])
def test_nearest_triangle_agrees_with_trimesh(name):
    mesh = body_of(name).mesh
    low, high = body_of(name).box
    points = (
        low
        - 5
        + (high - low + 10)
        * np.array([[(k * a) % 1.0 for a in (0.8191725134, 0.6710436067, 0.5497004779)] for k in range(1, 26)])
    )
    for point in points:
        nearest = trimesh.triangles.closest_point(mesh.corners, np.tile(point, (len(mesh.triangles), 1)))
        assert nearest_triangle(mesh, point)[1] == pytest.approx(
            np.linalg.norm(nearest - point, axis=1).min(), abs=1e-8
        )


def test_a_triangle_without_area_is_as_near_as_its_sides():
    # two triangles in the plane z = 0, and one far away that is only a line: its plane is nowhere, not here
    vertices = np.array([[0, 0, 0], [4, 0, 0], [0, 4, 0], [90, 0, 0], [91, 0, 0], [92, 0, 0]], dtype=float)
    mesh = SurfaceMesh(vertices, np.array([[0, 1, 2], [3, 4, 5]]), np.array([0, 1]), np.zeros((2, 3)), np.zeros((2, 3)))
    assert nearest_triangle(mesh, np.array([1.0, 1.0, 2.5])) == (0, pytest.approx(2.5))
    assert nearest_triangle(mesh, np.array([93.0, 0.0, 0.0])) == (1, pytest.approx(1.0))


def test_a_body_lists_the_edges_between_two_faces_and_no_seam():
    body = body_of("cup")  # two cones, two discs and a rim
    assert len(body.faces) == 5
    assert len(edges_of(body.solid)) == 6
    assert len(body.edges) == 4
    assert body.edge_lengths == pytest.approx([2 * math.pi * r for r in _radii(body)], rel=0.03)
    assert all(len({int(a), int(b)}) == 2 for a, b in body.edge_faces)
    around = [sorted(body.edges_at_face[f]) for f in range(5)]
    assert sorted(len(a) for a in around) == [1, 1, 2, 2, 2]


def _radii(body):
    return np.linalg.norm(body.edge_points[:, 0, :2], axis=1)


def test_face_measures_add_up_and_lie_on_their_face():
    body = body_of("block")
    assert sorted(body.face_areas) == pytest.approx([200, 200, 300, 300, 600, 600])
    assert body.face_heights[:, 0].min() == 0 and body.face_heights[:, 1].max() == 10
    for face, place in enumerate(body.face_places):
        number, distance = body.nearest_face(place)
        assert (number, distance) == (face, pytest.approx(0.0, abs=1e-12))
    assert body.diagonal == pytest.approx(math.sqrt(900 + 400 + 100))
    centre = (body.face_centres * body.face_areas[:, None]).sum(axis=0) / body.face_areas.sum()
    assert centre == pytest.approx([15, 10, 5])


@pytest.mark.parametrize(
    ("solid", "kinds"),
    [
        (solids.cylinder(3, 10), ["cylinder", "plane", "plane"]),
        (solids.cone(5, 2, 4), ["cone", "plane", "plane"]),
        (solids.sphere(3), ["sphere"]),
        (solids.torus(9, 2), ["torus"]),
        (solids.under_curve([3, 5, 4, 6], 30, 10), ["extrusion", *["plane"] * 5]),
    ],
)
def test_surface_kinds_are_named(solid, kinds):
    body = Body(solid)
    assert sorted(body.surface_kind(f) for f in range(len(body.faces))) == kinds


def test_one_solid_is_one_solid():
    block = SIMPLE["block"]
    assert only_solid(compound_of([block])).IsSame(block)
    assert len(vertices_of(block)) == 8 and len(edges_of(block)) == 12 and len(explore(block, TopAbs_SHELL)) == 1
    for wrong in (compound_of([]), compound_of([block, SIMPLE["ball"]])):
        with pytest.raises(KernelError, match="expected one solid"):
            only_solid(wrong)


def test_the_bulge_of_a_ball_is_its_sag_and_gives_its_volume_back() -> None:
    """Sphere: V = 4/3 pi r^3; the facets alone lose about 1 % at this deflection, the second order gives it back."""
    ball = solids.sphere(10.0)
    mesh = Body(ball, 0.2, 0.5).mesh
    exact = 4 / 3 * np.pi * 1000
    facets = float(np.einsum("ij,ij->", np.cross(mesh.corners[:, 0], mesh.corners[:, 1]), mesh.corners[:, 2])) / 6
    assert abs(facets / exact - 1) > 2e-3
    assert mesh.volume() == pytest.approx(exact, rel=5e-4)
    assert (mesh.bulge > -1e-9).all(), "a ball bulges outward everywhere"
