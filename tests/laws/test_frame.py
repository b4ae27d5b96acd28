"""The way from part to mold: shrink by ISO 294-4, and the pull turned to +z."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moldgen.catalog import resin
from moldgen.quantity import Provenance
from moldgen.release.frame import mold_frame, rotation_to_z
from moldgen.spec.pull import Shrink

BOX = ((-10.0, 0.0, 5.0), (30.0, 20.0, 25.0))
UP = (0.0, 0.0, 1.0)
AXES = [tuple(float(s * (i == k)) for i in range(3)) for k in range(3) for s in (1, -1)]

unit = st.tuples(*[st.floats(-1, 1)] * 3).filter(lambda v: math.hypot(*v) > 0.1)


def frame_of(shrink, direction=UP, name="ABS"):
    return mold_frame(direction, Shrink.model_validate(shrink), name, BOX)


@settings(deadline=None, max_examples=60, derandomize=True)
@given(unit)
def test_every_direction_is_turned_to_the_pull_by_a_rotation(direction):
    d = np.array(direction) / np.linalg.norm(direction)
    turn = np.array(rotation_to_z(tuple(d)))
    assert turn @ d == pytest.approx(np.array(UP), abs=1e-12)
    assert turn @ turn.T == pytest.approx(np.eye(3), abs=1e-12)
    assert np.linalg.det(turn) == pytest.approx(1.0)  # never a mirror


@pytest.mark.parametrize("direction", AXES)
def test_axes_turn_by_exact_quarters(direction):
    turn = np.array(rotation_to_z(direction))
    assert (turn @ direction == UP).all()
    assert set(turn.ravel()) <= {-1.0, 0.0, 1.0}


@pytest.mark.parametrize("tilt", [1e-3, 1e-6, 1e-9, 1e-12, 1e-15, 0.0])
def test_directions_near_minus_z_stay_rotations(tilt):
    d = np.array([tilt, 0.0, -math.sqrt(1 - tilt**2)])
    turn = np.array(rotation_to_z(tuple(d)))
    assert turn @ d == pytest.approx(np.array(UP), abs=1e-12)
    assert turn @ turn.T == pytest.approx(np.eye(3), abs=1e-12)


def test_up_turns_nothing_and_down_turns_half_about_x():
    assert rotation_to_z(UP) == ((1, 0, 0), (0, 1, 0), (0, 0, 1))
    assert rotation_to_z((0.0, 0.0, -1.0)) == ((1, 0, 0), (0, -1, 0), (0, 0, -1))


def test_shrink_is_of_the_mold_unless_asked_otherwise():
    # ISO 294-4: S = (mold - part) / mold, so 1.8 % turns 100 mm into 101.833 mm; the shop convention into 101.8 mm
    assert frame_of(1.8)[0].factors == pytest.approx([100 / 98.2] * 3)
    assert 100 * frame_of(1.8)[0].factors[0] == pytest.approx(101.833, abs=5e-4)
    assert 100 * frame_of({"all": 1.8, "convention": "part"})[0].factors[0] == pytest.approx(101.8)


def test_no_shrink_changes_nothing():
    frame, _ = frame_of(0)
    assert frame.factors == (1.0, 1.0, 1.0)
    assert frame.to_mold((3.0, -4.0, 5.0)) == (3.0, -4.0, 5.0)


def test_axes_of_the_part_shrink_each_by_its_own():
    frame, notes = frame_of({"x": 1.0, "y": 2.0, "z": 0.5}, direction=(1.0, 0.0, 0.0))
    assert frame.factors == pytest.approx((1 / 0.99, 1 / 0.98, 1 / 0.995))
    # the pull is x of the part: what grows along it is the part's x
    assert frame.to_mold((99.0, 0.0, 0.0))[2] == pytest.approx(100.0)
    assert [f.code for f in notes.findings] == ["shrink.not_uniform"]
    sizes = [q for q in notes.quantities if q.name == "shrink factor"]
    assert [q.value for q in sizes] == pytest.approx(frame.factors)
    assert [q.value for q in notes.quantities if q.name.startswith("shrinkage")] == pytest.approx([1.0, 2.0, 0.5])


def test_auto_takes_the_middle_of_the_resin_and_says_that_it_is_unverified():
    frame, notes = frame_of("auto", name="PP")
    data = resin("PP")
    middle = (data.shrink_along.low + data.shrink_along.high + data.shrink_across.low + data.shrink_across.high) / 4
    assert frame.factors[0] == pytest.approx(1 / (1 - middle / 100))
    assert notes.quantities[0].provenance is Provenance.UNVERIFIED
    assert "PP" in notes.decisions[0].why
    assert frame_of(0.5)[1].quantities[0].provenance is Provenance.GIVEN


@pytest.mark.parametrize(
    ("given", "fixed"),
    [("origin", (0.0, 0.0, 0.0)), ("centre", (10.0, 10.0, 15.0)), ([1.0, 2.0, 3.0], (1.0, 2.0, 3.0))],
)
def test_the_fixed_point_is_the_one_named(given, fixed):
    frame, _ = frame_of({"all": 2.0, "fixed_point": given})
    assert frame.fixed_point == fixed
    assert frame.to_mold(fixed) == pytest.approx(fixed)


@settings(deadline=None, max_examples=40, derandomize=True)
@given(unit, st.floats(0.0, 5.0), st.tuples(*[st.floats(-100, 100)] * 3))
def test_there_and_back_is_the_same_point(direction, percent, point):
    d = np.array(direction) / np.linalg.norm(direction)
    frame, _ = frame_of({"all": percent, "fixed_point": "centre"}, direction=tuple(float(v) for v in d))
    assert frame.to_part(frame.to_mold(point)) == pytest.approx(point, abs=1e-9)
    # a length grows by the factor, whatever the pull
    other = tuple(p + 1.0 for p in point)
    grown = np.linalg.norm(np.subtract(frame.to_mold(other), frame.to_mold(point)))
    assert grown == pytest.approx(math.sqrt(3) / (1 - percent / 100), rel=1e-9)
