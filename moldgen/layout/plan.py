"""The whole layout of one part in its halves: core pins, ejector pins, gate."""

from __future__ import annotations

from dataclasses import dataclass, field

from moldgen.catalog import Resin
from moldgen.finding import Notes
from moldgen.layout.clearances import check_clearances
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.ejection import GivenPin, place_ejector_pins
from moldgen.layout.gate import place_gate
from moldgen.layout.view import PartView
from moldgen.model.layout import Layout
from moldgen.model.part import Vector
from moldgen.spec.sections import CorePins, Ejection, Gate


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
    core_pins, notes = find_core_pins(view, wishes.core_pins, resin, wishes.core_pins_at)
    ejection, more = place_ejector_pins(view, wishes.ejection, resin, core_pins, wishes.pins, wishes.no_pins)
    notes += more
    gate, more = place_gate(view, wishes.gate, resin, wishes.gate_at, wishes.no_gate)
    notes += more + check_clearances(view, core_pins, ejection.pins)
    return Layout(core_pins, ejection.pins, gate, ejection.stroke_mm, ejection.force_n), notes
