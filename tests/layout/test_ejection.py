"""Laws of the ejector pins: room, steel, balance, symmetry; and every broken rule of a given pin is told."""

import itertools
import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import ejector_pin_series, resin
from moldgen.finding import Severity
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.ejection import GivenPin, place_ejector_pins
from moldgen.layout.sites import Underside
from moldgen.model.layout import Chooser
from moldgen.rules.layout_practice import SMALL_PIN_EDGE, STEEL_BETWEEN_BORES
from moldgen.spec.sections import CorePins, Ejection

from .shapes import box, channel, cup, faces_at, lid, plate, view_of

ABS = resin("ABS")
RIBBED = box(70, 50, 2, 20).union(cq.Workplane("XY", origin=(0, 0, 8)).rect(71, 1.5).extrude(13))
ALONE = Ejection.model_validate({"pins": [{"at": [0, 0, 0]}]})
SHAPES = {"cup": cup(), "box": box(), "channel": channel(), "lid": lid(), "plate": plate(50, 30, 3), "ribbed": RIBBED}


@pytest.fixture(scope="module", params=sorted(SHAPES))
def placed(request):
    view = view_of(SHAPES[request.param])
    core_pins, _ = find_core_pins(view, CorePins(), ABS)
    layout, notes = place_ejector_pins(view, Ejection(), ABS, core_pins)
    return view, core_pins, layout, notes


def test_there_are_pins_of_the_standard_series(placed):
    _, _, layout, _ = placed
    assert len(layout.pins) >= 3
    assert {p.diameter for p in layout.pins} <= {p.diameter for p in ejector_pin_series()}


def test_part_lies_over_the_whole_end_face_of_every_pin(placed):
    view, _, layout, _ = placed
    turn = np.linspace(0, 2 * np.pi, 61)
    for pin in layout.pins:
        rim = np.array([pin.x, pin.y]) + 0.499 * pin.diameter * np.column_stack([np.cos(turn), np.sin(turn)])
        height, triangle = view.underside(rim)
        assert np.isfinite(height).all()
        assert view.core_side[triangle].all()
        assert height.max() <= pin.tip_z + 1e-6
        assert height.min() >= pin.tip_z - pin.tip_drop - 1e-3


def test_pins_keep_clear_of_edges(placed):
    view, _, layout, _ = placed
    under = Underside(view)
    for pin in layout.pins:
        assert under.exact_room(np.array([pin.x, pin.y])) >= pin.diameter / 2 + Ejection().edge_clearance - 1e-6


def test_steel_is_left_between_all_bores(placed):
    _, core_pins, layout, _ = placed
    for one, other in itertools.combinations(layout.pins, 2):
        gap = math.hypot(one.x - other.x, one.y - other.y)
        assert gap >= (one.head_diameter + other.head_diameter) / 2
    for pin, core_pin in itertools.product(layout.pins, core_pins):
        steel = (
            math.hypot(pin.x - core_pin.x, pin.y - core_pin.y) - (pin.clearance_diameter + core_pin.head_diameter) / 2
        )
        assert steel >= STEEL_BETWEEN_BORES.default - 1e-9


def test_forces_add_up_and_act_at_the_centre_of_sticking(placed):
    _, _, layout, _ = placed
    force = np.array([p.force_n for p in layout.pins])
    assert force.sum() == pytest.approx(layout.force_n, abs=1e-6)
    if layout.force_n > 0:
        places = np.array([[p.x, p.y] for p in layout.pins])
        middle = (places * force[:, None]).sum(axis=0) / force.sum()
        assert middle == pytest.approx(layout.sticking.centre, abs=0.1)


def test_part_and_pins_stand_the_force(placed):
    _, _, layout, notes = placed
    for pin in layout.pins:
        assert pin.pressure_mpa <= ABS.push_pressure
        assert pin.force_n * 3.0 <= pin.buckling_n
        assert pin.length >= pin.tip_z - pin.seat_z
    assert not [f for f in notes.findings if f.severity in (Severity.FAILURE, Severity.WARNING)]


@pytest.mark.parametrize("name", ["cup", "box", "channel", "plate"])
def test_symmetric_part_gets_symmetric_pins(name):
    layout, _ = place_ejector_pins(view_of(SHAPES[name]), Ejection(), ABS)
    places = {(round(p.x, 3) + 0.0, round(p.y, 3) + 0.0) for p in layout.pins}
    assert places == {(-x + 0.0, y) for x, y in places} == {(x, -y + 0.0) for x, y in places}
    assert len({round(p.force_n, 6) for p in layout.pins}) == 1


def test_pins_stay_on_a_moved_part():
    here, _ = place_ejector_pins(view_of(box()), Ejection(), ABS)
    there, _ = place_ejector_pins(view_of(box().translate((100.0, -50.0, 0.0))), Ejection(), ABS)
    moved = [(p.x + 100.0, p.y - 50.0) for p in here.pins]
    assert np.array(sorted(moved)) == pytest.approx(np.array(sorted((p.x, p.y) for p in there.pins)), abs=1e-4)


def test_stroke_is_the_depth_and_five_millimeters():
    layout, _ = place_ejector_pins(view_of(cup()), Ejection(), ABS)
    assert layout.stroke_mm == 45.0


def test_a_short_stroke_is_told():
    layout, notes = place_ejector_pins(view_of(cup()), Ejection(stroke=30.0), ABS)
    assert layout.stroke_mm == 30.0
    (finding,) = [f for f in notes.findings if f.code == "ejection.short_stroke"]
    assert (finding.value, finding.limit) == (30.0, 45.0)


def test_the_diameter_asked_for_is_taken():
    layout, _ = place_ejector_pins(view_of(box()), Ejection(diameter=3.0), ABS)
    assert {p.diameter for p in layout.pins} == {3.0}


def test_a_part_without_room_says_so():
    rim = cq.Workplane().circle(20).circle(18.8).extrude(15)
    layout, notes = place_ejector_pins(view_of(rim), Ejection(), ABS)
    assert layout.pins == ()
    (finding,) = [f for f in notes.findings if f.code == "ejection.no_room"]
    assert finding.severity is Severity.FAILURE
    assert finding.value == pytest.approx(0.6, abs=0.05)
    assert finding.limit == pytest.approx(0.8 / 2 + SMALL_PIN_EDGE.low)  # the thinnest shouldered pin


def test_marked_faces_stay_free():
    view = view_of(plate(60, 40, 3).union(cq.Workplane().center(-15, 0).rect(30, 40).extrude(-4)))
    marked = faces_at(view, lambda x, y, z: z < -3.9)
    free, _ = place_ejector_pins(view, Ejection(), ABS)
    kept, _ = place_ejector_pins(view, Ejection(), ABS, no_pins=marked)
    assert any(p.x < 0 for p in free.pins)
    assert kept.pins
    assert all(p.x > 0 for p in kept.pins)


def test_tip_on_a_slope_is_told_with_its_fall():
    wedge = cq.Workplane("XZ").polyline([(0, 0), (60, 10), (60, 14), (0, 4)]).close().extrude(40)
    view = view_of(wedge, level=0.0, cavity=lambda body: body.face_places[:, 2] > 4 + body.face_places[:, 0] / 6 - 1e-3)
    layout, _ = place_ejector_pins(view, Ejection(), ABS, given=(GivenPin((30.0, -20.0, 5.0), 6.0),))
    (pin,) = [p for p in layout.pins if p.chosen_by is Chooser.GIVEN]
    assert pin.tip_drop == pytest.approx(6.0 * 10 / 60, rel=0.01)
    assert pin.tip_z == pytest.approx(5.5, abs=0.01)


GIVEN = {
    "no_part": ((60.0, 0.0, 0.0), 4.0),
    "step": ((29.5, 0.0, 40.0), 4.0),
    "edge_clearance": ((27.5, 0.0, 40.0), 4.0),
    "not_standard": ((0.0, 10.0, 40.0), 4.3),
    "too_close": ((4.0, 0.0, 40.0), 4.0),
}


@pytest.mark.parametrize("code", sorted(GIVEN))
def test_every_broken_rule_of_a_given_pin_is_told(code):
    at, diameter = GIVEN[code]
    given = (GivenPin((0.0, 0.0, 40.0), 4.0), GivenPin(at, diameter))
    layout, notes = place_ejector_pins(view_of(box()), ALONE, ABS, given=given)
    codes = [f.code for f in notes.findings if f.where == "ejection.pins[1]"]
    assert f"ejector_pin.{code}" in codes
    assert not [f for f in notes.findings if f.where == "ejection.pins[0]"]
    assert len(layout.pins) == (1 if code == "no_part" else 2)


def test_given_pin_on_a_marked_face_fails():
    view = view_of(box())
    ceiling = faces_at(view, lambda x, y, z: abs(z - 40.0) < 1e-6)
    given = (GivenPin((0.0, 0.0, 40.0), 4.0),)
    _, notes = place_ejector_pins(view, ALONE, ABS, given=given, no_pins=ceiling)
    assert "ejector_pin.marked_face" in {f.code for f in notes.findings}


def test_given_pins_too_few_for_the_force_are_told():
    given = (GivenPin((0.0, 0.0, 40.0), 2.0),)
    layout, notes = place_ejector_pins(view_of(box()), ALONE, ABS, given=given)
    (pin,) = layout.pins
    assert pin.force_n == pytest.approx(layout.force_n)
    assert {"ejector_pin.pressure", "ejector_pin.buckles"} <= {f.code for f in notes.findings}


def test_moldgen_adds_to_given_pins_only_when_it_may():
    given = (GivenPin((0.0, 0.0, 40.0), 4.0),)
    alone, _ = place_ejector_pins(view_of(box()), ALONE, ABS, given=given)
    more, _ = place_ejector_pins(view_of(box()), Ejection(add=True), ABS, given=given)
    assert len(alone.pins) == 1
    assert len(more.pins) > 1
    assert more.pins[0].chosen_by is Chooser.GIVEN


def test_part_that_stays_in_the_cavity_is_told():
    tray = box().rotate((0, 0, 0), (1, 0, 0), 180).translate((0, 0, 42))
    view = view_of(tray, level=0.0, cavity=lambda body: body.face_places[:, 2] > 1e-6)
    _, notes = place_ejector_pins(view, Ejection(), ABS)
    assert "ejection.stays_in_cavity" in {f.code for f in notes.findings}


def test_two_runs_agree_to_the_last_digit():
    assert (
        place_ejector_pins(view_of(lid()), Ejection(), ABS)[0].pins
        == place_ejector_pins(view_of(lid()), Ejection(), ABS)[0].pins
    )
