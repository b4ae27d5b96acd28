"""Side actions as their forming steel alone: slides that a cylinder draws before the mold opens, lifters as they are."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from moldgen.model.halves import SideSteel
from moldgen.model.motion import Step, straight_steps
from moldgen.model.part import Vector
from moldgen.model.side_action import SideKind
from moldgen.model.tool import Component, Motion, Role

CLEARANCE = 2.0
"""mm: travel beyond what clears the part (common practice: 2 to 3)."""


def plain_components(sides: Sequence[SideSteel], material: str) -> tuple[Component, ...]:
    """Return one component for each side action, moving by itself."""
    roles = {SideKind.SLIDE: Role.SLIDE, SideKind.LIFTER: Role.LIFTER}
    return tuple(Component(s.name, roles[s.front.kind], s.solid, material, s.name) for s in sides)


def plain_steps(sides: Sequence[SideSteel], stroke: float, depth: float) -> tuple[Step, ...]:
    """Return how the tool opens: slides one after the other, the mold, then ejectors and lifters together."""
    slides = [s for s in sides if s.front.kind is SideKind.SLIDE]
    first = tuple(Step(f"{s.name} is drawn", ((s.name, _way(s, s.front.travel + CLEARANCE)),)) for s in slides)
    opens, push, off = straight_steps(stroke, depth)
    lift = opens.displacement(Motion.CAVITY_HALF)
    opens = Step(opens.name, opens.moves + tuple((s.name, lift) for s in slides if s.in_cavity))
    lifters = [s for s in sides if s.front.kind is SideKind.LIFTER]
    moves = tuple((s.name, _lifted(s, stroke)) for s in lifters)
    return (*first, opens, Step(push.name, push.moves + moves), off)


def _way(side: SideSteel, length: float) -> Vector:
    x, y, z = (float(v) for v in np.asarray(side.front.release) * length)
    return (x, y, z)


def _lifted(side: SideSteel, stroke: float) -> Vector:
    """Return the way of a lifter along its own shaft while the ejectors rise by the stroke [mm]."""
    axis = -np.asarray(side.front.axis)
    x, y, z = (float(v) for v in axis * (stroke / axis[2]))
    return (x, y, z)
