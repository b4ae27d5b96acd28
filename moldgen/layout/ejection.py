"""Ejector pins: where they push, how thick they are, and whether part and pins stand the force."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Resin, ejector_pin_down, ejector_pin_series
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.balance import shares
from moldgen.layout.carry_fits import fits_told, hole_of
from moldgen.layout.carry_pins import carry_pins
from moldgen.layout.ejection_checks import check_balance, check_given, check_stays
from moldgen.layout.keep_out import STEEL
from moldgen.layout.kept import REMEDY, Kept, KeptItem, free_name
from moldgen.layout.pin_kinds import Place, fit_of, of_diameter, stack_up
from moldgen.layout.pin_search import Task, search_pins, side_steel, size_cap
from moldgen.layout.sites import Underside
from moldgen.layout.sticking import Sticking, find_sticking, hold_of_cavity
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, EjectorPinLayout
from moldgen.model.part import Vector
from moldgen.quantity import Quantity
from moldgen.rules.pushing import ejection_stroke_pye
from moldgen.rules.sheet import given as given_line
from moldgen.rules.sheet import measured
from moldgen.spec.sections import Ejection

ROLE: Final = "ejector pin"


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


def place_ejector_pins(
    view: PartView,
    section: Ejection,
    resin: Resin,
    core_pins: tuple[CorePinLayout, ...] = (),
    given: tuple[GivenPin, ...] | None = None,
    no_pins: frozenset[int] = frozenset(),
    kept: Kept | None = None,
) -> tuple[EjectionLayout, Notes]:
    """Return the ejector pins of a part.

    Parameters
    ----------
    section : `ejection` of the spec; its `pins` is not read
    core_pins : pins whose bores must be kept clear
    given : the user's pins in the mold frame, None for auto; they are kept, and checked
    no_pins : numbers of the faces that must stay free
    kept : an accepted layout: its pins stay where they keep the rules, and others are added where they do not suffice

    A pin pushes only where the part lies over its whole end face. The force is that of `find_sticking`.
    """
    sticking, notes = find_sticking(view, resin)
    notes += check_stays(view, sticking, hold_of_cavity(view, resin))
    stroke, more = ejector_stroke(view, section, 0.0 if kept is None else kept.stroke)
    notes += more
    task = Task(view, section, resin, Underside(view, no_pins), core_pins, sticking, stroke, no_pins)
    fixed, more = _given(task, given or (), () if kept is None else kept.given_pins)
    notes += more
    found: list[Place] = []
    if given is None or section.add:
        found, more = search_pins(task, fixed) if kept is None else carry_pins(task, kept, fixed)
        notes += more
    pins, more = _pins(task, [*fixed, *found])
    notes += more + check_balance(view, pins, sticking, resin)
    return EjectionLayout(pins, sticking.force, stroke, sticking), notes


def ejector_stroke(view: PartView, section: Ejection, kept: float = 0.0) -> tuple[float, Notes]:
    """Return the travel [mm] that frees the part: its depth on the core, and a margin; that of lifters if longer.

    kept : travel of an accepted layout, which stays where it is enough; lifters are made for one travel of their own
    """
    z = view.mesh.corners[view.core_side][:, :, 2]
    depth = float(max(z.max(), view.level) - min(z.min(), view.level)) if len(z) else 0.0
    needed = ejection_stroke_pye.line("ejector stroke", depth)
    lines: tuple[Quantity, ...] = (measured("depth of the part on the core", depth, "mm", "ejector stroke"), needed)
    if section.stroke is None:
        own = float(math.ceil(needed.value))
        lifters = max((side.front.stroke for side in view.halves.sides), default=0.0)
        if lifters > own:
            how = "the whole height of the part, and 10 mm: the most that is common practice"
            lines += (measured("stroke that the lifters are made for", lifters, "mm", "ejector stroke", how=how),)
        if kept <= 0.0 or kept == own or lifters > 0.0:
            return max(own, lifters), Notes(quantities=lines)
        if kept < needed.value - 1e-9:
            return own, Notes((_longer(kept, own, needed.value),), quantities=lines)
        how = "the accepted layout"
        lines += (measured("stroke that is kept", kept, "mm", "ejector stroke", how=how),)
        return kept, Notes(quantities=lines)
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


def _longer(kept: float, own: float, needed: float) -> Finding:
    return Finding(
        "accepted.stroke",
        Severity.CAUTION,
        f"the ejectors travel {own:g} mm instead of {kept:g} mm, so each pin has another length: with the accepted "
        f"stroke the part is not free, it needs {needed:.2f} mm",
        where="ejection.stroke",
        value=round(kept, 3),
        limit=round(needed, 3),
        unit="mm",
        remedy=REMEDY,
    )


def _given(task: Task, given: tuple[GivenPin, ...], cut: tuple[KeptItem, ...] = ()) -> tuple[list[Place], Notes]:
    """Return the user's pins as far as a pin can be made there at all, with a finding for each rule they break.

    cut : pins of the spec in an accepted layout, for their holes
    """
    kept: list[Place] = []
    notes = Notes()
    for number, pin in enumerate(given, 1):
        spot = np.array(pin.at[:2])
        diameter = pin.diameter or task.section.diameter or _fitting(task, spot)
        disc = task.under.discs(spot[None], np.array([diameter]))[0]
        kind = of_diameter(diameter, task.section.edge_clearance)
        place = _in_hole(Place(float(spot[0]), float(spot[1]), kind, disc, Chooser.GIVEN), cut)
        notes += check_given(task.under, place, number, kept, task.bores)
        notes += _marked(task.view, place, number, task.no_pins)
        notes += _near_side_action(task, place, number)
        room, needed = task.under.exact_room(spot), diameter / 2 + task.section.edge_clearance
        if disc.whole and disc.core_side and not disc.aside and room < needed - 1e-6:
            notes += Notes((_near_edge(task.view, place, number, room - diameter / 2, task.section.edge_clearance),))
        if disc.faces and disc.core_side and not disc.aside:
            kept.append(place)
    return kept, notes


def _in_hole(place: Place, cut: tuple[KeptItem, ...]) -> Place:
    """Return a pin of the spec with the fit and length that it was accepted with at that place."""
    item = hole_of(place.x, place.y, cut)
    if item is None or not math.isclose(item.diameter, place.diameter):
        return place
    return replace(place, fit_end=item.fit_end, length=item.length)


def _near_edge(view: PartView, place: Place, number: int, left: float, limit: float) -> Finding:
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


def _marked(view: PartView, place: Place, number: int, no_pins: frozenset[int]) -> Notes:
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


def _near_side_action(task: Task, place: Place, number: int) -> Notes:
    """Tell that a pin of the spec stands in the way of a side action, or too close to it."""
    if not (task.view.halves.sides and place.disc.faces):
        return Notes()
    high = place.disc.high
    near = side_steel(task, np.array([[place.x, place.y]]), place.kind, np.array([high]))
    steel, limit = float(near.steel[0]), STEEL
    if steel >= limit:
        return Notes()
    crossed = steel <= 0.0
    how = f"stands in the way of {near.names[0]}" if crossed else f"leaves {steel:.2f} mm of steel to {near.names[0]}"
    finding = Finding(
        "ejector_pin.side_action",
        Severity.FAILURE if crossed else Severity.WARNING,
        f"pin {number} of the spec {how}: {task.view.keep_out.why}",
        where=f"ejection.pins[{number - 1}]",
        at=task.view.place((place.x, place.y, high)),
        value=round(steel, 3),
        limit=limit,
        unit="mm",
        remedy="move the pin, make it thinner, or let moldgen place it",
    )
    return Notes((finding,))


def _fitting(task: Task, spot: np.ndarray) -> float:
    """Return the largest standard diameter that keeps the edge clearance at a place, else the smallest."""
    room = task.under.exact_room(spot) - task.section.edge_clearance
    pin = ejector_pin_down(min(2 * room, size_cap(task.view)))
    return (pin or ejector_pin_series()[0]).diameter


def _pins(task: Task, places: list[Place]) -> tuple[tuple[EjectorPinLayout, ...], Notes]:
    """Return the pins in the order of their places, with their share of the force."""
    order = sorted(places, key=_rank)
    names = _names(order)
    spots = np.array([[p.x, p.y] for p in order]).reshape(-1, 2)
    areas = np.array([math.pi / 4 * p.diameter**2 for p in order])
    forces = shares(spots, areas, task.sticking.force, task.sticking.centre)
    pins, ground, fits = [], [], []
    for name, place, force in zip(names, order, forces, strict=True):
        pin, cut = _pin(task, place, name, float(force))
        pins.append(pin)
        if cut > 0.0:
            ground.append((cut, pin))
        fit = fit_of(place.kind, task.view, place.disc.low, place.fit_end)
        fits.append((name, task.view.place((pin.x, pin.y, pin.tip_z)), fit))
    return tuple(pins), _ground(task.view, ground) + fits_told(fits)


def _rank(place: Place) -> tuple[int, float, float]:
    """Return what pins are sorted by: those of the spec, those that are kept in their own order, moldgen's."""
    if place.chooser is Chooser.KEPT:
        return 1, 0.0, 0.0
    return (0 if place.chooser is Chooser.GIVEN else 2), round(place.x, 3), round(place.y, 3)


def _names(order: list[Place]) -> list[str]:
    """Return a name for each pin; one that is kept keeps its own, so that no two pins ever share one."""
    given = sum(p.chooser is Chooser.GIVEN for p in order)
    names = [f"{ROLE} {number}" for number in range(1, given + 1)]
    taken = {*names, *(p.name for p in order if p.name)}
    used = set(names)
    for place in order[given:]:
        own = place.name and place.name not in used
        names.append(place.name if own else free_name(ROLE, taken))
        used.add(names[-1])
    return names


def _pin(task: Task, place: Place, name: str, force: float) -> tuple[EjectorPinLayout, float]:
    """Return one pin, and how much of its shank is ground down to the tip's diameter [mm]."""
    kind, disc = place.kind, place.disc
    stack = stack_up(kind, task.view, task.stroke, disc.high, disc.low, place.fit_end, place.length)
    pin = EjectorPinLayout(
        name=name,
        x=place.x,
        y=place.y,
        tip_z=disc.high,
        diameter=kind.diameter,
        fit_length=stack.fit,
        clearance_diameter=kind.bore,
        head_diameter=kind.head_diameter,
        head_height=kind.head_height,
        seat_z=stack.seat,
        length=stack.length,
        force_n=force,
        pressure_mpa=force / (math.pi / 4 * kind.diameter**2),
        buckling_n=stack.buckling,
        chosen_by=place.chooser,
        tip_drop=disc.high - disc.low,
        shank_diameter=kind.shank if kind.stepped else 0.0,
        shank_length=stack.shank,
    )
    return pin, stack.ground


def _ground(view: PartView, ground: list[tuple[float, EjectorPinLayout]]) -> Notes:
    """Tell when the tips that are sold are too short for stroke and fit."""
    if not ground:
        return Notes()
    most, pin = max(ground, key=lambda entry: entry[0])
    finding = Finding(
        "ejector_pin.ground_shank",
        Severity.NOTE,
        f"the shoulder of {len(ground)} ejector pins is ground back by up to {most:.1f} mm: on a pin of "
        f"{pin.length:g} mm it would run into the fit before the end of the stroke",
        at=view.place((pin.x, pin.y, pin.tip_z)),
        value=round(most, 2),
        unit="mm",
        remedy="grind the shank to the diameter of the tip, or order pins with a longer tip",
    )
    return Notes((finding,))
