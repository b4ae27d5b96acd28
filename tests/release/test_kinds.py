"""Faces against the pull, and what touches the vertical ones: closed forms and rigid motions."""

import math

import numpy as np
import pytest
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCone, BRepPrimAPI_MakeCylinder, BRepPrimAPI_MakeSphere
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt

from moldgen.kernel.body import Body
from moldgen.release.contact import vertical_contact
from moldgen.release.kinds import Kind, face_kinds

from .shapes import box, cut, fuse, mirrored, turned


def kinds_of(solid):
    body = Body(solid)
    return body, face_kinds(body)


def counts(kinds):
    return [int((kinds.kind == k).sum()) for k in Kind]


def test_box_has_one_face_up_one_down_four_along():
    _, kinds = kinds_of(box((0, 0, 0), (10, 20, 30)))
    assert counts(kinds) == [1, 1, 4, 0]


def test_overhang_of_a_flat_face_is_its_area_over_its_diagonal():
    body, kinds = kinds_of(box((0, 0, 0), (3, 4, 1)))
    up = kinds.numbers(Kind.UPPER)[0]
    assert kinds.overhang[up] == pytest.approx([12 / 5, 0.0])
    assert body.face_areas[up] == pytest.approx(12.0)


def test_lying_cylinder_straddles_with_equal_overhang():
    lying = BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0)), 5, 40).Solid()
    _, kinds = kinds_of(lying)
    assert counts(kinds) == [0, 0, 2, 1]
    up, down = kinds.overhang[kinds.numbers(Kind.STRADDLING)[0]]
    assert up == pytest.approx(400 / math.hypot(40, 10), rel=0.01)
    assert down == pytest.approx(up, rel=0.01)


@pytest.mark.parametrize(("lean", "kind"), [(0.015, Kind.VERTICAL), (0.03, Kind.UPPER)])
def test_a_wall_is_judged_by_its_offset_not_its_angle(lean, kind):
    # a cone that leans by `lean` over its height: the overhang of the ring is about 2.2 times that
    cone = BRepPrimAPI_MakeCone(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1)), 10, 10 - lean / 2.22, 5).Solid()
    body, kinds = kinds_of(cone)
    side = next(f for f in range(3) if body.surface_kind(f) == "cone")
    assert kinds.kind[side] == kind


def test_sphere_straddles_with_half_its_disc_each_way():
    _, kinds = kinds_of(BRepPrimAPI_MakeSphere(10).Solid())
    assert counts(kinds) == [0, 0, 0, 1]
    assert kinds.overhang[0] == pytest.approx(np.full(2, math.pi * 100 / math.hypot(20, 20)), rel=0.02)


@pytest.mark.parametrize("move", [lambda s: turned(s, 90.0), mirrored], ids=["turned", "mirrored"])
def test_kinds_do_not_notice_a_motion_that_keeps_the_pull(move):
    solid = fuse(box((0, 0, 0), (20, 10, 3)), box((0, 0, 0), (3, 10, 15)))
    assert counts(kinds_of(move(solid))[1]) == counts(kinds_of(solid)[1])


def test_contact_of_a_post_on_a_plate():
    body, kinds = kinds_of(fuse(box((0, 0, 0), (30, 30, 2)), box((10, 10, 1), (20, 20, 12))))
    contact = vertical_contact(body, kinds)
    high = body.face_heights[:, 1] > 5
    post = (kinds.kind == Kind.VERTICAL) & high
    rim = (kinds.kind == Kind.VERTICAL) & ~high
    assert contact[post] == pytest.approx(np.tile([1.0, 0.0], (4, 1)))
    assert contact[rim] == pytest.approx(0.0)


def test_contact_counts_the_share_of_a_face_that_is_covered():
    # a slab over half the width of a wall: that half has material above it
    wall = fuse(box((0, 0, 0), (2, 40, 10)), box((0, 0, 10), (8, 20, 12)))
    body, kinds = kinds_of(wall)
    contact = vertical_contact(body, kinds)
    wide = [
        f
        for f in kinds.numbers(Kind.VERTICAL)
        if np.allclose(body.mesh.corners[body.mesh.face == f][:, :, 0], 2.0) and body.face_heights[f, 0] < 1
    ]
    share = sum(contact[f, 1] * body.face_areas[f] for f in wide) / sum(body.face_areas[f] for f in wide)
    assert share == pytest.approx(0.5, abs=0.02)


def test_contact_inside_a_window_is_both_ways():
    body, kinds = kinds_of(cut(box((0, 0, 0), (30, 2, 20)), box((10, -1, 8), (20, 3, 12))))
    contact = vertical_contact(body, kinds)
    cheeks = [f for f in kinds.numbers(Kind.VERTICAL) if np.ptp(body.face_heights[f]) < 5]
    assert len(cheeks) == 2
    assert contact[cheeks] == pytest.approx(1.0)
