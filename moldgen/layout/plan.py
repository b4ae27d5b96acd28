"""The whole layout of one part in its halves: core pins, ejector pins, gate."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Final

from moldgen.catalog import Resin
from moldgen.finding import Decision, Notes
from moldgen.layout.clearances import check_clearances
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.ejection import EjectionLayout, GivenPin, place_ejector_pins
from moldgen.layout.gate import place_gate
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, Layout
from moldgen.model.part import Vector
from moldgen.spec.sections import CorePins, Ejection, Gate

WORTH: Final = 0.8
"""Core pins yield to ejector pins when that lowers the highest pressure on the part to this share."""


@dataclass(frozen=True)
class Wishes:
    """What the spec says about the layout, with every point brought into the mold frame [mm].

    core_pins_at : `core_pins.at`; pins : `ejection.pins`, None for auto; gate_at : `gate.at`, None for auto
    no_pins, no_gate : numbers of the marked faces of the body in the halves
    """

    core_pins: CorePins = field(default_factory=CorePins)
    core_pins_at: tuple[Vector, ...] = ()
    ejection: Ejection = field(default_factory=Ejection)
    pins: tuple[GivenPin, ...] | None = None
    gate: Gate = field(default_factory=Gate)
    gate_at: Vector | None = None
    no_pins: frozenset[int] = frozenset()
    no_gate: frozenset[int] = frozenset()


def plan_layout(view: PartView, resin: Resin, wishes: Wishes) -> tuple[Layout, Notes]:
    """Return pins and gate of the part that `view` shows."""
    core_pins, ejection, notes = _pins(view, resin, wishes)
    gate, more = place_gate(view, wishes.gate, resin, wishes.gate_at, wishes.no_gate)
    notes += more + check_clearances(view, core_pins, ejection.pins)
    return Layout(core_pins, ejection.pins, gate, ejection.stroke_mm, ejection.force_n), notes


def _pins(view: PartView, resin: Resin, wishes: Wishes) -> tuple[tuple[CorePinLayout, ...], EjectionLayout, Notes]:
    """Return the pins; where core pins of moldgen's own choice crowd out the ejectors, they stay in the block."""
    core_pins, notes = find_core_pins(view, wishes.core_pins, resin, wishes.core_pins_at)
    ejection, more = place_ejector_pins(view, wishes.ejection, resin, core_pins, wishes.pins, wishes.no_pins)
    pressure, small = _pressure(ejection), _small(ejection)
    if (pressure <= resin.push_pressure and not small) or all(p.chosen_by is Chooser.GIVEN for p in core_pins):
        return core_pins, ejection, notes + more
    own = wishes.core_pins.model_copy(update={"pick": "none"})
    fewer, told = find_core_pins(view, own, resin, wishes.core_pins_at)
    other, other_more = place_ejector_pins(view, wishes.ejection, resin, fewer, wishes.pins, wishes.no_pins)
    gain = _pressure(other) <= WORTH * pressure or (small and not _small(other))
    if not gain:
        return core_pins, ejection, notes + more
    press = f"{'shouldered ones would ' if small else 'which would '}press on the part with {pressure:.0f} MPa"
    if math.isinf(pressure):
        press = "for which no place would be left"
    why = f"core pins would crowd the ejector pins, {press}"
    refused = tuple(f"{p.name} at {p.x:.1f}, {p.y:.1f}" for p in core_pins if p.chosen_by is Chooser.MOLDGEN)
    decision = Decision("core pins", f"{len(fewer)}, the other round cores stay in the block", why, "", refused)
    return fewer, other, told + other_more + Notes(decisions=(decision,))


def _small(ejection: EjectionLayout) -> bool:
    """Return whether there was only room for shouldered pins."""
    return any(pin.shank_length > 0.0 and pin.chosen_by is Chooser.MOLDGEN for pin in ejection.pins)


def _pressure(ejection: EjectionLayout) -> float:
    """Return the highest pressure on the part [MPa], infinite when a part that sticks gets no pin."""
    none = math.inf if ejection.force_n > 0.0 else 0.0
    return max((pin.pressure_mpa for pin in ejection.pins), default=none)
