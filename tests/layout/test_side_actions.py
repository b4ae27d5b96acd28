"""Slides outside the part: drive, body, angled pin, room, neighbors, and every finding with a planted fault."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from helpers.side_molds import (
    LENGTH,
    MINUS_X,
    ONE,
    WALL,
    SideMold,
    X,
    Y,
    leaning_mold,
    part,
    shell,
    side_mold,
    task,
    window_front,
)
from helpers.solids import box, cut, fuse

from moldgen.errors import PartError
from moldgen.finding import Severity
from moldgen.kernel.body import Body
from moldgen.layout.lifters import lay_out_lifter
from moldgen.layout.side_actions import lay_out_sides, room_needed
from moldgen.layout.side_checks import check_slide
from moldgen.layout.side_drive import Driven, drive_fronts, steel_names
from moldgen.layout.side_neighbors import plan_gap, refuse_meeting
from moldgen.layout.slide_body import wanted_bodies
from moldgen.layout.slide_pin import OUT_EARLY
from moldgen.model.layout import BlockLayout
from moldgen.model.side_action import Front, SideKind
from moldgen.model.slide import Drive

BOX = box((-50.0, -50.0, -50.0), (50.0, 50.0, 50.0))


def with_travel(travel: float) -> SideMold:
    return SideMold(ONE, (Driven(replace(side_mold().driven[0].front, travel=travel), Drive.ANGLED_PIN),))


def codes(notes) -> set[str]:
    return {f.code for f in notes.findings}


def drive_of(solid, opening=ONE[0]) -> Driven:
    (found,), _ = drive_fronts([window_front(opening)], Body(solid), 0.0)
    return found


def window_cut(solid):
    return cut(solid, box((27.0, -6.0, 10.0), (31.0, 6.0, 18.0)))


# --- what drives it -------------------------------------------------------------------------------------------------
def test_a_front_takes_the_cavity_steel_under_it() -> None:
    """12 wide, from the top of the window at 18 down to the parting plane; nothing else under it: the wall's travel."""
    found = drive_of(part().solid)
    points = np.vstack(found.front.outline)
    assert points.min(axis=0) == pytest.approx((-6.0, 0.0))
    assert points.max(axis=0) == pytest.approx((6.0, 18.0))
    assert found.drive is Drive.ANGLED_PIN
    assert found.front.travel == pytest.approx(WALL)


def test_a_front_at_the_parting_plane_needs_nothing_more() -> None:
    found = drive_of(cut(shell(), box((27.0, -6.0, -1.0), (31.0, 6.0, 8.0))), (X, -6.0, 6.0, 0.0, 8.0))
    assert found.drive is Drive.ANGLED_PIN
    assert found.front.outline[0].tolist() == window_front((X, -6.0, 6.0, 0.0, 8.0)).outline[0].tolist()


def test_steel_over_a_flange_goes_along_and_must_travel_past_it() -> None:
    """A flange of 4 mm at the rim: the steel above it leaves over it, 6 mm from the window's inner edge."""
    flanged = window_cut(fuse(shell(), box((29.0, -20.0, 0.0), (34.0, 20.0, 3.0))))
    found = drive_of(flanged)
    assert found.drive is Drive.ANGLED_PIN
    assert found.front.travel == pytest.approx(6.0)


def test_steel_behind_a_lip_cannot_go_along() -> None:
    """The flange ends in a lip: steel between wall and lip is held, so the slide is drawn before the mold opens."""
    flanged = fuse(shell(), box((29.0, -20.0, 0.0), (34.0, 20.0, 3.0)))
    found = drive_of(window_cut(fuse(flanged, box((33.0, -20.0, 0.0), (34.0, 20.0, 8.0)))))
    assert (found.drive, found.caught) == (Drive.CYLINDER, True)
    assert found.front.outline[0].tolist() == window_front(ONE[0]).outline[0].tolist()


def test_under_a_drafted_wall_the_steel_begins_outside_the_core() -> None:
    """The core's wall stands at 28 under the window, its top at 26.8: the steel that goes along begins between."""
    own, under = leaning_mold().driven
    assert (own.under, under.under) == (False, True)
    assert own.front.outline[0].tolist() == window_front(ONE[0]).outline[0].tolist()
    assert LENGTH / 2 - WALL < under.front.near < LENGTH / 2 - 10.0 * 2.0 / 30.0
    assert steel_names(leaning_mold().driven) == ["slide 1", "slide 1, under it"]
    (slide,) = leaning_mold().layout.slides
    assert slide.serves == ("slide 1", "slide 1, under it")


def test_an_inclined_front_is_drawn_by_a_cylinder() -> None:
    slope = math.radians(30)
    axis = (math.cos(slope), 0.0, math.sin(slope))
    found = drive_fronts([replace(window_front(ONE[0]), axis=axis, release=axis)], part(), 0.0)[0][0]
    assert (found.drive, found.caught) == (Drive.CYLINDER, True)


def test_a_slide_that_is_drawn_first_leaves_all_cavity_steel() -> None:
    """From the front's near end at 28 to the body at 30 + 5, and 0.5 to be clear: 7.5 mm, not 2 + 2.5."""
    (body,) = wanted_bodies([(0, Driven(window_front(ONE[0]), Drive.CYLINDER, caught=True))], task())
    assert body.travel == pytest.approx(7.5)


# --- the body and its pin -------------------------------------------------------------------------------------------
def test_the_body_follows_the_rules() -> None:
    """Front 18 high and 12 wide, shoulder 4, 16 below the plane, land 5; 38 high, so 57 long; bore 11 + 2 x 5 wide."""
    (slide,) = side_mold().layout.slides
    body = slide.body
    assert body is not None
    assert (body.start, body.bottom, body.top, body.height) == (35.0, -16.0, 22.0, 38.0)
    assert body.length == pytest.approx(57.0)
    assert body.width == pytest.approx(21.0)
    assert (slide.travel, body.locking_deg) == (4.5, 17.0)


@pytest.mark.parametrize(("undercut", "angle"), [(9.5, 15.0), (13.0, 18.0), (15.0, 20.0), (17.0, 22.0), (20.0, 25.0)])
def test_a_longer_travel_takes_a_steeper_pin(undercut: float, angle: float) -> None:
    (slide,) = with_travel(undercut).layout.slides
    assert slide.pins[0].angle == angle
    assert slide.opening <= 50.0


def test_the_pin_has_the_printed_length() -> None:
    """M 12, c 0.5, 15 deg: L 48.36, H 44.78, D 1.93."""
    (slide,) = with_travel(9.5).layout.slides
    assert (slide.pins[0].working, slide.opening, slide.delay) == pytest.approx((48.36, 44.78, 1.93), abs=6e-3)


def test_the_pin_reaches_below_the_slides_top_by_its_working_length() -> None:
    """The outer side of the pin leaves the bore's edge a little before H + D: there it must be out of the slide."""
    (slide,) = with_travel(9.5).layout.slides
    pin, body = slide.pins[0], slide.body
    assert body is not None
    slope = math.radians(pin.angle)
    end = pin.length - pin.tip + OUT_EARLY
    outer_end = pin.top[2] - end * math.cos(slope) + pin.diameter / 2 * math.sin(slope)
    assert body.top - outer_end == pytest.approx(slide.opening + slide.delay, abs=1e-6)


def test_steel_stays_round_the_pin_and_before_the_part() -> None:
    (slide,) = with_travel(9.5).layout.slides
    pin, body = slide.pins[0], slide.body
    assert body is not None
    half = pin.bore / 2 / math.cos(math.radians(pin.angle))
    assert pin.at(body.top)[0] - half >= body.start + 5.0 - 1e-9
    assert pin.at(body.top)[0] + half <= body.locking_top - 5.0 + 1e-9
    assert pin.at(body.bottom)[0] + half <= body.side - 5.0 + 1e-9


def test_the_pin_keeps_clear_of_a_tall_part() -> None:
    """A part that rises 60 mm over the window: the pin leans over it, so it starts further out."""
    tall = cut(box((-30.0, -20.0, 0.0), (30.0, 20.0, 90.0)), box((-28.0, -18.0, -1.0), (28.0, 18.0, 88.0)))
    one = replace(task(), part=Body(window_cut(tall)))
    driven = drive_fronts([window_front(ONE[0])], one.part, 0.0)[0]
    room = room_needed(driven, one)
    assert room is not None
    block = BlockLayout((-60.0, -50.0, room.low[2]), (room.high[0], 50.0, 120.0))
    (slide,) = lay_out_sides(driven, ["slide 1"], one, block, 30.0)[0].slides
    pin = slide.pins[0]
    assert pin.at(90.0)[0] - pin.diameter / 2 / math.cos(math.radians(pin.angle)) >= LENGTH / 2 + 4.9


def test_a_far_travel_is_left_to_a_cylinder() -> None:
    (body,) = wanted_bodies([(0, with_travel(40.0).driven[0])], task())
    assert body.drive is Drive.CYLINDER
    assert body.pin is None


def test_a_wide_slide_gets_two_pins() -> None:
    wide = cut(box((-30.0, -80.0, 0.0), (30.0, 80.0, 30.0)), box((-28.0, -78.0, -1.0), (28.0, 78.0, 28.0)))
    opened = cut(wide, box((27.0, -60.0, 10.0), (31.0, 60.0, 18.0)))
    one = replace(task(), part=Body(opened))
    driven = drive_fronts([window_front((X, -60.0, 60.0, 10.0, 18.0))], one.part, 0.0)[0]
    (body,) = wanted_bodies([(0, driven[0])], one)
    assert body.pin is not None
    assert (body.pin.count, body.pin.spread) == (2, 64.0)


# --- room and neighbors ---------------------------------------------------------------------------------------------
def test_the_room_holds_body_guide_and_pin() -> None:
    room = room_needed(side_mold().driven, task())
    assert room is not None
    assert room.high[0] == pytest.approx(35.0 + 57.0)
    assert (room.low[1], room.high[1]) == pytest.approx((-10.5 - 16.0, 10.5 + 16.0))
    assert room.low[2] == pytest.approx(-16.0 - 15.0)
    assert room.high[2] >= 22.0 + 25.0


def test_no_slides_need_no_room() -> None:
    assert room_needed((), task()) is None


def test_a_block_without_room_is_refused_with_the_figure() -> None:
    one, driven = task(), side_mold().driven
    block = side_mold().block
    low = replace(block, high=(*block.high[:2], 30.0))
    with pytest.raises(PartError, match=r"leaves 8\.0 mm for it over it") as refused:
        lay_out_sides(driven, ["slide 1"], one, low, 30.0)
    assert "cavity_height" in refused.value.remedy
    short = replace(block, high=(50.0, *block.high[1:]))
    with pytest.raises(PartError, match="along its travel"):
        lay_out_sides(driven, ["slide 1"], one, short, 30.0)


def test_a_short_block_tilts_the_slide() -> None:
    block = side_mold().block
    short = replace(block, high=(84.0, *block.high[1:]))
    notes = lay_out_sides(side_mold().driven, ["slide 1"], task(), short, 30.0)[1]
    (finding,) = [f for f in notes.findings if f.code == "side.guide_length"]
    assert (finding.value, finding.limit, finding.severity) == (49.0, 57.0, Severity.WARNING)


def test_slides_round_a_corner_that_meet_are_refused() -> None:
    openings = ((X, 8.0, 17.0, 10.0, 18.0), (Y, -27.0, -10.0, 10.0, 18.0))
    fronts = tuple(Driven(window_front(o), Drive.ANGLED_PIN) for o in openings)
    with pytest.raises(PartError, match="they meet") as refused:
        _ = SideMold(openings[:1], fronts).layout
    assert refused.value.where == "slide 1 and slide 2"


def test_slides_apart_are_not_refused() -> None:
    openings = ((X, -6.0, 6.0, 10.0, 18.0), (MINUS_X, -6.0, 6.0, 10.0, 18.0))
    assert len(side_mold(openings).layout.slides) == 2
    refuse_meeting(side_mold(openings).layout.slides)


@pytest.mark.parametrize(("shift", "gap"), [((3.0, 0.0), 1.0), ((1.5, 0.0), -0.5), ((4.0, 9.0), 7.0)])
def test_the_gap_of_two_squares(shift: tuple[float, float], gap: float) -> None:
    square = np.array([(0.0, 0.0), (2.0, 0.0), (2.0, 2.0), (0.0, 2.0)])
    assert plan_gap(square, square + np.array(shift)) == pytest.approx(gap)


# --- findings -------------------------------------------------------------------------------------------------------
def test_a_good_slide_has_only_cautions() -> None:
    assert codes(side_mold().planned[1]) == {"side.not_back", "side.held_out", "side.opens_the_mold"}
    assert {f.severity for f in side_mold().planned[1].findings} == {Severity.CAUTION}


def test_the_melt_behind_the_slide_is_told() -> None:
    """12 x 18 mm^2 at the upper cavity pressure; square to the face it is divided by the cosine of 17 deg."""
    lines = {q.symbol: q.value for q in side_mold().planned[1].quantities}
    force = task().pressure * 12 * 18
    assert lines["slide_melt_force_kazmer"] == pytest.approx(force)
    assert lines["locking_axial_force"] == pytest.approx(force * math.tan(math.radians(17)))
    assert lines["locking_normal_force"] == pytest.approx(force / math.cos(math.radians(17)))


def planted(**changes) -> set[str]:
    """Return the findings of the good slide when its wanted body is changed."""
    (slide,) = side_mold().layout.slides
    (wanted,) = wanted_bodies([(0, side_mold().driven[0])], task())
    assert wanted.pin is not None
    pin = replace(wanted.pin, **{k: v for k, v in changes.items() if hasattr(wanted.pin, k)})
    body = replace(wanted, pin=pin, **{k: v for k, v in changes.items() if hasattr(wanted, k)})
    return codes(check_slide(slide, body, task())) - codes(side_mold().planned[1])


def test_each_limit_is_judged() -> None:
    assert planted() == set()
    assert planted(stress=151.0) == {"side.pin_bending"}
    assert planted(angle=22.0) == {"side.angle"}
    assert planted(angle=27.0) == {"side.angle", "rule.outside_range"}
    face = 21.0 * 22.0 / math.cos(math.radians(17))
    area = 80.0 * face * math.cos(math.radians(17)) / task().pressure
    assert planted(area=0.99 * area) == set()
    assert planted(area=1.01 * area) == {"side.heel_force"}


def test_a_pin_longer_than_any_blank_is_told() -> None:
    (slide,) = side_mold().layout.slides
    (wanted,) = wanted_bodies([(0, side_mold().driven[0])], task())
    long = replace(slide, pins=(replace(slide.pins[0], catalog_length=0.0),))
    assert "side.pin_length" in codes(check_slide(long, wanted, task()))


# --- lifters --------------------------------------------------------------------------------------------------------
BLOCK = BlockLayout((-60.0, -60.0, -40.0), (60.0, 60.0, 60.0))


def lifter_front(angle: float, travel: float) -> Front:
    slope = math.radians(angle)
    axis = (-math.sin(slope), 0.0, -math.cos(slope))
    square = np.array([(-3.0, -3.0), (3.0, -3.0), (3.0, 3.0), (-3.0, 3.0)])
    return Front(SideKind.LIFTER, axis, X, (square,), -5.0, 40.0, 0.0, travel, (0,), "by hand")


@pytest.mark.parametrize(
    ("angle", "stroke", "undercut", "expected"),
    [
        (8.0, 60.0, 7.0, {}),  # 8.43 sideways
        (8.0, 60.0, 8.0, {"side.lifter_travel": Severity.WARNING}),
        (8.0, 60.0, 8.5, {"side.lifter_travel": Severity.FAILURE}),
        (13.0, 60.0, 7.0, {"side.lifter_angle": Severity.WARNING, "rule.outside_range": Severity.CAUTION}),
        (16.0, 60.0, 7.0, {"side.lifter_angle": Severity.FAILURE, "rule.outside_range": Severity.CAUTION}),
    ],
)
def test_a_lifter_is_held_against_its_limits(angle, stroke, undercut, expected) -> None:
    lifter, notes = lay_out_lifter(lifter_front(angle, undercut), "lifter 1", part(), BLOCK, stroke)
    assert {f.code: f.severity for f in notes.findings} == expected
    assert lifter.travel == pytest.approx(stroke * math.tan(math.radians(angle)))
    assert lifter.angle == pytest.approx(angle)
    assert lifter.guided == pytest.approx(40.0 / math.cos(math.radians(angle)))


def test_a_lifter_with_a_short_guide_is_told() -> None:
    low = BlockLayout((-60.0, -60.0, -8.0), (60.0, 60.0, 60.0))
    assert codes(lay_out_lifter(lifter_front(8.0, 5.0), "lifter 1", part(), low, 60.0)[1]) == {"side.lifter_guide"}


def test_a_lifter_without_a_stroke_does_not_release() -> None:
    notes = lay_out_lifter(lifter_front(8.0, 5.0), "lifter 1", part(), BLOCK, 0.0)[1]
    assert codes(notes) == {"side.lifter_travel"}
