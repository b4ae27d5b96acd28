"""Loops between groups of faces, and what closes them: curtains, run-off, patches, the outside of a block."""

import math

import numpy as np
import pytest
from helpers import solids

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward, plane_face, plane_through, wire_of
from moldgen.kernel.curtain import EdgeLie, hang_curtain
from moldgen.kernel.edge_split import split_edges
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.measure import area, is_valid, volume
from moldgen.kernel.mesh import surface_mesh, tessellate
from moldgen.kernel.patches import filled_patch, flat_patches, host_patch, loop_points
from moldgen.kernel.polygon import signed_area
from moldgen.kernel.runoff import extreme_parameters, run_off
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import edge_points, edges_of, vertex_point, vertices_of
from moldgen.kernel.walls import block_outside, rectangle_rim

SLANTED = solids.extruded([(0, 0, 0), (40, 0, 0), (40, 0, 20), (0, 0, 10)], (0, 30, 0))
"""A block whose top rises from 10 to 20 mm over 40 mm."""

WAVY = solids.under_curve([8, 14, 21, 12, 17, 9], 60, 30)
TUBE = solids.cut(solids.cylinder(10, 40), solids.cylinder(8, 42, at=(0, 0, -1)))


def top_of(body):
    return body.face_centres[:, 2] > body.face_centres[:, 2].mean() + 1


def top_loop(solid):
    body = Body(solid)
    (loop,) = boundary_loops(body, np.arange(len(body.faces)) == int(np.argmax(body.mesh.normals[first_of(body), 2])))
    return body, loop


def first_of(body):
    return [int(np.flatnonzero(body.mesh.face == f)[0]) for f in range(len(body.faces))]


def closed(loop):
    points = [edge_points(e, 2)[:: (1 if not e.Orientation().name.endswith("REVERSED") else -1)] for e in loop]
    return all(np.allclose(a[1], b[0]) for a, b in zip(points, [*points[1:], points[0]], strict=True))


# --- loops ----------------------------------------------------------------------------------------------------------


def test_a_tube_parted_at_its_ends_has_two_loops_that_run_opposite_ways():
    body = Body(TUBE)
    ring = np.array([body.surface_kind(f) == "plane" and body.face_centres[f, 2] > 20 for f in range(len(body.faces))])
    loops = boundary_loops(body, ring)
    areas = sorted(signed_area(loop_points(loop, 200)[:, :2]) for loop in loops)
    assert areas == pytest.approx([-math.pi * 64, math.pi * 100], rel=1e-3)  # as the top face, seen from above


def test_loops_that_touch_in_a_corner_are_two():
    # opposite quarters of a plate belong to one side: their outlines meet in the middle
    feet = solids.box((0, 0, -1), (10, 10, 2)), solids.box((10, 10, -1), (20, 20, 2))
    plate = solids.fuse(solids.box((0, 0, -2), (20, 20, 0)), *feet)
    body = Body(plate)
    tops = np.isclose(body.face_heights[:, 0], 2.0)
    loops = boundary_loops(body, tops)
    assert sorted(len(loop) for loop in loops) == [4, 4]
    assert all(closed(loop) for loop in loops)
    assert [signed_area(loop_points(loop, 3)[:, :2]) for loop in loops] == pytest.approx([100.0, 100.0])


def test_no_boundary_no_loop():
    body = Body(SLANTED)
    assert boundary_loops(body, np.ones(len(body.faces), dtype=bool)) == []


# --- curtains -------------------------------------------------------------------------------------------------------


def test_a_curtain_has_the_area_of_its_height_times_its_length():
    _, loop = top_loop(SLANTED)
    curtain = hang_curtain(loop, 4.0)
    assert all(is_valid(f) for f in curtain.faces)
    # two trapezoids of mean height 11 and length 40, and two rectangles of 30 x 6 and 30 x 16
    assert sum(area(f) for f in curtain.faces) == pytest.approx(2 * 11 * 40 + 30 * 6 + 30 * 16)
    assert curtain.off_plane == 4
    assert set(np.round([vertex_point(v)[2] for e in curtain.foot for v in vertices_of(e)], 9)) == {4.0}
    assert area(plane_face(plane_through((0, 0, 4), (0, 0, 1)), wire_of(curtain.foot))) == pytest.approx(1200.0)


def test_a_curtain_closes_with_the_faces_it_hangs_from():
    body, loop = top_loop(WAVY)
    curtain = hang_curtain(loop, 2.0)
    top = body.faces[int(np.argmax(body.mesh.normals[first_of(body), 2]))]
    lid = plane_face(plane_through((0, 0, 2), (0, 0, 1)), wire_of(curtain.foot))
    result = solid_from_faces([top, *curtain.faces, lid])
    assert result.complaint == ""
    assert volume(result.solid) == pytest.approx(volume(WAVY) - 2 * 60 * 30, rel=2e-3)


def test_edges_on_the_level_need_no_curtain_and_upright_ones_no_foot():
    step = solids.extruded([(0, 0, 0), (30, 0, 0), (30, 0, 8), (10, 0, 8), (10, 0, 20), (0, 0, 20)], (0, 5, 0))
    body = Body(step)
    normals = body.mesh.normals[first_of(body)]
    # the stairs seen from above: both treads and the riser
    stairs = (normals[:, 2] > 0.5) | ((normals[:, 0] > 0.5) & (body.face_centres[:, 0] < 20))
    (loop,) = boundary_loops(body, stairs)
    curtain = hang_curtain(loop, 8.0)
    assert sorted(curtain.lies) == sorted([EdgeLie.ON] * 3 + [EdgeLie.VERTICAL] * 2 + [EdgeLie.OFF] * 3)
    assert sum(area(f) for f in curtain.faces) == pytest.approx((10 + 5 + 10) * 12)


def test_an_edge_through_the_level_is_refused():
    _, loop = top_loop(SLANTED)
    with pytest.raises(KernelError, match="crosses the level 15"):
        hang_curtain(loop, 15.0)


# --- run-off --------------------------------------------------------------------------------------------------------


TILTED = solids.turned(solids.box((0, 0, 0), (20, 9, 5)), 12, about=(1, 0, 0))


@pytest.mark.parametrize("solid", [SLANTED, WAVY, TILTED, solids.turned(SLANTED, 30)])
def test_a_run_off_covers_the_block_outside_the_loop(solid):
    body, loop = top_loop(solid)
    if signed_area(loop_points(loop, 8)[:, :2]) < 0:
        loop = [backward(e) for e in reversed(loop)]
    low, high = body.box[0] - 10, body.box[1] + 10
    ran = run_off(loop, low, high)
    assert all(is_valid(f) for f in ran.faces)
    # seen along the pull the faces cover the rectangle outside the loop once: by the divergence theorem the volume
    # under them is exact, and so is their shadow
    shadow = sum(_shadow(f) for f in ran.faces)
    inside = signed_area(loop_points(loop, 400)[:, :2])
    assert shadow == pytest.approx(float(np.prod((high - low)[:2])) - inside, rel=1e-4)
    corners = np.array([vertex_point(v)[:2] for v in ran.rim.corners])
    assert corners == pytest.approx(
        np.array([[low[0], low[1]], [high[0], low[1]], [high[0], high[1]], [low[0], high[1]]])
    )


def _shadow(face):
    mesh = _mesh_of_face(face)
    return float(np.abs(np.cross(mesh[:, 1, :2] - mesh[:, 0, :2], mesh[:, 2, :2] - mesh[:, 0, :2])).sum() / 2)


def _mesh_of_face(face):
    tessellate(face, 0.01, 0.1)
    return surface_mesh([face]).corners


def test_the_run_off_stays_level_square_to_the_sides():
    body, loop = top_loop(SLANTED)
    ran = run_off(loop, body.box[0] - 10, body.box[1] + 10)
    heights = {round(float(vertex_point(v)[2]), 9) for e in ran.rim.edges for v in vertices_of(e)}
    assert heights == {10.0, 20.0}  # no height that the loop does not have


def test_the_extremes_of_a_circle_lie_on_the_diagonals():
    body, loop = top_loop(solids.cone(10, 8, 5))
    found = extreme_parameters(loop)
    assert sorted(t for _, t in found) == pytest.approx([math.radians(a) for a in (45, 135, 225, 315)], abs=1e-6)
    split = split_edges(body, {body.edge_index.FindIndex(loop[0]) - 1: [t for _, t in found]})
    (again,) = boundary_loops(split, np.isclose(split.face_heights[:, 0], 5.0))
    assert extreme_parameters(again) == []  # every extreme is a vertex now


def test_a_loop_that_doubles_back_is_refused():
    # a dovetail in the north side: on its way west the loop runs east again
    points = [(0, 0, 5), (40, 0, 5), (40, 30, 9), (30, 30, 9), (34, 15, 7), (10, 15, 7), (14, 30, 9), (0, 30, 9)]
    plan = [(x, y, 0.0) for x, y, _ in points]
    above = [(-1, -1, 5 - 4 / 30), (-1, 31, 9 + 4 / 30), (-1, 31, 30), (-1, -1, 30)]
    lofted = solids.cut(solids.extruded(plan, (0, 0, 20)), solids.extruded(above, (60, 0, 0)))
    body, loop = top_loop(lofted)
    with pytest.raises(KernelError, match="doubles back"):
        run_off(loop, body.box[0] - 10, body.box[1] + 10)


# --- patches --------------------------------------------------------------------------------------------------------


def test_flat_loops_of_one_plane_share_a_face_with_holes():
    body = Body(TUBE)
    ring = np.array([body.surface_kind(f) == "plane" and body.face_centres[f, 2] > 20 for f in range(len(body.faces))])
    (patch,) = flat_patches(boundary_loops(body, ring))
    assert area(patch.face) == pytest.approx(math.pi * (100 - 64), rel=1e-9)
    assert len(patch.loops) == 2


def test_flat_loops_beside_each_other_are_faces_of_their_own():
    holes = solids.cylinder(4, 5, at=(10, 10, -1)), solids.box((25, 5, -1), (35, 15, 4))
    plate = solids.cut(solids.box((0, 0, 0), (40, 20, 3)), *holes)
    body = Body(plate)
    walls = np.isin(np.arange(len(body.faces)), [f for f in range(len(body.faces)) if _inner_wall(body, f)])
    patches = flat_patches(boundary_loops(body, walls))
    assert sorted(round(area(p.face), 6) for p in patches) == [round(16 * math.pi, 6)] * 2 + [100.0] * 2


def _inner_wall(body, f):
    x, y, z = body.face_centres[f]
    return abs(z - 1.5) < 0.1 and 1 < x < 39 and 1 < y < 19


def cross_bore(along=(1, 0, 0)):
    """A tube with a bore across one wall, and the loops of that bore."""
    body = Body(solids.cut(TUBE, solids.cylinder(3, 20, at=(0, 0, 20), along=along)))
    bore = [
        f for f in range(len(body.faces)) if body.surface_kind(f) == "cylinder" and np.ptp(body.face_heights[f]) < 7
    ]
    return body, boundary_loops(body, np.isin(np.arange(len(body.faces)), bore))


@pytest.mark.parametrize("along", [(0, 1, 0), (1, 0, 0), (3, -1, 0)])  # the seam of the wall lies at +x
def test_a_hole_in_a_round_wall_is_closed_by_the_wall(along):
    body, loops = cross_bore(along)
    for loop, radius in zip(sorted(loops, key=lambda w: np.hypot(*loop_points(w, 8)[0, :2])), (8, 10), strict=True):
        patch = host_patch(body, loop)
        assert is_valid(patch)
        # area of r dphi dz over the window y^2 + z^2 < 9: int 2 sqrt(9 - y^2) / sqrt(1 - y^2 / r^2) dy
        t = (np.arange(20000) + 0.5) / 20000 * np.pi - np.pi / 2
        expected = (2 * 9 * np.cos(t) ** 2 / np.sqrt(1 - (3 * np.sin(t) / radius) ** 2)).mean() * np.pi
        assert area(patch) == pytest.approx(expected, rel=1e-4)
        assert np.hypot(*_mesh_of_face(patch)[..., :2].reshape(-1, 2).T) == pytest.approx(radius, abs=1e-3)


def test_a_rim_over_two_walls_has_no_host_but_a_filling():
    corner = solids.cut(solids.box((0, 0, 0), (30, 30, 30)), solids.cylinder(4, 60, at=(-9, -9, 15), along=(1, 1, 0)))
    body = Body(corner)
    bore = [f for f in range(len(body.faces)) if body.surface_kind(f) == "cylinder"]
    loops = boundary_loops(body, np.isin(np.arange(len(body.faces)), bore))
    assert len(loops) == 2
    for loop in loops:
        assert host_patch(body, loop) is None
        patch = filled_patch(loop)
        assert is_valid(patch)
        assert {e.TShape() for e in edges_of(patch)} == {e.TShape() for e in loop}
        # more than the flat section of the bore, less than the corner itself that the bore took away
        assert math.pi * 16 < area(patch) < math.sqrt(2) * math.pi * 16


def test_a_bent_rim_is_not_flat():
    _, loops = cross_bore()
    assert flat_patches(loops) == []


# --- the block ------------------------------------------------------------------------------------------------------


def test_the_outside_of_a_block_and_its_parting_plane_make_the_block():
    low, high = np.array([-5.0, -6.0, 0.0]), np.array([7.0, 9.0, 20.0])
    rim = rectangle_rim(low, high, 3.0)
    floor = plane_face(plane_through((0, 0, 3), (0, 0, 1)), wire_of(rim.edges))
    for lid, height in ((20.0, 17.0), (-8.0, 11.0)):
        result = solid_from_faces([floor, *block_outside(rim, lid)])
        assert result.complaint == ""
        assert volume(result.solid) == pytest.approx(12 * 15 * height)
    assert len(edges_of(result.solid)) == 12
