"""Why a trapped space has no side action, in the trade's words, and the smallest change of the part that would help."""

from __future__ import annotations

import math

import numpy as np

from moldgen.kernel.mesh_prism import box_of
from moldgen.kernel.tracer import Tracer
from moldgen.model.side_action import Unreleased
from moldgen.release.side_choice import shares
from moldgen.release.side_search import Search, Space
from moldgen.release.trapped import TrapPiece

CLOSED = 0.05
"""Share of free rays, in the best direction, under which a space counts as closed."""

RING_CLOSED = 0.45
"""The same for a groove all the way round: one around the outside has half of it free each way, one inside less."""

LEANING = 5.0
"""Angle [deg] up to which an undercut is a wall that leans the wrong way, for draft to cure: our choice."""

TURNS = 3
"""Ring grooves about one axis from which they count as a thread."""


def refusal(search: Search, space: Space, piece: TrapPiece, rings: int) -> Unreleased:
    """Return why a space stays trapped and what would help; `rings` of its part's trapped pieces go round an axis."""
    tracer = search.tracer
    ways = np.vstack([search.directions.level, search.directions.inclined])
    free = shares(tracer, space.points, ways)
    best = int(np.argmax(np.round(free, 6)))
    why = _why(search, space, ways[best], float(free[best]), rings)
    return Unreleased(space.piece, why, _remedy(tracer, space, piece), tuple(space.tried))


def ring_count(pieces: list[TrapPiece]) -> int:
    """Return how many trapped pieces go all the way round something."""
    return sum(p.solid.genus() > 0 for p in pieces)


def _why(search: Search, space: Space, way: np.ndarray, free: float, rings: int) -> str:
    if space.solid.genus() > 0 and rings >= TURNS:
        return "thread, or ring grooves like one: it turns out, no straight motion releases it"
    if space.solid.genus() > 0 and free < RING_CLOSED:
        return "closed undercut, a groove all the way round the inside: a collapsing core would be needed"
    if free < CLOSED:
        return "closed undercut: no straight motion releases any of it; a collapsing core or a split part is needed"
    hit = search.tracer.first_triangle(space.points, way)
    hit = hit[hit >= 0]
    if len(hit) == 0:
        return "hollow with a small mouth: steel that leaves it would need more room than its mouth gives"
    places = search.shared.corners[hit].mean(axis=1)
    x, y, z = places[np.argmin(np.round(np.linalg.norm(places - np.median(places, axis=0), axis=1), 6))]
    a, b, c = (round(float(v), 3) + 0.0 for v in way)
    return (
        f"the part's own wall at {x:.2f}, {y:.2f}, {z:.2f} stands in the way: the best direction "
        f"{a:g}, {b:g}, {c:g} frees {100.0 * free:.0f} % of it"
    )


def _remedy(tracer: Tracer, space: Space, piece: TrapPiece) -> str:
    """Return the smallest change that would help."""
    angle = math.degrees(math.atan2(piece.depth_mm, max(piece.height_mm, 1e-9)))
    if angle <= LEANING:
        return (
            f"draft: the wall reaches {piece.depth_mm:.2f} mm over {piece.height_mm:.2f} mm of height; "
            f"lean it {angle:.1f} deg the other way"
        )
    low, high = box_of(space.solid)
    below = tracer.blocked(space.points, (0.0, 0.0, -1.0)).mean()
    above = tracer.blocked(space.points, (0.0, 0.0, 1.0)).mean()
    side = "below" if below <= above else "above"
    width, length = high[0] - low[0], high[1] - low[1]
    x, y = 0.5 * (low + high)[:2]
    return (
        f"a slot of {width:.1f} x {length:.1f} mm through the wall {side} it, about {x:.2f}, {y:.2f}, opens it along "
        "the pull; or move the split of the part into it"
    )
