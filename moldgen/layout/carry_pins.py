"""Ejector pins of an accepted layout on the changed part: kept where they keep the rules, else moved or left."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.finding import Decision, Notes
from moldgen.layout.balance import resultant
from moldgen.layout.carry_fits import end_of
from moldgen.layout.ejection_checks import OFF_CENTRE, steel_beside
from moldgen.layout.keep_out import STEEL
from moldgen.layout.kept import MOST_MOVED, Kept, KeptItem, Reason, dropped, followed, moved, steps_around, still_held
from moldgen.layout.pin_kinds import PinKind, Place, of_diameter
from moldgen.layout.pin_search import (
    HEADS_APART,
    Task,
    clear_of_steel,
    counts_of,
    highest_pressure,
    search_pins,
    side_steel,
    small_edges,
)
from moldgen.model.accepted import SNAP
from moldgen.model.layout import Chooser
from moldgen.model.part import Vector
from moldgen.rules.layout_practice import PIN_SLOPE

STEP: Final = 0.25
"""mm: distance of the places tried round one that breaks a rule (our choice)."""

BETTER: Final = 0.8
"""Added pins are taken when they bring what is passed down to this share of itself (our choice, as in the search)."""

NO_WORSE: Final = 1.02
"""Pins press no harder than in the accepted tool up to this share of what they did there (our choice: what is measured
on the mesh of a part comes out otherwise by a percent where it changes elsewhere)."""

_GONE: Final = Reason("gone", "the face that it pushed on is gone, and where it stood ")


def carry_pins(task: Task, kept: Kept, fixed: list[Place]) -> tuple[list[Place], Notes]:
    """Return the ejector pins of an accepted layout, and moldgen's own where those do not suffice.

    fixed : pins of the spec, which stay where they are
    """
    items = kept.ejector_pins
    if not items:
        return search_pins(task, fixed)
    if kept.same_part:
        found, notes = search_pins(task, fixed)
        same = _found_again(found, items)
        if same is not None:
            return same, notes + Notes(decisions=(_decision(len(same), len(items), []),))
    places, notes = keep_pins(task, items, fixed)
    now, missing = lack_of(task, [*fixed, *places]), len(items) - len(places)
    added: list[Place] = []
    if not missing and not now.suffices and now.borne(task, kept.pressure):
        choice = _decision(len(places), len(items), [])
        why = f"no pin is added: {now.text}, with {kept.pressure:.1f} MPa in the accepted tool"
        return places, notes + Notes(decisions=(replace(choice, why=why),))
    if missing or not now.suffices:
        added, more = _added(task, [*fixed, *places], 0 if not now.suffices else missing)
        if not (now.suffices and added) and not now.worse_than(lack_of(task, [*fixed, *places, *added])):
            added = []
        if added or not places:
            notes += more
    return [*places, *added], notes + Notes(decisions=(_decision(len(places), len(items), added, now),))


def _decision(stay: int, accepted: int, added: list[Place], lack: Lack | None = None) -> Decision:
    choice = f"{stay} of {accepted} as accepted" + (f", {len(added)} added" if added else "")
    why = "an accepted pin stays where it keeps the rules"
    if added and lack is not None:
        why += "; added: " + ("for those that were not kept" if lack.suffices else lack.text)
    return Decision("ejector pins kept", choice, why)


def _found_again(found: list[Place], items: tuple[KeptItem, ...]) -> list[Place] | None:
    """Return the pins of the search under their accepted names if they are the accepted ones, else None."""
    order = sorted(found, key=lambda p: (round(p.x, 3), round(p.y, 3)))
    if len(order) != len(items):
        return None
    for place, item in zip(order, items, strict=True):
        off = max(abs(place.x - item.at[0]), abs(place.y - item.at[1]), abs(place.diameter - item.diameter))
        if off > SNAP:
            return None
    return [
        replace(p, chooser=Chooser.KEPT, name=i.name, fit_end=i.fit_end, length=i.length)
        for p, i in zip(order, items, strict=True)
    ]


def _added(task: Task, kept: list[Place], count: int) -> tuple[list[Place], Notes]:
    """Return more pins, of the size that most have if there is room for it; at most `count`, 0 for what is needed."""
    most = len(kept) + count if count else 0
    sizes = [p.diameter for p in kept]
    if sizes and task.section.diameter is None:
        usual = max(sorted(set(sizes)), key=sizes.count)
        alike = task.section.model_copy(update={"diameter": usual})
        found, notes = search_pins(replace(task, section=alike, most=most), kept)
        if found:
            return found, notes
    return search_pins(replace(task, most=most), kept)


def keep_pins(task: Task, kept: tuple[KeptItem, ...], fixed: list[Place]) -> tuple[list[Place], Notes]:
    """Return the accepted ejector pins that stay, in their order, with a finding for each that moved or was left.

    fixed : pins of the spec, which stay where they are
    """
    placed: dict[int, Place] = {}
    reasons: dict[int, Reason] = {}
    for number, item in enumerate(kept):
        kind = kind_of(task, item.diameter)
        reason = broken(task, item.at, kind, [*fixed, *placed.values()])
        if reason is None:
            placed[number] = _place(task, item, np.array(item.at[:2]), kind)
        else:
            reasons[number] = reason
    notes = Notes()
    for number, item in enumerate(kept):
        at = task.view.place(item.at)
        if number in placed:
            notes += followed(item.name, item.shift, at) if not item.gone else still_held(item.name, at)
            continue
        reason = _with_gone(item, reasons[number])
        spot = _nearest(task, item, [*fixed, *placed.values()])
        if spot is None:
            notes += dropped(item.name, reason, at)
            continue
        placed[number] = _place(task, item, spot, kind_of(task, item.diameter))
        notes += moved(item.name, float(np.hypot(*(spot - np.array(item.at[:2])))), reason, at)
    return [placed[n] for n in sorted(placed)], notes


def kind_of(task: Task, diameter: float) -> PinKind:
    """Return the pin of a diameter; small ones may come as near to edges as the search lets them."""
    kind = of_diameter(diameter, task.section.edge_clearance)
    return replace(kind, edge=min(small_edges(task))) if kind.stepped else kind


def _place(task: Task, item: KeptItem, spot: np.ndarray, kind: PinKind) -> Place:
    disc = task.under.discs(spot[None], np.array([kind.diameter]))[0]
    end = end_of(item, kind.diameter, float(np.hypot(*(spot - np.array(item.at[:2])))))
    return Place(float(spot[0]), float(spot[1]), kind, disc, Chooser.KEPT, item.name, end, item.length)


def _with_gone(item: KeptItem, reason: Reason) -> Reason:
    """Return why a pin cannot stay, with the news that its face is gone where that is so."""
    return (
        replace(reason, text=_GONE.text + "it " + reason.text)
        if item.gone
        else replace(reason, text=f"it {reason.text}")
    )


def broken(task: Task, at: Vector, kind: PinKind, others: list[Place]) -> Reason | None:
    """Return the first rule that a pin at a place [mm, mold frame] breaks, None if it keeps all."""
    spot = np.array(at[:2])
    disc = task.under.discs(spot[None], np.array([kind.diameter]))[0]
    marked = bool(task.no_pins & set(disc.faces))
    for code, wrong, text in (
        ("no_part", not disc.faces, "has no part above it"),
        ("cavity_face", not disc.core_side, "would push on a face that the cavity half forms"),
        ("side_face", disc.aside, "would push on the steel of a slide or lifter"),
        ("marked_face", marked, "would push on a face that is marked no_pins"),
        ("overhangs", not disc.whole, "would have the part over only a portion of its end face"),
    ):
        if wrong:
            return Reason(code, text)
    if disc.slope > PIN_SLOPE.default:
        text = f"would push on a surface that slopes by {disc.slope:.0f} deg"
        return Reason("slope", text, disc.slope, PIN_SLOPE.default, "deg")
    room = task.under.exact_room(spot)
    if room < kind.room - SNAP:
        left = room - kind.diameter / 2
        text = f"would leave {left:.2f} mm to an edge of the surface that it pushes on"
        return Reason("edge_clearance", text, left, kind.edge, "mm")
    return _crowded(task, Place(float(spot[0]), float(spot[1]), kind, disc, Chooser.KEPT), others)


def _crowded(task: Task, place: Place, others: list[Place]) -> Reason | None:
    """Return what of the other steel stands too close to a pin."""
    spot = np.array([[place.x, place.y]])
    for other in others:
        gap = float(np.hypot(other.x - place.x, other.y - place.y))
        heads = gap - (place.kind.head_diameter + other.kind.head_diameter) / 2
        if heads < HEADS_APART - SNAP:
            whose = other.name or "a pin of the spec"
            return Reason(
                "too_close",
                f"would leave {heads:.2f} mm between its head and that of {whose}",
                heads,
                HEADS_APART,
                "mm",
            )
    for code, _, text, value, limit, unit in steel_beside(task.view, place, [], task.bores):
        if value is None or limit is None or value < limit - SNAP:
            return Reason(code, text, value, limit, unit)
    if task.view.halves.sides:
        near = side_steel(task, spot, place.kind, np.array([place.disc.high]))
        steel = float(near.steel[0])
        if steel < STEEL - SNAP:
            return Reason("side_action", f"would leave {steel:.2f} mm of steel to {near.names[0]}", steel, STEEL, "mm")
    return None


def _nearest(task: Task, item: KeptItem, others: list[Place]) -> np.ndarray | None:
    """Return the nearest place within `MOST_MOVED` at which a pin keeps all rules, (2,) [mm]."""
    kind, spot = kind_of(task, item.diameter), np.array(item.at[:2])
    places = spot + steps_around(STEP, MOST_MOVED)
    places = places[task.under.room(places) >= kind.room]
    places = places[clear_of_steel(task, places, kind)] if len(places) else places
    for place in places:
        if broken(task, (float(place[0]), float(place[1]), 0.0), kind, others) is None:
            return np.asarray(place)
    return None


@dataclass(frozen=True)
class Lack:
    """What pins lack: how many are missing, and the worst of pressure and offset as a share of its limit."""

    missing: int
    passed: float
    text: str
    pressure: float = float("inf")
    off: float = float("inf")

    def borne(self, task: Task, accepted: float) -> bool:
        """True when the pins push in the middle and press no harder than in the accepted tool, there with [MPa]."""
        return self.off <= 1.0 and self.pressure * task.resin.push_pressure <= NO_WORSE * accepted

    @property
    def suffices(self) -> bool:
        """True when nothing is lacking."""
        return self.missing == 0 and self.passed <= 1.0 + 1e-9

    def worse_than(self, other: Lack) -> bool:
        """True when the other pins are worth having instead."""
        return other.missing < self.missing or (
            other.missing == self.missing and other.passed <= max(BETTER * self.passed, 1.0)
        )


def lack_of(task: Task, places: list[Place]) -> Lack:
    """Return what the ejection lacks with these pins."""
    if not places:
        return Lack(1, float("inf"), "no pin is left")
    kind = max((p.kind for p in places), key=lambda k: sum(p.kind == k for p in places))
    least = counts_of(task, kind).least
    pressure = highest_pressure(task, places, np.zeros((0, 2)), kind.diameter) / task.resin.push_pressure
    low, high = task.view.body.box
    diagonal = float(np.linalg.norm((high - low)[:2]))
    middle = resultant(np.array([[p.x, p.y] for p in places]), np.array([p.diameter**2 for p in places]))
    off = float(np.linalg.norm(middle - task.sticking.centre)) if task.sticking.force > 0.0 else 0.0
    shares = {
        f"{len(places)} pins are left, {least} are needed": least / len(places),
        f"they would press on the part with {pressure * task.resin.push_pressure:.1f} MPa": pressure,
        f"they push {off:.1f} mm beside the centre of what sticks": off / (OFF_CENTRE * diagonal),
    }
    text = max(shares, key=lambda key: shares[key])
    beside = off / (OFF_CENTRE * diagonal)
    return Lack(max(least - len(places), 0), max(pressure, beside), text, pressure, beside)
