"""Trapped volume against closed forms, and its laws: it turns and mirrors with the part."""

import math

import numpy as np
import pytest

from moldgen.kernel.body import Body
from moldgen.release.kinds import Kind, face_kinds
from moldgen.release.trapped import Grip, trapped_volume

from .shapes import box, cut, cylinder, fuse, mirrored, turned


def trapped(solid):
    body = Body(solid)
    return body, trapped_volume(body, face_kinds(body))


GROOVED = cut(box((0, 0, 0), (30, 20, 10)), box((-1, -1, 4), (31, 2.5, 7)))
MUSHROOM = fuse(cylinder(10, 0, 5), fuse(cylinder(4, 4, 12), cylinder(10, 12, 15)))
ELL = fuse(box((0, 0, 0), (20, 10, 3)), box((0, 0, 0), (3, 10, 15)))


@pytest.mark.parametrize("solid", [box((0, 0, 0), (10, 20, 30)), ELL, fuse(cylinder(4, 0, 8), cylinder(9, 7, 10))])
def test_parts_that_leave_both_halves_trap_nothing(solid):
    _, result = trapped(solid)
    assert result.pieces == ()
    assert result.noise_mm3 == pytest.approx(0.0, abs=1e-9)


def test_side_groove_is_trapped_whole():
    body, result = trapped(GROOVED)
    (piece,) = result.pieces
    assert piece.grip is Grip.UNDERCUT
    assert piece.volume_mm3 == pytest.approx(30 * 2.5 * 3, rel=1e-9)
    assert piece.depth_mm == pytest.approx(2.5, abs=1e-6)
    assert piece.height_mm == pytest.approx(3.0, abs=1e-9)
    area = 2 * (30 * 2.5 + 30 * 3 + 2.5 * 3)
    assert piece.thickness_mm == pytest.approx(2 * 225 / area, rel=1e-9)
    _, _, z = piece.at
    assert z in (pytest.approx(4.0), pytest.approx(7.0))
    leaning = {f: a for f, a in piece.faces if body.mesh.normals[body.mesh.face == f][0, 2] != 0}
    assert sorted(leaning.values()) == pytest.approx([75.0, 75.0])


def test_groove_between_two_collars_is_a_ring():
    _, result = trapped(MUSHROOM)
    (piece,) = result.pieces
    assert piece.volume_mm3 == pytest.approx(math.pi * (100 - 16) * 7, rel=0.02)
    assert piece.depth_mm == pytest.approx(6.0, abs=0.1)
    assert piece.height_mm == pytest.approx(7.0)


def test_closed_bubble_is_trapped():
    _, result = trapped(cut(box((0, 0, 0), (10, 10, 10)), box((3, 3, 3), (7, 6, 8))))
    (piece,) = result.pieces
    assert piece.volume_mm3 == pytest.approx(4 * 3 * 5)
    assert piece.depth_mm == pytest.approx(1.5, abs=0.05)


def test_window_through_a_wall_counts_depth_from_its_middle():
    wall = cut(box((0, 0, 0), (30, 2, 20)), box((10, -1, 8), (20, 3, 12)))
    _, result = trapped(wall)
    (piece,) = result.pieces
    assert piece.volume_mm3 == pytest.approx(10 * 2 * 4)
    assert piece.depth_mm == pytest.approx(1.0)


@pytest.mark.parametrize(("depth", "grip"), [(0.02, None), (0.05, Grip.RUB), (0.2, Grip.UNDERCUT)])
def test_thickness_separates_noise_rub_and_undercut(depth, grip):
    # a groove of depth d, height 3, length 30 is a sheet of thickness close to d
    body = Body(cut(box((0, 0, 0), (30, 20, 10)), box((-1, -1, 4), (31, depth, 7))))
    result = trapped_volume(body, face_kinds(body))
    assert [p.grip for p in result.pieces] == ([] if grip is None else [grip])


@pytest.mark.parametrize("solid", [GROOVED, MUSHROOM], ids=["groove", "mushroom"])
@pytest.mark.parametrize("move", [lambda s: turned(s, 37.0), mirrored], ids=["turned", "mirrored"])
def test_trapped_volume_moves_with_the_part(solid, move):
    _, before = trapped(solid)
    _, after = trapped(move(solid))
    for one, other in zip(before.pieces, after.pieces, strict=True):
        assert other.volume_mm3 == pytest.approx(one.volume_mm3, rel=2e-3)
        assert other.depth_mm == pytest.approx(one.depth_mm, abs=0.05)


def test_two_runs_agree_to_the_last_digit():
    _, one = trapped(MUSHROOM)
    _, two = trapped(MUSHROOM)
    assert [(p.volume_mm3, p.at, p.faces) for p in one.pieces] == [(p.volume_mm3, p.at, p.faces) for p in two.pieces]


def test_place_lies_on_a_touched_face():
    body, result = trapped(GROOVED)
    face, distance = body.nearest_face(np.array(result.pieces[0].at))
    assert distance < 1e-6
    assert face_kinds(body).kind[face] != Kind.VERTICAL
