"""Ejector pins: where they push, how thick they are, and whether part and pins stand the force."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import Pin, Resin, ejector_pin_down, ejector_pin_series, ejector_pin_up
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.balance import shares
from moldgen.layout.ejection_checks import check_balance, check_given, check_stays
from moldgen.layout.pin_choice import Choice, Counts, Load, gather, mirrors, units
from moldgen.layout.sites import Disc, Underside
from moldgen.layout.sticking import Sticking, find_sticking, hold_of_cavity
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, EjectorPinLayout
from moldgen.model.part import Vector
from moldgen.quantity import Quantity
from moldgen.rules.layout_practice import EJECTOR_FEWEST, RETAINER_PLATE, STEEL_BETWEEN_BORES, STEEL_TO_EDGE
from moldgen.rules.pins import clearance_bore_diameter, euler_buckling_force, guided_fit_length
from moldgen.rules.practice import BUCKLING_SAFETY, PIN_END_FACTOR
from moldgen.rules.pushing import ejection_stroke_pye
from moldgen.rules.sheet import given as given_line
from moldgen.rules.sheet import measured
from moldgen.spec.sections import Ejection

CAP: Final = 0.08
"""Largest diameter that moldgen takes, as a share of the part's diagonal in plan (common practice: the largest that
fits, so a size-dependent cap)."""

CAP_RANGE: Final = (3.0, 12.0)
"""mm: the cap is kept between these."""

WORSE: Final = 1.25
"""A thicker pin is taken although its places cost up to this much more than those of the thinnest."""

MOST_PINS: Final = 24
"""Pins of one part, unless the force asks for more."""

SUPPORT: Final = 0.3
"""Weight of the floor itself among what sticks, so that large free areas are pushed too."""

MOST_UNITS: Final = 700
"""Sets of places that are weighed against each other for one diameter."""

SIZES_TRIED: Final = 3
"""Diameters that are compared, the largest that fit."""

HEADS_APART: Final = 1.5
"""mm: steel between the counterbores of two ejector pin heads."""


@dataclass(frozen=True)
class GivenPin:
    """An ejector pin of the spec: a point in the mold frame and its diameter [mm], None for moldgen's choice."""

    at: Vector
    diameter: float | None = None


@dataclass(frozen=True)
class EjectionLayout:
    """The ejector pins, the force they bring up [N] and their travel [mm]."""

    pins: tuple[EjectorPinLayout, ...]
    force_n: float
    stroke_mm: float
    sticking: Sticking


@dataclass(frozen=True)
class _Task:
    """What the search for places works on."""

    view: PartView
    section: Ejection
    resin: Resin
    under: Underside
    bores: tuple[CorePinLayout, ...]
    sticking: Sticking
    stroke: float


@dataclass(frozen=True)
class _Place:
    x: float
    y: float
    diameter: float
    disc: Disc
    chooser: Chooser


def place_ejector_pins(
    view: PartView,
    section: Ejection,
    resin: Resin,
    core_pins: tuple[CorePinLayout, ...] = (),
    given: tuple[GivenPin, ...] | None = None,
    no_pins: frozenset[int] = frozenset(),
) -> tuple[EjectionLayout, Notes]:
    """Return the ejector pins of a part.

    Parameters
    ----------
    section : `ejection` of the spec; its `pins` is not read
    core_pins : pins whose bores must be kept clear
    given : the user's pins in the mold frame, None for auto; they are kept, and checked
    no_pins : numbers of the faces that must stay free

    A pin pushes only where the part lies over its whole end face. The force is that of `find_sticking`.
    """
    sticking, notes = find_sticking(view, resin)
    notes += check_stays(view, sticking, hold_of_cavity(view, resin))
    stroke, more = _stroke(view, section)
    notes += more
    task = _Task(view, section, resin, Underside(view, no_pins), core_pins, sticking, stroke)
    kept, more = _given(task, given or (), no_pins)
    notes += more
    found: list[_Place] = []
    if given is None or section.add:
        found, more = _search(task, kept)
        notes += more
    pins = _pins(task, [*kept, *found])
    notes += check_balance(view, pins, sticking, resin)
    return EjectionLayout(pins, sticking.force, stroke, sticking), notes


def _stroke(view: PartView, section: Ejection) -> tuple[float, Notes]:
    """Return the travel that frees the part: its depth on the core, and a margin."""
    z = view.mesh.corners[view.core_side][:, :, 2]
    depth = float(max(z.max(), view.level) - min(z.min(), view.level)) if len(z) else 0.0
    needed = ejection_stroke_pye.line("ejector stroke", depth)
    lines: tuple[Quantity, ...] = (measured("depth of the part on the core", depth, "mm", "ejector stroke"), needed)
    if section.stroke is None:
        return float(math.ceil(needed.value)), Notes(quantities=lines)
    lines += (given_line("ejector stroke", section.stroke, "mm", "ejector stroke", where="ejection.stroke"),)
    if section.stroke >= needed.value - 1e-9:
        return section.stroke, Notes(quantities=lines)
    finding = Finding(
        "ejection.short_stroke",
        Severity.WARNING,
        f"a stroke of {section.stroke:g} mm does not free a part that sits {depth:.1f} mm deep on the core",
        where="ejection.stroke",
        value=section.stroke,
        limit=round(needed.value, 2),
        unit="mm",
        remedy=f"give at least {math.ceil(needed.value):g} mm, or leave it to moldgen",
    )
    return section.stroke, Notes((finding,), quantities=lines)


def _given(task: _Task, given: tuple[GivenPin, ...], no_pins: frozenset[int]) -> tuple[list[_Place], Notes]:
    """Return the user's pins as far as a pin can be made there at all, with a finding for each rule they break."""
    kept: list[_Place] = []
    notes = Notes()
    for number, pin in enumerate(given, 1):
        spot = np.array(pin.at[:2])
        diameter = pin.diameter or task.section.diameter or _fitting(task, spot)
        disc = task.under.discs(spot[None], np.array([diameter]))[0]
        others = [(p.x, p.y, p.diameter) for p in kept]
        place = _Place(float(spot[0]), float(spot[1]), diameter, disc, Chooser.GIVEN)
        notes += check_given(task.under, (place.x, place.y, diameter), disc, number, others, task.bores)
        notes += _marked(task.view, place, number, no_pins)
        room, needed = task.under.exact_room(spot), diameter / 2 + task.section.edge_clearance
        if disc.whole and disc.core_side and room < needed - 1e-6:
            notes += Notes((_near_edge(task.view, place, number, room - diameter / 2, task.section.edge_clearance),))
        if disc.faces and disc.core_side:
            kept.append(place)
    return kept, notes


def _near_edge(view: PartView, place: _Place, number: int, left: float, limit: float) -> Finding:
    return Finding(
        "ejector_pin.edge_clearance",
        Severity.WARNING,
        f"pin {number} of the spec leaves {left:.2f} mm to an edge of the surface that it pushes on",
        where=f"ejection.pins[{number - 1}]",
        at=view.place((place.x, place.y, place.disc.high)),
        value=round(left, 3),
        limit=limit,
        unit="mm",
        remedy="move it inward, make it thinner, or lower edge_clearance",
    )


def _marked(view: PartView, place: _Place, number: int, no_pins: frozenset[int]) -> Notes:
    if not no_pins & set(place.disc.faces):
        return Notes()
    finding = Finding(
        "ejector_pin.marked_face",
        Severity.FAILURE,
        f"pin {number} of the spec pushes on a face that is marked no_pins",
        where=f"ejection.pins[{number - 1}]",
        at=view.place((place.x, place.y, place.disc.high)),
        remedy="move the pin or delete the mark",
    )
    return Notes((finding,))


def _fitting(task: _Task, spot: np.ndarray) -> float:
    """Return the largest standard diameter that keeps the edge clearance at a place, else the smallest."""
    room = task.under.exact_room(spot) - task.section.edge_clearance
    pin = ejector_pin_down(min(2 * room, _cap(task.view)))
    return (pin or ejector_pin_series()[0]).diameter


def _cap(view: PartView) -> float:
    low, high = view.body.box
    share = CAP * float(np.linalg.norm((high - low)[:2]))
    return min(max(share, CAP_RANGE[0]), CAP_RANGE[1])


def _load(task: _Task) -> Load:
    """Return what is to be pushed: what sticks, and a little of the whole underside."""
    view, sticking = task.view, task.sticking
    low, high = view.body.box
    diagonal = float(np.linalg.norm((high - low)[:2]))
    floor = view.core_side & (view.normals[:, 2] < -0.5)
    if not floor.any():
        floor = view.core_side
    area = view.body.triangle_areas[floor]
    weight = SUPPORT * max(sticking.force, 1.0)
    places = np.vstack([sticking.places, view.centres[floor][:, :2]])
    weights = np.r_[sticking.forces, weight * area / max(float(area.sum()), 1e-30)]
    centre = sticking.centre if sticking.force > 0.0 else (places * weights[:, None]).sum(axis=0) / weights.sum()
    return Load(*gather(places, weights, diagonal), centre, diagonal)


def _search(task: _Task, kept: list[_Place]) -> tuple[list[_Place], Notes]:
    """Return moldgen's pins: the largest diameter whose places are hardly worse than those of smaller pins."""
    places, room = task.under.grid()
    group = mirrors(places, room, task.view.middle) if not kept else [np.array([1.0, 1.0])]
    load = _load(task)
    sizes = [p for p in reversed(ejector_pin_series()) if p.diameter <= _cap(task.view) + 1e-9]
    if task.section.diameter is not None:
        sizes = [_as_pin(task.section.diameter)]
    fixed = np.array([[p.x, p.y] for p in kept]).reshape(-1, 2)
    tried: list[tuple[Pin, Choice, float]] = []
    for pin in sizes:
        choice = _choose(task, pin, (places, room, group), load, fixed)
        if choice is not None and choice.count() > len(kept):
            tried.append((pin, choice, choice.cost()))
        if sum(t[1].count() >= _counts(task, t[0]).least for t in tried) >= SIZES_TRIED:
            break
    if not tried:
        return [], _no_room(task, room, kept)
    enough = [t for t in tried if t[1].count() >= min(_counts(task, t[0]).least, MOST_PINS)] or tried
    best = min(cost for _, _, cost in enough)
    pin, choice, _ = next(t for t in enough if t[2] <= WORSE * best)
    spots = choice.result()
    discs = task.under.discs(spots, np.full(len(spots), pin.diameter))
    found = [
        _Place(float(x), float(y), pin.diameter, disc, Chooser.MOLDGEN)
        for (x, y), disc in zip(spots, discs, strict=True)
    ]
    why = "thickest standard pins whose places are hardly farther from what sticks than those of thinner ones"
    return found, Notes(decisions=(Decision("ejector pins", f"{len(found)} of {pin.diameter:g} mm", why),))


def _as_pin(diameter: float) -> Pin:
    """Return the standard pin of this diameter; for another diameter the next one's head is used."""
    like = ejector_pin_up(diameter) or ejector_pin_series()[-1]
    if math.isclose(like.diameter, diameter):
        return like
    return Pin(
        name=f"{diameter:g}",
        diameter=diameter,
        head_diameter=max(like.head_diameter, diameter + 2.0),
        head_height=like.head_height,
        lengths=like.lengths,
        facts=like.facts,
    )


def _choose(
    task: _Task, pin: Pin, grid: tuple[np.ndarray, np.ndarray, list[np.ndarray]], load: Load, fixed: np.ndarray
) -> Choice | None:
    places, room, group = grid
    needed = pin.diameter / 2 + task.section.edge_clearance
    spots = places[(room >= needed) & _clear(task, places, pin)]
    if len(spots) == 0:
        return None
    apart = pin.head_diameter + HEADS_APART
    sets = units(spots, group, task.view.middle, apart)
    if len(sets) == 0:
        sets = units(spots, group[:1], task.view.middle, apart)
    sets = sets[:: math.ceil(len(sets) / MOST_UNITS)]
    choice = Choice(spots, sets, load, apart, fixed)
    choice.search(_counts(task, pin))
    return choice


def _counts(task: _Task, pin: Pin) -> Counts:
    """Return how many pins of a size the part and the pins themselves ask for."""
    force, limit = task.sticking.force, task.resin.push_pressure
    area = math.pi / 4 * pin.diameter**2
    by_pressure = force / (limit * area)
    by_punch = force / (0.5 * limit * math.pi * pin.diameter * max(task.view.wall, 0.1))
    length = max(task.view.level - task.view.low[2] + task.stroke + RETAINER_PLATE.default, 1.0)
    hold = euler_buckling_force(pin.diameter, float(length)) / BUCKLING_SAFETY.default
    least = max(int(EJECTOR_FEWEST.default), math.ceil(max(by_pressure, by_punch, force / hold) - 1e-9))
    return Counts(least, max(MOST_PINS, 2 * least))


def _clear(task: _Task, places: np.ndarray, pin: Pin) -> np.ndarray:
    """Return which places keep clear of core pins and of the sides of the block, (k,) bool."""
    bore = clearance_bore_diameter(pin.diameter) / 2
    view, steel = task.view, STEEL_BETWEEN_BORES.default
    edge = np.minimum(places - view.low[:2], view.high[:2] - places).min(axis=1)
    free = edge >= bore + STEEL_TO_EDGE.default
    for other in task.bores:
        gap = np.linalg.norm(places - np.array([other.x, other.y]), axis=1)
        free &= gap >= bore + max(other.clearance_diameter, other.head_diameter + 0.5) / 2 + steel
    return np.asarray(free)


def _no_room(task: _Task, room: np.ndarray, kept: list[_Place]) -> Notes:
    smallest = task.section.diameter or ejector_pin_series()[0].diameter
    needed = smallest / 2 + task.section.edge_clearance
    widest = float(room.max()) if len(room) else 0.0
    if widest <= 0.0:
        reason = "the core half forms no surface that a pin could push on: all of it is steeper than 30 deg or marked"
    elif widest < needed:
        reason = f"the widest place leaves {widest:.2f} mm from its middle to its edge, a pin needs {needed:.2f} mm"
    else:
        reason = "core pins, given pins or the sides of the block are too close to every place"
    finding = Finding(
        "ejection.no_room",
        Severity.CAUTION if kept else Severity.FAILURE,
        f"no place for an ejector pin: {reason}",
        at=task.view.place((*task.view.middle, task.view.body.box[0][2])),
        value=round(widest, 3),
        limit=round(needed, 3),
        unit="mm",
        remedy="give the part a flat pad, allow a smaller edge_clearance, give pins, or use a stripper plate",
    )
    return Notes((finding,))


def _pins(task: _Task, places: list[_Place]) -> tuple[EjectorPinLayout, ...]:
    """Return the pins in the order of their places, with their share of the force."""
    order = sorted(places, key=lambda p: (p.chooser is not Chooser.GIVEN, round(p.x, 3), round(p.y, 3)))
    spots = np.array([[p.x, p.y] for p in order]).reshape(-1, 2)
    areas = np.array([math.pi / 4 * p.diameter**2 for p in order])
    forces = shares(spots, areas, task.sticking.force, task.sticking.centre)
    return tuple(
        _pin(task, place, number, float(force), float(area))
        for number, (place, force, area) in enumerate(zip(order, forces, areas, strict=True), 1)
    )


def _pin(task: _Task, place: _Place, number: int, force: float, area: float) -> EjectorPinLayout:
    catalog = _as_pin(place.diameter)
    bottom = float(task.view.low[2])
    seat = bottom - task.stroke - RETAINER_PLATE.default
    fit = min(guided_fit_length(place.diameter), max(place.disc.low - bottom, 0.0))
    needed = place.disc.high - seat
    free = max(place.disc.low - fit - seat, 1.0)
    return EjectorPinLayout(
        name=f"ejector pin {number}",
        x=place.x,
        y=place.y,
        tip_z=place.disc.high,
        diameter=place.diameter,
        fit_length=fit,
        clearance_diameter=clearance_bore_diameter(place.diameter),
        head_diameter=catalog.head_diameter,
        head_height=catalog.head_height,
        seat_z=seat,
        length=catalog.length_up(needed) or math.ceil(needed),
        force_n=force,
        pressure_mpa=force / area,
        buckling_n=euler_buckling_force(place.diameter, free, end_factor=PIN_END_FACTOR.default),
        chosen_by=place.chooser,
        tip_drop=place.disc.high - place.disc.low,
    )
