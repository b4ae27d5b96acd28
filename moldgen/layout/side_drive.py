"""What may move a slide: an angled pin while the mold opens, or a cylinder before that."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.finding import Decision, Notes
from moldgen.kernel.body import Body
from moldgen.kernel.side_window import Window, extent_in, lowered, outline_gain, steel_outside
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import Drive
from moldgen.tolerances import NOISE_THICKNESS, ON_PLANE

LEVEL_AXIS: Final = 1e-6
"""Pull component of an axis up to which a slide is level."""

LEAST_STEEL: Final = 0.05
"""mm^2: an outline that grows by less holds no cavity steel under it."""


@dataclass(frozen=True)
class Driven:
    """A front that is ready to be made: extended where it takes the cavity steel under it, and what drives it.

    caught : cavity steel stays under the front, so that it must be drawn back wholly before the mold opens
    """

    front: Front
    drive: Drive
    caught: bool = False


def is_level(front: Front) -> bool:
    """Return whether a front leaves square to the pull."""
    return abs(front.axis[2]) < LEVEL_AXIS


def drive_fronts(fronts: Sequence[Front], part: Body, level: float) -> tuple[tuple[Driven, ...], Notes]:
    """Return every front with what drives it, in the same order; to be asked before the forming steel is made.

    An angled pin moves a slide while the cavity half lifts, so no cavity steel may lie under the front. Where there is
    some, the slide takes it too, down to the parting plane, if that leaves the part clear; else it must be drawn before
    the mold opens.

    part : the real part in the mold; level : height of the parting plane [mm]
    """
    found, decisions, count = [], [], 0
    for front in fronts:
        if front.kind is not SideKind.SLIDE:
            found.append(Driven(front, Drive.ANGLED_PIN))
            continue
        count += 1
        driven, choice, why = _driven(front, part, level)
        found.append(driven)
        decisions.append(Decision(f"slide {count}, drive", choice, why))
    return tuple(found), Notes(decisions=tuple(decisions))


def _driven(front: Front, part: Body, level: float) -> tuple[Driven, str, str]:
    if not is_level(front):
        return Driven(front, Drive.CYLINDER, True), Drive.CYLINDER, "it does not leave square to the pull"
    outline = lowered(front.outline, level)
    if outline_gain(front.outline, outline) < LEAST_STEEL:
        return Driven(front, Drive.ANGLED_PIN), Drive.ANGLED_PIN, "no cavity steel lies under its front"
    frame = across(front.axis)
    taken = steel_outside(part.mesh, outline, frame, front.near, front.far)
    if taken is None or taken.depth > NOISE_THICKNESS:
        deep = 0.0 if taken is None else taken.depth
        why = f"cavity steel lies under its front, and taking that along would cut {deep:.2f} mm into the part"
        return Driven(front, Drive.CYLINDER, True), Drive.CYLINDER, why
    longer = replace(front, outline=outline, travel=_travel(front, outline, part, taken.start))
    gain = outline_gain(front.outline, outline)
    why = f"its front takes {gain:.1f} mm^2 of cavity steel under it along, down to the parting plane"
    return Driven(longer, Drive.ANGLED_PIN), Drive.ANGLED_PIN, why


def _travel(front: Front, outline: Sequence[np.ndarray], part: Body, start: float) -> float:
    """Return the travel after which no plastic under the extended front can meet it when the part is pushed up."""
    points = np.vstack(list(outline))
    (left, low), (right, high) = points.min(axis=0), points.max(axis=0)
    inside = extent_in(part.mesh, across(front.axis), Window(left, right, low - ON_PLANE, high))
    reach = float(inside[:, 2].max()) if inside is not None else start
    return max(front.travel, reach - start)
