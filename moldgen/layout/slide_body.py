"""How large the body of a slide must be: round its fronts, down into its guide, long enough for guide, pin and lock."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Resin, steel
from moldgen.kernel.body import Body
from moldgen.kernel.side_window import Window, extent_in, joined_area
from moldgen.layout.side_core_pins import round_front
from moldgen.layout.side_drive import Driven
from moldgen.layout.slide_pin import PinChoice, choose_pin, too_far_for_pin
from moldgen.model.side_action import Front, across
from moldgen.model.slide import Drive
from moldgen.rules.cavity_wall import cavity_side_wall_thickness, parting_gap_limit
from moldgen.rules.side_practice import (
    LEDGE_COVER,
    LEDGE_HEIGHT,
    LEDGE_WIDTH,
    LOCKING_FOOT,
    LOCKING_HEIGHT,
    PIN_WALL,
    SLIDE_LAND,
    SLIDE_SHOULDER,
    STEEL_BESIDE_SLIDE,
)
from moldgen.rules.slide import locking_face_angle, slide_guided_length, slide_melt_force_kazmer, slide_travel_practice

SAME_AXIS: Final = 1e-9
"""1 - cosine up to which two slides move the same way."""

CLEAR_OF_STEEL: Final = 0.5
"""mm: how far behind the cavity steel a slide that is drawn before the opening stops (our choice)."""

STEP: Final = 1.0
"""mm: lengths are rounded up to this."""


@dataclass(frozen=True)
class SideTask:
    """What all side actions of a tool share.

    part : the real part in the mold; level : height of the parting plane [mm]; material : steel of slides and blocks
    """

    part: Body
    level: float
    resin: Resin
    material: str = "1.2311"

    @property
    def pressure(self) -> float:
        """Melt pressure that slides are held against [MPa]."""
        return self.resin.cavity_pressure.high


@dataclass(frozen=True)
class WantedBody:
    """The body that a slide wants, before the block is known; frame `across(axis)` [mm].

    members : places of its fronts in the order of the plan; window : of its body without ledges
    start : where it begins; travel; area : of its forming faces seen along the travel [mm^2]; pin : None without one
    foot, locking_deg : of the locking face, 0 without one; length : from start to the side of the block, at least
    part_reach : how far out the part is that the pin must pass on its way up, as if at the height of the body's top
    """

    members: tuple[int, ...]
    axis: np.ndarray
    drive: Drive
    window: Window
    start: float
    travel: float
    area: float
    pin: PinChoice | None
    foot: float
    locking_deg: float
    length: float
    part_reach: float = -math.inf

    @property
    def left(self) -> float:
        """Least u with ledges and the steel beside them."""
        return self.window.left - LEDGE_WIDTH.default - STEEL_BESIDE_SLIDE.default

    @property
    def right(self) -> float:
        """Largest u with ledges and the steel beside them."""
        return self.window.right + LEDGE_WIDTH.default + STEEL_BESIDE_SLIDE.default


def wanted_bodies(driven: Sequence[tuple[int, Driven]], task: SideTask) -> tuple[WantedBody, ...]:
    """Return one body for each level slide, those that would meet and move the same way merged into one.

    driven : (place in the plan, front with its drive)
    """
    groups = [[one] for one in driven]
    while True:
        bodies = [_wanted(group, task) for group in groups]
        pair = next(((i, j) for j in range(len(bodies)) for i in range(j) if _one_body(bodies[i], bodies[j])), None)
        if pair is None:
            return tuple(bodies)
        i, j = pair
        groups[i] = groups[i] + groups.pop(j)


def _one_body(one: WantedBody, other: WantedBody) -> bool:
    if float(one.axis @ other.axis) < 1.0 - SAME_AXIS:
        return False
    between = STEEL_BESIDE_SLIDE.default  # counted on both sides, needed once
    return one.left < other.right - between and other.left < one.right - between


def _wanted(group: Sequence[tuple[int, Driven]], task: SideTask) -> WantedBody:
    fronts = [d.front for _, d in group]
    frame = across(fronts[0].axis)
    points = np.vstack([p for f in fronts for p in f.outline])
    window = _window(points, task.level, 0.0)
    start = _start(fronts, window, frame, task)
    travel = max(slide_travel_practice(max(f.travel, STEP)) for f in fronts)
    if any(d.caught for _, d in group):
        travel = max(travel, start - min(f.near for f in fronts) + CLEAR_OF_STEEL)
    by_cylinder = any(d.drive is Drive.CYLINDER for _, d in group) or too_far_for_pin(travel)
    drive = Drive.CYLINDER if by_cylinder else Drive.ANGLED_PIN
    area = joined_area([f.outline for f in fronts])
    found = WantedBody(
        tuple(n for n, _ in group), frame[2], drive, window, start, travel, area, None, 0.0, 0.0, 0.0
    )  # fmt: skip
    height = window.high - window.low
    length = slide_guided_length(height, travel)
    if drive is Drive.CYLINDER:
        return replace(found, length=_up(length))
    return _with_pin(found, group, length, task)


def _with_pin(found: WantedBody, group: Sequence[tuple[int, Driven]], length: float, task: SideTask) -> WantedBody:
    fronts = [d.front for _, d in group]
    gripped = [d.front for _, d in group if not d.under]
    window = found.window
    pin = choose_pin(gripped, found.travel, (window.right - window.left, window.high - window.low, length), task.resin,
                     task.part)  # fmt: skip
    if pin.width_needed > window.right - window.left:
        middle, half = 0.5 * (window.left + window.right), 0.5 * pin.width_needed
        window = replace(window, left=middle - half, right=middle + half)
        start = _start(fronts, window, across(fronts[0].axis), task)
        found = replace(found, window=window, start=start)
    locking = locking_face_angle(pin.angle)
    rise = window.high - task.level
    foot = _foot(found.area, window.right - window.left, rise, task)
    reach = _part_over(found, pin, task)
    hole = pin.hole_half
    seats = [pin.depth for pin in (round_front(f) for f in fronts) if pin is not None]
    first = max(found.start + max(seats, default=0.0) + PIN_WALL.default + hole, reach)
    behind = PIN_WALL.default + hole
    top_length = first - found.start + behind + foot + rise * math.tan(math.radians(locking))
    lean = (window.high - window.low) * math.tan(math.radians(pin.angle))
    bottom_length = first - found.start + lean + behind
    length = _up(max(length, top_length, bottom_length))
    return replace(
        found, pin=pin, foot=foot, locking_deg=locking, length=length, part_reach=reach
    )  # fmt: skip


def _part_over(found: WantedBody, pin: PinChoice, task: SideTask) -> float:
    """Return the least s of the pin's axis at the body's top for which the pin passes the part on its way up."""
    frame, window = across(tuple(found.axis)), found.window
    middle, half = 0.5 * (window.left + window.right), pin.spread / 2 + pin.hole_half + PIN_WALL.default
    over = Window(middle - half, middle + half, window.high, float(task.part.box[1][2]) + STEP)
    inside = extent_in(task.part.mesh, frame, over) if over.high > over.low + STEP else None
    if inside is None:
        return -math.inf
    lean = math.tan(math.radians(pin.angle))
    shifted = inside[:, 2] + (inside[:, 1] - window.high) * lean
    return float(shifted.max()) + pin.hole_half + PIN_WALL.default


def _window(points: np.ndarray, level: float, least_width: float) -> Window:
    shoulder = SLIDE_SHOULDER.default
    left, right = float(points[:, 0].min()) - shoulder, float(points[:, 0].max()) + shoulder
    if right - left < least_width:
        left, right = 0.5 * (left + right - least_width), 0.5 * (left + right + least_width)
    low = min(float(points[:, 1].min()) - shoulder, level - LEDGE_COVER.default - LEDGE_HEIGHT.default)
    high = max(float(points[:, 1].max()) + shoulder, level + LOCKING_HEIGHT.default)
    return Window(left, right, low, high)


def _start(fronts: Sequence[Front], window: Window, frame: np.ndarray, task: SideTask) -> float:
    """Return where the body begins: beyond the plastic of its fronts and of all of the part that it would meet."""
    wide = LEDGE_WIDTH.default
    ledges = Window(window.left - wide, window.right + wide, window.low, window.low + LEDGE_HEIGHT.default)
    reach = max(f.clear for f in fronts)
    for one in (window, ledges):
        inside = extent_in(task.part.mesh, frame, one)
        reach = max(reach, -math.inf if inside is None else float(inside[:, 2].max()))
    return float(reach + SLIDE_LAND.default)


def _foot(area: float, width: float, rise: float, task: SideTask) -> float:
    """Return the steel behind the locking face at its foot: it moves no more than a vent is deep."""
    force = slide_melt_force_kazmer(task.pressure, area)
    limit = parting_gap_limit(task.resin.vent_depth.high)
    modulus = steel(task.material).modulus.low
    needed = cavity_side_wall_thickness(force / (width * rise), rise, width, limit, modulus)
    return max(LOCKING_FOOT.default, math.ceil(2.0 * needed) / 2.0)


def _up(length: float) -> float:
    return STEP * math.ceil(length / STEP - 1e-9)
