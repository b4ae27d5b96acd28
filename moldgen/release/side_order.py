"""One front for several spaces where their common outline can leave, and the order in which fronts open."""

from __future__ import annotations

from moldgen.kernel.mesh_prism import bounds as region_bounds
from moldgen.kernel.mesh_prism import box_of, grown, hull, rectangle, shadow
from moldgen.kernel.meshsolid import MeshSolid, thick_pieces, union
from moldgen.release.side_front import Found, obstacles, settled
from moldgen.release.side_lifter import Lifted
from moldgen.release.side_outline import LANDS, Outline, is_free
from moldgen.release.side_search import Placed
from moldgen.release.side_space import SideSpace

SAME_NEAR = 0.5
"""Fronts whose inner ends differ by more than this [mm] stay apart: one end for both would cut into the core (ours)."""

MOST_MERGES = 200
"""Bound on the pairs of fronts for which a common outline is tried."""

REACHED = 0.1
"""A piece of steel that ends this near [mm] to the far end of its front is held there."""


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
    forbidden = obstacles(view, need, near)
    low, high = region_bounds(need)
    for land in LANDS:
        box = Outline(rectangle(low - land, high + land), f"rectangle, land {land:g} mm")
        for outline in (box, Outline(grown(hull(need), land, 0.05), f"hull, land {land:g} mm")):
            found = settled(view, seen, outline, near) if is_free(outline.shape, forbidden) else None
            if found is not None and not found.rest:
                pieces = tuple(sorted({*one.pieces, *other.pieces}))
                return Placed(found, pieces, union([one.covered, other.covered]))
    return None


def ordered(placed: list[Placed], space: SideSpace) -> list[Placed]:
    """Return slides in an order in which each can leave, then lifters. Where two overlap the earlier takes the steel.

    A front may not follow one that would cut its inner end off from its outer one.
    """
    lifters = [p for p in placed if isinstance(p.found, Lifted)]
    placed = [p for p in placed if not isinstance(p.found, Lifted)]
    steel = [p.found.steel() - space.part for p in placed if isinstance(p.found, Found)]
    after: dict[int, set[int]] = {i: set() for i in range(len(placed))}
    for i in range(len(placed)):
        for j in range(i + 1, len(placed)):
            if not thick_pieces(steel[i] ^ steel[j]):
                continue
            if not _held(placed[j], steel[j] - steel[i]):
                after[i].add(j)
            elif not _held(placed[i], steel[i] - steel[j]):
                after[j].add(i)
    order: list[int] = []
    waiting = list(range(len(placed)))
    while waiting:
        ready = next((i for i in waiting if not after[i] & set(waiting)), waiting[0])
        order.append(ready)
        waiting.remove(ready)
    return [*(placed[i] for i in order), *lifters]


def _held(placed: Placed, left: MeshSolid) -> bool:
    """Return whether all of the steel left of a front still reaches its far end."""
    view = placed.found.view
    return all(float(box_of(view.seen(p))[1][2]) > view.far - REACHED for p in thick_pieces(left))
