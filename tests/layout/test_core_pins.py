"""Core pins: which round cores become pins, with the right sizes, and why others do not."""

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.core_pin_checks import imbalance_share
from moldgen.layout.core_pins import find_core_pins
from moldgen.model.layout import Chooser
from moldgen.rules.layout_practice import STEEL_BETWEEN_BORES
from moldgen.spec.sections import CorePins

from .shapes import cup, lid, plate, view_of

ABS = resin("ABS")


def pins_of(shape, section=None, at=(), **more):
    return find_core_pins(view_of(shape, **more), section or CorePins(), ABS, at)


def drilled(*holes, thickness=20.0):
    """A plate on the core with holes (x, y, diameter, depth) from below."""
    body = plate(80, 60, thickness)
    for x, y, diameter, depth in holes:
        body = body.cut(cq.Workplane().center(x, y).circle(diameter / 2).extrude(depth))
    return body


def below(body):
    """The core half forms what looks down and every hole."""
    x, y, z = body.face_places.T
    return (z > 19.9) | (np.abs(x) > 39.9) | (np.abs(y) > 29.9)


def test_blind_hole_becomes_a_pin_with_its_own_sizes():
    ((pin,), _) = pins_of(drilled((10, 5, 3.6, 12)), cavity=below)
    assert (pin.x, pin.y, pin.base_z, pin.top_z) == pytest.approx((10, 5, 0, 12), abs=1e-6)
    assert pin.blind
    assert pin.slenderness == pytest.approx(12 / 3.6)
    # the plate is level round the hole, so the shank is the next stock size
    assert pin.diameter == 4.0
    assert pin.fit_length == pytest.approx(10.0)


def test_through_hole_ends_at_the_upper_side():
    ((pin,), _) = pins_of(drilled((0, 0, 6, 20)), cavity=below)
    assert not pin.blind
    assert pin.top_z == pytest.approx(20.0)


def test_stepped_bore_is_one_pin():
    ((pin,), _) = pins_of(drilled((0, 0, 8, 6), (0, 0, 4, 15)), cavity=below)
    assert (pin.base_z, pin.top_z) == pytest.approx((0, 15))
    assert pin.diameter == 8.0 or pin.diameter == pytest.approx(8.0, abs=0.2)
    assert pin.slenderness == pytest.approx(15 / 4)


def test_slender_tip_on_a_thick_core_is_a_pin_of_its_own():
    ((pin,), _) = pins_of(drilled((0, 0, 30, 6), (0, 0, 4, 15)), cavity=below)
    assert (pin.base_z, pin.top_z) == pytest.approx((6, 15))


def test_hole_split_in_two_faces_is_one_pin():
    half = drilled((0, 0, 5, 12)).intersect(cq.Workplane().center(-25, 0).box(50, 100, 100))
    other = drilled((0, 0, 5, 12)).intersect(cq.Workplane().center(25, 0).box(50, 100, 100))
    ((pin,), _) = pins_of(half.union(other), cavity=below)
    assert pin.top_z == pytest.approx(12.0)


def test_a_slot_that_opens_the_core_refuses_it():
    slotted = drilled((0, 0, 8, 12)).cut(cq.Workplane().center(10, 0).rect(20, 2).extrude(12))
    pins, notes = pins_of(slotted, cavity=below)
    assert pins == ()
    assert "not round" in notes.decisions[0].refused[0]


@pytest.mark.parametrize(
    ("hole", "worth"),
    [((0, 0, 16, 12), True), ((0, 0, 18, 12), False), ((0, 0, 4, 0.8), False), ((0, 0, 12, 2), False)],
    ids=["16 mm", "thick and short", "low", "shallow"],
)
def test_what_is_worth_a_pin(hole, worth):
    pins, _ = pins_of(drilled(hole), cavity=below, pad=80.0)
    assert bool(pins) is worth


def test_largest_diameter_is_kept():
    pins, _ = pins_of(drilled((20, 0, 3, 9), (-20, 0, 8, 12)), CorePins(largest=5.0), cavity=below)
    assert [p.x for p in pins] == pytest.approx([20.0])


def test_core_of_a_cup_is_no_pin():
    assert pins_of(cup())[0] == ()


def test_none_leaves_all_in_the_block_but_those_asked_for():
    both = lid()
    assert len(pins_of(both)[0]) == 2
    assert pins_of(both, CorePins(pick="none"))[0] == ()
    ((pin,), _) = pins_of(both, CorePins(pick="none"), at=((15.5, 8.0, 4.0),))
    assert pin.x == pytest.approx(15.0)
    assert pin.chosen_by is Chooser.GIVEN


def test_a_point_beside_every_core_is_told():
    _, notes = pins_of(lid(), at=((15.0, 11.0, 4.0),))
    (finding,) = [f for f in notes.findings if f.code == "core_pin.no_core"]
    assert finding.value == pytest.approx(3.0 - 1.6, abs=1e-3)


def test_heads_of_close_pins_are_ground_to_leave_steel():
    # stock heads of 8 mm on a pitch of 8 mm would meet
    pins, _ = pins_of(drilled((-4, 0, 3.6, 9), (4, 0, 3.6, 9)), cavity=below)
    one, other = pins
    assert one.head_diameter < 8.0
    assert 8.0 - (one.head_diameter + other.head_diameter) / 2 >= STEEL_BETWEEN_BORES.default - 1e-9


def test_pins_too_close_for_any_head_stay_in_the_block():
    pins, notes = pins_of(drilled((-3, 0, 3.6, 9), (3, 0, 3.6, 9)), cavity=below)
    assert pins == ()
    assert len(notes.decisions[0].refused) == 2


def test_a_given_pin_that_breaks_a_rule_is_made_and_told():
    pins, notes = pins_of(drilled((-3, 0, 3.6, 9), (3, 0, 3.6, 9)), at=((-3, 0, 2), (3, 0, 2)), cavity=below)
    assert len(pins) == 2
    assert {f.code for f in notes.findings} >= {"core_pin.too_close"}


def test_slender_pin_is_told_with_its_bending():
    _, notes = pins_of(drilled((0, 0, 2.5, 18)), cavity=below)
    codes = {f.code: f for f in notes.findings}
    assert codes["core_pin.slender"].value == pytest.approx(18 / 2.5, abs=0.01)
    bend = next(q for q in notes.quantities if q.name == "bending of a core pin, tip free")
    # round cantilever in closed form: 8 p L^4 / (pi E d^3), with a tenth of the pressure on a slender core
    pressure = ABS.cavity_pressure.mean * imbalance_share(18 / 2.5)
    assert bend.value == pytest.approx(8 * pressure * 18**4 / (np.pi * 210e3 * 2.5**3), rel=1e-6)


def test_a_low_core_block_is_told():
    pins, notes = pins_of(drilled((0, 0, 8, 12)), at=((0, 0, 3),), cavity=below, pad=20.0)
    assert [f.code for f in notes.findings if f.code == "core_pin.short_fit"] == ["core_pin.short_fit"]
    assert pins[0].fit_length < 16.0
