"""Blocks that stand turned to each other are compared where they share steel."""

from __future__ import annotations

import math

import pytest

from moldgen.revision.placing import Placing
from moldgen.revision.shared_block import shared_upright, turned_by_deg

BLOCK = ((-50.0, -50.0, -30.0), (50.0, 50.0, 20.0))


def turned(degrees: float, shift: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Placing:
    c, s = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
    return Placing(((c, -s, 0.0), (s, c, 0.0), (0.0, 0.0, 1.0)), shift)


def part(half: float) -> tuple[tuple[float, float, float], tuple[float, float, float]]:
    return (-half, -half, 0.0), (half, half, 10.0)


@pytest.mark.parametrize("degrees", [45.0, -45.0, 135.0])
def test_two_squares_at_45_deg_share_one_of_half_the_area(degrees: float) -> None:
    found = shared_upright(BLOCK, BLOCK, turned(degrees), part(30.0))
    assert found is not None
    assert found[0].tolist() == pytest.approx([-50.0 / math.sqrt(2.0)] * 2)
    assert found[1].tolist() == pytest.approx([50.0 / math.sqrt(2.0)] * 2)


def test_what_they_share_depends_on_where_the_old_one_stands() -> None:
    """A shift of 10 mm along a diagonal takes 10 mm off the room of that corner: 40 mm of 50 sqrt(2)."""
    found = shared_upright(
        BLOCK, BLOCK, turned(45.0, (-10.0 / math.sqrt(2.0), -10.0 / math.sqrt(2.0), 0.0)), part(20.0)
    )
    assert found is not None
    assert found[1].tolist() == pytest.approx([40.0 / math.sqrt(2.0)] * 2)


def test_a_part_that_does_not_fit_is_compared_otherwise() -> None:
    assert shared_upright(BLOCK, BLOCK, turned(45.0), part(34.0)) is None, "1.36 mm of steel beside it"
    assert shared_upright(BLOCK, BLOCK, turned(45.0), part(33.0)) is not None


def test_the_turn_is_told_with_its_sense() -> None:
    assert turned_by_deg(turned(37.0)) == pytest.approx(37.0)
    assert turned_by_deg(turned(-37.0)) == pytest.approx(-37.0)
