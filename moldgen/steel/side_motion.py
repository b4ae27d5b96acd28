"""The order in which a tool with side actions opens, as straight steps."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

from moldgen.errors import StageError
from moldgen.model.motion import Step
from moldgen.model.part import Vector
from moldgen.model.slide import Drive, SideLayout, SlideLayout
from moldgen.model.tool import Motion

SAME = 1e-9
"""mm: openings closer than this are one."""


def slide_way(slide: SlideLayout, opening: float) -> float:
    """Return how far an angled pin has moved its slide when the mold is open by `opening` [mm].

    Nothing until the pin has crossed its clearance, then opening * tan(angle), nothing more once the slide is off the
    pin. The law of the angled pin: Pye, Injection Mould Design, from memory.
    """
    if slide.drive is not Drive.ANGLED_PIN:
        return 0.0
    share = (opening - slide.delay) / slide.opening
    return slide.travel * min(max(share, 0.0), 1.0)


def opening_steps(layout: SideLayout, opening: float, stroke: float, leave: float) -> tuple[Step, ...]:
    """Return the steps in order: cylinders, opening, ejection, and the part's way out of the mold.

    Parameters
    ----------
    opening : of the mold [mm]; it is made longer where an angled pin needs more
    stroke : of the ejectors [mm]; 0 leaves out that step
    leave : how far the part then goes up, off its ejectors [mm]; 0 leaves out that step

    Raises
    ------
    StageError : a length is negative or not finite
    """
    for name, value in (("opening", opening), ("stroke", stroke), ("leave", leave)):
        if not (math.isfinite(value) and value >= 0.0):
            raise StageError(f"{name} must be a length, got {value}")
    drawn = [s for s in layout.slides if s.drive is Drive.CYLINDER]
    steps = [Step(f"the cylinder draws {s.name}", ((s.name, _along(s.axis, s.travel)),)) for s in drawn]
    steps += _open(layout.slides, opening)
    if stroke > 0.0:
        lifters = tuple((lifter.name, lifter.displacement(stroke)) for lifter in layout.lifters)
        up = (0.0, 0.0, stroke)
        steps.append(Step("the ejectors push", ((Motion.EJECTOR, up), (Motion.PART, up), *lifters)))
    if leave > 0.0:
        steps.append(Step("the part leaves", ((Motion.PART, (0.0, 0.0, leave)),)))
    return tuple(steps)


def _open(slides: Sequence[SlideLayout], opening: float) -> list[Step]:
    """Return the opening in stretches: it is broken where a slide starts and where it stops."""
    driven = [s for s in slides if s.drive is Drive.ANGLED_PIN]
    full = max([opening, *(s.delay + s.opening for s in driven)])
    breaks = sorted({0.0, full, *(s.delay for s in driven), *(s.delay + s.opening for s in driven)})
    steps = []
    for low, high in pairwise(breaks):
        if high - low <= SAME:
            continue
        moves: list[tuple[str, Vector]] = [(Motion.CAVITY_HALF, (0.0, 0.0, high - low))]
        moving = []
        for slide in slides:
            if slide.carried == Motion.CAVITY_HALF:
                moves.append((slide.name, (0.0, 0.0, high - low)))
            way = slide_way(slide, high) - slide_way(slide, low)
            if way > SAME:
                moves.append((slide.name, _along(slide.axis, way)))
                moving.append(slide.name)
        name = f"the mold opens, angled pins move {', '.join(moving)}" if moving else "the mold opens"
        steps.append(Step(name, tuple(moves)))
    return steps


def _along(axis: Vector, way: float) -> Vector:
    x, y, z = (float(v * way) + 0.0 for v in axis)
    return (x, y, z)
