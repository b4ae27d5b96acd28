"""The force with which a part sticks, against the closed forms of Menges (see `moldgen.rules.ejection`)."""

import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.sticking import find_sticking, hold_of_cavity
from moldgen.rules.ejection import (
    draft_factor_menges,
    ejection_force_box_menges,
    ejection_force_cup_menges,
    ejection_force_sleeve_menges,
    vacuum_force,
)

from .shapes import box, channel, cup, view_of

ABS = resin("ABS")
STRAIN = min(ABS.shrink_along.low, ABS.shrink_across.low) / 100
GRIP = (ABS.friction.mean, ABS.ejection_modulus.mean, STRAIN, 2.0, 40.0)


def friction(view):
    return sum(core.friction for core in find_sticking(view, ABS)[0].cores)


def sleeve_on_a_core():
    ring = cq.Workplane().circle(22).circle(20).extrude(40)
    # the core half forms the bore, the cavity half everything else
    return view_of(ring, cavity=lambda body: np.hypot(body.face_places[:, 0], body.face_places[:, 1]) > 20.5)


def test_cup_sticks_as_the_closed_form_says():
    found, _ = find_sticking(view_of(cup()), ABS)
    (core,) = found.cores
    assert core.blind
    assert core.friction == pytest.approx(ejection_force_cup_menges(*GRIP, ABS.poisson), rel=0.01)
    assert found.force == pytest.approx(core.friction + vacuum_force(math.pi * 20**2), rel=0.005)


def test_open_sleeve_sticks_without_vacuum():
    found, _ = find_sticking(sleeve_on_a_core(), ABS)
    (core,) = found.cores
    assert not core.blind
    assert core.vacuum == 0.0
    assert found.force == pytest.approx(ejection_force_sleeve_menges(*GRIP), rel=0.01)


def test_box_sticks_as_the_closed_form_says():
    closed = ejection_force_box_menges(*GRIP) / (1 - ABS.poisson / 2)
    assert friction(view_of(box())) == pytest.approx(closed, rel=0.01)


def test_radius_cancels():
    # the abstract of Shen, Chen & Jiang (1999): nearly independent of the radius
    assert friction(view_of(cup(radius=35.0))) == pytest.approx(friction(view_of(cup())), rel=0.01)


def test_force_grows_as_the_depth():
    assert friction(view_of(cup(depth=20.0))) == pytest.approx(friction(view_of(cup())) / 2, rel=0.01)


def test_draft_eases_as_the_factor_says():
    eased = friction(view_of(cup(draft=2.0))) / friction(view_of(cup()))
    # the wall stands square to the core: it is thinner by the cosine
    assert eased == pytest.approx(draft_factor_menges(ABS.friction.mean, 2.0), rel=0.01)


def test_a_hole_in_the_floor_lets_air_in():
    vented = cup().cut(cq.Workplane().circle(2).extrude(50))
    found, _ = find_sticking(view_of(vented), ABS)
    assert sum(core.vacuum for core in found.cores) == 0.0


def test_a_dent_from_above_lets_no_air_in():
    dented = cup(wall=4.0).cut(cq.Workplane("XY", origin=(0, 0, 42)).circle(2).extrude(10))
    found, _ = find_sticking(view_of(dented), ABS)
    assert max(core.vacuum for core in found.cores) == pytest.approx(vacuum_force(math.pi * 400), rel=0.005)


def test_open_walls_are_pressed_by_the_floor_between_them():
    # full restraint of the floor: friction * modulus * strain * wall on the length of each of two walls
    found, _ = find_sticking(view_of(channel()), ABS)
    bound = ABS.friction.mean * ABS.ejection_modulus.mean * STRAIN * 2.0 * 44.0 * 2
    assert found.cores == ()
    assert 0.8 * bound < found.force <= bound * 1.001


@pytest.mark.parametrize("at", [(0.0, 0.0), (30.0, -12.0)])
def test_centre_is_on_the_axis(at):
    found, _ = find_sticking(view_of(cup(at=at)), ABS)
    assert found.centre == pytest.approx(at, abs=0.05)


def test_turned_cup_holds_to_the_cavity_as_hard_as_the_cup_to_its_core():
    turned = cup().rotate((0, 0, 0), (1, 0, 0), 180).translate((0, 0, 42))
    view = view_of(turned, level=42.0, cavity=lambda body: np.ones(len(body.faces), dtype=bool))
    assert hold_of_cavity(view, ABS) == pytest.approx(friction(view_of(cup())), rel=0.01)


def test_flat_plate_does_not_stick():
    found, _ = find_sticking(view_of(cq.Workplane().rect(40, 30).extrude(3)), ABS)
    assert found.force == 0.0
