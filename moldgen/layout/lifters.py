"""Lifters: the way they go sideways over the ejection stroke, and how they are guided."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.body import Body
from moldgen.model.layout import BlockLayout
from moldgen.model.side_action import Front
from moldgen.model.slide import LifterLayout
from moldgen.rules.side_action import lifter_travel_pye
from moldgen.rules.side_practice import LIFTER_CLEARANCE, LIFTER_GUIDED

STEEPEST: Final = 12.0
"""deg: above it a lifter jams unless it is guided in two stages (common practice; 3 to 8 usual)."""

TWO_STAGE: Final = 15.0
"""deg: not even two stages help above it (common practice)."""


def lay_out_lifter(
    front: Front, name: str, part: Body, block: BlockLayout, stroke: float
) -> tuple[LifterLayout, Notes]:
    """Return a lifter whose shaft is its front, with its figures and whatever breaks a rule."""
    angle = math.degrees(math.acos(min(abs(front.axis[2]), 1.0)))
    needed = front.travel + LIFTER_CLEARANCE.default
    lines = [LIFTER_CLEARANCE.line(f"travel of {name}")]
    travel = 0.0
    outside: tuple[Finding, ...] = ()
    if angle > 0.0 and stroke > 0.0:
        line = lifter_travel_pye.line(f"travel of {name}", stroke, angle)
        travel, outside = line.value, lifter_travel_pye.outside(stroke, angle)
        lines.append(line)
    points = np.vstack(list(front.outline))
    thickness = float(np.ptp(points, axis=0).min())
    top = min(float(part.box[0][2]), block.high[2])
    guided = max((top - block.low[2]) / max(abs(front.axis[2]), 1e-9), 0.0)
    lifter = LifterLayout(name, front.axis, front.release, angle, stroke, travel, needed, guided, thickness)
    choice = f"shaft at {angle:.1f} deg, {travel:.2f} mm sideways over a stroke of {stroke:.1f} mm"
    why = (
        f"the undercut wants {front.travel:.2f} mm; its foot slides sideways on the ejector plate (guide to be bought)"
    )
    return lifter, Notes((*outside, *_findings(lifter, front)), (Decision(name, choice, why),), tuple(lines))


def _findings(lifter: LifterLayout, front: Front) -> list[Finding]:
    found = []
    if lifter.travel < lifter.needed:
        short = lifter.travel < front.travel
        found.append(
            Finding(
                "side.lifter_travel",
                Severity.FAILURE if short else Severity.WARNING,
                f"{lifter.name} goes {lifter.travel:.2f} mm sideways; the undercut wants {front.travel:.2f} mm and "
                f"{LIFTER_CLEARANCE.default:g} mm to be clear",
                where=lifter.name,
                value=round(lifter.travel, 3),
                limit=round(lifter.needed, 3),
                unit="mm",
                remedy="a longer ejection stroke (ejection.stroke), or a larger angle of the lifter",
            )
        )
    if lifter.angle > STEEPEST:
        found.append(
            Finding(
                "side.lifter_angle",
                Severity.WARNING if lifter.angle <= TWO_STAGE else Severity.FAILURE,
                f"{lifter.name} leans by {lifter.angle:.1f} deg: above {STEEPEST:g} deg it needs a guide in two "
                f"stages, above {TWO_STAGE:g} deg it jams",
                where=lifter.name,
                value=round(lifter.angle, 2),
                limit=STEEPEST,
                unit="deg",
                remedy="a longer stroke at a smaller angle, or guide it in two stages",
            )
        )
    guide = LIFTER_GUIDED.default * lifter.thickness
    if lifter.guided < guide:
        found.append(
            Finding(
                "side.lifter_guide",
                Severity.WARNING,
                f"{lifter.name} is guided over {lifter.guided:.1f} mm in the core",
                where=lifter.name,
                value=round(lifter.guided, 2),
                limit=round(guide, 2),
                unit="mm",
                remedy="a higher core block (blocks.core_height), or a guide plate under it",
            )
        )
    return found
