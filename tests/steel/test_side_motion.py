"""The law of the angled pin, and the order in which a tool with side actions opens."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from helpers.side_molds import side_mold

from moldgen.errors import StageError
from moldgen.model.motion import total_displacement
from moldgen.model.slide import Drive, LifterLayout, SideLayout
from moldgen.model.tool import Motion
from moldgen.rules.side_action import angled_pin_delay_pye, angled_pin_opening_pye
from moldgen.steel.side_motion import opening_steps, slide_way

SLIDE = replace(
    side_mold().layout.slides[0],
    travel=12.0,
    delay=angled_pin_delay_pye(0.5, 20.0),
    opening=angled_pin_opening_pye(12.0, 20.0),
)


@pytest.mark.parametrize(
    ("opening", "way"), [(0.0, 0.0), (1.46, 0.0), (1.4619 + 32.97 / 2, 6.0), (34.44, 12.0), (200.0, 12.0)]
)
def test_a_slide_follows_its_pin(opening: float, way: float) -> None:
    """M 12, c 0.5, 20 deg: nothing for 1.46 mm, then 12 mm over 32.97 mm (printed check values)."""
    assert slide_way(SLIDE, opening) == pytest.approx(way, abs=2e-3)


def test_the_opening_is_broken_where_a_slide_starts_and_stops() -> None:
    steps = opening_steps(SideLayout((SLIDE,)), 80.0, 35.0, 40.0)
    heights = [s.displacement(Motion.CAVITY_HALF)[2] for s in steps]
    assert heights == pytest.approx([1.4619, 32.9697, 80 - 1.4619 - 32.9697, 0.0, 0.0], abs=1e-4)
    assert [s.displacement("slide 1")[0] for s in steps] == pytest.approx([0, 12, 0, 0, 0])
    slope = steps[1].displacement("slide 1")[0] / heights[1]
    assert slope == pytest.approx(math.tan(math.radians(20)))


def test_slides_of_different_pins_share_the_opening() -> None:
    """15 and 20 deg: five breaks, each slide ends where its own travel says, the pins' slopes hold in every stretch."""
    other = replace(SLIDE, name="slide 2", axis=(0.0, 1.0, 0.0), travel=7.0,
                    delay=angled_pin_delay_pye(0.5, 15.0), opening=angled_pin_opening_pye(7.0, 15.0))  # fmt: skip
    steps = opening_steps(SideLayout((SLIDE, other)), 80.0, 0.0, 0.0)
    assert len(steps) == 5
    assert total_displacement(steps, "slide 1") == pytest.approx((12.0, 0.0, 0.0))
    assert total_displacement(steps, "slide 2") == pytest.approx((0.0, 7.0, 0.0))
    for step in steps:
        rise = step.displacement(Motion.CAVITY_HALF)[2]
        for name, k, angle in (("slide 1", 0, 20.0), ("slide 2", 1, 15.0)):
            way = step.displacement(name)[k]
            assert way == pytest.approx(0.0) or way == pytest.approx(rise * math.tan(math.radians(angle)))


def test_the_mold_opens_far_enough_for_its_pins() -> None:
    steps = opening_steps(SideLayout((SLIDE,)), 5.0, 0.0, 0.0)
    assert total_displacement(steps, Motion.CAVITY_HALF)[2] == pytest.approx(34.4316, abs=1e-4)


def test_cylinders_come_first_and_may_ride_on_the_cavity_half() -> None:
    drawn = replace(SLIDE, drive=Drive.CYLINDER, carried=Motion.CAVITY_HALF, delay=0.0, opening=0.0, pins=())
    first, second = opening_steps(SideLayout((drawn,)), 80.0, 0.0, 0.0)
    assert first.moves == (("slide 1", (12.0, 0.0, 0.0)),)
    assert second.displacement("slide 1") == second.displacement(Motion.CAVITY_HALF) == (0.0, 0.0, 80.0)


@pytest.mark.parametrize(("angle", "sideways"), [(5.0, 5.25), (8.0, 8.43), (12.0, 12.75)])
def test_a_lifter_goes_sideways_while_it_pushes(angle: float, sideways: float) -> None:
    """E 60 mm: printed check values of M = E tan(angle); the shaft leans so that its foot stands behind."""
    slope = math.radians(angle)
    axis = (-math.sin(slope), 0.0, -math.cos(slope))
    lifter = LifterLayout("lifter 1", axis, (1.0, 0.0, 0.0), angle, 60.0, 0.0, 0.0, 0.0, 0.0)
    (*_, push, leave) = opening_steps(SideLayout((), (lifter,)), 80.0, 60.0, 40.0)
    assert push.displacement("lifter 1") == pytest.approx((sideways, 0.0, 60.0), abs=6e-3)
    assert push.displacement(Motion.EJECTOR) == push.displacement(Motion.PART) == (0.0, 0.0, 60.0)
    assert leave.moves == ((Motion.PART, (0.0, 0.0, 40.0)),)


@pytest.mark.parametrize("value", [-1.0, math.nan, math.inf])
def test_lengths_are_lengths(value: float) -> None:
    with pytest.raises(StageError):
        opening_steps(SideLayout(), value, 1.0, 1.0)
