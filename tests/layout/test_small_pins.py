"""Shouldered ejector pins: taken only where straight ones find no room, and what they must keep then."""

import math

import cadquery as cq
import numpy as np
import pytest
from scipy.linalg import eigh

from moldgen.catalog import resin, shouldered_pin_series
from moldgen.finding import Severity
from moldgen.layout.ejection import GivenPin, place_ejector_pins
from moldgen.layout.sites import Underside
from moldgen.model.layout import Chooser
from moldgen.rules.layout_practice import RETAINER_PLATE, SHOULDER_GAP, SMALL_PIN_EDGE
from moldgen.rules.pins import euler_buckling_force, guided_fit_length
from moldgen.rules.stepped_column import stepped_buckling_force
from moldgen.spec.sections import Ejection

from .shapes import plate, view_of

ABS = resin("ABS")
ALONE = Ejection.model_validate({"pins": [{"at": [0, 0, 0]}]})


def frame(width, height=6.0):
    """A flat frame whose bars are this wide: half of that is the room of a pin."""
    return plate(40, 30, height).cut(plate(40 - 2 * width, 30 - 2 * width, height))


def beam_buckling(tip_diameter, tip, diameter, shank, modulus=200e3, pieces=60):
    """Return the buckling force by finite elements (beam with the consistent geometric matrix), an upper bound."""
    lengths = np.r_[np.full(pieces, tip / pieces), np.full(pieces, shank / pieces)]
    diameters = np.r_[np.full(pieces, tip_diameter), np.full(pieces, diameter)]
    size = 2 * (len(lengths) + 1)
    elastic, geometric = np.zeros((size, size)), np.zeros((size, size))
    for i, (h, d) in enumerate(zip(lengths, diameters, strict=True)):
        bend = modulus * math.pi * d**4 / 64 / h**3
        k = [[12, 6 * h, -12, 6 * h], [6 * h, 4 * h * h, -6 * h, 2 * h * h]]
        k += [[-12, -6 * h, 12, -6 * h], [6 * h, 2 * h * h, -6 * h, 4 * h * h]]
        g = [[36, 3 * h, -36, 3 * h], [3 * h, 4 * h * h, -3 * h, -h * h]]
        g += [[-36, -3 * h, 36, -3 * h], [3 * h, -h * h, -3 * h, 4 * h * h]]
        own = slice(2 * i, 2 * i + 4)
        elastic[own, own] += bend * np.array(k)
        geometric[own, own] += np.array(g) / (30 * h)
    free = [n for n in range(size) if n not in (0, size - 2, size - 1)]  # the nose guided, the head held
    grid = np.ix_(free, free)
    return 1.0 / eigh(geometric[grid], elastic[grid], eigvals_only=True)[-1]


@pytest.mark.parametrize("sizes", [(1.0, 20.0, 2.0, 40.0), (0.8, 9.0, 2.0, 33.0), (2.5, 30.0, 3.0, 60.0)])
def test_a_stepped_pin_buckles_as_finite_elements_say(sizes):
    assert stepped_buckling_force(*sizes) == pytest.approx(beam_buckling(*sizes), rel=1e-4)


def test_a_pin_without_a_step_buckles_by_euler():
    exact = 4.4934094579**2 * 200e3 * math.pi * 3.0**4 / 64 / 120.0**2  # tan(x) = x
    assert stepped_buckling_force(3.0, 50.0, 3.0, 70.0) == pytest.approx(exact, rel=1e-9)
    assert exact == pytest.approx(euler_buckling_force(3.0, 120.0), rel=0.003)


def test_a_stepped_pin_lies_between_its_two_diameters():
    force = stepped_buckling_force(1.0, 20.0, 2.0, 40.0)
    assert stepped_buckling_force(1.0, 20.0, 1.0, 40.0) < force < stepped_buckling_force(2.0, 20.0, 2.0, 40.0)


@pytest.mark.parametrize(("width", "most"), [(1.5, 0.8), (2.0, 1.0), (2.6, 1.5)])
def test_a_narrow_part_gets_shouldered_pins_with_a_caution(width, most):
    view = view_of(frame(width))
    layout, notes = place_ejector_pins(view, Ejection(), ABS)
    assert len(layout.pins) >= 3
    assert {p.diameter for p in layout.pins} <= {p.diameter for p in shouldered_pin_series() if p.diameter <= most}
    under = Underside(view)
    left = [under.exact_room(np.array([p.x, p.y])) - p.diameter / 2 for p in layout.pins]
    assert min(left) >= SMALL_PIN_EDGE.low - 1e-6
    (finding,) = [f for f in notes.findings if f.code == "ejection.small_pins"]
    assert finding.severity is Severity.CAUTION
    assert finding.value == pytest.approx(min(left), abs=1e-3)
    assert finding.limit == Ejection().edge_clearance


def test_a_part_with_room_gets_straight_pins():
    layout, notes = place_ejector_pins(view_of(frame(5.0)), Ejection(), ABS)
    assert all(p.shank_length == 0.0 and p.diameter >= 2.0 for p in layout.pins)
    assert "ejection.small_pins" not in {f.code for f in notes.findings}


def test_the_shoulder_never_reaches_the_fit():
    view = view_of(frame(2.0))
    layout, _ = place_ejector_pins(view, Ejection(), ABS)
    for pin in layout.pins:
        assert pin.fit_length == guided_fit_length(pin.diameter)
        assert pin.tip_z - pin.shoulder_z >= pin.fit_length + layout.stroke_mm + SHOULDER_GAP.default - 1e-9
        assert pin.seat_z == pytest.approx(view.low[2] - layout.stroke_mm - RETAINER_PLATE.default)
        assert pin.length >= pin.tip_z - pin.seat_z
        free = pin.tip_z - pin.fit_length - pin.shoulder_z
        expected = stepped_buckling_force(pin.diameter, free, pin.shank_diameter, pin.shank_length)
        assert pin.buckling_n == pytest.approx(expected)
        assert pin.clearance_diameter == pytest.approx(pin.shank_diameter + 0.5)


def test_a_tip_that_is_sold_too_short_is_told():
    layout, notes = place_ejector_pins(view_of(frame(2.0)), Ejection(stroke=60.0), ABS)
    (finding,) = [f for f in notes.findings if f.code == "ejector_pin.ground_shank"]
    pin = layout.pins[0]
    (sold,) = [p for p in shouldered_pin_series() if p.diameter == pin.diameter]
    stock = sold.shank_lengths[sold.lengths.index(pin.length)]
    assert finding.value == pytest.approx(stock - pin.shank_length, abs=0.01)


def test_an_edge_clearance_of_the_spec_is_kept_also_by_small_pins():
    layout, notes = place_ejector_pins(view_of(frame(2.0)), Ejection(edge_clearance=0.9), ABS)
    assert layout.pins == ()
    (finding,) = [f for f in notes.findings if f.code == "ejection.no_room"]
    assert finding.limit == pytest.approx(0.4 + 0.9)
    assert "stripper" in finding.remedy


def test_a_given_pin_of_a_shouldered_size_is_one():
    given = (GivenPin((0.0, 0.0, 0.0), 1.2),)
    layout, notes = place_ejector_pins(view_of(plate(30, 20, 3)), ALONE, ABS, given=given)
    (pin,) = layout.pins
    assert (pin.diameter, pin.shank_diameter, pin.chosen_by) == (1.2, 2.0, Chooser.GIVEN)
    assert "ejector_pin.not_standard" not in {f.code for f in notes.findings}


def test_a_tip_on_a_slope_keeps_its_fit_below_the_lowest_place():
    wedge = cq.Workplane("XZ").polyline([(0, 0), (30, 5), (30, 8), (0, 3)]).close().extrude(2.0)
    view = view_of(wedge, cavity=lambda body: body.face_places[:, 2] > 3 + body.face_places[:, 0] / 6 - 1e-3)
    layout, _ = place_ejector_pins(view, Ejection(), ABS)
    for pin in layout.pins:
        assert pin.tip_drop == pytest.approx(pin.diameter * 5 / 30, rel=0.02)
        lowest = pin.tip_z - pin.tip_drop
        assert lowest - pin.fit_length - layout.stroke_mm - SHOULDER_GAP.default >= pin.shoulder_z - 1e-9
    assert layout.pins
