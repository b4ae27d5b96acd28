"""Steel between all bores of the core, and from each to the sides of the block: the last look at the whole layout."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.keep_out import STEEL
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, CorePinLayout, EjectorPinLayout
from moldgen.quantity import Provenance, Quantity
from moldgen.rules.layout_practice import STEEL_BETWEEN_BORES, STEEL_TO_EDGE

COUNTERBORE: Final = 0.5
"""mm: counterbore over the head of a core pin, in diameter (common practice: 0.5 to 1)."""


@dataclass(frozen=True)
class Drilled:
    """One cylinder that is drilled into the core, along the pull [mm]."""

    name: str
    x: float
    y: float
    radius: float
    z_low: float
    z_high: float
    given: bool


def core_bores(
    view: PartView, core_pins: tuple[CorePinLayout, ...], ejector_pins: tuple[EjectorPinLayout, ...]
) -> list[Drilled]:
    """Return every cylinder that the pins need in the core block: fit, relief and counterbore."""
    bottom = float(view.low[2])
    bores = []
    for pin in core_pins:
        own = pin.chosen_by is Chooser.GIVEN
        seat, fit = bottom + pin.head_height, pin.base_z - pin.fit_length
        head = (pin.head_diameter + COUNTERBORE) / 2
        bores.append(Drilled(pin.name, pin.x, pin.y, pin.diameter / 2, fit, pin.base_z, own))
        bores.append(Drilled(pin.name, pin.x, pin.y, pin.clearance_diameter / 2, seat, fit, own))
        bores.append(Drilled(pin.name, pin.x, pin.y, head, bottom, seat, own))
    for ejector in ejector_pins:
        own = ejector.chosen_by is Chooser.GIVEN
        fit = ejector.tip_z - ejector.tip_drop - ejector.fit_length
        bores.append(Drilled(ejector.name, ejector.x, ejector.y, ejector.diameter / 2, fit, ejector.tip_z, own))
        bores.append(Drilled(ejector.name, ejector.x, ejector.y, ejector.clearance_diameter / 2, bottom, fit, own))
    return bores


def check_clearances(
    view: PartView, core_pins: tuple[CorePinLayout, ...], ejector_pins: tuple[EjectorPinLayout, ...]
) -> Notes:
    """Return the least steel between two bores and to the sides of the block, and a finding where it is too little.

    What the user placed himself has its findings already; here a finding means that moldgen broke its own rule.
    """
    bores = core_bores(view, core_pins, ejector_pins)
    between, pair = math.inf, ("", "")
    findings = []
    for i, one in enumerate(bores):
        for other in bores[i + 1 :]:
            if one.name == other.name or min(one.z_high, other.z_high) <= max(one.z_low, other.z_low):
                continue
            steel = math.hypot(one.x - other.x, one.y - other.y) - one.radius - other.radius
            if steel < between:
                between, pair = steel, (one.name, other.name)
            if steel < STEEL_BETWEEN_BORES.default - 1e-6 and not (one.given or other.given):
                findings.append(
                    _thin(view, one, f"between {one.name} and {other.name}", steel, STEEL_BETWEEN_BORES.default)
                )
    edge = math.inf
    for bore in bores:
        x, y = (bore.x, bore.y)
        steel = min(x - view.low[0], view.high[0] - x, y - view.low[1], view.high[1] - y) - bore.radius
        edge = min(edge, float(steel))
        if steel < STEEL_TO_EDGE.default - 1e-6 and not bore.given:
            findings.append(
                _thin(view, bore, f"between {bore.name} and the side of the block", float(steel), STEEL_TO_EDGE.default)
            )
    beside, more = _beside_sides(view, bores)
    findings += more
    lines = []
    if math.isfinite(beside):
        lines.append(_line("least steel from a bore to the way of a slide or lifter", beside))
    if math.isfinite(between):
        lines.append(_line(f"least steel between two bores ({pair[0]}, {pair[1]})", between))
    if math.isfinite(edge):
        lines.append(_line("least steel from a bore to the side of the block", edge))
    return Notes(tuple(findings), quantities=tuple(lines))


def _beside_sides(view: PartView, bores: list[Drilled]) -> tuple[float, list[Finding]]:
    """Return the least steel from a bore to the way of a side action, inf without one [mm], and what is too thin."""
    least, findings = math.inf, []
    for bore in bores:
        near = view.keep_out.upright(np.array([[bore.x, bore.y]]), bore.radius, bore.z_low, bore.z_high)
        steel = float(near.steel[0])
        least = min(least, steel)
        if steel < STEEL - 1e-6 and not bore.given:
            findings.append(_thin(view, bore, f"between {bore.name} and the way of {near.names[0]}", steel, STEEL))
    return least, findings


def _line(name: str, value: float) -> Quantity:
    return Quantity(name, value, "mm", "distance of the axes less the radii", Provenance.DERIVED, drives="pins")


def _thin(view: PartView, bore: Drilled, where: str, steel: float, limit: float) -> Finding:
    return Finding(
        "layout.thin_steel",
        Severity.FAILURE,
        f"{steel:.2f} mm of steel {where}",
        at=view.place((bore.x, bore.y, bore.z_high)),
        value=round(steel, 3),
        limit=limit,
        unit="mm",
        remedy="give the positions of these pins in the spec",
    )
