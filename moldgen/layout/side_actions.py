"""Slides and lifters outside the part: bodies, angled pins, locking faces, travel; and the room that they need."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from moldgen.errors import PartError
from moldgen.finding import Decision, Notes
from moldgen.layout.lifters import lay_out_lifter
from moldgen.layout.side_checks import check_slide
from moldgen.layout.side_core_pins import core_pin_of
from moldgen.layout.side_drive import Driven, is_level
from moldgen.layout.side_neighbors import refuse_meeting
from moldgen.layout.slide_body import SideTask, WantedBody, wanted_bodies
from moldgen.layout.slide_pin import PinChoice
from moldgen.model.layout import BlockLayout
from moldgen.model.part import Vector
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import AngledPinLayout, Drive, SideCorePinLayout, SideLayout, SlideBody, SlideLayout
from moldgen.model.tool import Motion
from moldgen.rules.side_practice import (
    LEDGE_HEIGHT,
    LEDGE_WIDTH,
    PIN_HELD,
    PIN_TIP,
    PIN_WALL,
    STEEL_OVER_SLIDE,
    STEEL_UNDER_SLIDE,
    UNDER_TIP,
)
from moldgen.rules.slide import slide_travel_practice

NO_ROOM: Final = 0.01
"""mm: a block may be smaller than what a slide wants by this."""


def room_needed(driven: Sequence[Driven], task: SideTask) -> BlockLayout | None:
    """Return the corners of a box that the block must hold for the slides; None without level slides.

    Of the corners only what the slides need counts: unite them with those that the part needs.
    """
    corners = []
    for body in wanted_bodies(_level_slides(driven), task):
        frame = across((float(body.axis[0]), float(body.axis[1]), float(body.axis[2])))
        low = body.window.low - _under(body)
        high = body.window.high + _over(body)
        for u in (body.left, body.right):
            for s, z in ((body.start, low), (body.start + body.length, high)):
                plan = u * frame[0] + s * frame[2]
                corners.append((float(plan[0]), float(plan[1]), z))
    if not corners:
        return None
    box = np.array(corners)
    (a, b, c), (d, e, f) = box.min(axis=0).tolist(), box.max(axis=0).tolist()
    return BlockLayout((a, b, c), (d, e, f))


def lay_out_sides(
    driven: Sequence[Driven], names: Sequence[str], task: SideTask, block: BlockLayout, stroke: float
) -> tuple[SideLayout, Notes]:
    """Return slides and lifters in the block.

    Parameters
    ----------
    driven, names : fronts with their drives, and the names of their steel ("slide 1", "lifter 1"), in the same order
    task : the part, the level of the parting plane, resin and steel
    block : the closed block
    stroke : of the ejectors [mm]

    Raises
    ------
    PartError : two slides meet, or the block leaves no room for a slide
    """
    slides, notes = [], Notes()
    for wanted in wanted_bodies(_level_slides(driven), task):
        serves = tuple(names[n] for n in wanted.members)
        slide = _slide(wanted, serves, task, block, _core_pins(wanted.members, driven, names))
        slides.append(slide)
        notes += check_slide(slide, wanted, task) + _told(slide)
    for number, one in enumerate(driven):
        if one.front.kind is SideKind.SLIDE and not is_level(one.front):
            slide = _inclined(one.front, names[number], task, block)
            slides.append(slide)
            notes += check_slide(slide, None, task) + _told(slide)
    order = {name: place for place, name in enumerate(names)}
    slides.sort(key=lambda s: order[s.name])
    refuse_meeting(slides)
    lifters = []
    for number, one in enumerate(driven):
        if one.front.kind is SideKind.LIFTER:
            lifter, more = lay_out_lifter(one.front, names[number], task.part, block, stroke)
            lifters.append(lifter)
            notes += more
    return SideLayout(tuple(slides), tuple(lifters)), notes


def _level_slides(driven: Sequence[Driven]) -> list[tuple[int, Driven]]:
    return [(n, d) for n, d in enumerate(driven) if d.front.kind is SideKind.SLIDE and is_level(d.front)]


def _over(body: WantedBody) -> float:
    """Return the steel over a slide: its angled pin is held in it over 1.5 diameters under the head."""
    if body.pin is None:
        return STEEL_OVER_SLIDE.default
    pin = body.pin
    held = _head_depth(pin) + PIN_HELD.default * pin.diameter
    return max(STEEL_OVER_SLIDE.default, held * math.cos(math.radians(pin.angle)))


def _under(body: WantedBody) -> float:
    """Return the core steel under a slide: the tip of its angled pin stands in it, too."""
    if body.pin is None:
        return STEEL_UNDER_SLIDE.default
    pin, slope = body.pin, math.radians(body.pin.angle)
    tip = pin.reach * math.cos(slope) + pin.diameter / 2 * math.sin(slope) - (body.window.high - body.window.low)
    return max(STEEL_UNDER_SLIDE.default, tip + UNDER_TIP.default + PIN_WALL.default)


def _head_depth(pin: PinChoice) -> float:
    """Return how far down the axis the lower face of the head lies, so that the head is whole at its thinner side."""
    return pin.blank.head_height + pin.blank.head_diameter / 2 * math.tan(math.radians(pin.angle))


def _exit(window: tuple[float, float], frame: np.ndarray, block: BlockLayout) -> float:
    """Return where the nearer edge of a body meets the side of the block, along its axis."""
    low, high = np.asarray(block.low), np.asarray(block.high)
    exits = []
    for u in window:
        for i in range(2):
            if abs(frame[2][i]) > NO_ROOM * NO_ROOM:
                bound = high[i] if frame[2][i] > 0 else low[i]
                exits.append(float((bound - u * frame[0][i]) / frame[2][i]))
    return min(exits)


def _core_pins(members: Sequence[int], driven: Sequence[Driven], names: Sequence[str]) -> tuple[SideCorePinLayout, ...]:
    """Return the fronts that become pins of their own: round, long, and with no steel under them in their way."""
    with_saddle = {n - 1 for n, d in enumerate(driven) if d.under}
    own = (core_pin_of(driven[n].front, names[n]) for n in members if n not in with_saddle and not driven[n].under)
    return tuple(pin for pin in own if pin is not None)


def _slide(
    wanted: WantedBody,
    serves: tuple[str, ...],
    task: SideTask,
    block: BlockLayout,
    core_pins: tuple[SideCorePinLayout, ...],
) -> SlideLayout:
    axis: Vector = (float(wanted.axis[0]), float(wanted.axis[1]), 0.0)
    frame, window, wide = across(axis), wanted.window, LEDGE_WIDTH.default
    side = _exit((window.left - wide, window.right + wide), frame, block)
    body = SlideBody(wanted.start, side, window.left, window.right, window.low, window.high, task.level, wide,
                     LEDGE_HEIGHT.default, wanted.foot, wanted.locking_deg)  # fmt: skip
    name = serves[0]
    _refuse_no_room(name, body, wanted, block)
    if wanted.pin is None:
        return SlideLayout(name, serves, axis, wanted.drive, Motion.CORE_HALF, body, wanted.travel, 0.0, 0.0,
                           core_pins=core_pins)  # fmt: skip
    pins = _pins(name, body, wanted, wanted.pin, block, core_pins)
    return SlideLayout(name, serves, axis, Drive.ANGLED_PIN, Motion.CORE_HALF, body, wanted.travel,
                       wanted.pin.delay, wanted.pin.opening, pins, core_pins)  # fmt: skip


def _refuse_no_room(name: str, body: SlideBody, wanted: WantedBody, block: BlockLayout) -> None:
    over, under = _over(wanted), _under(wanted)
    short = (
        ("along its travel", 2 * PIN_WALL.default + wanted.foot + wanted.travel, body.length, "length or width"),
        ("over it", over, block.high[2] - body.top, "cavity_height"),
        ("under it", under, body.bottom - block.low[2], "core_height"),
    )
    for place, needed, found, key in short:
        if found < needed - NO_ROOM:
            raise PartError(
                f"the block leaves {found:.1f} mm for it {place}, {needed:.1f} mm are needed",
                where=name,
                remedy=f"give a larger block, or leave its {key} (section blocks) to moldgen",
            )


def _pins(
    name: str,
    body: SlideBody,
    wanted: WantedBody,
    pin: PinChoice,
    block: BlockLayout,
    core_pins: Sequence[SideCorePinLayout],
) -> tuple[AngledPinLayout, ...]:
    frame, slope = across((float(wanted.axis[0]), float(wanted.axis[1]), 0.0)), math.radians(pin.angle)
    hole = pin.hole_half + PIN_WALL.default
    first = max(body.start + max((p.depth for p in core_pins), default=0.0) + hole, wanted.part_reach)
    last = min(body.locking_top, body.side - body.height * math.tan(slope)) - hole
    if last < first - NO_ROOM:
        raise PartError(
            f"its angled pin of {pin.diameter:g} mm finds no room: the body is {first - last:.1f} mm too short",
            where=name,
            remedy="give a larger block, or leave its length and width (section blocks) to moldgen",
        )
    over = block.high[2] - body.top
    at_top = 0.5 * (first + last) - over * math.tan(slope)
    along = frame[2] * math.sin(slope) - np.array([0.0, 0.0, math.cos(slope)])
    middle = 0.5 * (body.left + body.right)
    length = over / math.cos(slope) + pin.reach
    places = [0.0] if pin.count == 1 else [-pin.spread / 2, pin.spread / 2]
    found = []
    for number, place in enumerate(places, 1):
        plan = (middle + place) * frame[0] + at_top * frame[2]
        top: Vector = (float(plan[0]), float(plan[1]), float(block.high[2]))
        way: Vector = (float(along[0]), float(along[1]), float(along[2]))
        label = f"angled pin of {name}" if len(places) == 1 else f"angled pin {number} of {name}"
        found.append(
            AngledPinLayout(
                label,
                top,
                way,
                pin.angle,
                pin.diameter,
                pin.bore,
                pin.blank.head_diameter,
                _head_depth(pin),
                PIN_TIP.default,
                length,
                pin.working,
                pin.blank.length_up(length) or 0.0,
            )
        )
    return tuple(found)


def _inclined(front: Front, name: str, task: SideTask, block: BlockLayout) -> SlideLayout:
    """Return a slide that leaves at an angle to the pull: its front runs out of the block in a bore of its own."""
    frame = across(front.axis)
    points = np.vstack(list(front.outline))
    rim = points @ frame[:2]
    heights = []
    for end in (front.clear, _leaves(front, block)):
        heights += [float(rim[:, 2].min() + end * frame[2][2]), float(rim[:, 2].max() + end * frame[2][2])]
    if min(heights) < task.level < max(heights):
        raise PartError(
            "it leaves at an angle and would cross the parting plane on its way out of the block",
            where=name,
            remedy="give the side action a direction square to the pull, or another height of the parting plane",
        )
    carried = Motion.CAVITY_HALF if min(heights) >= task.level else Motion.CORE_HALF
    travel = slide_travel_practice(max(front.travel, 1.0))
    return SlideLayout(name, (name,), front.axis, Drive.CYLINDER, carried, None, travel, 0.0, 0.0)


def _leaves(front: Front, block: BlockLayout) -> float:
    """Return where the middle of a front meets the surface of the block, along its axis."""
    frame = across(front.axis)
    points = np.vstack(list(front.outline))
    middle = 0.5 * (points.min(axis=0) + points.max(axis=0)) @ frame[:2]
    exits = []
    for i in range(3):
        if abs(frame[2][i]) > NO_ROOM * NO_ROOM:
            bound = block.high[i] if frame[2][i] > 0 else block.low[i]
            exits.append(float((bound - middle[i]) / frame[2][i]))
    return min(exits)


def _told(slide: SlideLayout) -> Notes:
    if slide.body is None:
        choice = f"a bore of its own outline, {slide.drive}, travel {slide.travel:.1f} mm"
        why = "it does not leave square to the pull"
        return Notes(decisions=(Decision(slide.name, choice, why),))
    body = slide.body
    size = f"body {body.width:.1f} x {body.length:.1f} x {body.height:.1f} mm, travel {slide.travel:.1f} mm"
    serves = f"carries {', '.join(slide.serves)}" if len(slide.serves) > 1 else "carries its own front"
    if not slide.pins:
        choice = f"{size}, drawn by a locking cylinder (to be bought) before the mold opens"
        return Notes(decisions=(Decision(slide.name, choice, f"{serves}; the cylinder must hold against the melt"),))
    pin = slide.pins[0]
    many = f"{len(slide.pins)} angled pins" if len(slide.pins) > 1 else "angled pin"
    choice = (
        f"{size}; {many} {pin.diameter:g} mm at {pin.angle:g} deg, locking face {body.locking_deg:g} deg; "
        "ball catch or spring to hold it out, and a stop (to be bought)"
    )
    return Notes(decisions=(Decision(slide.name, choice, serves),))
