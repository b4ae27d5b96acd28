"""Whether the bodies of slides meet."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from moldgen.errors import PartError
from moldgen.model.slide import SlideLayout
from moldgen.rules.side_practice import STEEL_BESIDE_SLIDE


def refuse_meeting(slides: Sequence[SlideLayout]) -> None:
    """Refuse slides whose bodies, with their ledges, meet or leave too little steel between them.

    All bodies reach through the parting plane, so plan is enough; outward they only part, and their way out is square
    to their width.

    Raises
    ------
    PartError : two bodies meet
    """
    placed = [s for s in slides if s.body is not None]
    for one, other in combinations(placed, 2):
        gap = plan_gap(one.footprint(), other.footprint())
        needed = STEEL_BESIDE_SLIDE.default / 2
        if gap < needed:
            meet = f"their bodies overlap by {-gap:.1f} mm" if gap < 0.0 else f"only {gap:.1f} mm of steel lie between"
            raise PartError(
                f"they meet: {meet}, at least {needed:g} mm are needed",
                where=f"{one.name} and {other.name}",
                remedy="move one of the undercuts along the part, let one direction serve both (side_actions in the "
                "spec), or form one of them with a lifter",
            )


def plan_gap(one: np.ndarray, other: np.ndarray) -> float:
    """Return the widest gap that a straight line leaves between two convex polygons (k, 2), negative: they overlap."""
    best = -np.inf
    for polygon in (one, other):
        edges = np.roll(polygon, -1, axis=0) - polygon
        normals = np.column_stack([edges[:, 1], -edges[:, 0]])
        normals = normals / np.linalg.norm(normals, axis=1)[:, None]
        for normal in normals:
            a, b = one @ normal, other @ normal
            best = max(best, float(b.min() - a.max()), float(a.min() - b.max()))
    return best
