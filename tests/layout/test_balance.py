"""Shares of a force, against the lever rule and statics."""

import numpy as np
import pytest

from moldgen.layout.balance import resultant, shares


def test_two_pins_share_by_the_lever_rule():
    force = shares(np.array([[0.0, 0.0], [10.0, 0.0]]), np.ones(2), 100.0, np.array([2.5, 0.0]))
    assert force == pytest.approx([75.0, 25.0])


def test_equal_pins_round_the_centre_share_alike():
    square = np.array([[1.0, 1.0], [-1.0, 1.0], [-1.0, -1.0], [1.0, -1.0]]) * 20
    assert shares(square, np.full(4, 12.0), 400.0, np.zeros(2)) == pytest.approx([100.0] * 4)


def test_thicker_pins_carry_more():
    places = np.array([[-10.0, 0.0], [10.0, 0.0], [0.0, 10.0], [0.0, -10.0]])
    force = shares(places, np.array([4.0, 4.0, 1.0, 1.0]), 100.0, np.zeros(2))
    assert force == pytest.approx([40.0, 40.0, 10.0, 10.0])


@pytest.mark.parametrize("seed", range(12))
def test_forces_are_pushes_with_the_right_sum_and_moment(seed):
    random = np.random.default_rng(seed)
    places = random.uniform(-50, 50, (6, 2))
    inside = random.dirichlet(np.ones(6)) @ places
    force = shares(places, random.uniform(3, 50, 6), 1000.0, inside)
    assert force.min() >= 0.0
    assert force.sum() == pytest.approx(1000.0)
    if force.min() > 1e-6:  # no pin had to be left out: then the moment is exact
        assert resultant(places, force) == pytest.approx(inside, abs=1e-6)


def test_a_centre_outside_is_carried_by_the_nearest_pins():
    force = shares(np.array([[0.0, 0.0], [10.0, 0.0], [5.0, 5.0]]), np.ones(3), 90.0, np.array([30.0, 0.0]))
    assert force.sum() == pytest.approx(90.0)
    assert force.min() >= 0.0
    assert force[0] == pytest.approx(0.0)
