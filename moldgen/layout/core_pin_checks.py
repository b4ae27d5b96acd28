"""Whether a core pin stands the melt: slenderness, bending, tilt in its seat."""

from __future__ import annotations

from typing import Final

from moldgen.catalog import Resin, fit_clearance
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.round_cores import RoundCore
from moldgen.layout.view import PartView
from moldgen.model.layout import CorePinLayout
from moldgen.rules.core_pin import (
    core_pin_deflection_cantilever,
    core_pin_deflection_limit,
    core_pin_imbalance_kazmer,
    core_pin_slenderness_limit,
    core_pin_tilt,
)
from moldgen.rules.layout_practice import POSITION_TOLERANCE

STOUT: Final = 2.5
SLENDER: Final = 5.0
"""Length over diameter up to which the short-core share of the pressure acts, and from which the slender one does."""

SHARE_STOUT: Final = 0.5
SHARE_SLENDER: Final = 0.1
"""Share of the filling pressure on one side (Kazmer, pp. 414-415)."""


def imbalance_share(slenderness: float) -> float:
    """Return the share of the filling pressure that bends a core, between the two published cases by straight line.

    >>> imbalance_share(1.0), imbalance_share(8.0)
    (0.5, 0.1)
    """
    part = min(max((slenderness - STOUT) / (SLENDER - STOUT), 0.0), 1.0)
    return SHARE_STOUT + part * (SHARE_SLENDER - SHARE_STOUT)


def check_strength(view: PartView, core: RoundCore, pin: CorePinLayout, resin: Resin) -> Notes:
    """Return slenderness, bending and tilt of a core pin, with a finding where a limit is passed.

    The tip is taken as free: nothing guides it in the other half. The whole length is taken as thin as its thinnest
    step, so the bending is an upper bound.
    """
    at = view.place((core.x, core.y, core.top_z))
    length = max(core.length, 1e-3)
    drives = pin.name
    findings = []
    limit = core_pin_slenderness_limit(core.smallest, False)
    if core.slenderness > limit:
        findings.append(
            Finding(
                "core_pin.slender",
                Severity.WARNING,
                f"{pin.name} is {core.slenderness:.1f} times as long as thick",
                at=at,
                value=round(core.slenderness, 2),
                limit=limit,
                unit="1",
                remedy="guide its tip in the cavity, gate so that both sides fill alike, or shorten the hole",
            )
        )
    pressure = core_pin_imbalance_kazmer.line(drives, resin.cavity_pressure.mean, imbalance_share(core.slenderness))
    bend = core_pin_deflection_cantilever.line(drives, pressure.value, core.smallest, length)
    allowed = core_pin_deflection_limit.line(drives, max(core.wall, 0.1), POSITION_TOLERANCE.default)
    clearance = fit_clearance(pin.diameter)
    tilt = core_pin_tilt.line(drives, 0.0 if clearance is None else clearance.high, pin.fit_length, length)
    moved = bend.value + tilt.value
    if moved > allowed.value:
        findings.append(
            Finding(
                "core_pin.moves",
                Severity.WARNING,
                f"the tip of {pin.name} may move {moved:.3f} mm ({bend.value:.3f} bending, {tilt.value:.3f} tilt)",
                at=at,
                value=round(moved, 4),
                limit=round(allowed.value, 4),
                unit="mm",
                remedy="guide its tip in the cavity, move the gate, or make the hole shorter or wider",
            )
        )
    return Notes(tuple(findings), quantities=(pressure, bend, tilt, allowed))
