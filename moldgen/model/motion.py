"""How the mold opens: groups of components that move together, in straight stretches. Mold frame, mm."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from moldgen.model.part import Vector


@dataclass(frozen=True)
class Step:
    """One straight stretch of the opening, in which every group moves evenly from its place at the start.

    name : what happens, in words ("the mold opens", "the ejectors push")
    moves : (group, displacement [mm]); a group that is not named stands still. Groups are the values of
        `moldgen.model.tool.Motion`, and "slide 1", "lifter 2", ... for side actions
    """

    name: str
    moves: tuple[tuple[str, Vector], ...]

    def displacement(self, group: str) -> Vector:
        """Return how far a group moves in this step."""
        return dict(self.moves).get(group, (0.0, 0.0, 0.0))


def total_displacement(steps: Sequence[Step], group: str) -> Vector:
    """Return how far a group stands from its place in the closed mold after some steps [mm]."""
    moves = [step.displacement(group) for step in steps]
    return (sum((m[0] for m in moves), 0.0), sum((m[1] for m in moves), 0.0), sum((m[2] for m in moves), 0.0))


def straight_steps(stroke: float, depth: float) -> tuple[Step, ...]:
    """Return the steps of a tool that opens along +z with nothing but its two halves and ejectors.

    stroke : travel of the ejectors [mm]; depth : height of the closed block [mm]. The mold opens by twice the depth and
    the stroke, which leaves room to take the part off: more than machines need, since a part is tilted out earlier
    """
    return (
        Step("the mold opens", (("cavity half", (0.0, 0.0, 2.0 * depth + stroke)),)),
        Step("the ejectors push", (("ejector", (0.0, 0.0, stroke)), ("part", (0.0, 0.0, stroke)))),
        Step("the part is taken off", (("part", (0.0, 0.0, depth)),)),
    )
