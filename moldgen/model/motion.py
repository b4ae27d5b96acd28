"""How the mold opens: groups of components that move together, in straight stretches. Mold frame, mm."""

from __future__ import annotations

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
