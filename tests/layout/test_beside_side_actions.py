"""Pins, core pins and gate keep out of the way of slides; what is given in the way is told. Each with and without."""

import itertools

import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.finding import Severity
from moldgen.layout.clearances import check_clearances
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.ejection import GivenPin, place_ejector_pins
from moldgen.layout.gate import place_gate
from moldgen.layout.keep_out import STEEL
from moldgen.model.layout import GateKind
from moldgen.rules.side_practice import LEDGE_WIDTH, SLIDE_SHOULDER
from moldgen.spec.sections import CorePins, Ejection, Gate

from .shapes import box, lid, plate
from .side_shapes import MINUS_X, MINUS_Y, X, Y, slide, with_sides

ABS = resin("ABS")
THROUGH = slide(X, -14.0, 14.0, 10.0, 18.0, -32.0, 32.0)
"""A slide right through the box of 64 x 44 x 42 mm, under most of its ceiling: y from -14 to 14."""

POCKET = plate(60, 40, 10).cut(plate(22, 16, 6).translate((19, 0, 0)))
"""A plate with a pocket in its side, open below: x from 8 to 30, y from -8 to 8, z from 0 to 6."""

IN_POCKET = slide(X, -8.0, 8.0, 0.0, 6.0, 8.0, 30.0)
LONG, WIDE = 120.0, 30.0


ALONE = Ejection.model_validate({"pins": [{"at": [0, 0, 0]}]})


def ejectors(view, given=None):
    return place_ejector_pins(view, Ejection() if given is None else ALONE, ABS, given=given)


def codes(notes):
    return {f.code for f in notes.findings}


def test_ejector_pins_stand_beside_a_slide():
    free, _ = ejectors(with_sides(box()))
    assert any(abs(p.y) < 14.0 for p in free.pins)  # else this shows nothing
    layout, notes = ejectors(with_sides(box(), THROUGH))
    assert len(layout.pins) >= 3
    for pin in layout.pins:
        assert abs(pin.y) - 14.0 - pin.clearance_diameter / 2 >= STEEL - 1e-6
    assert "ejection.no_room" not in codes(notes)


def test_ejector_pins_may_stand_under_a_slide_that_they_do_not_reach():
    # plastic of 4 mm lies between the pins and the slide
    over = slide(X, -20.0, 20.0, 4.0, 8.0, -30.0, 30.0)
    free, _ = ejectors(with_sides(plate(60, 40, 10)))
    layout, _ = ejectors(with_sides(plate(60, 40, 10), over))
    assert [(p.x, p.y) for p in layout.pins] == [(p.x, p.y) for p in free.pins]


def test_no_room_beside_a_slide_names_it():
    everywhere = slide(X, -23.0, 23.0, -12.0, -5.0, -33.0, 32.0)
    layout, notes = ejectors(with_sides(box(), everywhere))
    assert not layout.pins
    (finding,) = (f for f in notes.findings if f.code == "ejection.no_room")
    assert finding.severity is Severity.FAILURE
    assert "slides" in finding.message


def test_ejector_pins_push_on_the_part_not_on_the_slide():
    def inside(pin):
        beside = np.array([max(8.0 - pin.x, 0.0), max(abs(pin.y) - 8.0, 0.0)])
        return np.linalg.norm(beside) < pin.diameter / 2

    free, _ = ejectors(with_sides(plate(60, 40, 10)))
    assert any(inside(p) for p in free.pins)
    layout, _ = ejectors(with_sides(plate(60, 40, 10), IN_POCKET, real=POCKET))
    assert len(layout.pins) >= 3
    assert not any(inside(p) for p in layout.pins)


@pytest.mark.parametrize(("y", "severity"), [(0.0, Severity.FAILURE), (16.05, Severity.WARNING), (17.7, None)])
def test_given_pin_in_the_way_is_told(y, severity):
    given = (GivenPin((10.0, y, 40.0), 3.0),)
    layout, notes = ejectors(with_sides(box(), THROUGH), given=given)
    found = [f for f in notes.findings if f.code == "ejector_pin.side_action"]
    assert [f.severity for f in found] == ([] if severity is None else [severity])
    assert all("slide 1" in f.message and "a slide leaves here" in f.message for f in found)
    steel = y - 14.0 - layout.pins[0].clearance_diameter / 2
    if severity is Severity.WARNING:
        assert found[0].value == pytest.approx(steel, abs=1e-3)
    else:
        assert (steel >= STEEL) is (severity is None)


def test_given_pin_on_a_slide_is_left_out():
    given = (GivenPin((20.0, 0.0, 0.0), 3.0), GivenPin((-20.0, 0.0, 0.0), 3.0))
    view = with_sides(plate(60, 40, 10), IN_POCKET, real=POCKET)
    layout, notes = ejectors(view, given=given)
    assert [p.x for p in layout.pins] == [-20.0]
    (finding,) = (f for f in notes.findings if f.code == "ejector_pin.side_face")
    assert finding.severity is Severity.FAILURE
    assert finding.where == "ejection.pins[0]"


def test_core_pin_that_a_slide_meets_stays_in_the_block():
    meets = slide(X, 6.0, 10.0, 3.0, 5.0, 10.0, 30.0)
    free, _ = find_core_pins(with_sides(lid()), CorePins(), ABS)
    assert sorted(p.x for p in free) == pytest.approx([-15.0, 15.0])
    view = with_sides(lid(), meets)
    pins, notes = find_core_pins(view, CorePins(), ABS)
    assert [p.x for p in pins] == pytest.approx([-15.0])
    (decision,) = notes.decisions
    assert any("slide 1" in text for text in decision.refused)
    pins, notes = find_core_pins(view, CorePins(), ABS, ((15.0, 8.0, 1.0),))
    assert "core_pin.side_action" in codes(notes)


def test_last_look_finds_a_pin_in_the_way():
    layout, _ = ejectors(with_sides(box()))
    notes = check_clearances(with_sides(box(), THROUGH), (), layout.pins)
    assert codes(notes) == {"layout.thin_steel"}
    assert any("slide 1" in f.message for f in notes.findings)
    good, _ = ejectors(with_sides(box(), THROUGH))
    notes = check_clearances(with_sides(box(), THROUGH), (), good.pins)
    assert not notes.findings
    (line,) = (q for q in notes.quantities if "slide or lifter" in q.name)
    assert line.value == pytest.approx(min(abs(p.y) - 14.0 - p.clearance_diameter / 2 for p in good.pins), abs=1e-6)


def window(axis, name):
    """A slide that forms a window through the middle of one side of a plate 3 mm thick."""
    rim = (LONG if abs(axis[0]) > 0.5 else WIDE) / 2
    return slide(axis, -6.0, 6.0, 1.0, 2.0, rim - 4.0, rim, name)


BODY = 6.0 + SLIDE_SHOULDER.default + LEDGE_WIDTH.default


@pytest.mark.parametrize("axis", [Y, MINUS_Y])
def test_edge_gate_goes_where_no_slide_is(axis):
    free, _ = place_gate(with_sides(plate(LONG, WIDE, 3)), Gate(), ABS)
    assert abs(free.at[0]) < 6.0
    gate, notes = place_gate(with_sides(plate(LONG, WIDE, 3), window(axis, "slide 1")), Gate(), ABS)
    assert gate.kind is GateKind.EDGE
    assert "gate.bad_place" not in codes(notes)
    sprue = np.array(gate.at[:2]) - (gate.land + gate.runner_length) * np.array(gate.inward[:2])
    behind = axis[1] * sprue[1] > WIDE / 2
    assert not behind or abs(sprue[0]) >= BODY + gate.sprue_foot_diameter / 2 + STEEL - 1e-6


AROUND = tuple(
    slide(axis, -w, w, 1.0, 2.0, r - 2.0, r, f"slide {n}")
    for n, (axis, w, r) in enumerate(itertools.product((X, MINUS_X), [(15.0)], [60.0]), 1)
) + tuple(
    slide(axis, -w, w, 1.0, 2.0, r - 2.0, r, f"slide {n}")
    for n, (axis, w, r) in enumerate(itertools.product((Y, MINUS_Y), [(60.0)], [15.0]), 3)
)
"""Slides along the whole of all four sides."""


def test_slides_on_all_sides_leave_the_gate_from_above():
    gate, notes = place_gate(with_sides(plate(LONG, WIDE, 3), *AROUND), Gate(), ABS)
    assert gate.kind is not GateKind.EDGE
    assert "gate.bad_place" not in codes(notes)
    assert (np.abs(gate.at[:2]) <= np.array([58.0, 13.0])).all()
    (decision,) = (d for d in notes.decisions if d.topic == "gate")
    assert any("a slide leaves here" in text for text in decision.refused)


def test_edge_gate_that_is_asked_for_in_the_way_is_told():
    view = with_sides(plate(LONG, WIDE, 3), *AROUND)
    gate, notes = place_gate(view, Gate(kind="edge"), ABS, at=(0.0, 15.0, 0.0))
    assert gate.kind is GateKind.EDGE
    (finding,) = (f for f in notes.findings if f.code == "gate.bad_place")
    assert finding.severity is Severity.FAILURE
    assert "a slide leaves here" in finding.message


def test_gate_from_above_keeps_off_a_slide():
    over = slide(X, -10.0, 10.0, 3.0, 8.0, -20.0, 60.0)  # it forms the middle of the upper face
    free, _ = place_gate(with_sides(plate(LONG, WIDE, 3)), Gate(kind="pin"), ABS)
    assert free.at[0] > -20.0
    assert abs(free.at[1]) < 10.0
    gate, notes = place_gate(with_sides(plate(LONG, WIDE, 3), over), Gate(kind="pin"), ABS)
    assert "gate.bad_place" not in codes(notes)
    assert gate.at[0] < -20.0 - STEEL or abs(gate.at[1]) > 10.0 + STEEL


def test_gate_from_above_feeds_the_part_not_the_steel_of_a_slide():
    # a pocket open above that a slide forms, level with the upper face: x from -20 to 60, y from -10 to 10
    real = plate(LONG, WIDE, 3).cut(plate(80, 20, 2).translate((20, 0, 1)))
    flush = slide(X, -10.0, 10.0, 1.0, 3.0, -20.0, 60.0)
    gate, notes = place_gate(with_sides(plate(LONG, WIDE, 3), flush, real=real), Gate(kind="pin"), ABS)
    assert "gate.bad_place" not in codes(notes)
    assert gate.at[0] < -20.0 or abs(gate.at[1]) > 10.0
