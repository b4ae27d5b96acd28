"""What the search for a gate works on, and what it finds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Notes
from moldgen.layout.flow_paths import FlowPaths
from moldgen.layout.gate_size import Melt
from moldgen.layout.keep_out import CANNOT_BE, is_side_rule
from moldgen.layout.kept import KeptFeed
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, GateLayout
from moldgen.spec.sections import Gate

MOST_WEIGHED: Final = 40
"""Places whose flow lengths are compared."""

FAR: Final = 2.0
"""mm: a gate this far from the place asked for is reported."""

ASIDE: Final = 0.3
"""Cost of a place beside the part's middle lines, by its distance over the size in plan: flow lengths are only good
to a few percent, and a gate on a middle line is easier to make and to balance."""


@dataclass(frozen=True)
class Task:
    """One gate to place: the part, the wishes of the spec, what must flow, and the ways inside the part.

    feed : of an accepted gate, with the foot of its sprue brought to this parting plane; it stays where it suffices
    """

    view: PartView
    section: Gate
    resin: Resin
    melt: Melt
    paths: FlowPaths
    at: np.ndarray | None
    no_gate: frozenset[int]
    feed: KeptFeed | None = None

    @property
    def chooser(self) -> Chooser:
        """Who decides the place."""
        return Chooser.MOLDGEN if self.at is None else Chooser.GIVEN

    @property
    def size(self) -> float:
        """Larger extent of the part in plan [mm]."""
        low, high = self.view.body.box
        return float((high - low)[:2].max())

    def thin(self, wall: np.ndarray) -> np.ndarray:
        """Return what a gate into a wall costs against one into the usual wall: melt should flow from thick to thin."""
        return np.asarray(np.sqrt(np.clip(self.view.wall / np.maximum(wall, 1e-3), 0.5, 4.0)))

    def flow_from(self, place: np.ndarray) -> tuple[tuple[float, float, float], float]:
        """Return the farthest place of the part and the flow length to it [mm]."""
        flow, end = self.paths.longest(place[None], through=8)
        x, y, z = (float(v) for v in self.paths.surface[end[0]])
        return (x, y, z), float(flow[0])


@dataclass(frozen=True)
class Found:
    """A gate with the rules that its place breaks.

    open : share of its mouth that opens into the part; end : the farthest place that the melt must reach [mm]
    """

    gate: GateLayout
    notes: Notes
    broken: tuple[str, ...]
    open: float
    end: tuple[float, float, float]

    @property
    def badness(self) -> float:
        """How bad the place is: 0 when it keeps all rules; a mouth that misses the part is the worst."""
        rules = sum(CANNOT_BE if is_side_rule(text) else 1 for text in self.broken)
        return rules + (1.0 - self.open) + (100.0 if self.open <= 0.0 else 0.0)
