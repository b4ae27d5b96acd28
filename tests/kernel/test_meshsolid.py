"""Mesh solids: volumes, faces that survive booleans, erosion, and how deep one body reaches into another."""

import math
from typing import Any

import numpy as np
import pytest
import trimesh
from helpers import solids

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import (
    eroded,
    face_areas,
    make_solid,
    mesh_solid,
    overlap_depth,
    piece_mesh,
    thick_pieces,
    thickness,
    union,
    without,
)
from moldgen.tolerances import EROSION


def mesh_of(solid):
    return Body(solid, 0.02, 0.12).mesh


def solid_of(solid):
    return mesh_solid(mesh_of(solid))


def test_volume_and_area_agree_with_trimesh():
    mesh = mesh_of(solids.cut(solids.cone(20, 18, 25), solids.cone(18, 16, 23)))
    reference = trimesh.Trimesh(mesh.vertices, mesh.triangles, process=False)
    assert mesh_solid(mesh).volume() == pytest.approx(reference.volume, rel=1e-9)
    assert mesh_solid(mesh).surface_area() == pytest.approx(reference.area, rel=1e-9)


def test_a_mesh_with_a_hole_is_no_solid():
    mesh = mesh_of(solids.box((0, 0, 0), (1, 1, 1)))
    assert make_solid(mesh.vertices, mesh.triangles[1:], mesh.face[1:]) is None
    open_mesh = type(mesh)(mesh.vertices, mesh.triangles[1:], mesh.face[1:], mesh.normals[1:], mesh.bulge[1:])
    with pytest.raises(KernelError, match="not closed"):
        mesh_solid(open_mesh)


def test_pieces_remember_the_faces_of_both_parents():
    base = Body(solids.box((0, 0, 0), (10, 10, 10)))
    tool = mesh_of(solids.box((4, 4, 5), (6, 6, 20)))
    rest = mesh_solid(base.mesh) - make_solid(tool.vertices, tool.triangles, tool.face + 100)
    areas = face_areas(rest, 6)
    top = int(np.argmax(base.face_centres[:, 2]))
    assert areas[top] == pytest.approx(100 - 4)
    assert sorted(areas)[1:] == pytest.approx([100.0] * 5)
    own = piece_mesh(rest).face
    assert set(own[own >= 100]) == {100 + f for f in range(6)} - {100 + _highest(tool)}


def _highest(mesh):
    return int(mesh.face[np.argmax(mesh.corners[:, :, 2].min(axis=1))])


@pytest.mark.parametrize(
    ("solid", "expected"),
    [
        (solids.box((0, 0, 0), (100, 100, 0.1)), 2 * 1000 / (20000 + 40)),  # a sheet: about its thickness
        (solids.sphere(3), 2.0),  # a ball: two thirds of its radius
        (solids.cylinder(0.5, 100), 2 * math.pi * 25 / (math.pi * 0.5 + math.pi * 100)),  # a wire: about its radius
    ],
)
def test_thickness_is_twice_volume_over_area(solid, expected):
    assert thickness(solid_of(solid)) == pytest.approx(expected, rel=2e-3)


def test_pieces_come_largest_first_and_thin_ones_are_left_out():
    sizes = (1.0, 3.0, 2.0)
    cubes = [solid_of(solids.box((10 * i, 0, 0), (10 * i + s, s, s))) for i, s in enumerate(sizes)]
    sheet = solid_of(solids.box((0, 20, 0), (9, 29, 0.02)))
    found = thick_pieces(union([*cubes, sheet]), 0.03)
    assert [p.volume() for p in found] == pytest.approx([27.0, 8.0, 1.0])
    assert thick_pieces(union([])) == []


@pytest.mark.parametrize("by", [0.012, 0.2])
def test_a_block_erodes_by_the_same_on_every_side(by):
    # where three faces meet at right angles the vertex moves by sqrt(3) x by along the diagonal
    thin = eroded(mesh_of(solids.box((0, 0, 0), (10, 8, 6))), by)
    assert thin.volume() == pytest.approx((10 - 2 * by) * (8 - 2 * by) * (6 - 2 * by), rel=1e-9)


def test_a_ball_erodes_to_a_smaller_ball_and_a_bore_grows():
    ball = mesh_of(solids.sphere(10))
    ratio = eroded(ball, 0.2).volume() / mesh_solid(ball).volume()
    assert ratio == pytest.approx(0.98**3, rel=1e-3)
    tube = mesh_of(solids.cut(solids.cylinder(6, 10), solids.cylinder(4, 12, at=(0, 0, -1))))
    ratio = eroded(tube, 0.1).volume() / mesh_solid(tube).volume()
    assert ratio == pytest.approx((5.9**2 - 4.1**2) * 9.8 / (20 * 10), rel=2e-3)


def slab_depth(side, depth):
    side, left = side - 2 * EROSION, depth - EROSION
    return 2 * side**2 * left / (2 * side**2 + 4 * side * left) + EROSION


@pytest.mark.parametrize("depth", [0.02, 0.05, 0.1, 0.5])
def test_the_depth_of_a_flat_overlap_is_its_thickness(depth):
    # a slab of 20 x 20: 2 V / A of what remains after erosion, plus the erosion
    lower = solid_of(solids.box((0, 0, 0), (20, 20, 10)))
    upper = eroded(mesh_of(solids.box((0, 0, 10 - depth), (20, 20, 20))))
    assert overlap_depth(lower, upper) == pytest.approx(slab_depth(20, depth), rel=1e-6)
    assert overlap_depth(lower, upper) == pytest.approx(depth, rel=0.05)


@pytest.mark.parametrize("depth", [-5.0, 0.0, 0.9 * EROSION])
def test_bodies_that_touch_or_nearly_do_overlap_by_nothing(depth):
    lower = solid_of(solids.box((0, 0, 0), (20, 20, 10)))
    assert overlap_depth(lower, eroded(mesh_of(solids.box((0, 0, 10 - depth), (20, 20, 20))))) == 0.0


def test_curved_neighbours_with_a_shared_wall_do_not_overlap():
    ball = solids.sphere(10)
    around = solids.cut(solids.box((-20, -20, -20), (20, 20, 20)), ball)
    assert overlap_depth(solid_of(around), eroded(mesh_of(ball))) == 0.0


def test_the_thickest_of_several_overlaps_counts():
    block = solid_of(solids.box((0, 0, 0), (50, 50, 10)))
    feet = [solids.box((5, 5, 9.9), (15, 15, 12)), solids.box((30, 30, 9.6), (40, 40, 12))]
    feet = solids.fuse(solids.box((0, 0, 12), (50, 50, 14)), *feet)
    assert overlap_depth(block, eroded(mesh_of(feet))) == pytest.approx(slab_depth(10, 0.4), rel=1e-6)


def test_a_part_as_thin_as_the_erosion_does_not_turn_into_a_body_of_its_own():
    leaf = eroded(mesh_of(solids.box((0, 0, 0), (20, 20, 0.02))))  # eroded from both sides by more than it has
    assert overlap_depth(solid_of(solids.box((-5, -5, -5), (25, 25, 5))), leaf) == 0.0


def test_a_mesh_boolean_that_loses_volume_is_not_believed() -> None:
    """A stand-in for the boolean that keeps too much at first, and then for ever."""
    corners = (((0, 0, 0), (2, 2, 2)), ((1, 0, 0), (3, 2, 2)))
    one, other = (mesh_solid(Body(solids.box(*pair)).mesh) for pair in corners)
    assert without(one, other).volume() == pytest.approx(4.0)
    assert without(Faulty(one, 1), other).volume() == pytest.approx(4.0, rel=1e-6)
    with pytest.raises(KernelError, match=r"by 4 mm\^3"):
        without(Faulty(one, 99), other)


class Faulty:
    """A mesh solid whose difference takes nothing away, so many times."""

    def __init__(self, solid: Any, times: int) -> None:
        self._solid, self._times = solid, times

    def volume(self) -> float:
        return float(self._solid.volume())

    def __sub__(self, other: Any) -> Any:
        self._times -= 1
        return self._solid if self._times >= 0 else self._solid - other

    def __xor__(self, other: Any) -> Any:
        return self._solid ^ other
