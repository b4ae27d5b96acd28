"""What may move a slide: an angled pin while the mold opens, or a cylinder before that."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.finding import Decision, Notes
from moldgen.kernel.body import Body
from moldgen.kernel.side_window import Outside, Window, extent_in, lowered, outline_gain
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import Drive
from moldgen.tolerances import NOISE_THICKNESS, ON_PLANE

LEVEL_AXIS: Final = 1e-6
"""Pull component of an axis up to which a slide is level."""

LEAST_STEEL: Final = 0.05
"""mm^2: an outline that grows by less holds no cavity steel under it."""


PLACES: Final = 8
"""Places between the near end of a front and the end of its plastic where the steel under it may begin."""


@dataclass(frozen=True)
class Driven:
    """A front that is ready to be made, and what drives it.

    caught : cavity steel stays under the front, so that it must be drawn back wholly before the mold opens
    under : it is not a front of its own, but the cavity steel under the front before it, which goes along
    """

    front: Front
    drive: Drive
    caught: bool = False
    under: bool = False


def is_level(front: Front) -> bool:
    """Return whether a front leaves square to the pull."""
    return abs(front.axis[2]) < LEVEL_AXIS


def steel_names(driven: Sequence[Driven]) -> list[str]:
    """Return the names of the forming steel, in order: "slide 1", "slide 1, under it", "slide 2", "lifter 1", ..."""
    count: dict[SideKind, int] = {}
    names: list[str] = []
    for one in driven:
        if one.under:
            names.append(f"{names[-1]}, under it")
            continue
        kind = one.front.kind
        count[kind] = count.get(kind, 0) + 1
        names.append(f"{kind} {count[kind]}")
    return names


def drive_fronts(fronts: Sequence[Front], part: Body, level: float) -> tuple[tuple[Driven, ...], Notes]:
    """Return every front with what drives it, in the same order; to be asked before the forming steel is made.

    An angled pin moves a slide while the cavity half lifts, so no cavity steel may lie under the front. Where there is
    some, the slide takes it too, down to the parting plane, if that leaves the part clear; else it must be drawn before
    the mold opens. That steel is part of the front where it can begin with it, else an entry of its own (`under`) that
    follows the front: with draft, steel of the core would come along and be held by the wall.

    part : the real part in the mold; level : height of the parting plane [mm]
    """
    found: list[Driven] = []
    decisions, count = [], 0
    for front in fronts:
        if front.kind is not SideKind.SLIDE:
            found.append(Driven(front, Drive.ANGLED_PIN))
            continue
        count += 1
        driven, why = _driven(front, part, level)
        found += driven
        decisions.append(Decision(f"slide {count}, drive", driven[0].drive, why))
    return tuple(found), Notes(decisions=tuple(decisions))


def _driven(front: Front, part: Body, level: float) -> tuple[list[Driven], str]:
    if not is_level(front):
        return [Driven(front, Drive.CYLINDER, True)], "it does not leave square to the pull"
    outline = lowered(front.outline, level)
    gain = outline_gain(front.outline, outline)
    if gain < LEAST_STEEL:
        return [Driven(front, Drive.ANGLED_PIN)], "no cavity steel lies under its front"
    outside = Outside(part.mesh, outline, across(front.axis), front.outline)
    reasons = []
    for near in np.linspace(front.near, front.clear, PLACES + 1).tolist():
        taken = outside.taken(front.near, near, front.far)
        if taken is None:
            continue
        if max(taken.depth, taken.left) > NOISE_THICKNESS:
            cuts = f"would cut {taken.depth:.2f} mm into the part"
            reasons.append(cuts if taken.depth > NOISE_THICKNESS else f"would leave {taken.left:.2f} mm of it")
            continue
        why = f"it takes {gain:.1f} mm^2 of cavity steel under its front along, down to the parting plane"
        travel = _travel(front, outline, part, taken.start)
        if near <= front.near:
            return [Driven(replace(front, outline=outline, travel=travel), Drive.ANGLED_PIN)], why
        under = replace(front, outline=outline, near=near, travel=travel, pieces=(), rung="cavity steel under a front")
        return [Driven(front, Drive.ANGLED_PIN), Driven(under, Drive.ANGLED_PIN, under=True)], why
    why = f"cavity steel lies under its front, and taking that along {reasons[0] if reasons else 'is not possible'}"
    return [Driven(front, Drive.CYLINDER, True)], why


def _travel(front: Front, outline: Sequence[np.ndarray], part: Body, start: float) -> float:
    """Return the travel after which no plastic under the extended front can meet it when the part is pushed up."""
    points = np.vstack(list(outline))
    (left, low), (right, high) = points.min(axis=0), points.max(axis=0)
    inside = extent_in(part.mesh, across(front.axis), Window(left, right, low - ON_PLANE, high))
    reach = float(inside[:, 2].max()) if inside is not None else start
    return max(front.travel, reach - start)
