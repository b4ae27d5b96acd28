"""The search for ejector pins: size and places; straight pins if they find room, else shouldered ones."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.catalog import Resin, ejector_pin_series, shouldered_pin_series
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.balance import shares
from moldgen.layout.keep_out import Nearest
from moldgen.layout.pin_choice import Choice, Counts, Load, gather, mirrors, units
from moldgen.layout.pin_kinds import PinKind, Place, of_diameter, shouldered, stack_up, straight
from moldgen.layout.sites import Underside
from moldgen.layout.sticking import Sticking
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout
from moldgen.rules.layout_practice import (
    EJECTOR_FEWEST,
    PIN_GENTLE_SLOPE,
    SMALL_PIN_EDGE,
    STEEL_BETWEEN_BORES,
    STEEL_TO_EDGE,
)
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

BETTER: Final = 0.8
"""Pins that come nearer to an edge are taken when they press on the part with no more than this share."""

HEADS_APART: Final = 1.5
"""mm: steel between the counterbores of two ejector pin heads."""


@dataclass(frozen=True)
class Task:
    """What the search for places works on.

    bores : core pins whose bores must be kept clear; stroke : travel [mm]
    most : how many pins there may be, with those that are kept, unless the force asks for more; 0 for `MOST_PINS`
    """

    view: PartView
    section: Ejection
    resin: Resin
    under: Underside
    bores: tuple[CorePinLayout, ...]
    sticking: Sticking
    stroke: float
    no_pins: frozenset[int]
    most: int = 0


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
    """Return moldgen's pins: straight ones if they find room, else shouldered ones that come nearer to edges."""
    load = _load(task)
    gentle = Underside(task.view, task.no_pins, PIN_GENTLE_SLOPE.default)
    grounds = [replace(task, under=gentle), task]
    if (gentle.pushable == task.under.pushable).all():
        grounds = [task]
    best = _on_slopes(grounds, kept, load, _straight_kinds(task))
    why = "thickest standard pins whose places are hardly farther from what sticks than those of thinner ones"
    few = int(EJECTOR_FEWEST.default) - len(kept)
    for edge in small_edges(task):
        if best is not None and (best.enough or (len(best.places) >= few and not best.kind.stepped)):
            break
        other = _on_slopes(grounds, kept, load, _small_kinds(task, edge))
        if other is not None and (best is None or _better(other, best, few)):
            best, why = other, "too few places for straight pins: shouldered pins, as thick as their tips may be"
    if best is None:
        return [], _no_room(task, kept)
    spots, kind = best.places, best.kind
    discs = task.under.discs(spots, np.full(len(spots), kind.diameter))
    found = [Place(float(x), float(y), kind, disc, Chooser.MOLDGEN) for (x, y), disc in zip(spots, discs, strict=True)]
    name = f" shouldered, shank {kind.shank:g} mm" if kind.stepped else ""
    notes = Notes(decisions=(Decision("ejector pins", f"{len(found)} of {kind.diameter:g} mm{name}", why),))
    return found, notes + (_small(task, found, kind) if kind.edge < task.section.edge_clearance else Notes())


def _better(other: _Proposal, best: _Proposal, few: int) -> bool:
    """Return whether pins that come nearer to edges are worth it; `few` pins are needed to hold the part level."""
    missing, now = (max(few - len(p.places), 0) for p in (other, best))
    return other.enough or missing < now or (missing == now and other.pressure < BETTER * best.pressure)


def _on_slopes(grounds: list[Task], kept: list[Place], load: Load, kinds: list[PinKind]) -> _Proposal | None:
    """Return pins on the first ground, the gentle slopes, if enough of them find room there, else on the next too."""
    best: _Proposal | None = None
    for ground in grounds:
        if best is None or not best.enough:
            found = _size_and_places(ground, kept, load, kinds)
            if found is not None and (best is None or found.enough or found.pressure < best.pressure):
                best = found
    return best


def _straight_kinds(task: Task) -> list[PinKind]:
    """Return the straight pins that may be taken, thickest first; a diameter of the spec leaves only that one."""
    edge, wanted = task.section.edge_clearance, task.section.diameter
    if wanted is not None:
        kind = of_diameter(wanted, edge)
        return [] if kind.stepped else [kind]
    return [straight(p, edge) for p in reversed(ejector_pin_series()) if p.diameter <= size_cap(task.view) + 1e-9]


def _small_kinds(task: Task, edge: float) -> list[PinKind]:
    """Return the shouldered pins that may be taken, thickest first."""
    wanted = task.section.diameter
    series = reversed(shouldered_pin_series())
    return [shouldered(p, edge) for p in series if wanted is None or math.isclose(p.diameter, wanted)]


def small_edges(task: Task) -> list[float]:
    """Return the edge clearances of shouldered pins, in the order tried; one that the spec gives is kept."""
    limit = task.section.edge_clearance
    if "edge_clearance" in task.section.model_fields_set:
        return [limit]
    return [min(limit, SMALL_PIN_EDGE.default), min(limit, SMALL_PIN_EDGE.low)]


@dataclass(frozen=True)
class _Proposal:
    """Places (n, 2) for pins of one kind, the highest pressure on the part [MPa], whether they suffice."""

    places: np.ndarray
    kind: PinKind
    pressure: float
    enough: bool
    cost: float


def _size_and_places(task: Task, kept: list[Place], load: Load, kinds: list[PinKind]) -> _Proposal | None:
    """Return the largest pins whose places are hardly worse than those of smaller ones; None without any place."""
    if not kinds:
        return None
    places, room = task.under.fine_grid if kinds[0].stepped else task.under.grid
    group = mirrors(places, room, task.view.middle) if not kept else [np.array([1.0, 1.0])]
    fixed = np.array([[p.x, p.y] for p in kept]).reshape(-1, 2)
    tried: list[_Proposal] = []
    for kind in kinds:
        choice = _choose(task, kind, (places, room, group), load, fixed)
        if choice is None or choice.count() <= len(kept):
            continue
        pressure = highest_pressure(task, kept, choice.result(), kind.diameter)
        enough = choice.count() >= counts_of(task, kind).least and pressure <= task.resin.push_pressure
        tried.append(_Proposal(choice.result(), kind, pressure, enough, choice.cost()))
        if sum(p.enough for p in tried) >= SIZES_TRIED:
            break
    good = [p for p in tried if p.enough]
    if good:
        limit = WORSE * min(p.cost for p in good)
        return next(p for p in good if p.cost <= limit)
    few = int(EJECTOR_FEWEST.default) - len(kept)
    return min(tried, key=lambda p: (max(few - len(p.places), 0), p.pressure), default=None)


def highest_pressure(task: Task, kept: list[Place], places: np.ndarray, diameter: float) -> float:
    """Return the highest pressure of a pin on the part when these pins are added to the kept ones [MPa]."""
    spots = np.vstack([np.array([[p.x, p.y] for p in kept]).reshape(-1, 2), places])
    areas = math.pi / 4 * np.r_[[p.diameter**2 for p in kept], np.full(len(places), diameter**2)]
    return float((shares(spots, areas, task.sticking.force, task.sticking.centre) / areas).max())


def _choose(
    task: Task, kind: PinKind, grid: tuple[np.ndarray, np.ndarray, list[np.ndarray]], load: Load, fixed: np.ndarray
) -> Choice | None:
    places, room, group = grid
    spots = places[room >= kind.room]
    spots = spots[clear_of_steel(task, spots, kind)]
    if len(spots) == 0:
        return None
    apart = kind.head_diameter + HEADS_APART
    sets = units(spots, group, task.view.middle, apart)
    if len(sets) == 0:
        sets = units(spots, group[:1], task.view.middle, apart)
    sets = sets[:: math.ceil(len(sets) / MOST_UNITS)]
    choice = Choice(spots, sets, load, apart, fixed)
    choice.search(counts_of(task, kind))
    return choice


def counts_of(task: Task, kind: PinKind) -> Counts:
    """Return how many pins of a size the part and the pins themselves ask for."""
    force, limit = task.sticking.force, task.resin.push_pressure
    area = math.pi / 4 * kind.diameter**2
    by_pressure = force / (limit * area)
    by_punch = force / (0.5 * limit * math.pi * kind.diameter * max(task.view.wall, 0.1))
    level = task.view.level
    hold = stack_up(kind, task.view, task.stroke, level, level).buckling / BUCKLING_SAFETY.default
    least = max(int(EJECTOR_FEWEST.default), math.ceil(max(by_pressure, by_punch, force / hold) - 1e-9))
    return Counts(least, max(task.most, least) if task.most else max(MOST_PINS, 2 * least))


def clear_of_steel(task: Task, places: np.ndarray, kind: PinKind) -> np.ndarray:
    """Return which places keep clear of core pins, side actions and the sides of the block, (k,) bool."""
    bore = kind.bore / 2
    view, steel = task.view, STEEL_BETWEEN_BORES.default
    edge = np.minimum(places - view.low[:2], view.high[:2] - places).min(axis=1)
    free = edge >= bore + STEEL_TO_EDGE.default
    for other in task.bores:
        gap = np.linalg.norm(places - np.array([other.x, other.y]), axis=1)
        free &= gap >= bore + max(other.clearance_diameter, other.head_diameter + 0.5) / 2 + steel
    if view.halves.sides and free.any():
        rows = np.flatnonzero(free)
        height, _ = view.underside(places[rows])
        free[rows] = side_steel(task, places[rows], kind, height).steel >= steel
        rows = np.flatnonzero(free)
        # one face may belong to the part here and to a side action there, without an edge between
        discs = task.under.discs(places[rows], np.full(len(rows), kind.diameter + 2 * kind.edge))
        free[rows] = ~np.array([disc.aside for disc in discs], dtype=bool)
    return np.asarray(free)


def side_steel(task: Task, places: np.ndarray, kind: PinKind, height: np.ndarray) -> Nearest:
    """Return the steel between pins at places (k, 2), their ends at heights (k,) [mm], and the ways of side actions."""
    keep_out, bottom = task.view.keep_out, float(task.view.low[2])
    bore = keep_out.upright(places, kind.bore / 2, bottom, height)
    seat = stack_up(kind, task.view, task.stroke, task.view.level, task.view.level).seat
    below = keep_out.upright(places, kind.head_diameter / 2, seat, bottom)
    names = (b if lower else a for a, b, lower in zip(bore.names, below.names, below.steel < bore.steel, strict=True))
    return Nearest(np.minimum(bore.steel, below.steel), tuple(names))


def _small(task: Task, found: list[Place], kind: PinKind) -> Notes:
    """Tell that small pins come nearer to an edge than pins usually do."""
    room = [(task.under.exact_room(np.array([p.x, p.y])), p) for p in found]
    least, place = min(room, key=lambda entry: entry[0])
    left = least - kind.diameter / 2
    usual, name = task.section.edge_clearance, f"{len(found)} shouldered of {kind.diameter:g} mm"
    finding = Finding(
        "ejection.small_pins",
        Severity.CAUTION,
        f"straight ejector pins find too little room; {name} come to {left:.2f} mm from an edge of the part; "
        f"{kind.edge:g} mm is common practice for pins so small",
        at=task.view.place((place.x, place.y, place.disc.high)),
        value=round(left, 3),
        limit=usual,
        unit="mm",
        remedy="give the part a pad for a thicker pin, or watch these pins for wear and flash",
    )
    return Notes((finding,), quantities=(SMALL_PIN_EDGE.line("shouldered ejector pins"),))


def _no_room(task: Task, kept: list[Place]) -> Notes:
    _, room = task.under.fine_grid
    kinds = [*_straight_kinds(task), *(k for e in small_edges(task) for k in _small_kinds(task, e))]
    needed = min(kind.room for kind in kinds)
    widest = float(room.max()) if len(room) else 0.0
    if widest <= 0.0:
        reason = "the core half forms no surface that a pin could push on: all of it is steeper than 30 deg or marked"
    elif widest < needed:
        reason = f"the widest place leaves {widest:.2f} mm from its middle to its edge, a pin needs {needed:.2f} mm"
    else:
        aside = "slides and lifters, " if task.view.halves.sides else ""
        reason = f"{aside}core pins, given pins or the sides of the block are too close to every place"
    finding = Finding(
        "ejection.no_room",
        Severity.CAUTION if kept else Severity.FAILURE,
        f"no place for an ejector pin, not even for the thinnest shouldered one: {reason}",
        at=task.view.place((*task.view.middle, task.view.body.box[0][2])),
        value=round(widest, 3),
        limit=round(needed, 3),
        unit="mm",
        remedy="push the part off with a stripper plate or sleeve, give it a flat pad, or give pins in the spec",
    )
    return Notes((finding,))
