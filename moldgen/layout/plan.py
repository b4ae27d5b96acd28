"""The whole layout of one part in its halves: core pins, ejector pins, gate."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from typing import Final

from moldgen.catalog import Resin
from moldgen.finding import Decision, Notes
from moldgen.layout.carry_cores import Bore, KeptCores
from moldgen.layout.clearances import check_clearances
from moldgen.layout.core_pins import find_core_pins
from moldgen.layout.ejection import EjectionLayout, GivenPin, place_ejector_pins
from moldgen.layout.gate import place_gate
from moldgen.layout.kept import Kept, KeptItem
from moldgen.layout.round_cores import find_round_cores
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, Layout
from moldgen.model.part import Vector
from moldgen.rules.pins import clearance_bore_diameter
from moldgen.spec.sections import CorePins, Ejection, Gate

WORTH: Final = 0.8
"""Core pins yield to ejector pins when that lowers the highest pressure on the part to this share."""


@dataclass(frozen=True)
class Wishes:
    """What the spec says about the layout, with every point brought into the mold frame [mm].

    core_pins_at : `core_pins.at`; pins : `ejection.pins`, None for auto; gate_at : `gate.at`, None for auto
    no_pins, no_gate : numbers of the marked faces of the body in the halves
    kept : an accepted layout, which stays where the spec and the rules let it; None for none
    """

    core_pins: CorePins = field(default_factory=CorePins)
    core_pins_at: tuple[Vector, ...] = ()
    ejection: Ejection = field(default_factory=Ejection)
    pins: tuple[GivenPin, ...] | None = None
    gate: Gate = field(default_factory=Gate)
    gate_at: Vector | None = None
    no_pins: frozenset[int] = frozenset()
    no_gate: frozenset[int] = frozenset()
    kept: Kept | None = None


def plan_layout(view: PartView, resin: Resin, wishes: Wishes) -> tuple[Layout, Notes]:
    """Return pins and gate of the part that `view` shows."""
    wishes, notes = _agreed(wishes)
    core_pins, ejection, more = _pins(view, resin, wishes)
    notes += more
    gate, more = place_gate(view, wishes.gate, resin, wishes.gate_at, wishes.no_gate, wishes.kept)
    notes += more + check_clearances(view, core_pins, ejection.pins)
    in_block = _in_block(view, wishes.core_pins, core_pins)
    return Layout(core_pins, ejection.pins, gate, ejection.stroke_mm, ejection.force_n, in_block), notes


def _agreed(wishes: Wishes) -> tuple[Wishes, Notes]:
    """Return the wishes without what of an accepted layout the spec itself gives otherwise, and what that is."""
    kept, notes = wishes.kept, Notes()
    if kept is None:
        return wishes, notes
    if wishes.core_pins.pick == "none" and kept.core_pins:
        kept = replace(kept, core_pins=())
        notes += _beaten(
            "core pins kept", f"only those of the spec, {len(wishes.core_pins_at)}", "core_pins.pick: none"
        )
    if wishes.pins is not None and not wishes.ejection.add and kept.ejector_pins:
        kept = replace(kept, ejector_pins=())
        notes += _beaten("ejector pins kept", f"only those of the spec, {len(wishes.pins)}", "ejection.pins")
    diameter = wishes.ejection.diameter
    if diameter is not None and any(not math.isclose(p.diameter, diameter) for p in kept.ejector_pins):
        own = (p if math.isclose(p.diameter, diameter) else _other_size(p, diameter) for p in kept.ejector_pins)
        kept = replace(kept, ejector_pins=tuple(own))
        notes += _beaten("ejector pins kept", f"their places, with {diameter:g} mm", "ejection.diameter")
    return replace(wishes, kept=kept), notes


def _other_size(pin: KeptItem, diameter: float) -> KeptItem:
    """Return a pin of another diameter at the same place: another pin in another hole."""
    return replace(pin, diameter=diameter, fit_end=None, length=0.0)


def _beaten(topic: str, choice: str, key: str) -> Notes:
    return Notes(decisions=(Decision(topic, choice, f"the spec gives {key}, which comes before the accepted layout"),))


def _in_block(view: PartView, section: CorePins, core_pins: tuple[CorePinLayout, ...]) -> tuple[Vector, ...]:
    """Return the feet of the round cores that are no pins [mm]."""
    pins = {(p.x, p.y) for p in core_pins}
    cores = find_round_cores(view, max(section.largest, 1.0))
    return tuple((c.x, c.y, c.base_z) for c in cores if (c.x, c.y) not in pins)


def _pins(view: PartView, resin: Resin, wishes: Wishes) -> tuple[tuple[CorePinLayout, ...], EjectionLayout, Notes]:
    """Return the pins; where core pins of moldgen's own choice crowd out the ejectors, they stay in the block."""
    core_pins, ejection, notes = _both(view, resin, wishes, wishes.core_pins)
    pressure, small = _pressure(ejection), _small(ejection)
    own = [p for p in core_pins if p.chosen_by is Chooser.MOLDGEN]
    if (pressure <= resin.push_pressure and not small) or not own:
        return core_pins, ejection, notes
    fewer, other, told = _both(view, resin, wishes, wishes.core_pins.model_copy(update={"pick": "none"}))
    gain = _pressure(other) <= WORTH * pressure or (small and not _small(other))
    if not gain:
        return core_pins, ejection, notes
    press = f"{'shouldered ones would ' if small else 'which would '}press on the part with {pressure:.0f} MPa"
    if math.isinf(pressure):
        press = "for which no place would be left"
    why = f"core pins would crowd the ejector pins, {press}"
    refused = tuple(f"{p.name} at {p.x:.1f}, {p.y:.1f}" for p in own)
    decision = Decision("core pins", f"{len(fewer)}, the other round cores stay in the block", why, "", refused)
    return fewer, other, told + Notes(decisions=(decision,))


def _both(
    view: PartView, resin: Resin, wishes: Wishes, section: CorePins
) -> tuple[tuple[CorePinLayout, ...], EjectionLayout, Notes]:
    kept = wishes.kept
    cores = None
    if kept is not None:
        bores = (Bore(p.at[0], p.at[1], clearance_bore_diameter(p.diameter) / 2, p.name) for p in kept.ejector_pins)
        cores = KeptCores(kept.core_pins, kept.cores_in_block, tuple(bores), kept.given_cores)
    core_pins, notes = find_core_pins(view, section, resin, wishes.core_pins_at, cores)
    ejection, more = place_ejector_pins(view, wishes.ejection, resin, core_pins, wishes.pins, wishes.no_pins, kept)
    return core_pins, ejection, notes + more


def _small(ejection: EjectionLayout) -> bool:
    """Return whether there was only room for shouldered pins."""
    return any(pin.shank_length > 0.0 and pin.chosen_by is Chooser.MOLDGEN for pin in ejection.pins)


def _pressure(ejection: EjectionLayout) -> float:
    """Return the highest pressure on the part [MPa], infinite when a part that sticks gets no pin."""
    none = math.inf if ejection.force_n > 0.0 else 0.0
    return max((pin.pressure_mpa for pin in ejection.pins), default=none)
