"""Whether a slide keeps the rules: guide, angle, forces on locking face and angled pin; and what to beware of."""

from __future__ import annotations

import math

import numpy as np

from moldgen.catalog import steel
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.slide_body import SideTask, WantedBody
from moldgen.layout.slide_pin import PinChoice
from moldgen.model.slide import Drive, SlideBody, SlideLayout
from moldgen.quantity import Quantity
from moldgen.rules.core_pin import core_pin_slenderness_limit
from moldgen.rules.sheet import measured
from moldgen.rules.side_action import angled_pin_delay_pye, angled_pin_length_pye, angled_pin_opening_pye
from moldgen.rules.side_practice import PIN_STRESS, SLIDE_FRICTION
from moldgen.rules.slide import (
    angled_pin_bending_stress,
    angled_pin_side_force,
    locking_axial_force,
    locking_face_angle,
    locking_face_pressure,
    locking_normal_force,
    self_locking_angle,
    slide_drag,
    slide_guided_length,
    slide_melt_force_kazmer,
)

STEEP: float = 20.0
"""deg: a steeper angled pin is allowed but not liked (common practice: best 15 to 20, up to 25)."""


def check_slide(slide: SlideLayout, wanted: WantedBody | None, task: SideTask) -> Notes:
    """Return the lines of the calculation sheet of one slide and a finding for each limit that it passes."""
    notes = Notes(tuple(_cautions(slide)))
    if slide.body is None or wanted is None:
        return notes
    notes += _guide(slide, slide.body) + _core_pins(slide)
    force = slide_melt_force_kazmer.line(f"locking of {slide.name}", task.pressure, wanted.area)
    area = measured("area of the forming faces along the travel", wanted.area, "mm^2", f"locking of {slide.name}")
    notes += Notes(quantities=(area, force))
    if wanted.pin is None:
        return notes + _cylinder(slide, force)
    return notes + _locking(slide, slide.body, force.value, task) + _pin(slide, wanted.pin)


def _guide(slide: SlideLayout, body: SlideBody) -> Notes:
    line = slide_guided_length.line(f"length of {slide.name}", body.height, slide.travel)
    if body.length >= line.value - 1e-6:
        return Notes(quantities=(line,))
    finding = Finding(
        "side.guide_length",
        Severity.WARNING,
        f"{slide.name} is guided over {body.length:.1f} mm: it may tilt and jam",
        where=slide.name,
        value=round(body.length, 2),
        limit=round(line.value, 2),
        unit="mm",
        remedy="give a larger block, or leave its length and width (section blocks) to moldgen",
    )
    return Notes((finding,), quantities=(line,))


def _core_pins(slide: SlideLayout) -> Notes:
    """A side core pin is free at its tip, unless it stands against the core there."""
    notes = Notes()
    for pin in slide.core_pins:
        limit = core_pin_slenderness_limit.line(f"length of {pin.name}", pin.diameter, tip_supported=False)
        notes += Notes(quantities=(limit,))
        if pin.slenderness > limit.value:
            finding = Finding(
                "side.slender_core_pin",
                Severity.WARNING,
                f"{pin.name} is {pin.slenderness:.1f} times as long as thick: the melt may bend it",
                where=pin.name,
                value=round(pin.slenderness, 2),
                limit=limit.value,
                unit="1",
                remedy="let its tip into a bore of the core, or gate so that the melt comes from both sides",
            )
            notes += Notes((finding,))
    return notes


def _locking(slide: SlideLayout, body: SlideBody, force: float, task: SideTask) -> Notes:
    """The melt drives the slide against the locking face, which takes that and passes a part of it to the clamp."""
    drives = f"locking of {slide.name}"
    pin = slide.pins[0]
    angle = locking_face_angle.line(drives, pin.angle)
    normal = locking_normal_force.line(drives, force, body.locking_deg)
    axial = locking_axial_force.line(f"clamp force: to be added for {slide.name}", force, body.locking_deg)
    holds = self_locking_angle.line(drives, SLIDE_FRICTION.default)
    face = body.width * (body.top - body.level) / math.cos(math.radians(body.locking_deg))
    pressure = locking_face_pressure.line(drives, normal.value, face)
    limit = steel(task.material).contact_pressure
    findings = [
        Finding(
            "side.opens_the_mold",
            Severity.CAUTION,
            f"the melt behind {slide.name} pushes the mold open with {axial.value / 1000:.1f} kN through its locking "
            f"face of {body.locking_deg:g} deg; only below {holds.value:.1f} deg friction would hold it",
            where=slide.name,
            value=round(axial.value / 1000, 2),
            unit="kN",
            remedy="add it to the clamp force, and back the locking face with screws and plate",
        )
    ]
    if pressure.value > limit:
        findings.append(
            Finding(
                "side.heel_force",
                Severity.WARNING,
                f"the locking face of {slide.name} carries {normal.value / 1000:.1f} kN on {face:.0f} mm^2",
                where=slide.name,
                value=round(pressure.value, 2),
                limit=limit,
                unit="MPa",
                remedy="hardened wear plates, or a wider slide",
            )
        )
    return Notes(tuple(findings), quantities=(angle, normal, axial, holds, pressure))


def _pin(slide: SlideLayout, pin: PinChoice) -> Notes:
    drives = f"angled pin of {slide.name}"
    friction = SLIDE_FRICTION.default
    lines: list[Quantity] = [
        angled_pin_length_pye.line(drives, slide.travel, pin.clearance, pin.angle),
        angled_pin_delay_pye.line(drives, pin.clearance, pin.angle),
        angled_pin_opening_pye.line(drives, slide.travel, pin.angle),
        slide_drag.line(drives, pin.sticking, pin.mass, friction),
        angled_pin_side_force.line(drives, pin.drag, pin.angle, friction),
        angled_pin_bending_stress.line(drives, pin.side_force, pin.working, pin.diameter),
        PIN_STRESS.line(drives),
    ]
    outside = angled_pin_length_pye.outside(slide.travel, pin.clearance, pin.angle)
    return Notes((*outside, *_pin_findings(slide, pin)), quantities=tuple(lines))


def _pin_findings(slide: SlideLayout, pin: PinChoice) -> list[Finding]:
    findings = []
    if pin.angle > STEEP:
        findings.append(
            Finding(
                "side.angle",
                Severity.CAUTION,
                f"the angled pin of {slide.name} leans by {pin.angle:g} deg, so that the mold need not open further "
                f"than {slide.delay + slide.opening:.0f} mm for it",
                where=slide.name,
                value=pin.angle,
                limit=STEEP,
                unit="deg",
                remedy="a cylinder, or a part with a shallower undercut",
            )
        )
    if pin.stress > PIN_STRESS.default:
        findings.append(
            Finding(
                "side.pin_bending",
                Severity.WARNING,
                f"the angled pin of {slide.name} ({pin.diameter:g} mm) bends with {pin.stress:.0f} MPa when the slide "
                f"is pulled with {pin.drag:.0f} N",
                where=slide.name,
                value=round(pin.stress, 1),
                limit=PIN_STRESS.default,
                unit="MPa",
                remedy="more draft on the front, or a cylinder",
            )
        )
    if slide.pins[0].catalog_length <= 0.0:
        findings.append(
            Finding(
                "side.pin_length",
                Severity.WARNING,
                f"the angled pin of {slide.name} is {slide.pins[0].length:.0f} mm long: no blank is that long",
                where=slide.name,
                value=round(slide.pins[0].length, 1),
                unit="mm",
                remedy="have it made, or give a lower cavity block",
            )
        )
    return findings


def _cylinder(slide: SlideLayout, force: Quantity) -> Notes:
    finding = Finding(
        "side.cylinder",
        Severity.WARNING,
        f"{slide.name} must be drawn by {slide.travel:.1f} mm before the mold opens and set before it closes; the "
        f"cylinder must lock against {force.value / 1000:.1f} kN of melt",
        where=slide.name,
        value=round(force.value / 1000, 2),
        unit="kN",
        remedy="a locking cylinder with switches at both ends that the machine waits for",
    )
    return Notes((finding,))


def _cautions(slide: SlideLayout) -> list[Finding]:
    """What a person must see to: no figure decides it."""
    found = [
        Finding(
            "side.not_back",
            Severity.CAUTION,
            f"closing on {slide.name} when it is not in its place breaks the mold",
            where=slide.name,
            remedy="a switch that keeps the press from closing while the slide is not where it belongs",
        )
    ]
    if slide.drive is Drive.ANGLED_PIN:
        way = ", ".join(f"{v:.2f}" for v in np.round(slide.axis, 2) + 0.0)
        found.append(
            Finding(
                "side.held_out",
                Severity.CAUTION,
                f"off its angled pin {slide.name} must stay where it is: one that points up or down in the machine "
                f"falls by its own weight (it moves along {way} in the mold)",
                where=slide.name,
                remedy="a ball catch where it lies level, a spring and a stop where it points up; springs store "
                "energy: relieve them before the slide is taken out",
            )
        )
    return found
