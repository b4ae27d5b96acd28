"""Slides of a box with windows: volumes against closed forms, the whole way past everything, and planted faults."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from helpers.side_molds import (
    LENGTH,
    MINUS_X,
    ONE,
    WALL,
    SideMold,
    X,
    Y,
    failed,
    leaning_mold,
    oblique,
    side_mold,
    window_front,
)

from moldgen.errors import KernelError
from moldgen.kernel.measure import volume
from moldgen.layout.side_drive import Driven
from moldgen.model.motion import Step
from moldgen.model.slide import Drive, SideLayout
from moldgen.model.tool import Motion, Role
from moldgen.proof.opening import SIDES_MOVE
from moldgen.proof.rest import APART, FILLED
from moldgen.steel.side_actions import cut_side_actions
from moldgen.steel.side_motion import opening_steps
from moldgen.steel.slide_solids import LEAD, body_solid

OPPOSITE = ((X, -6.0, 6.0, 10.0, 18.0), (MINUS_X, -6.0, 6.0, 10.0, 18.0))
BESIDE = ((X, -14.0, -6.0, 10.0, 18.0), (X, 4.0, 12.0, 4.0, 20.0))
DEEP = SideMold(ONE, (Driven(replace(side_mold().driven[0].front, travel=12.0), Drive.ANGLED_PIN),))
BY_CYLINDER = SideMold(ONE, (Driven(window_front(ONE[0]), Drive.CYLINDER, caught=True),))
MOLDS = {
    "one": side_mold(),
    "two opposite": side_mold(OPPOSITE),
    "two on one body": side_mold(BESIDE),
    "along y": side_mold(((Y, -10.0, 10.0, 3.0, 25.0),)),
    "deep": DEEP,
    "by cylinder": BY_CYLINDER,
    "at 20 deg in plan": side_mold(oblique(20.0)),
    "at -45 deg in plan": side_mold(oblique(-45.0)),
    "in a wall with draft": leaning_mold(),
}


def only(mold: SideMold, role: Role):
    (found,) = [c for c in mold.made.components if c.role is role]
    return found


def test_a_slide_has_the_volume_of_its_pieces() -> None:
    """T less what the locking face cuts off, the window's plug, the steel under it, less the leaning bore."""
    (slide,), body = side_mold().layout.slides, side_mold().layout.slides[0].body
    assert body is not None
    assert volume(body_solid(slide, (side_mold().halves.low, side_mold().halves.high))) == pytest.approx(
        body.volume_mm3, rel=1e-9
    )
    front = 12 * 8 * WALL + 12 * 18 * (body.start - LENGTH / 2)
    bore = math.pi / 4 * slide.pins[0].bore ** 2 * body.height / math.cos(math.radians(slide.pins[0].angle))
    assert volume(only(side_mold(), Role.SLIDE).solid) == pytest.approx(body.volume_mm3 + front - bore, rel=1e-7)


def test_an_angled_pin_has_the_volume_of_its_pieces() -> None:
    """A head cut off flush at an angle has the volume of its mean height."""
    (pin,) = side_mold().layout.slides[0].pins
    radius, nose = pin.diameter / 2, pin.diameter / 2 - pin.tip * math.tan(math.radians(LEAD))
    head = math.pi / 4 * pin.head_diameter**2 * pin.head_depth
    shank = math.pi * radius**2 * (pin.length - pin.tip - pin.head_depth)
    tip = math.pi / 3 * pin.tip * (radius**2 + radius * nose + nose**2)
    assert volume(only(side_mold(), Role.ANGLED_PIN).solid) == pytest.approx(head + shank + tip, rel=1e-6)


@pytest.mark.parametrize("name", MOLDS)
def test_every_proof_holds_on_the_whole_way(name: str) -> None:
    assert failed(MOLDS[name]) == set()


def test_two_fronts_of_one_body_make_one_slide() -> None:
    made = side_mold(BESIDE).made
    assert [(c.name, c.motion) for c in made.components if c.role is Role.SLIDE] == [("slide 1", "slide 1")]
    assert side_mold(BESIDE).layout.slides[0].serves == ("slide 1", "slide 2")


def test_a_long_pin_gets_a_bore_under_the_slide_in_which_it_rises() -> None:
    (slide,) = DEEP.layout.slides
    (hole,) = [h for h in DEEP.made.holes if h.component == "core"]
    pin, body = slide.pins[0], slide.body
    assert body is not None
    assert hole.z_to_mm == body.bottom
    assert DEEP.halves.low[2] < hole.z_from_mm < pin.tip_z
    reach = math.dist(pin.at(body.bottom), pin.at(pin.tip_z))
    assert hole.diameter_mm >= reach + pin.diameter


def test_the_table_has_every_bore_of_a_pin() -> None:
    rows = [(h.component, h.purpose.split(", ")[1], h.diameter_mm) for h in side_mold().made.holes]
    assert rows == [("cavity", "head seat", 16.0), ("cavity", "fit", 10.0), ("slide 1", "clearance bore", 11.0)]


def test_what_is_bored_out_is_named() -> None:
    removed = {(r.half, r.purpose) for r in BY_CYLINDER.made.removed}
    assert removed == {("slide 1", "rod of slide 1")}


def steps_with(mold: SideMold, way: float, name: str = "slide 1") -> list[Step]:
    """The mold's own steps, the motion of one slide multiplied."""
    return [
        Step(s.name, tuple((g, tuple(way * v for v in m)) if g == name else (g, m) for g, m in s.moves))
        for s in opening_steps(mold.layout, 80.0, 35.0, 40.0)
    ]


@pytest.mark.parametrize(
    ("way", "broken"),
    [
        (-1.0, {SIDES_MOVE}),  # inward, into the core
        (0.0, {SIDES_MOVE}),  # not at all: its angled pin is torn off
        (0.3, {SIDES_MOVE}),  # 1.35 mm, less than the wall is thick
        (1.3, {SIDES_MOVE}),  # faster than its pin leans
    ],
    ids=["inward", "still", "short", "fast"],
)
def test_a_wrong_motion_is_found(way: float, broken: set[str]) -> None:
    assert failed(side_mold(), steps_with(side_mold(), way)) >= broken


def test_a_slide_drawn_after_the_opening_is_found() -> None:
    """Cavity steel lies under the window's front: the cylinder must come first."""
    first, *rest = opening_steps(BY_CYLINDER.layout, 80.0, 35.0, 40.0)
    assert SIDES_MOVE in failed(BY_CYLINDER, [rest[0], first, *rest[1:]])


def test_a_locking_face_that_leans_less_than_the_pin_is_found() -> None:
    slide = side_mold().layout.slides[0]
    assert slide.body is not None
    worse = replace(slide, body=replace(slide.body, locking_deg=slide.pins[0].angle - 3.0))
    mold = SideMold(ONE, side_mold().driven)
    mold.__dict__["planned"] = (SideLayout((worse,)), side_mold().planned[1])
    assert failed(mold) == {SIDES_MOVE}


def test_a_body_that_meets_the_part_is_refused() -> None:
    slide = side_mold().layout.slides[0]
    assert slide.body is not None
    worse = replace(slide, body=replace(slide.body, start=LENGTH / 2 - 1.0))
    with pytest.raises(KernelError, match="it meets the part"):
        cut_side_actions(side_mold().halves, SideLayout((worse,)), "1.2311")


def test_forgotten_bores_unbalance_the_block() -> None:
    mold = SideMold(ONE, side_mold().driven)
    mold.__dict__["made"] = replace(side_mold().made, removed=side_mold().made.removed[:1])
    assert failed(mold) == {FILLED}


def test_a_pin_without_a_bore_is_found() -> None:
    """The slide's own bore taken away: pin and slide share the place, and hit each other when the mold opens."""
    mold = SideMold(ONE, side_mold().driven)
    bodies = list(side_mold().bodies)
    place = next(i for i, b in enumerate(bodies) if b.role is Role.SLIDE)
    whole = body_solid(side_mold().layout.slides[0], (side_mold().halves.low, side_mold().halves.high))
    bodies[place] = replace(bodies[place], solid=whole)
    mold.__dict__["bodies"] = bodies
    assert failed(mold) >= {APART, FILLED, SIDES_MOVE}


def test_pins_move_with_the_cavity_half() -> None:
    assert only(side_mold(), Role.ANGLED_PIN).motion == Motion.CAVITY_HALF
