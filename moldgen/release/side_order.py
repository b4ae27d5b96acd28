"""One front for several spaces where their common outline can leave, and the order in which fronts open."""

from __future__ import annotations

from moldgen.kernel.mesh_prism import bounds as region_bounds
from moldgen.kernel.mesh_prism import box_of, grown, hull, rectangle, shadow
from moldgen.kernel.meshsolid import MeshSolid, thick_pieces, union
from moldgen.release.side_front import WINDOW, Found, obstacles, settled
from moldgen.release.side_held import REACHED, held_back
from moldgen.release.side_lifter import Lifted
from moldgen.release.side_outline import LANDS, Outline, is_free
from moldgen.release.side_search import Placed
from moldgen.release.side_space import SideSpace

SAME_NEAR = 0.5
"""Fronts whose inner ends differ by more than this [mm] stay apart: one end for both would cut into the core (ours)."""

MOST_MERGES = 200
"""Bound on the pairs of fronts for which a common outline is tried."""


def merged(placed: list[Placed]) -> list[Placed]:
    """Return the fronts with those joined that one outline along one direction can serve."""
    kept = list(placed)
    tries = 0
    start = 0
    while start < len(kept):
        other = start + 1
        while other < len(kept) and tries < MOST_MERGES:
            tries += _same_way(kept[start].found, kept[other].found)
            joined = _joined(kept[start], kept[other])
            if joined is not None and _in_the_way(joined.found, kept):
                joined = None
            if joined is None:
                other += 1
            else:
                kept[start] = joined
                del kept[other]
                other = start + 1
        start += 1
    return kept


def _same_way(one: Found | Lifted, other: Found | Lifted) -> bool:
    if isinstance(one, Lifted) or isinstance(other, Lifted):
        return False
    return one.view is other.view and abs(one.near - other.near) <= SAME_NEAR


def _in_the_way(found: Found | Lifted, placed: list[Placed]) -> bool:
    """Return whether steel of a slide meets a lifter's, which was placed where it met none of the single slides."""
    lifters = [p.found.steel for p in placed if isinstance(p.found, Lifted)]
    return isinstance(found, Found) and any(thick_pieces(found.steel() ^ steel) for steel in lifters)


def _joined(one: Placed, other: Placed) -> Placed | None:
    """Return one front that covers what two cover, or None."""
    first, second = one.found, other.found
    if isinstance(first, Lifted) or isinstance(second, Lifted) or not _same_way(first, second):
        return None
    if one.given >= 0 or other.given >= 0:
        return None
    view, near = first.view, min(first.start, second.start)
    seen = view.seen(union([one.covered, other.covered]))
    need = shadow(seen)
    parted = bool(first.loose or second.loose)
    forbidden = held_back(view, need, near, WINDOW) if parted else obstacles(view, need, near)
    low, high = region_bounds(need)
    wall = "through a wall, " if parted else ""
    for land in LANDS:
        box = Outline(rectangle(low - land, high + land), f"{wall}rectangle, land {land:g} mm")
        for outline in (box, Outline(grown(hull(need), land, 0.05), f"{wall}hull, land {land:g} mm")):
            found = settled(view, seen, outline, near, parted) if is_free(outline.shape, forbidden) else None
            if found is not None and not found.rest:
                pieces = tuple(sorted({*one.pieces, *other.pieces}))
                return Placed(found, pieces, union([one.covered, other.covered]))
    return None


def ordered(placed: list[Placed], space: SideSpace) -> tuple[list[Placed], list[Placed]]:
    """Return slides in an order in which each can leave, then lifters, and slides for which there is no order.

    Where two overlap the earlier takes the steel: a front may not follow one that would cut its inner end off.
    """
    lifters = [p for p in placed if isinstance(p.found, Lifted)]
    slides = [(p, p.found) for p in placed if isinstance(p.found, Found)]
    steel = [found.steel() - union([space.part, *found.loose]) for _, found in slides]
    before: dict[int, set[int]] = {i: set() for i in range(len(slides))}
    for i in range(len(slides)):
        for j in range(i + 1, len(slides)):
            if thick_pieces(steel[i] ^ steel[j]):
                if not _held(slides[j][1], steel[j] - steel[i]):
                    before[i].add(j)
                if not _held(slides[i][1], steel[i] - steel[j]):
                    before[j].add(i)
    order: list[int] = []
    waiting = list(range(len(slides)))
    while ready := [i for i in waiting if not before[i] & set(waiting)]:
        order.append(ready[0])
        waiting.remove(ready[0])
    return [*(slides[i][0] for i in order), *lifters], [slides[i][0] for i in waiting]


def _held(found: Found, left: MeshSolid) -> bool:
    """Return whether all of the steel left of a front still reaches its far end."""
    view = found.view
    return all(float(box_of(view.seen(p))[1][2]) > view.far - REACHED for p in thick_pieces(left))
