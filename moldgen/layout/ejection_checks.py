"""Whether ejector pins, given or placed, keep the rules: room, steel, pressure, buckling, balance."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from moldgen.catalog import Resin, ejector_pin_series, shouldered_pin_series
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.balance import resultant
from moldgen.layout.pin_kinds import Place
from moldgen.layout.sites import Underside
from moldgen.layout.sticking import Sticking
from moldgen.layout.view import PartView
from moldgen.model.layout import CorePinLayout, EjectorPinLayout
from moldgen.quantity import Provenance, Quantity
from moldgen.rules.layout_practice import PIN_SLOPE, STEEL_BETWEEN_BORES, STEEL_TO_EDGE
from moldgen.rules.pins import euler_buckling_force
from moldgen.rules.practice import BUCKLING_SAFETY
from moldgen.rules.pushing import pin_push_pressure, punch_shear_stress

OFF_CENTRE: Final = 0.1
"""Distance of the pins' resultant from the centre of sticking, as a share of the part's diagonal, that is reported."""

PUNCH_SHARE: Final = 0.5
"""Shear stress that may punch a pin through, as a share of the push pressure (common practice)."""


def check_given(
    under: Underside,
    pin: Place,
    number: int,
    others: list[Place],
    core_pins: tuple[CorePinLayout, ...],
) -> Notes:
    """Return a finding for each rule that pin `number` of the spec breaks; `others` are the ones before it."""
    view = under.view
    disc, diameter = pin.disc, pin.diameter
    at = view.place((pin.x, pin.y, disc.high if disc.faces else view.level))
    found: list[tuple[str, Severity, str, float | None, float | None, str]] = []
    if not disc.faces:
        found.append(("no_part", Severity.FAILURE, "has no part above it and is left out", None, None, ""))
    elif not disc.core_side:
        text = "pushes on a face that the cavity half forms and is left out"
        found.append(("cavity_face", Severity.FAILURE, text, None, None, ""))
    elif disc.aside:
        text = "pushes on the steel of a slide or lifter instead of the part and is left out"
        found.append(("side_face", Severity.FAILURE, text, None, None, ""))
    elif not disc.whole:
        text = "has the part over only a portion of its end face"
        found.append(("overhangs", Severity.FAILURE, text, None, None, ""))
    step = math.tan(math.radians(PIN_SLOPE.default)) * diameter + 0.1
    if disc.faces and disc.high - disc.low > step:
        text = f"meets a step of {disc.high - disc.low:.2f} mm of the part within its end face"
        found.append(("step", Severity.FAILURE, text, disc.high - disc.low, step, "mm"))
    if disc.faces and disc.slope > PIN_SLOPE.default:
        text = f"pushes on a surface that slopes by {disc.slope:.0f} deg"
        found.append(("slope", Severity.WARNING, text, disc.slope, PIN_SLOPE.default, "deg"))
    series = [*(p.diameter for p in ejector_pin_series()), *(p.diameter for p in shouldered_pin_series())]
    if not any(math.isclose(d, diameter) for d in series):
        text = f"has a diameter of {diameter:g} mm, which is not in the standard series"
        found.append(("not_standard", Severity.CAUTION, text, diameter, None, "mm"))
    found += steel_beside(view, pin, others, core_pins)
    return Notes(
        tuple(
            Finding(
                f"ejector_pin.{code}",
                severity,
                f"pin {number} of the spec {text}",
                where=f"ejection.pins[{number - 1}]",
                at=at,
                value=None if value is None else round(value, 3),
                limit=limit,
                unit=unit,
                remedy="move the pin, change its diameter, or let moldgen place it",
            )
            for code, severity, text, value, limit, unit in found
        )
    )


def steel_beside(
    view: PartView, pin: Place, others: list[Place], core_pins: tuple[CorePinLayout, ...]
) -> list[tuple[str, Severity, str, float | None, float | None, str]]:
    """Return what stands too close to a pin, each as code, severity, words, value, limit and unit."""
    x, y = pin.x, pin.y
    bore, limit = pin.kind.bore / 2, STEEL_BETWEEN_BORES.default
    found: list[tuple[str, Severity, str, float | None, float | None, str]] = []
    for other in others:
        steel = math.hypot(other.x - x, other.y - y) - bore - other.kind.bore / 2
        if steel < limit:
            text = f"leaves {steel:.2f} mm of steel to another ejector pin's bore"
            found.append(("too_close", Severity.WARNING, text, steel, limit, "mm"))
    for core_pin in core_pins:
        wide = max(core_pin.clearance_diameter, core_pin.head_diameter + 0.5) / 2
        steel = math.hypot(core_pin.x - x, core_pin.y - y) - bore - wide
        if steel < limit:
            text = f"leaves {steel:.2f} mm of steel to the bore or head of {core_pin.name}"
            found.append(("too_close", Severity.WARNING, text, steel, limit, "mm"))
    place = np.array([x, y])
    edge = float(np.minimum(place - view.low[:2], view.high[:2] - place).min()) - bore
    if edge < STEEL_TO_EDGE.default:
        text = f"leaves {edge:.2f} mm of steel to the side of the block"
        found.append(("block_edge", Severity.WARNING, text, edge, STEEL_TO_EDGE.default, "mm"))
    return found


def check_stays(view: PartView, sticking: Sticking, cavity_force: float) -> Notes:
    """Return what holds the part to the cavity half, with a finding when that is more than the core's hold."""
    core = sum(c.friction for c in sticking.cores)
    core = max(core, sticking.force - sum(c.vacuum for c in sticking.cores))
    line = Quantity(
        "hold of the cavity half",
        cavity_force,
        "N",
        "as for the core, without vacuum (see the hold of the cores)",
        Provenance.DERIVED,
        inputs={"hold of the core half": f"{core:.4g} N"},
        drives="which half the part stays on",
    )
    if cavity_force <= core:
        return Notes(quantities=(line,))
    low, high = view.body.box
    finding = Finding(
        "ejection.stays_in_cavity",
        Severity.WARNING,
        f"the part holds to the cavity half with {cavity_force:.0f} N and to the core half, where the ejectors are, "
        f"with {core:.0f} N: it may stay in the cavity when the mold opens",
        at=view.place(0.5 * (low + high)),
        value=round(cavity_force, 1),
        limit=round(core, 1),
        unit="N",
        remedy="turn the pull round, so that what the part shrinks onto is the core",
    )
    return Notes((finding,), quantities=(line,))


def check_balance(view: PartView, pins: tuple[EjectorPinLayout, ...], sticking: Sticking, resin: Resin) -> Notes:
    """Return the force balance as lines, with a finding for each limit that is passed."""
    if not pins:
        return Notes()
    notes = Notes(quantities=tuple(_lines(view, pins, sticking, resin)))
    for pin in pins:
        notes += _strength(view, pin, resin)
    low, high = view.body.box
    diagonal = float(np.linalg.norm((high - low)[:2]))
    places = np.array([[p.x, p.y] for p in pins])
    off = float(np.linalg.norm(resultant(places, np.array([p.diameter**2 for p in pins])) - sticking.centre))
    centre = (*sticking.centre, view.level)
    line = Quantity(
        "distance from the middle of the pin faces to the centre of sticking",
        off,
        "mm",
        "first moments of the pin faces and of the ejection force",
        Provenance.DERIVED,
        drives="even ejection",
    )
    notes += Notes(quantities=(line,))
    forces = np.array([p.force_n for p in pins])
    missed = float(np.linalg.norm(resultant(places, forces) - sticking.centre)) if sticking.force > 0.0 else 0.0
    if off > OFF_CENTRE * diagonal or missed > 0.02 * diagonal:
        finding = Finding(
            "ejection.off_centre",
            Severity.WARNING if missed > 0.02 * diagonal else Severity.CAUTION,
            f"the pins push {off:.1f} mm beside the centre of what sticks, so the part may tilt",
            at=view.place(centre),
            value=round(off, 2),
            limit=round(OFF_CENTRE * diagonal, 2),
            unit="mm",
            remedy="add pins on the side of the centre, or give the part a pad there",
        )
        notes += Notes((finding,))
    return notes


def _lines(view: PartView, pins: tuple[EjectorPinLayout, ...], sticking: Sticking, resin: Resin) -> list[Quantity]:
    drives = "ejector pins"
    lines = [resin.line("push_pressure", drives), BUCKLING_SAFETY.line(drives)]
    sizes = sorted({p.diameter for p in pins})
    if len(sizes) == 1:
        lines.append(pin_push_pressure.line(drives, sticking.force, len(pins), sizes[0]))
        lines.append(punch_shear_stress.line(drives, sticking.force, len(pins), sizes[0], max(view.wall, 0.05)))
    for pin in pins:
        free = max(pin.tip_z - pin.tip_drop - pin.fit_length - pin.seat_z, 1.0)
        lines.append(
            Quantity(
                f"force on {pin.name}",
                pin.force_n,
                "N",
                "statics of the rigid ejector plate, spread evenly over the pin faces",
                Provenance.DERIVED,
                inputs={
                    "pressure": f"{pin.pressure_mpa:.4g} MPa",
                    "buckling force": f"{pin.buckling_n:.5g} N" + (", tip and shank" if pin.shank_length else ""),
                },
                drives=pin.name,
            )
        )
        if pin is pins[0] and pin.shank_length == 0.0:
            lines.append(euler_buckling_force.line(f"{pin.name} and pins like it", pin.diameter, free))
    return lines


def _strength(view: PartView, pin: EjectorPinLayout, resin: Resin) -> Notes:
    at = view.place((pin.x, pin.y, pin.tip_z))
    found = []
    if pin.pressure_mpa > resin.push_pressure:
        found.append(
            Finding(
                "ejector_pin.pressure",
                Severity.WARNING,
                f"{pin.name} presses on the part with {pin.pressure_mpa:.1f} MPa",
                at=at,
                value=round(pin.pressure_mpa, 2),
                limit=resin.push_pressure,
                unit="MPa",
                remedy="more or thicker pins, more draft, or a stripper plate",
            )
        )
    shear = punch_shear_stress(pin.force_n, 1, pin.diameter, max(view.wall, 0.05))
    if shear > PUNCH_SHARE * resin.push_pressure:
        found.append(
            Finding(
                "ejector_pin.punches",
                Severity.WARNING,
                f"{pin.name} shears the wall over it with {shear:.1f} MPa",
                at=at,
                value=round(shear, 2),
                limit=PUNCH_SHARE * resin.push_pressure,
                unit="MPa",
                remedy="more or thicker pins, or a thicker wall",
            )
        )
    if pin.force_n * BUCKLING_SAFETY.default > pin.buckling_n:
        found.append(
            Finding(
                "ejector_pin.buckles",
                Severity.WARNING,
                f"{pin.name} may buckle under its {pin.force_n:.0f} N",
                at=at,
                value=round(pin.buckling_n / pin.force_n, 2),
                limit=BUCKLING_SAFETY.default,
                unit="1",
                remedy="thicker pins, shoulder pins, or a shorter stroke",
            )
        )
    return Notes(tuple(found))
