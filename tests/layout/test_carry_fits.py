"""What is cut stays: bores, stroke, lengths of pins and the feed of an accepted layout on a part that changed."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.finding import Notes
from moldgen.layout.carry_fits import keep_fit
from moldgen.layout.ejection import GivenPin, ejector_stroke
from moldgen.layout.kept import Kept, KeptFeed, KeptGate, KeptItem
from moldgen.layout.plan import Wishes, plan_layout
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, EjectorPinLayout, Layout
from moldgen.rules.layout_practice import STEEL_TO_EDGE
from moldgen.spec.sections import Ejection, Gate

from .shapes import box, plate, view_of

ABS = resin("ABS")
EXACT = 1e-9
"""mm: as well as it is written."""


def cap(ceiling: float = 20.0, end: float = 8.0, roof: float = 2.0) -> Any:
    """A box 60 x 40 mm, open below, with two posts under its ceiling that end at a height and have blind holes 4 mm."""
    posts = cq.Workplane("XY", origin=(0, 0, end)).pushPoints([(15.0, 8.0), (-15.0, 8.0)])
    holes = posts.circle(2.0).extrude(ceiling - end - 2.0)
    return (
        box(60.0, 40.0, 2.0, ceiling)
        .union(posts.circle(5.0).extrude(ceiling - end))
        .cut(holes)
        .union(plate(64.0, 44.0, roof).translate((0, 0, ceiling)))
    )


def view(shape: Any, block: tuple[float, float] = (-40.0, 60.0)) -> PartView:
    """Look at a part in a block that stays where it is: 144 x 124 mm, between two heights."""
    found = view_of(shape)
    low, high = np.array([-72.0, -62.0, block[0]]), np.array([72.0, 62.0, block[1]])
    return PartView(replace(found.halves, low=low, high=high))


def laid(shape: Any, kept: Kept | None = None, **wishes: Any) -> tuple[Layout, Notes]:
    return plan_layout(view(shape), ABS, Wishes(kept=kept, **wishes))


def end_of(pin: EjectorPinLayout | CorePinLayout) -> float:
    """Return the height at which the bore widens."""
    if isinstance(pin, CorePinLayout):
        return pin.base_z - pin.fit_length
    return pin.tip_z - pin.tip_drop - pin.fit_length


def kept(layout: Layout) -> Kept:
    """Accept a layout; the part may be another one."""
    gate = layout.gate
    sizes = (gate.width, gate.depth, gate.land, gate.diameter)
    feed = KeptFeed(gate.runner_diameter, gate.runner_length, gate.sprue_foot_diameter or gate.diameter, gate.at[2])
    return Kept(
        tuple(
            KeptItem(p.name, (p.x, p.y, p.tip_z), p.diameter, fit_end=end_of(p), length=p.length)
            for p in layout.ejector_pins
        ),
        tuple(
            KeptItem(p.name, (p.x, p.y, p.base_z), p.diameter, fit_end=end_of(p), length=0.0) for p in layout.core_pins
        ),
        tuple(KeptItem("round core", at, 0.0) for at in layout.cores_in_block),
        KeptGate(gate.kind, gate.at, *sizes, feed=feed, inward=gate.inward[:2]),
        layout.stroke_mm,
    )


@pytest.fixture(scope="module")
def first() -> Layout:
    layout, _ = laid(cap())
    assert layout.ejector_pins
    assert len(layout.core_pins) == 2
    return layout


def pins(layout: Layout) -> dict[str, EjectorPinLayout | CorePinLayout]:
    return {p.name: p for p in (*layout.core_pins, *layout.ejector_pins)}


def codes(notes: Notes) -> list[str]:
    return [f.code for f in notes.findings if f.code.startswith("accepted.")]


# --- bores -----------------------------------------------------------------------------------------------------------
@pytest.mark.parametrize(
    ("end", "length"),
    [
        (None, 15.0),  # a new hole: 2.5 diameters of 6 mm
        (5.0, 15.0),
        (5.0 + 1e-6, 15.0),  # an older file: six decimals
        (8.0, 12.0),  # 2 diameters
        (8.1, 15.0),
        (2.0, 18.0),  # 3 diameters
        (1.9, 15.0),
        (-50.0, 15.0),  # it would leave the block
    ],
)
def test_a_fit_stays_between_two_and_three_diameters(end: float | None, length: float) -> None:
    fit = keep_fit(6.0, 15.0, 20.0, -10.0, end)
    assert fit.length == pytest.approx(length, abs=EXACT)
    assert (fit.limit is None) == (end is None or 2.0 <= end <= 8.0)
    if fit.limit is not None:
        assert fit.limit == (12.0 if end == 8.1 else 18.0)


def test_the_fit_of_a_thin_pin_may_be_8_to_12_mm() -> None:
    lengths = [keep_fit(2.0, 10.0, 20.0, -10.0, end).length for end in (7.9, 8.0, 12.0, 12.1)]
    assert lengths == pytest.approx([10.0, 12.0, 8.0, 10.0])


@pytest.mark.parametrize("by", [-0.6, 0.6])
def test_where_the_ceiling_moves_the_bores_of_kept_pins_stay(first: Layout, by: float) -> None:
    layout, notes = laid(cap(20.0 + by), kept(first))
    fresh, _ = laid(cap(20.0 + by))
    old, new = pins(first), pins(layout)
    assert new.keys() == old.keys()
    for name, pin in old.items():
        assert end_of(new[name]) == pytest.approx(end_of(pin), abs=EXACT)
    own = [p.name for p in layout.ejector_pins if abs(p.tip_z - (20.0 + by)) < 1e-6]
    assert own, "there are pins at the ceiling"
    for name in own:
        assert new[name].fit_length == pytest.approx(old[name].fit_length + by, abs=EXACT)
    assert {round(p.fit_length, 6) for p in fresh.ejector_pins} <= {round(p.fit_length, 6) for p in first.ejector_pins}
    assert codes(notes) == (["accepted.stroke"] if by > 0.0 else [])
    (decision,) = [d for d in notes.decisions if d.topic == "fits kept"]
    assert all(name in decision.choice for name in own)


def test_the_bore_of_a_kept_core_pin_stays_where_its_foot_moves(first: Layout) -> None:
    for end in (7.2, 8.7):
        layout, notes = laid(cap(end=end), kept(first))
        for now, then in zip(layout.core_pins, first.core_pins, strict=True):
            assert now.base_z == pytest.approx(end)
            assert end_of(now) == pytest.approx(end_of(then), abs=EXACT)
        assert codes(notes) == []


def test_a_fit_that_would_get_too_short_is_made_anew_and_tells_value_and_limit(first: Layout) -> None:
    layout, notes = laid(cap(end=5.0), kept(first))
    (diameter,) = {p.diameter for p in first.core_pins}
    for now, then in zip(layout.core_pins, first.core_pins, strict=True):
        assert now.fit_length == pytest.approx(then.fit_length)
        assert end_of(now) == pytest.approx(end_of(then) - 3.0)
    found = [f for f in notes.findings if f.code == "accepted.fit_made_anew"]
    assert len(found) == 2
    for finding in found:
        assert finding.value == pytest.approx(first.core_pins[0].fit_length - 3.0, abs=1e-3)
        assert finding.limit == pytest.approx(max(8.0, 2 * diameter))
        assert "steel is missing" in finding.message
        assert finding.remedy


def test_a_fit_that_would_get_too_long_is_made_anew(first: Layout) -> None:
    layout, notes = laid(cap(27.0), kept(first))
    (diameter,) = {p.diameter for p in first.ejector_pins}
    found = [f for f in notes.findings if f.code == "accepted.fit_made_anew"]
    assert found
    assert {f.limit for f in found} == {max(12.0, 3 * diameter)}
    assert all("drilled deeper" in f.message for f in found)
    assert {p.fit_length for p in layout.ejector_pins} == {p.fit_length for p in first.ejector_pins}


def test_a_pin_that_follows_its_face_gets_a_new_hole(first: Layout) -> None:
    accepted = kept(first)
    x, y, z = accepted.ejector_pins[0].at
    moved = replace(accepted.ejector_pins[0], at=(x + 0.5, y, z), shift=(0.5, 0.0, 0.0))
    layout, _ = laid(cap(19.4), replace(accepted, ejector_pins=(moved, *accepted.ejector_pins[1:])))
    now, then = layout.ejector_pins[0], first.ejector_pins[0]
    assert now.x == pytest.approx(x + 0.5)
    assert now.fit_length == then.fit_length
    assert end_of(layout.ejector_pins[1]) == pytest.approx(end_of(first.ejector_pins[1]), abs=EXACT)


def test_the_bores_of_pins_of_the_spec_stay_too(first: Layout) -> None:
    """The spec gives the places; how their holes are cut is known from the accepted layout."""
    accepted = kept(first)
    given: dict[str, Any] = {
        "pins": tuple(GivenPin(p.at, p.diameter) for p in accepted.ejector_pins),
        "core_pins_at": tuple(p.at for p in accepted.core_pins),
        "ejection": Ejection.model_validate({"pins": [{"at": [0, 0, 0]}]}),  # then none is added
    }
    cut = Kept(
        given_pins=accepted.ejector_pins, given_cores=accepted.core_pins, gate=accepted.gate, stroke=accepted.stroke
    )
    layout, notes = laid(cap(19.4, end=8.5), cut, **given)
    assert {p.chosen_by for p in (*layout.ejector_pins, *layout.core_pins)} == {Chooser.GIVEN}
    now, then = ({(p.x, p.y): end_of(p) for p in pins(one).values()} for one in (layout, first))
    assert now.keys() == then.keys()
    assert [now[at] for at in then] == pytest.approx(list(then.values()), abs=EXACT)
    assert codes(notes) == []
    aside = tuple(GivenPin((p.at[0] + 1.0, *p.at[1:]), p.diameter) for p in accepted.ejector_pins)
    layout, _ = laid(cap(19.4), cut, **{**given, "pins": aside})
    assert {p.fit_length for p in layout.ejector_pins} == {p.fit_length for p in first.ejector_pins}, "new holes"


# --- stroke and lengths ----------------------------------------------------------------------------------------------
@pytest.mark.parametrize(("ceiling", "fresh"), [(20.0, 25.0), (19.4, 25.0), (18.9, 24.0), (15.0, 20.0)])
def test_a_stroke_that_is_enough_stays_and_so_do_the_pins_on_the_shelf(
    first: Layout, ceiling: float, fresh: float
) -> None:
    assert first.stroke_mm == 25.0  # 20 mm deep, and 5 mm (Pye)
    layout, notes = laid(cap(ceiling), kept(first))
    assert laid(cap(ceiling))[0].stroke_mm == fresh
    assert layout.stroke_mm == 25.0
    old = {p.name: (p.length, p.seat_z) for p in first.ejector_pins}
    assert {p.name: (p.length, p.seat_z) for p in layout.ejector_pins if p.name in old} == old
    assert "accepted.stroke" not in codes(notes)


def test_a_stroke_between_the_rule_and_the_next_millimetre_stays() -> None:
    shape = view(cap(19.3))
    assert ejector_stroke(shape, Ejection())[0] == 25.0
    assert ejector_stroke(shape, Ejection(), 24.5)[0] == 24.5
    assert ejector_stroke(shape, Ejection(stroke=30.0), 24.5)[0] == 30.0, "the spec comes first"


def test_a_stroke_that_frees_the_part_no_more_grows_and_tells_it(first: Layout) -> None:
    layout, notes = laid(cap(20.5), kept(first))
    assert layout.stroke_mm == 26.0
    (finding,) = [f for f in notes.findings if f.code == "accepted.stroke"]
    assert (finding.value, finding.limit, finding.unit) == (25.0, 25.5, "mm")


def test_a_bought_pin_stays_though_a_shorter_one_would_do(first: Layout) -> None:
    accepted = kept(first)
    longer = tuple(replace(p, length=p.length + 60.0) for p in accepted.ejector_pins)
    layout, _ = laid(cap(), replace(accepted, ejector_pins=longer))
    assert [p.length for p in layout.ejector_pins] == [p.length + 60.0 for p in first.ejector_pins]
    short = tuple(replace(p, length=20.0) for p in accepted.ejector_pins)
    layout, _ = laid(cap(), replace(accepted, ejector_pins=short))
    assert [p.length for p in layout.ejector_pins] == [p.length for p in first.ejector_pins]


# --- feed ------------------------------------------------------------------------------------------------------------
def fed(first: Layout, shape: Any, block: tuple[float, float] = (-40.0, 60.0), **feed: float) -> tuple[Any, Notes]:
    """Return the gate on a part, with other numbers in the accepted feed."""
    accepted = kept(first)
    assert accepted.gate is not None
    gate = replace(accepted.gate, feed=replace(accepted.gate.feed, **feed))
    layout, notes = plan_layout(view(shape, block), ABS, Wishes(kept=replace(accepted, gate=gate)))
    assert layout.gate.at[:2] == pytest.approx(first.gate.at[:2], abs=1e-3)
    return layout.gate, notes


def test_the_feed_stays_though_a_lighter_part_would_get_a_thinner_runner(first: Layout) -> None:
    thick = first.gate.runner_diameter + 1.0
    gate, notes = fed(first, cap(), runner=thick, length=20.0, foot=thick + 2.0)
    assert (gate.runner_diameter, gate.runner_length, gate.sprue_foot_diameter) == (thick, 20.0, thick + 2.0)
    assert codes(notes) == []


def test_a_runner_that_is_too_thin_becomes_thicker_and_tells_it(first: Layout) -> None:
    gate, notes = fed(first, cap(), runner=2.0)
    assert gate.runner_diameter == first.gate.runner_diameter
    (finding,) = [f for f in notes.findings if f.code == "accepted.resized"]
    assert "runner becomes" in finding.message
    assert (finding.value, finding.limit) == (2.0, first.gate.runner_diameter)


def test_a_runner_that_has_no_room_any_more_becomes_shorter(first: Layout) -> None:
    """The block ends where the sprue at the far end of the accepted runner would stand."""
    accepted, wide = kept(first), view(cap())
    assert accepted.gate is not None
    gate = replace(accepted.gate, feed=replace(accepted.gate.feed, length=25.0))
    far = np.array(first.gate.at[:2]) - (25.0 + first.gate.land) * np.array(first.gate.inward[:2])
    half = np.maximum(np.abs(far), (32.0 + 5.0, 22.0 + 5.0))
    low, high = np.array([*-half, -40.0]), np.array([*half, 60.0])
    narrow = PartView(replace(wide.halves, low=low, high=high))
    layout, notes = plan_layout(narrow, ABS, Wishes(kept=replace(accepted, gate=gate)))
    assert layout.gate.runner_length < 25.0
    (finding,) = [f for f in notes.findings if "length of the runner becomes" in f.message]
    assert (finding.value, finding.limit) == (25.0, layout.gate.runner_length)


def test_the_sprue_of_a_higher_block_stays_until_its_orifice_is_too_narrow(first: Layout) -> None:
    """The sprue narrows by 2 tan 1 deg a millimetre; 3.5 mm at the nozzle are usual, 2.5 mm the least (practice)."""
    foot = first.gate.sprue_foot_diameter
    assert foot == pytest.approx(3.5 + 120.0 * TAN)
    gate, notes = fed(first, cap(), (-40.0, 80.0))
    assert gate.sprue_foot_diameter == foot
    assert codes(notes) == []
    gate, notes = fed(first, cap(), (-40.0, 90.0))
    assert gate.sprue_foot_diameter == pytest.approx(3.5 + 180.0 * TAN)
    (finding,) = [f for f in notes.findings if f.code == "accepted.resized"]
    assert "foot of the sprue becomes" in finding.message


TAN = math.tan(math.radians(1.0))


def test_a_direct_sprue_keeps_its_cone_where_the_roof_comes_down() -> None:
    asked: dict[str, Any] = {"gate": Gate(kind="sprue")}
    then, _ = laid(cap(), **asked)
    gate = then.gate
    lower, notes = laid(cap(19.0), kept(then), **asked)
    assert lower.gate.at[2] == pytest.approx(gate.at[2] - 1.0)
    assert lower.gate.diameter == pytest.approx(gate.diameter + 2.0 * TAN, abs=EXACT), "no steel is missing round it"
    assert codes(notes) == []
    higher, _ = laid(cap(21.0), kept(then), **asked)
    assert higher.gate.diameter == gate.diameter, "it is cut wider: the rule wants this foot"


def test_an_older_layout_without_fits_and_feed_is_kept_as_before(first: Layout) -> None:
    accepted = kept(first)
    assert accepted.gate is not None
    old = replace(
        accepted,
        ejector_pins=tuple(replace(p, fit_end=None, length=0.0) for p in accepted.ejector_pins),
        core_pins=tuple(replace(p, fit_end=None) for p in accepted.core_pins),
        gate=replace(accepted.gate, feed=KeptFeed()),
    )
    layout, notes = laid(cap(19.4), old)
    for now, then in zip(layout.ejector_pins, first.ejector_pins, strict=True):
        assert (now.x, now.y, now.fit_length) == (then.x, then.y, then.fit_length)
    assert layout.gate.runner_diameter == first.gate.runner_diameter
    assert codes(notes) == []


def looking(first: Layout, turn: float, *, same: bool = False) -> tuple[Any, Any, Notes]:
    """Return the accepted way of the gate when it is turned [deg], and the gate on the part with notes."""
    accepted = kept(first)
    assert accepted.gate is not None
    way = math.atan2(first.gate.inward[1], first.gate.inward[0]) + math.radians(turn)
    gate = replace(accepted.gate, inward=(round(math.cos(way), 9), round(math.sin(way), 9)))
    layout, notes = laid(cap(), replace(accepted, gate=gate, same_part=same))
    assert layout.gate.at[:2] == pytest.approx(first.gate.at[:2], abs=1e-6)
    return gate, layout.gate, notes


@pytest.mark.parametrize("same", [False, True])
@pytest.mark.parametrize("turn", [0.0, 0.4, -3.0])
def test_the_gate_keeps_its_way_into_the_part_and_with_it_runner_and_sprue(
    first: Layout, turn: float, same: bool
) -> None:
    accepted, gate, notes = looking(first, turn, same=same)
    assert gate.inward == (*accepted.inward, 0.0)
    assert (gate.width, gate.depth, gate.runner_length) == (
        first.gate.width,
        first.gate.depth,
        first.gate.runner_length,
    )
    assert "accepted.turned" not in codes(notes)


def test_a_gate_that_would_lean_too_far_turns_and_tells_it(first: Layout) -> None:
    _, gate, notes = looking(first, 6.0)
    assert gate.inward == first.gate.inward
    (finding,) = [f for f in notes.findings if f.code == "accepted.turned"]
    assert (finding.value, finding.limit) == (pytest.approx(6.0), 5.0)


def test_where_the_old_way_has_no_room_the_gate_turns_and_tells_it(first: Layout) -> None:
    """A block ends beside the sprue: square to the part it just has its steel, turned by 4 deg it has not."""
    accepted, at, way = kept(first), np.array(first.gate.at[:2]), np.array(first.gate.inward[:2])
    assert accepted.gate is not None
    feed = replace(accepted.gate.feed, length=25.0)
    turn = math.radians(4.0)
    cos, sin = math.cos(turn), math.sin(turn)
    turned = (float(cos * way[0] - sin * way[1]), float(sin * way[0] + cos * way[1]))
    back = first.gate.land + 25.0
    square, leaning = at - back * way, at - back * np.array(turned)
    axis = int(np.argmax(np.abs(leaning - square)))
    sign = 1.0 if leaning[axis] > square[axis] else -1.0
    found = view_of(cap())
    low, high = np.array([-120.0, -120.0, -40.0]), np.array([120.0, 120.0, 60.0])
    edge = square[axis] + sign * (first.gate.sprue_foot_diameter / 2 + STEEL_TO_EDGE.default + 0.5)
    (high if sign > 0 else low)[axis] = edge
    part = PartView(replace(found.halves, low=low, high=high))
    wishes = Wishes(kept=replace(accepted, gate=replace(accepted.gate, feed=feed, inward=turned)))
    layout, notes = plan_layout(part, ABS, wishes)
    assert layout.gate.runner_length == 25.0
    assert layout.gate.inward == pytest.approx(first.gate.inward)
    (finding,) = [f for f in notes.findings if f.code == "accepted.turned"]
    assert "breaks rules" in finding.message
