"""The search for ejector pins: diameter and places, on gentle slopes if there is room."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Pin, Resin, ejector_pin_series, ejector_pin_up
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.balance import shares
from moldgen.layout.pin_choice import Choice, Counts, Load, gather, mirrors, units
from moldgen.layout.sites import Disc, Underside
from moldgen.layout.sticking import Sticking
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout
from moldgen.rules.layout_practice import (
    EJECTOR_FEWEST,
    PIN_GENTLE_SLOPE,
    RETAINER_PLATE,
    STEEL_BETWEEN_BORES,
    STEEL_TO_EDGE,
)
from moldgen.rules.pins import clearance_bore_diameter, euler_buckling_force
from moldgen.rules.practice import BUCKLING_SAFETY
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
class Task:
    """What the search for places works on. bores : core pins whose bores must be kept clear; stroke : travel [mm]."""

    view: PartView
    section: Ejection
    resin: Resin
    under: Underside
    bores: tuple[CorePinLayout, ...]
    sticking: Sticking
    stroke: float
    no_pins: frozenset[int]


@dataclass(frozen=True)
class Place:
    """One ejector pin: axis and diameter [mm], what lies over its end face, who chose it."""

    x: float
    y: float
    diameter: float
    disc: Disc
    chooser: Chooser


def size_cap(view: PartView) -> float:
    """Return the largest diameter that moldgen takes on a part of this size [mm]."""
    low, high = view.body.box
    share = CAP * float(np.linalg.norm((high - low)[:2]))
    return min(max(share, CAP_RANGE[0]), CAP_RANGE[1])


def _load(task: Task) -> Load:
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
    return Load(*gather(places, weights, diagonal, view.middle), centre, diagonal)


def search_pins(task: Task, kept: list[Place]) -> tuple[list[Place], Notes]:
    """Return moldgen's pins: on gentle slopes if enough of them find room there, else also on steeper ones."""
    gentle = Underside(task.view, task.no_pins, PIN_GENTLE_SLOPE.default)
    load = _load(task)
    best = _size_and_places(replace(task, under=gentle), kept, load)
    if best is None or not best.enough:
        steep = _size_and_places(task, kept, load)
        if steep is not None and (best is None or steep.enough or steep.pressure < best.pressure):
            best = steep
    if best is None:
        return [], _no_room(task, kept)
    spots, diameter = best.places, best.diameter
    discs = task.under.discs(spots, np.full(len(spots), diameter))
    found = [
        Place(float(x), float(y), diameter, disc, Chooser.MOLDGEN) for (x, y), disc in zip(spots, discs, strict=True)
    ]
    why = "thickest standard pins whose places are hardly farther from what sticks than those of thinner ones"
    return found, Notes(decisions=(Decision("ejector pins", f"{len(found)} of {diameter:g} mm", why),))


@dataclass(frozen=True)
class _Proposal:
    """Places (n, 2) for pins of one diameter [mm], the highest pressure on the part [MPa], whether they suffice."""

    places: np.ndarray
    diameter: float
    pressure: float
    enough: bool
    cost: float


def _size_and_places(task: Task, kept: list[Place], load: Load) -> _Proposal | None:
    """Return the largest diameter whose places are hardly worse than those of smaller ones; None without any place."""
    places, room = task.under.grid()
    group = mirrors(places, room, task.view.middle) if not kept else [np.array([1.0, 1.0])]
    sizes = [p for p in reversed(ejector_pin_series()) if p.diameter <= size_cap(task.view) + 1e-9]
    if task.section.diameter is not None:
        sizes = [standard_pin(task.section.diameter)]
    fixed = np.array([[p.x, p.y] for p in kept]).reshape(-1, 2)
    tried: list[_Proposal] = []
    for pin in sizes:
        choice = _choose(task, pin, (places, room, group), load, fixed)
        if choice is None or choice.count() <= len(kept):
            continue
        pressure = _highest_pressure(task, kept, choice.result(), pin.diameter)
        enough = choice.count() >= _counts(task, pin).least and pressure <= task.resin.push_pressure
        tried.append(_Proposal(choice.result(), pin.diameter, pressure, enough, choice.cost()))
        if sum(p.enough for p in tried) >= SIZES_TRIED:
            break
    good = [p for p in tried if p.enough]
    if good:
        limit = WORSE * min(p.cost for p in good)
        return next(p for p in good if p.cost <= limit)
    return min(tried, key=lambda p: p.pressure, default=None)


def _highest_pressure(task: Task, kept: list[Place], places: np.ndarray, diameter: float) -> float:
    """Return the highest pressure of a pin on the part when these pins are added to the kept ones [MPa]."""
    spots = np.vstack([np.array([[p.x, p.y] for p in kept]).reshape(-1, 2), places])
    areas = math.pi / 4 * np.r_[[p.diameter**2 for p in kept], np.full(len(places), diameter**2)]
    return float((shares(spots, areas, task.sticking.force, task.sticking.centre) / areas).max())


def standard_pin(diameter: float) -> Pin:
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
    task: Task, pin: Pin, grid: tuple[np.ndarray, np.ndarray, list[np.ndarray]], load: Load, fixed: np.ndarray
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


def _counts(task: Task, pin: Pin) -> Counts:
    """Return how many pins of a size the part and the pins themselves ask for."""
    force, limit = task.sticking.force, task.resin.push_pressure
    area = math.pi / 4 * pin.diameter**2
    by_pressure = force / (limit * area)
    by_punch = force / (0.5 * limit * math.pi * pin.diameter * max(task.view.wall, 0.1))
    length = max(task.view.level - task.view.low[2] + task.stroke + RETAINER_PLATE.default, 1.0)
    hold = euler_buckling_force(pin.diameter, float(length)) / BUCKLING_SAFETY.default
    least = max(int(EJECTOR_FEWEST.default), math.ceil(max(by_pressure, by_punch, force / hold) - 1e-9))
    return Counts(least, max(MOST_PINS, 2 * least))


def _clear(task: Task, places: np.ndarray, pin: Pin) -> np.ndarray:
    """Return which places keep clear of core pins and of the sides of the block, (k,) bool."""
    bore = clearance_bore_diameter(pin.diameter) / 2
    view, steel = task.view, STEEL_BETWEEN_BORES.default
    edge = np.minimum(places - view.low[:2], view.high[:2] - places).min(axis=1)
    free = edge >= bore + STEEL_TO_EDGE.default
    for other in task.bores:
        gap = np.linalg.norm(places - np.array([other.x, other.y]), axis=1)
        free &= gap >= bore + max(other.clearance_diameter, other.head_diameter + 0.5) / 2 + steel
    return np.asarray(free)


def _no_room(task: Task, kept: list[Place]) -> Notes:
    _, room = task.under.grid()
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
