"""Solids from faces that share edges, and splits that change nothing but the number of faces and edges."""

import math

import numpy as np
import pytest
from helpers import solids

from moldgen.kernel.body import Body
from moldgen.kernel.build import line_edge, plane_face, plane_through, vertex_at, wire_of
from moldgen.kernel.edge_split import parameter_range, split_edges
from moldgen.kernel.level_split import chord, level_curves, level_parameters, upright_lines
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.shells import shells_from_faces, solid_from_faces
from moldgen.kernel.split import split_faces
from moldgen.kernel.topology import edges_of, faces_of, vertex_point, vertices_of

CUP = solids.cut(solids.cone(20, 18, 25), solids.cone(18, 16, 23))


def kind_numbers(body, kind):
    return [f for f in range(len(body.faces)) if body.surface_kind(f) == kind]


def test_faces_in_any_order_and_direction_make_the_solid_again():
    faces = faces_of(CUP)
    mixed = [f.Reversed() if i % 2 else f for i, f in enumerate(reversed(faces))]
    result = solid_from_faces(mixed)
    assert result.complaint == ""
    assert volume(result.solid) == pytest.approx(volume(CUP), rel=1e-12)  # positive: it looks outward


def test_a_missing_face_leaves_free_edges():
    result = solid_from_faces(faces_of(solids.box((0, 0, 0), (1, 2, 3)))[1:])
    assert not result.closed
    assert len(result.free) == 4
    assert result.complaint.startswith("4 free edges")


def test_a_face_too_many_crowds_its_edges():
    block = solids.box((0, 0, 0), (10, 10, 10))
    wall = split_faces(Body(block), range(6), level_curves(faces_of(block), 4.0))
    level = [e for e in edges_of(wall.solid) if np.ptp(np.array([vertex_point(v)[2] for v in vertices_of(e)])) < 1e-9]
    ring = [e for e in level if abs(vertex_point(vertices_of(e)[0])[2] - 4.0) < 1e-9]
    lid = plane_face(plane_through((0, 0, 4), (0, 0, 1)), wire_of(ring))
    result = solid_from_faces([*faces_of(wall.solid), lid])
    assert result.crowded == 4
    assert not result.closed


def test_separate_bodies_are_told_apart_and_flat_ones_dropped():
    two = [*faces_of(solids.box((0, 0, 0), (1, 1, 1))), *faces_of(solids.sphere(2))]
    assert solid_from_faces(two).components == 2
    assert [round(volume(s.solid), 6) for s in shells_from_faces(two)] == [1.0, round(32 * math.pi / 3, 6)]
    sheet = faces_of(solids.shifted(solids.box((0, 0, 0), (5, 5, 5)), 20, 0, 0))[0]
    copy = sheet.Reversed()  # the same face twice: closed, and nothing inside
    kept = solid_from_faces([*faces_of(solids.sphere(2)), sheet, copy], drop_flat=True)
    assert kept.complaint == ""
    assert len(kept.faces) == 1


@pytest.mark.parametrize("level", [3.0, 11.5])
def test_a_level_split_cuts_the_walls_and_nothing_else(level):
    body = Body(CUP)
    walls = kind_numbers(body, "cone")
    split = split_faces(body, walls, level_curves([body.faces[f] for f in walls], level))
    assert len(split.faces) == len(body.faces) + 2
    assert is_valid(split.solid)
    assert volume(split.solid) == pytest.approx(volume(CUP), rel=1e-9)
    kept = [f for f in body.faces if any(f.IsSame(g) for g in split.faces)]
    assert len(kept) <= len(body.faces) - 2
    new = [p for p in split.edge_points if np.ptp(p[:, 2]) < 1e-9 and abs(p[0, 2] - level) < 1e-9]
    radii = sorted(float(np.hypot(*p[0, :2])) for p in new)
    assert radii == pytest.approx([18 - 2 * level / 23, 20 - 2 * level / 25])


def test_edges_are_split_at_their_parameters_and_stay_on_their_curves():
    body = Body(CUP)
    places = {n: [0.5, 2.0, 4.0] for n in range(len(body.edges))}  # four closed circles, parameter = angle
    split = split_edges(body, places)
    assert is_valid(split.solid)
    assert len(split.edges) == 16
    assert len(split.faces) == len(body.faces)
    assert volume(split.solid) == pytest.approx(volume(CUP), rel=1e-12)
    assert split.edge_lengths.sum() == pytest.approx(body.edge_lengths.sum(), rel=0.05)
    corners = [vertex_point(v) for v in vertices_of(split.solid)]
    angles = sorted({round(math.atan2(p[1], p[0]) % (2 * math.pi), 6) % 6.283185 for p in corners})
    assert angles == pytest.approx([0.0, 0.5, 2.0, 4.0])
    split.mesh  # noqa: B018  it still meshes
    assert parameter_range(body.edges[0]) == pytest.approx((0.0, 2 * math.pi))


def test_edge_splits_of_spline_edges_keep_the_solid_sound():
    body = Body(solids.under_curve([8, 14, 21, 12, 17, 9], 60, 30))
    curved = [n for n, p in enumerate(body.edge_points) if np.linalg.norm(p[4] - (p[0] + p[8]) / 2) > 0.5]
    places = {n: level_parameters(body.edges[n], 13.0) for n in curved}
    assert [len(v) for v in places.values()] == [4, 4]  # the curve passes 13 mm four times
    split = split_edges(body, places)
    assert is_valid(split.solid)
    assert len(split.edges) == len(body.edges) + 8
    found = [vertex_point(v) for v in vertices_of(split.solid)]
    assert sum(abs(p[2] - 13.0) < 1e-9 for p in found) == 8


def test_an_edge_that_only_touches_or_ends_at_the_level_is_not_split():
    block = Body(solids.box((0, 0, 0), (4, 4, 4)))
    assert [level_parameters(e, 4.0) for e in block.edges] == [[]] * 12
    for level in (1.0, 1.1):  # a quarter of the height is one of the samples
        assert sorted(len(level_parameters(e, level)) for e in block.edges) == [0] * 8 + [1] * 4


def test_a_circle_passes_a_level_twice_and_touches_it_at_its_summit():
    upright = Body(solids.cylinder(5, 3, along=(1, 0, 0))).edges[0]
    assert len(level_parameters(upright, 3.0)) == 2
    assert level_parameters(upright, 5.0) == []
    assert level_parameters(upright, -5.0) == []


def test_upright_lines_run_through_the_corners_of_a_wall():
    step = solids.extruded([(0, 0, 0), (30, 0, 0), (30, 0, 8), (10, 0, 8), (10, 0, 20), (0, 0, 20)], (0, 5, 0))
    sides = [f for f in faces_of(step) if len(vertices_of(f)) == 6]
    front = next(f for f in sides if vertex_point(vertices_of(f)[0])[1] == 0.0)
    lines = upright_lines(front, 0.0, 20.0)
    assert len(lines) == 1  # below the step; the other corners stand on the outline
    assert sorted(vertex_point(v)[2] for v in vertices_of(lines[0])) == pytest.approx([0.0, 8.0])
    assert chord(lines[0]) == pytest.approx(8.0)


def test_the_chord_of_a_circle_is_twice_its_diameter():
    circle = Body(solids.cylinder(5, 3)).edges[0]
    assert chord(circle) == pytest.approx(20.0)
    assert chord(line_edge(vertex_at((0, 0, 0)), vertex_at((3, 4, 0)))) == pytest.approx(5.0)
