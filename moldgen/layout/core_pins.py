"""Round cores that are made as pins: which ones, how they sit, and whether they stand the melt."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Pin, Resin, core_pin_blank
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.carry_cores import KeptCores, gap, in_the_way, match_cores, resized
from moldgen.layout.carry_fits import Fit, end_of, fits_told, hole_of, keep_fit, shortest_kept
from moldgen.layout.core_pin_checks import check_strength
from moldgen.layout.keep_out import STEEL
from moldgen.layout.kept import KeptItem, Reason, dropped, free_name
from moldgen.layout.round_cores import RoundCore, find_round_cores, underside_ring, with_base
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout
from moldgen.model.part import Vector
from moldgen.rules.layout_practice import (
    CORE_PIN_LARGEST,
    CORE_PIN_SHALLOW,
    CORE_PIN_SLENDER,
    HEAD_SHOULDER,
    STEEL_BEHIND_FIT,
    STEEL_BETWEEN_BORES,
    STEEL_TO_EDGE,
    STEEL_TO_FEATURE,
)
from moldgen.rules.pins import clearance_bore_diameter, guided_fit_length
from moldgen.spec.sections import CorePins

FLAT: Final = 0.02
"""mm: the part's underside round the foot of a pin counts as level within this."""

BESIDE: Final = 0.15
"""mm: level ring that a shank thicker than its core needs round it."""

GROUND: Final = 0.1
"""mm: step to which a ground shank is rounded up."""

WIDEST_FOOT: Final = 3.0
"""mm: largest rounding or chamfer at the mouth of a hole that the shank takes in."""

SHORTEST: Final = 1.0
"""mm: a lower core is never worth a pin."""

SHORTEST_FIT: Final = 5.0
"""mm: with less room for its fit a pin is refused."""


@dataclass(frozen=True)
class _Seat:
    """A round core and the pin that could make it; `trouble`: what stands against it, (code, text, value, limit)."""

    core: RoundCore
    blank: Pin | None
    diameter: float
    head: float
    fit: Fit
    trouble: tuple[tuple[str, str, float, float], ...] = ()


def find_core_pins(
    view: PartView,
    section: CorePins,
    resin: Resin,
    at: tuple[Vector, ...] = (),
    kept: KeptCores | None = None,
) -> tuple[tuple[CorePinLayout, ...], Notes]:
    """Return the core pins.

    Parameters
    ----------
    section : `core_pins` of the spec; its `at` is not read
    at : the same points in the mold frame [mm]; each must lie in a round core, which becomes a pin in any case that
        the steel allows
    kept : round cores of an accepted layout: its pins stay pins where the steel allows, the others stay in the block

    What is worth a pin is common practice: up to 16 mm in diameter or longer than 1.5 diameters, and not shallow.
    """
    cores = find_round_cores(view, max(section.largest, 1.0))
    wanted, notes = _wanted(view, cores, at)
    match, more = match_cores(view, cores, kept or KeptCores())
    notes += more
    stay, auto = match.pins, section.pick == "auto"
    cut = {i: hole_of(cores[i].x, cores[i].y, kept.given if kept else ()) for i in wanted}
    seats = [_kept_seat(view, core, cut.get(i) or stay.get(i)) for i, core in enumerate(cores)]
    use = [
        i for i, c in enumerate(cores) if i in wanted or i in stay or (auto and _pays(c) and i not in match.in_block)
    ]
    made = [i for i in use if i in wanted or not seats[i].trouble]
    seats = _neighbours(seats, made)
    pins, refused = [], []
    names = {item.name for item in stay.values()}
    for i in use:
        seat, item = seats[i], stay.get(i)
        if i in wanted:
            notes += Notes(tuple(_trouble(view, seat, *one) for one in seat.trouble))
        else:
            left, more = _left(view, seat, item, kept)
            if left:
                refused.append(left)
                notes += more
                continue
        if seat.blank is None or seat.fit.length < SHORTEST_FIT or not seat.core.closed:
            continue
        chooser = Chooser.GIVEN if i in wanted else Chooser.KEPT if item else Chooser.MOLDGEN
        pins.append(_pin(seat, item.name if item else free_name("core pin", names), chooser))
        notes += check_strength(view, seat.core, pins[-1], resin)
        notes += _as_kept(view, seat, item, pins[-1])
    if pins or refused:
        why = "round cores up to 16 mm or longer than 1.5 diameters, not shallow (common practice)"
        notes += Notes(
            decisions=(Decision("core pins", f"{len(pins)} of {len(cores)} round cores", why, "", tuple(refused)),)
        )
    return tuple(pins), notes


def _left(view: PartView, seat: _Seat, item: KeptItem | None, kept: KeptCores | None) -> tuple[str, Notes]:
    """Return why a core stays in the block, "" if nothing stands against its pin: its seat, or kept ejector pins."""
    place = view.place((seat.core.x, seat.core.y, seat.core.base_z))
    if seat.trouble:
        code, text, value, limit = seat.trouble[0]
        told = dropped(item.name, Reason(code, text, value, limit, "mm"), place) if item else Notes()
    else:
        wide = max(clearance_bore_diameter(seat.diameter), seat.head + 0.5)
        text = in_the_way(seat.core, wide, kept.ejectors) if kept and not item else ""
        told = Notes()
    return (f"core at {place[0]:g}, {place[1]:g}: {text}" if text else ""), told


def _as_kept(view: PartView, seat: _Seat, item: KeptItem | None, pin: CorePinLayout) -> Notes:
    """Return what of an accepted pin, None for one of the spec, does not stay as it was."""
    place = view.place((pin.x, pin.y, pin.base_z))
    size = resized(view, seat.core, item, pin.diameter) if item else Notes()
    return size + fits_told([(pin.name, place, seat.fit)])


def _kept_seat(view: PartView, core: RoundCore, item: KeptItem | None) -> _Seat:
    """Return the seat of a core; an accepted pin keeps its diameter where that makes no trouble."""
    if item is not None:
        seat = _seat(view, core, item.diameter, item)
        if not seat.trouble:
            return seat
    return _seat(view, core)


def _wanted(view: PartView, cores: list[RoundCore], at: tuple[Vector, ...]) -> tuple[set[int], Notes]:
    """Return the numbers of the cores that the user's points lie in; a finding for each point that lies in none."""
    wanted: set[int] = set()
    findings = []
    for x, y, z in at:
        off = [math.hypot(c.x - x, c.y - y) - c.largest / 2 for c in cores]
        best = min(range(len(cores)), key=lambda i: (off[i], abs(cores[i].base_z - z)), default=None)
        if best is not None and off[best] <= FLAT:
            wanted.add(best)
            continue
        near = "there is none" if best is None else f"the nearest is {off[best]:.2f} mm away"
        findings.append(
            Finding(
                "core_pin.no_core",
                Severity.FAILURE,
                f"no round core of the core half at this point; {near}",
                at=view.place((x, y, z)),
                value=None if best is None else round(off[best], 3),
                limit=0.0,
                unit="mm",
                remedy="give a point in a round hole that opens to the core, or raise core_pins.largest",
            )
        )
    return wanted, Notes(tuple(findings))


def _pays(core: RoundCore) -> bool:
    ratio = core.length / core.largest
    small = core.largest <= CORE_PIN_LARGEST.default or ratio > CORE_PIN_SLENDER.default
    return small and ratio >= CORE_PIN_SHALLOW.default and core.length >= SHORTEST


def _seat(view: PartView, core: RoundCore, wanted: float = 0.0, item: KeptItem | None = None) -> _Seat:
    diameter, base = _shank(view, core, wanted)
    core = with_base(core, base)
    blank = core_pin_blank(diameter)
    trouble: list[tuple[str, str, float, float]] = []
    if not core.closed:
        trouble.append(("not_round", "the core is not round all the way: a window or slot opens it", 0.0, 1.0))
    if blank is None:
        trouble.append(("no_blank", f"no pin blank of {diameter:.2f} mm", diameter, 0.0))
    height = 0.0 if blank is None else blank.head_height
    room = core.base_z - float(view.low[2]) - height - STEEL_BEHIND_FIT.low
    end = None if item is None else end_of(item, diameter, gap(core, item))
    fit = keep_fit(diameter, min(guided_fit_length(diameter), room), core.base_z, core.base_z - room, end)
    least = guided_fit_length(diameter, 2.0) if end is None else shortest_kept(diameter)
    if fit.length < least - 1e-9:
        text = f"the core block leaves {fit.length:.1f} mm for the fit, {least:.1f} mm are needed"
        trouble.append(("short_fit", text, fit.length, least))
    steel, limit = _steel_beside(view, core, diameter), STEEL_TO_FEATURE.default
    if steel < limit:
        trouble.append(("thin_steel", f"{steel:.2f} mm of steel to a deeper feature of the part", steel, limit))
    head = diameter if blank is None else blank.head_diameter
    trouble += _edge(view, core, head)
    trouble += _side_action(view, core, diameter, head)
    return _Seat(core, blank, diameter, head, fit, tuple(trouble))


def _shank(view: PartView, core: RoundCore, wanted: float = 0.0) -> tuple[float, float]:
    """Return the diameter of the shank and the height of its foot: a stock size where the part is level round it.

    A thicker shank forms a ring of the surface round the hole. Where that is not level, the shank is ground to the
    core's own diameter. The diameter `wanted` is tried first.
    """
    stock = core_pin_blank(core.largest)
    ground = math.ceil(core.largest / GROUND + 0.2) * GROUND
    steps = np.arange(0.0, WIDEST_FOOT, GROUND)
    tries = [wanted] if wanted >= core.largest - 1e-6 else []
    tries += ([stock.diameter] if stock is not None and stock.diameter > core.largest + 1e-6 else []) + [
        round(float(ground + 2 * step), 3) for step in steps
    ]
    for diameter in tries:
        ring = underside_ring(view, core, diameter / 2 + BESIDE)
        if not np.isfinite(ring).all() or np.ptp(ring) >= FLAT:
            continue
        foot = float(ring.mean())
        if core.base_z - WIDEST_FOOT <= foot <= core.base_z + FLAT:
            return diameter, min(foot, core.base_z)
    return core.largest, core.base_z


def _steel_beside(view: PartView, core: RoundCore, diameter: float) -> float:
    """Return the steel between the bore and what of the part lies deeper than the foot, up to twice the limit [mm]."""
    for step in np.linspace(0.1, 2 * STEEL_TO_FEATURE.default, 12):
        if (underside_ring(view, core, diameter / 2 + float(step)) < core.base_z - 0.05).any():
            return float(step) - 0.1
    return 2 * STEEL_TO_FEATURE.default


def _edge(view: PartView, core: RoundCore, head: float) -> list[tuple[str, str, float, float]]:
    place = np.array([core.x, core.y])
    left = float(np.minimum(place - view.low[:2], view.high[:2] - place).min()) - head / 2
    if left >= STEEL_TO_EDGE.default:
        return []
    return [("block_edge", f"{left:.1f} mm of steel to the side of the block", left, STEEL_TO_EDGE.default)]


def _side_action(view: PartView, core: RoundCore, diameter: float, head: float) -> list[tuple[str, str, float, float]]:
    """Return whether a slide or lifter comes too close to the bore, or meets the core itself in the part."""
    place, keep_out = np.array([[core.x, core.y]]), view.keep_out
    bore = keep_out.upright(place, max(head, diameter) / 2, float(view.low[2]), core.base_z)
    # in the part there is plastic between the pin and a side action, however thin, unless they meet
    tip = keep_out.upright(place, core.largest / 2, core.base_z, core.top_z)
    found: list[tuple[str, str, float, float]] = []
    for near, limit in ((bore, STEEL), (tip, FLAT)):
        steel = float(near.steel[0])
        if steel < limit and not found:
            text = f"{max(steel, 0.0):.2f} mm to {near.names[0]}: {keep_out.why}"
            found.append(("side_action", text, steel, limit))
    return found


def _neighbours(seats: list[_Seat], use: list[int]) -> list[_Seat]:
    """Grind heads down where pins stand close; state where even that leaves too little steel."""
    result = list(seats)
    limit = STEEL_BETWEEN_BORES.default
    for i in use:
        for j in use:
            one, other = seats[i], seats[j]
            gap = math.hypot(one.core.x - other.core.x, one.core.y - other.core.y)
            steel = gap - (one.diameter + other.diameter) / 2
            if i == j or gap - (one.head + other.head) / 2 >= limit:
                continue
            # the room between the shanks is shared by the two shoulders
            shoulder = (steel - limit) / 2
            head = min(result[i].head, one.diameter + 2 * max(shoulder, HEAD_SHOULDER.default))
            trouble = result[i].trouble
            if shoulder < HEAD_SHOULDER.default:
                needed = limit + 2 * HEAD_SHOULDER.default
                text = f"{steel:.2f} mm between its bore and the next core pin's, {needed:.2f} mm hold both heads"
                trouble = (*trouble, ("too_close", text, steel, needed))
            result[i] = replace(result[i], head=head, trouble=trouble)
    return result


def _pin(seat: _Seat, name: str, chooser: Chooser) -> CorePinLayout:
    core = seat.core
    return CorePinLayout(
        name=name,
        x=core.x,
        y=core.y,
        top_z=core.top_z,
        base_z=core.base_z,
        diameter=seat.diameter,
        fit_length=seat.fit.length,
        clearance_diameter=clearance_bore_diameter(seat.diameter),
        head_diameter=seat.head,
        head_height=0.0 if seat.blank is None else seat.blank.head_height,
        slenderness=core.slenderness,
        blind=core.blind,
        chosen_by=chooser,
    )


def _trouble(view: PartView, seat: _Seat, code: str, text: str, value: float, limit: float) -> Finding:
    core = seat.core
    return Finding(
        f"core_pin.{code}",
        Severity.WARNING,
        f"the core pin asked for here: {text}",
        at=view.place((core.x, core.y, core.base_z)),
        value=round(value, 3),
        limit=round(limit, 3),
        unit="mm",
        remedy="leave this core in the block, or change the part or the block",
    )
