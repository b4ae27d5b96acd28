"""Signs of faces: closed forms, independent of who wrote the part, and found again on a changed part."""

from __future__ import annotations

import math

import numpy as np
import pytest
from OCP.BRepBuilderAPI import BRepBuilderAPI_NurbsConvert
from OCP.ShapeUpgrade import ShapeUpgrade_ShapeDivideAngle

from moldgen.kernel.face_again import Found, find_again
from moldgen.kernel.face_compare import in_same_place
from moldgen.kernel.face_signature import PartSigns, part_signs
from moldgen.model.face_sign import FaceSign, SurfaceKind
from tests.helpers.solids import box, cone, cut, cylinder, fuse, shifted, sphere, torus, turned

EXACT = 1e-9


def plate(boss=(20.0, 20.0), radius=4.0, hole=2.0, thick=3.0, second=True):
    """100 x 60 x 3 with a boss of radius 4 and height 10 bored through, and one more at (80, 20) without a hole."""
    solid = fuse(box((0, 0, 0), (100, 60, thick)), cylinder(radius, 10, (*boss, thick)))
    if second:
        solid = fuse(solid, cylinder(4, 10, (80, 20, thick)))
    return cut(solid, cylinder(hole, 30, (*boss, -1)))


def divided(solid):
    divider = ShapeUpgrade_ShapeDivideAngle(math.pi / 4, solid)
    divider.Perform()
    return divider.Result()


@pytest.fixture(scope="module")
def old() -> PartSigns:
    return part_signs(plate())


def at(part: PartSigns, kind: str, center, side: int | None = None) -> FaceSign:
    """The sign of a kind with its center nearest to a point."""
    those = [s for s in part.signs if s.kind.value == kind and side in (None, s.side)]
    return min(those, key=lambda s: math.dist(s.center, center))


def test_numbers_of_plain_faces_in_closed_form(old):
    boss = at(old, "cylinder", (20, 20, 8), 1)
    assert boss.area_mm2 == pytest.approx(2 * math.pi * 4 * 10, rel=EXACT)
    assert (boss.radius, boss.side, boss.axis) == (pytest.approx(4), 1, pytest.approx((0, 0, 1)))
    assert boss.center == pytest.approx((20, 20, 8), abs=EXACT) and boss.at == pytest.approx((20, 20, 8), abs=EXACT)
    assert boss.spread == pytest.approx((8, 8, 100 / 12, 0, 0, 0), abs=1e-6)  # r^2 / 2, h^2 / 12
    assert boss.perimeter_mm == pytest.approx(2 * 2 * math.pi * 4)
    assert boss.twins == (pytest.approx((80, 20, 8)),)
    bore = at(old, "cylinder", (20, 20, 6.5), -1)
    assert (bore.side, bore.radius, bore.twins) == (-1, pytest.approx(2), ())
    under = at(old, "plane", (50, 30, 0))
    assert under.axis == pytest.approx((0, 0, -1))
    assert under.area_mm2 == pytest.approx(6000 - math.pi * 4, rel=EXACT)


def test_numbers_of_round_faces_in_closed_form():
    lean = at(part_signs(cone(5, 3, 8)), "cone", (0, 0, 4))
    assert lean.angle_deg == pytest.approx(math.degrees(math.atan(2 / 8)))
    assert lean.axis == pytest.approx((0, 0, -1))  # towards its wide end
    height = lean.center[2]
    assert height == pytest.approx(8 / 3 * (5 + 2 * 3) / (5 + 3))
    assert lean.radius == pytest.approx(5 - height / 4)
    (ball,) = part_signs(sphere(7, (1, 2, 3))).signs
    assert (ball.kind, ball.radius, ball.side) == (SurfaceKind.SPHERE, pytest.approx(7), 1)
    assert ball.at == pytest.approx((1, 2, 3)) and ball.perimeter_mm == 0
    (ring,) = part_signs(torus(10, 2)).signs
    assert (ring.kind, ring.radius, ring.minor, ring.side) == (SurfaceKind.TORUS, 10, 2, 1)
    assert ring.area_mm2 == pytest.approx(4 * math.pi**2 * 20)
    groove = at(part_signs(cut(cylinder(10, 4, (0, 0, -2)), torus(10, 1))), "torus", (0, 0, 0))
    assert groove.side == -1


@pytest.mark.parametrize(
    "rewritten",
    [
        pytest.param(lambda s: BRepBuilderAPI_NurbsConvert(s).Shape(), id="all splines"),
        pytest.param(divided, id="arcs of 45 deg"),
        pytest.param(lambda s: turned(turned(s, 180), -180), id="same"),
    ],
)
def test_another_writing_has_the_same_signs(old, rewritten):
    other = part_signs(rewritten(plate()))
    assert len(other.signs) == len(old.signs) == 11
    for sign in old.signs:
        assert sum(in_same_place(sign, s) for s in other.signs) == 1, sign


def test_a_divided_cylinder_is_one_face():
    part = part_signs(divided(plate()))
    assert len(part.body.faces) > 20
    boss = at(part, "cylinder", (20, 20, 8), 1)
    assert len(boss.faces) == 8 and set(part.of_face[list(boss.faces)]) == {part.signs.index(boss)}
    assert sorted(f for s in part.signs for f in s.faces) == list(range(len(part.body.faces)))


def test_a_placed_sign_is_the_sign_of_the_placed_part():
    solid = fuse(plate(), cone(6, 4, 5, (60, 40, 3)))
    turn = math.radians(33)
    about = np.array([1, 2, 3]) / math.sqrt(14)
    cross = np.array([[0, -about[2], about[1]], [about[2], 0, -about[0]], [-about[1], about[0], 0]])
    rotation = np.eye(3) + math.sin(turn) * cross + (1 - math.cos(turn)) * cross @ cross
    rows = tuple(tuple(float(v) for v in row) for row in rotation)
    moved = part_signs(shifted(turned(solid, 33, (1, 2, 3)), 5, -7, 9))
    for sign in part_signs(solid).signs:
        assert sum(in_same_place(sign.placed(rows, (5, -7, 9)), s) for s in moved.signs) == 1, sign
        assert not any(in_same_place(sign, s) for s in moved.signs)


def test_a_sign_survives_the_lock_file(old):
    for sign in old.signs:
        read = FaceSign.from_plain(sign.to_plain())
        assert in_same_place(read, sign, 2e-6) and read.faces == ()
        assert FaceSign.from_plain(read.to_plain()) == read
    with pytest.raises(ValueError, match="no signature of a face: 'area_mm2'"):
        FaceSign.from_plain({"kind": "plane"})
    with pytest.raises(ValueError):
        FaceSign.from_plain({**sign.to_plain(), "center": [1, 2]})


def stored(part: PartSigns, kind: str, center, side: int | None = None) -> FaceSign:
    return FaceSign.from_plain(at(part, kind, center, side).to_plain())


MOVES = [(2.0, 0.0), (0.3, -0.2), (0.01, 0.0)]


@pytest.mark.parametrize("move", MOVES)
def test_what_stands_on_a_moved_boss_follows_it(old, move):
    new = part_signs(plate(boss=(20 + move[0], 20 + move[1])))
    faces = [("cylinder", (20, 20, 8), 1), ("cylinder", (20, 20, 6.5), -1), ("plane", (20, 20, 13), 0)]
    for kind, center, side in faces:
        again = find_again(stored(old, kind, center, side), new)
        assert again.how is Found.MOVED
        assert again.shift == pytest.approx((*move, 0), abs=1e-6)


@pytest.mark.parametrize("move", MOVES)
def test_a_floor_stays_when_a_boss_on_it_moves(old, move):
    new = part_signs(plate(boss=(20 + move[0], 20 + move[1])))
    floor = stored(old, "plane", (50, 30, 3))
    again = find_again(floor, new, (50.0, 50.0, 3.0))
    assert again.how in (Found.TRIMMED, Found.SAME) and again.shift == (0, 0, 0) and again.holds_point
    assert new.signs[again.number].area_mm2 == pytest.approx(floor.area_mm2)
    assert find_again(stored(old, "cylinder", (80, 20, 8)), new).how is Found.SAME


def test_a_floor_stays_when_a_boss_in_its_middle_moves_a_little():
    middle, near = part_signs(plate(boss=(50.0, 30.0))), part_signs(plate(boss=(50.5, 30.0)))
    again = find_again(stored(middle, "plane", (50, 30, 3)), near, (10.0, 50.0, 3.0))
    assert again.how is Found.TRIMMED and again.shift == (0, 0, 0)


def test_a_place_that_a_boss_came_to_stand_on_is_told(old):
    new = part_signs(plate(boss=(26.0, 20.0)))
    floor = stored(old, "plane", (50, 30, 3))
    assert not find_again(floor, new, (29.0, 20.0, 3.0)).holds_point
    assert find_again(floor, new, (20.5, 20.0, 3.0)).holds_point


def test_a_boss_that_is_gone_is_not_mistaken_for_its_twin(old):
    new = part_signs(plate(second=False, boss=(20.0, 20.0)))
    assert find_again(stored(old, "cylinder", (80, 20, 8), 1), new) is None
    assert find_again(stored(old, "cylinder", (20, 20, 8), 1), new).how is Found.SAME


def test_a_floor_that_was_lowered_is_found(old):
    again = find_again(stored(old, "plane", (50, 30, 3)), part_signs(plate(thick=2.5)), (50.0, 50.0, 3.0))
    assert again.shift == pytest.approx((0, 0, -0.5), abs=1e-6) and again.holds_point


def test_a_wider_hole_is_found(old):
    again = find_again(stored(old, "cylinder", (20, 20, 6.5), -1), part_signs(plate(hole=2.5)))
    assert (again.how, again.shift) == (Found.RESIZED, (0, 0, 0))


def test_what_is_too_far_away_is_another_one(old):
    new = part_signs(plate(boss=(20.0, 45.0)))
    sign = stored(old, "cylinder", (20, 20, 6.5), -1)
    assert find_again(sign, new) is None
    assert find_again(sign, new, within=30).shift == pytest.approx((0, 25, 0))
