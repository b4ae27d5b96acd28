"""Steel-safe advice: sizes against closed forms, which side the steel is left on, and what is no fit at all."""

from dataclasses import replace

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.steel_safe import steel_safe_advice
from moldgen.layout.view import PartView
from moldgen.model.layout import Layout
from moldgen.model.part import MoldFrame
from moldgen.model.steel_safe import Fit
from moldgen.rules.steel_safe import OTHER_ALLOWANCE, PRESS_ALLOWANCE, SNAP_ALLOWANCE
from moldgen.spec.sections import CorePins
from moldgen.spec.steel_safe import SteelSafe

from .shapes import box, lid, plate
from .side_shapes import X, slide, with_sides

ABS = resin("ABS")
AS_DRAWN = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)))
GROWN = replace(AS_DRAWN, factors=(1.25, 1.25, 1.25))
"""A shrink that nobody has, so that what is not converted shows."""


def advice(view, frame=AS_DRAWN, *, pins=True, **section):
    found = find_core_pins(view, CorePins(), ABS)[0] if pins else ()
    layout = Layout(found, (), None, 30.0, 0.0)
    return steel_safe_advice(view, layout, SteelSafe.model_validate(section), ABS, frame)


def named(*places, **section):
    """A section that names places and finds nothing by itself."""
    return {"find": "none", "places": list(places), **section}


def codes(notes):
    return [f.code for f in notes.findings]


def test_blind_holes_in_bosses_are_press_fits_formed_by_their_core_pins():
    (one,), notes = advice(with_sides(lid()))
    assert (one.fit, one.feature, one.dimension) == (Fit.PRESS, "round hole", "diameter")
    assert one.nominal_mm == pytest.approx(3.2, abs=1e-6)
    assert one.formed_by == ("core pin 1", "core pin 2")
    assert [p[:2] for p in one.places] == [(-15.0, 8.0), (15.0, 8.0)]
    assert one.allowance_mm == PRESS_ALLOWANCE.default
    # a hole is formed by steel: more steel, larger hole; both sides of the diameter
    assert one.steel_last_mm == pytest.approx(3.2)
    assert one.steel_first_mm == pytest.approx(3.2 + 2 * PRESS_ALLOWANCE.default)
    assert "on core pin 1 and core pin 2 all round: the hole starts 0.20 mm larger" in one.steel_safe
    assert "unverified" in one.source
    assert notes.decisions[0].choice == "1 dimension to be tuned; advice only: the steel itself is cut to size"


def test_nominal_is_the_drawn_size_and_steel_the_shrunk_one():
    (one,), _ = advice(with_sides(lid()), GROWN)
    assert one.nominal_mm == pytest.approx(3.2 / 1.25, abs=1e-4)
    assert one.steel_last_mm == pytest.approx(3.2)
    assert one.places[1][:2] == pytest.approx((15.0 / 1.25, 8.0 / 1.25))


def test_without_pins_of_their_own_the_core_forms_them():
    (one,), _ = advice(with_sides(lid()), pins=False)
    assert one.formed_by == ("core",)


@pytest.mark.parametrize(
    ("boss", "bore", "depth", "listed"),
    [(6.0, 3.0, 9.0, True), (6.0, 5.0, 9.0, False), (14.0, 3.0, 9.0, False), (6.0, 3.0, 2.0, False)],
    ids=["boss", "thin tube", "block of plastic", "shallow"],
)
def test_what_is_a_hole_in_a_boss(boss, bore, depth, listed):
    body = box(56.0, 36.0, 2.0, 10.0).union(cq.Workplane().circle(boss / 2).extrude(10.0))
    found, _ = advice(with_sides(body.cut(cq.Workplane().circle(bore / 2).extrude(depth))))
    assert bool(found) is listed


def test_a_free_pin_starts_thin_and_a_plain_hole_in_a_plate_is_no_fit():
    body = plate(60, 40, 3).union(cq.Workplane(origin=(10, 5, 3)).circle(2.0).extrude(6.0))
    body = body.cut(cq.Workplane().center(-10, 0).circle(2.0).extrude(3.0))
    (one,), _ = advice(with_sides(body))
    assert (one.feature, one.formed_by) == ("round pin", ("cavity",))
    assert one.nominal_mm == pytest.approx(4.0)
    assert one.steel_first_mm == pytest.approx(4.0 - 2 * PRESS_ALLOWANCE.default)


def test_find_none_lists_nothing_and_says_nothing():
    found, notes = advice(with_sides(lid()), find="none")
    assert found == ()
    assert notes.decisions == notes.findings == ()


# --- snap fits -------------------------------------------------------------------------------------------------------
REACH, LIP = 1.2, 3.0


def hooked(reach=REACH, lip=LIP, wall=False):
    """A plate, z from 20 to 23, with a stem of 2 mm that hangs to z = 8 and a lip toward +x at its lower end."""
    body = plate(60, 40, 3).translate((0, 0, 20)).union(cq.Workplane(origin=(20, 0, 8)).rect(2, 8).extrude(12.0))
    body = body.union(cq.Workplane(origin=(21 + reach / 2, 0, 8)).rect(reach, 8).extrude(lip))
    return body if not wall else body.union(cq.Workplane(origin=(25, 0, 0)).rect(2, 30).extrude(20.0))


def over_lip(reach=REACH, lip=LIP):
    """A slide that forms what lies over the lip; the tip is the core's."""
    return slide(X, -4.0, 4.0, 8.0 + lip, 20.0, 21.0, 40.0)


def test_a_lip_over_which_a_slide_stands_is_a_snap_fit():
    body = hooked()
    filled = body.union(cq.Workplane(origin=(21 + REACH / 2, 0, 11)).rect(REACH, 8).extrude(9.0))
    (reach, thickness), _ = advice(with_sides(filled, over_lip(), real=body))
    assert (reach.fit, reach.dimension, thickness.dimension) == (Fit.SNAP, "reach", "thickness")
    assert reach.nominal_mm == pytest.approx(REACH, abs=1e-3)
    assert thickness.nominal_mm == pytest.approx(LIP, abs=1e-3)
    assert thickness.formed_by == ("slide 1",)
    assert reach.formed_by != ("slide 1",)
    assert (thickness.allowance_mm, thickness.faces) == (SNAP_ALLOWANCE.default, 1)
    # less plastic at first: shorter and thinner, by one face each
    assert reach.steel_first_mm == pytest.approx(REACH - SNAP_ALLOWANCE.default, abs=1e-3)
    assert thickness.steel_first_mm == pytest.approx(LIP - SNAP_ALLOWANCE.default, abs=1e-3)
    assert reach.places[0] == pytest.approx((21 + REACH / 2, 0.0, 11.0), abs=REACH / 2)


def test_a_lip_with_a_wall_before_it_or_a_long_one_is_no_snap_fit():
    for body, steel in ((hooked(wall=True), over_lip()), (hooked(reach=6.0), over_lip(6.0))):
        found, _ = advice(with_sides(hooked(), steel, real=body))
        assert found == ()


def test_a_window_is_no_snap_fit():
    real = box().cut(cq.Workplane(origin=(31, 0, 14)).box(6, 12, 8))
    found, _ = advice(with_sides(box(), slide(X, -6.0, 6.0, 10.0, 18.0, 28.0, 34.0), real=real))
    assert found == ()


def test_a_snap_that_a_point_names_is_listed_once_and_first():
    body = hooked()
    place = {"at": [21.5, 0, 11], "fit": "snap", "allowance": "0.3 mm"}
    (reach, thickness), _ = advice(with_sides(body, over_lip(), real=body), places=[place])
    assert (reach.given, thickness.given) == (0, 0)
    assert reach.allowance_mm == 0.3
    assert reach.source == "given in steel_safe.places[0].allowance"
    assert reach.steel_first_mm == pytest.approx(REACH - 0.3, abs=1e-3)


def through(loop, body):
    """The view of a part with one shut-off, whose line is given."""
    view = with_sides(body)
    lines = (*view.halves.parting_line, np.array([(x, y, 20.0) for x, y in loop]))
    return with_halves(view, parting_line=lines)


def with_halves(view, **more):
    return PartView(replace(view.halves, **more), None)


def test_a_lip_under_a_window_of_its_own_is_a_snap_fit_formed_by_the_cavity():
    window = [(21.0, -4.5), (24.0, -4.5), (24.0, 4.5), (21.0, 4.5)]
    body = hooked().cut(cq.Workplane(origin=(22.5, 0, 19)).rect(3, 9).extrude(6.0))
    (reach, thickness), _ = advice(through(window, body))
    assert reach.nominal_mm == pytest.approx(REACH, abs=1e-3)
    assert thickness.formed_by == ("cavity",)
    assert thickness.nominal_mm == pytest.approx(LIP, abs=1e-3)


def test_a_step_in_a_hole_is_no_snap_fit():
    """The step looks up, stands 2 mm in and has room before it; but its way ends in the same hole."""
    body = plate(60, 40, 3).translate((0, 0, 20)).cut(cq.Workplane(origin=(0, 0, 22)).circle(4.0).extrude(2.0))
    body = body.cut(cq.Workplane(origin=(0, 0, 19)).circle(2.0).extrude(6.0))
    turn = np.radians(np.arange(0, 360, 10))
    found, _ = advice(through(np.column_stack([4.0 * np.cos(turn), 4.0 * np.sin(turn)]), body))
    assert found == ()


# --- places that the spec names --------------------------------------------------------------------------------------
def slotted():
    """A plate of 60 x 40 x 10 with a slot 4 mm wide from above, x from 3 to 7, 6 mm deep."""
    return plate(60, 40, 10).cut(cq.Workplane(origin=(5, 0, 7)).box(4, 20, 6))


def test_a_point_in_a_slot_means_its_width():
    (one,), _ = advice(with_sides(slotted()), **named({"at": [5, 0, 7]}))
    assert (one.feature, one.dimension, one.faces) == ("slot", "width", 2)
    assert one.nominal_mm == pytest.approx(4.0, abs=1e-6)
    assert one.steel_first_mm == pytest.approx(4.0 + 2 * OTHER_ALLOWANCE.default)
    assert one.formed_by == ("cavity",)
    assert one.fit is Fit.MARKED


def test_a_slot_at_any_angle_has_its_own_width():
    body = slotted().rotate((0, 0, 0), (0, 0, 1), 17.0)
    at = cq.Vertex.makeVertex(5, 0, 7).rotate((0, 0, 0), (0, 0, 1), 17.0)
    (one,), _ = advice(with_sides(body), **named({"at": [at.X, at.Y, at.Z]}))
    assert one.nominal_mm == pytest.approx(4.0, abs=1e-4)


def test_a_point_in_plastic_means_the_wall_there():
    (one,), _ = advice(with_sides(box()), **named({"at": [31, 0, 20], "fit": "press", "allowance": 0.05}))
    assert (one.fit, one.feature) == (Fit.PRESS, "wall")
    assert one.nominal_mm == pytest.approx(2.0, abs=1e-6)
    assert one.steel_first_mm == pytest.approx(2.0 - 2 * 0.05)
    assert set(one.formed_by) == {"cavity", "core"}
    assert "the wall starts 0.10 mm thinner" in one.steel_safe


def test_a_face_gets_steel_on_its_own_side_only():
    inner = {"at": [30, 0, 20], "face": True}
    outer = {"at": [32.1, 0, 20], "face": True}
    (first, second), _ = advice(with_sides(box()), **named(inner, outer))
    assert (first.formed_by, second.formed_by) == (("core",), ("cavity",))
    for one in (first, second):
        assert one.steel_first_mm == pytest.approx(2.0 - OTHER_ALLOWANCE.default)


def test_a_round_face_means_the_whole_hole():
    (one,), _ = advice(with_sides(lid()), **named({"at": [16.6, 8, 4], "face": True}))
    assert one.feature == "round hole"
    assert one.nominal_mm == pytest.approx(3.2)
    assert one.formed_by == ("core pin 2",)


def test_a_point_in_the_wall_of_a_boss_means_its_outside():
    (one,), _ = advice(with_sides(lid()), **named({"at": [17.5, 8, 4]}))
    assert (one.feature, one.nominal_mm) == ("round pin", pytest.approx(6.0))


def test_a_named_hole_is_not_found_a_second_time():
    found, _ = advice(with_sides(lid()), places=[{"at": [15, 8, 4], "fit": "press"}])
    assert [(o.given, o.places[0][0]) for o in found] == [(0, 15.0), (-1, -15.0)]


@pytest.mark.parametrize(
    ("place", "code"),
    [
        ({"at": [0, 0, 25.0], "face": True}, "steel_safe.no_face"),
        ({"at": [0, 0, 200.0]}, "steel_safe.no_feature"),
        ({"at": [0, 0, 20.0]}, "steel_safe.no_feature"),
    ],
    ids=["face far away", "beside the part", "a room is no slot"],
)
def test_a_point_that_means_nothing_is_told(place, code):
    found, notes = advice(with_sides(box()), **named(place))
    assert found == ()
    assert codes(notes) == [code]
    assert notes.findings[0].where == "steel_safe.places[0]"
    assert notes.findings[0].at == tuple(place["at"])


# --- allowances ------------------------------------------------------------------------------------------------------
def test_a_long_dimension_is_left_what_the_shrink_may_miss_it_by():
    (one,), _ = advice(with_sides(plate(300, 40, 10)), **named({"at": [150, 0, 5], "face": True}))
    least = min(ABS.shrink_along.low, ABS.shrink_across.low)
    most = max(ABS.shrink_along.high, ABS.shrink_across.high)
    assert one.nominal_mm == pytest.approx(300.0)
    assert one.allowance_mm == pytest.approx(300.0 * (most - least) / 200.0, abs=0.006)
    assert one.allowance_mm > OTHER_ALLOWANCE.default
    assert "shrink of ABS" in one.source


def test_auto_leaves_at_most_a_quarter_and_a_given_excess_is_told():
    thin = box(wall=0.5)
    (one,), notes = advice(with_sides(thin), **named({"at": [30.25, 0, 20]}))
    assert one.allowance_mm * 2 == pytest.approx(0.5 / 4, abs=0.01)
    assert codes(notes) == []
    (one,), notes = advice(with_sides(thin), **named({"at": [30.25, 0, 20], "allowance": 0.2}))
    assert codes(notes) == ["steel_safe.large_allowance"]
    assert notes.findings[0].value == pytest.approx(0.4 / 0.5, abs=1e-3)


def test_one_allowance_for_all():
    (one,), _ = advice(with_sides(lid()), allowance=0.15)
    assert (one.allowance_mm, one.source) == (0.15, "given in steel_safe.allowance")
