"""Long round side bores: their core is a pin of its own in the slide, which can be exchanged when it bends or wears."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.model.side_action import Front
from moldgen.model.slide import SideCorePinLayout
from moldgen.rules.side_practice import SIDE_BORE_SLENDER

ROUND: Final = 0.03
"""Share of the radius by which the corners of a round outline may differ from a circle."""

FEWEST_CORNERS: Final = 8
"""An outline with fewer corners is not taken for a circle."""

HELD: Final = 2.0
"""Length of a side core pin in its slide by its diameter (common practice: 2 to 3)."""

SHANK_STEP: Final = 0.5
"""mm: shanks are rounded up to this; they are ground from blanks."""


@dataclass(frozen=True)
class RoundFront:
    """A front with a round outline [mm]: its axis, its diameter over the corners, and how far it reaches."""

    u: float
    z: float
    diameter: float
    slenderness: float

    @property
    def shank(self) -> float:
        """Diameter of the pin in the slide: the outline lies inside it."""
        return SHANK_STEP * math.floor(self.diameter / SHANK_STEP + 1.5)

    @property
    def depth(self) -> float:
        """Depth of its bore in the slide."""
        return HELD * self.shank


def round_front(front: Front) -> RoundFront | None:
    """Return a front as a pin where it is one circle and long enough over its diameter for one, else None."""
    if len(front.outline) != 1 or len(front.outline[0]) < FEWEST_CORNERS:
        return None
    points = np.asarray(front.outline[0], float)
    middle = 0.5 * (points.min(axis=0) + points.max(axis=0))
    reach = np.linalg.norm(points - middle, axis=1)
    diameter = 2.0 * float(reach.max())
    if reach.min() < (1.0 - ROUND) * reach.max():
        return None
    slenderness = (front.clear - front.near) / diameter
    if slenderness < SIDE_BORE_SLENDER.default:
        return None
    return RoundFront(float(middle[0]), float(middle[1]), diameter, slenderness)


def core_pin_of(front: Front, name: str) -> SideCorePinLayout | None:
    """Return the pin that a front becomes, None when it stays a piece of its slide."""
    found = round_front(front)
    if found is None:
        return None
    return SideCorePinLayout(
        f"side core pin of {name}", name, found.u, found.z, found.shank, found.depth, found.slenderness
    )
