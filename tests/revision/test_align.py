"""Laying an old part onto the new one: by known motions, parts that changed, symmetric, mirrored and scaled ones."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from moldgen.errors import PartError
from moldgen.kernel.face_signature import part_signs
from moldgen.kernel.step_read import read_step
from moldgen.model.revision import Alignment
from moldgen.revision.align import align
from tests.helpers.solids import box, cone, cut, cylinder, extruded, fuse, grown, mirrored, shifted, sphere, turned
from tests.kernel_io.test_step_read import write_raw
from tests.parting.test_two_systems import WRITINGS, tub

ABOUT = np.array([1.0, 2.0, 3.0]) / math.sqrt(14.0)
AWAY = (5.0, -7.0, 9.0)


def plate(x: float = 20.0, hole: float = 2.0) -> Any:
    """A plate with three unlike bosses, one of them bored: nothing of it is symmetric."""
    solid = fuse(box((0, 0, 0), (100, 60, 3)), cylinder(4, 10, (x, 20, 3)), cylinder(4, 8, (80, 20, 3)))
    return cut(fuse(solid, cylinder(3, 7, (60, 40, 3))), cylinder(hole, 20, (x, 20, -1)))


def away(solid: Any) -> Any:
    """Turned by 33 degrees about (1, 2, 3) and moved by (5, -7, 9)."""
    return shifted(turned(solid, 33, (1, 2, 3)), *AWAY)


def rotation(degrees: float, about: np.ndarray) -> np.ndarray:
    turn, (x, y, z) = math.radians(degrees), about
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    return np.eye(3) + math.sin(turn) * cross + (1 - math.cos(turn)) * cross @ cross


def laid(old: Any, new: Any) -> Alignment:
    return align(part_signs(old), part_signs(new))


def assert_away(found: Alignment) -> None:
    assert np.allclose(found.rotation, rotation(33, ABOUT), atol=1e-9)
    assert found.translation == pytest.approx(AWAY, abs=1e-7)


def test_a_part_that_did_not_move_is_as_drawn():
    found = laid(plate(), plate())
    assert found.how == "as drawn: 13 of 13 faces lie on the new part's within 0.001 mm"
    assert (found.translation, found.matched, found.faces, found.scale) == ((0, 0, 0), 13, 13, 1)
    assert np.array_equal(found.rotation, np.eye(3))


def test_a_changed_part_in_its_place_is_as_drawn():
    found = laid(plate(), plate(x=22))
    assert found.how.startswith("as drawn: 11 of 13 faces")  # the tops of the boss share a plane; its walls do not
    assert np.array_equal(found.rotation, np.eye(3))


def test_a_part_that_was_only_moved():
    found = laid(plate(), shifted(plate(), 3, 4, 5))
    assert found.how.startswith("moved by 3.000, 4.000, 5.000 mm: 13 of 13")
    assert found.translation == pytest.approx((3, 4, 5), abs=1e-9)


def test_a_part_that_was_turned_by_an_odd_angle():
    found = laid(plate(), away(plate()))
    assert_away(found)
    assert found.residual_mm < 1e-9 and found.matched == 13
    assert "turned by 33.000 deg about 0.267, 0.535, 0.802 and moved by 5.000, -7.000, 9.000 mm" in found.how


def test_a_part_that_was_turned_and_changed():
    found = laid(plate(), away(plate(x=22, hole=3)))
    assert_away(found)
    assert found.matched < 13


def test_a_symmetric_plate_takes_the_nearest_of_its_positions():
    block = box((-50, -30, 0), (50, 30, 3))
    assert laid(block, turned(block, 180)).how.startswith("as drawn")
    for new in (away(block), away(turned(block, 180))):
        found = laid(block, new)
        assert_away(found)
        assert "4 positions fit equally well" in found.how


def test_one_small_hole_decides_between_the_positions_of_a_plate():
    block = cut(box((-50, -30, 0), (50, 30, 3)), cylinder(0.5, 5, (40, 20, -1)))
    found = laid(block, shifted(turned(block, 170), *AWAY))
    assert np.allclose(found.rotation, rotation(170, np.array([0, 0, 1])), atol=1e-9)
    assert "positions" not in found.how


def test_a_round_body_turns_as_little_as_possible():
    body = fuse(cylinder(20, 3), cone(8, 5, 10, (0, 0, 3)))
    found = laid(body, away(body))
    to = rotation(33, ABOUT)[:, 2]
    assert np.allclose(np.array(found.rotation)[:, 2], to, atol=1e-9)
    assert np.trace(found.rotation) == pytest.approx(1 + 2 * to[2])  # the turn from z to `to`, and no more
    assert "round about an axis" in found.how


@pytest.mark.parametrize("moved", [lambda s: s, away], ids=["in place", "away"])
def test_a_mirrored_part_is_refused(moved):
    bracket = extruded([(0, 0, 0), (40, 0, 0), (40, 10, 0), (10, 10, 0), (10, 60, 0), (0, 60, 0)], (0, 0, 8))
    handed = cut(bracket, cylinder(2, 5, (30, 5, 5)))
    with pytest.raises(PartError, match=r"mirror image of the old one: 10 of 10 faces"):
        laid(handed, moved(mirrored(handed)))
    assert laid(bracket, moved(mirrored(bracket))).matched == 8  # turned over, this one is its own mirror image


def test_a_part_scaled_about_the_origin_tells_its_factor():
    found = laid(plate(), grown(plate(), 1.01))
    assert found.scale == pytest.approx(1.01, abs=1e-9)
    assert found.how.startswith("as drawn: 13 of 13") and "the whole part is 1.01 times as large" in found.how
    assert found.translation == (0, 0, 0)


def test_a_part_scaled_and_moved_lies_middle_on_middle():
    found = laid(plate(), away(grown(plate(), 0.98)))
    assert found.scale == pytest.approx(0.98, abs=1e-9)
    middle = np.array([50, 30, 6.5])  # of the centers of all faces: 0..100, 0..60, 0..13
    there = np.array(found.rotation) @ middle + found.translation
    assert there == pytest.approx(rotation(33, ABOUT) @ (0.98 * middle) + AWAY, abs=1e-6)


def test_a_scaled_part_that_also_changed_still_tells_its_factor():
    found = laid(plate(), grown(plate(hole=3), 1.02))
    assert found.scale == pytest.approx(1.02, abs=1e-5)


def test_another_part_is_refused_with_what_was_tried():
    with pytest.raises(
        PartError, match=r"tried as drawn, moved and turned within 0\.001 and 0\.01 mm, larger and smaller"
    ):
        laid(plate(), fuse(sphere(30), box((0, 0, 0), (20, 40, 40))))


def test_a_part_whose_faces_all_changed_a_little_stays_as_drawn():
    found = laid(box((0, 0, 0), (100, 60, 20)), box((1, 1, 0.5), (99, 59, 19)))
    assert found.how.startswith("as drawn") and "the boxes agree" in found.how


def test_a_taller_part_stays_as_drawn_although_more_faces_moved_up_than_stayed():
    def cup(height: float) -> Any:
        solid = cut(box((0, 0, 0), (60, 40, height)), box((5, 5, -1), (55, 35, height - 5)))
        for x in (8.0, 20.0, 32.0, 44.0):
            solid = fuse(solid, box((x, 10, height - 1), (x + 3, 30, height + 4)))
        return fuse(solid, box((0, 0, 0), (2, -4, 6)), box((40, 0, 0), (44, -4, 5)))

    found = laid(cup(20), cup(21))
    assert found.how.startswith("as drawn") and found.translation == (0, 0, 0)
    assert laid(cup(20), shifted(cup(20), 0, 0, 1)).translation == pytest.approx((0, 0, 1))


@pytest.mark.parametrize(("rewritten", "unit", "_faces"), [w for w in WRITINGS if w.id != "other seams"])
def test_another_writing_of_the_part_is_found_where_it_lies(tmp_path, rewritten, unit, _faces):
    new = read_step(write_raw(rewritten(away(notched())), tmp_path / "new.step", unit=unit)).solid
    found = laid(notched(), new)
    assert_away_as_read(found)
    assert found.matched == found.faces


def assert_away_as_read(found: Alignment) -> None:
    assert np.abs(np.array(found.rotation) - rotation(33, ABOUT)).max() < 1e-6
    assert np.abs(np.array(found.translation) - AWAY).max() < 1e-4
    assert found.residual_mm < 1e-3


def notched() -> Any:
    """The tub of the writings with a hole off its middle: it lies in one way only."""
    return cut(tub(), cylinder(2, 40, (15, 12, -5)))


REAL = ["card_lid", "latch_tongue", "connector_bezel", "controller_base", "handheld_top", "thin_shell"]


@pytest.mark.parametrize("name", REAL)
def test_real_parts_are_found_again(real_parts, tmp_path, name):
    if not (real_parts / f"{name}.step").exists():
        pytest.skip(f"no {name}")
    old = read_step(real_parts / f"{name}.step", find_crossings=False).solid
    new = read_step(write_raw(away(old), tmp_path / "new.step"), find_crossings=False).solid
    found = laid(old, new)
    assert_away_as_read(found)
    assert found.matched >= 0.95 * found.faces
