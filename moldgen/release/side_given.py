"""Side actions that the user fixes: checked, not trusted. Mold frame, mm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.mesh_prism import bounds, box_of, rectangle, shadow
from moldgen.model.side_action import SideGiven, SideKind, Unreleased
from moldgen.release.side_front import Found, flush, obstacles, settled, whole_front
from moldgen.release.side_lifter import Lifted
from moldgen.release.side_outline import Outline, is_free
from moldgen.release.side_search import Placed, Search, Space, of_space
from moldgen.release.side_space import View

NEAREST = 5.0
"""A given point farther than this [mm] from every undercut names none: our choice."""


@dataclass(frozen=True)
class Answer:
    """What came of one entry: a front, the spaces that it leaves to the search, or why it does not work."""

    placed: Placed | None
    rest: tuple[Space, ...]
    refused: Unreleased | None


def answer(search: Search, given: SideGiven, number: int, spaces: list[Space]) -> Answer:
    """Return what came of an entry, the number of its place in the spec. The space that it names leaves the list."""
    space = _named(given, spaces)
    if space is None:
        x, y, z = given.point
        why = f"side action {number + 1}: no undercut within {NEAREST:g} mm of {x:.2f}, {y:.2f}, {z:.2f}"
        return Answer(None, (), Unreleased(-1, why, "give a point on the undercut that it is for"))
    spaces.remove(space)
    way = np.asarray(given.direction, dtype=float)
    way = np.round(way / np.linalg.norm(way), 12) + 0.0
    found = _lifter(search, space, way) if given.kind is SideKind.LIFTER else _slide(search, space, given, way)
    if isinstance(found, str):
        remedy = "give another direction or size, or leave it to moldgen"
        return Answer(None, (), Unreleased(space.piece, f"side action {number + 1}: {found}", remedy))
    search.note(placed := of_space(found, space, number))
    rest = tuple(Space(space.piece, r, 1) for r in found.rest) if isinstance(found, Found) else ()
    return Answer(placed, rest, None)


def _named(given: SideGiven, spaces: list[Space]) -> Space | None:
    """Return the space whose box is nearest to the given point."""
    gaps = []
    for k, space in enumerate(spaces):
        low, high = box_of(space.solid)
        outside = np.maximum(np.maximum(low - given.point, np.asarray(given.point) - high), 0.0)
        gaps.append((round(float(np.linalg.norm(outside)), 6), k))
    if not gaps or min(gaps)[0] > NEAREST:
        return None
    return spaces[min(gaps)[1]]


def _slide(search: Search, space: Space, given: SideGiven, way: np.ndarray) -> Found | str:
    view = search.view(way)
    if given.width is None or given.height is None:
        return whole_front(view, space.solid) or _blocked(view, space)
    seen = view.seen(space.solid)
    near = flush(view, float(box_of(seen)[0][2]))
    middle = (view.rows @ np.asarray(given.point))[:2]
    half = 0.5 * np.array([given.width, given.height])
    shape = rectangle(middle - half, middle + half)
    found = settled(view, seen, Outline(shape, "outline as given"), near)
    if found is None or not is_free(shape, obstacles(view, shape, near)):
        return _blocked(view, space, shape_low=middle - half, shape_high=middle + half)
    if sum(float(r.volume()) for r in found.rest) > 0.99 * float(space.solid.volume()):
        return "the given outline covers nothing of the undercut"
    return found


def _lifter(search: Search, space: Space, way: np.ndarray) -> Lifted | str:
    if abs(float(way[2])) > 1e-6:
        return "a lifter is released square to the pull"
    need = search.lifting.need(space.points, way)
    if need is None:
        return f"no level way within the stroke of {search.lifting.stroke:.1f} mm frees it"
    made = search.lifting.lifter(space.solid, way, need)
    return "another side action is in its way" if isinstance(made, Lifted) and search.meets(made) else made


def _blocked(
    view: View, space: Space, shape_low: np.ndarray | None = None, shape_high: np.ndarray | None = None
) -> str:
    """Return where along a view's direction plastic stands before a space, and how much of it, in words."""
    seen = view.seen(space.solid)
    near = flush(view, float(box_of(seen)[0][2]))
    need = shadow(seen) if shape_low is None or shape_high is None else rectangle(shape_low, shape_high)
    blocked = need ^ obstacles(view, need, near)
    share = 100.0 * float(blocked.area()) / max(float(need.area()), 1e-9)
    if blocked.is_empty():
        return "along the given direction its outline cannot be kept off the plastic beside it"
    low, high = bounds(blocked)
    hooks = view.hooks_above(low, high, near)
    first = hooks[np.argmin(hooks[:, :, 2].min(axis=1))].mean(axis=0)
    x, y, z = view.rows.T @ first
    before = float(first[2]) - near
    return (
        f"along the given direction plastic stands before {share:.0f} % of it ({float(blocked.area()):.2f} mm2), "
        f"first at {x:.2f}, {y:.2f}, {z:.2f}, {before:.2f} mm from its inner end"
    )
