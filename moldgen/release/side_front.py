"""One front for one trapped space along one direction: where it starts, its outline, what it leaves to others."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.mesh_prism import Region, bounds, box_of, grown, prism, shadow, split_level
from moldgen.kernel.meshsolid import MeshSolid, thick_pieces
from moldgen.model.part import Vector
from moldgen.model.side_action import Front, SideKind
from moldgen.release.side_held import held_back, leaves_with_halves, steel_within
from moldgen.release.side_outline import LANDS, MOVE, MOVES, Outline, carved, is_free, outlines, polygons_of
from moldgen.release.side_space import View

FLUSH = 0.06
"""A level face of the part this near [mm] to the inner end of a trapped space is where the front ends."""

INTO_WALL = (0.6, 0.3, 0.15)
"""How far [mm] a front without a level face to end at is pushed on into solid plastic, deepest first (our choice)."""

OVER = 0.02
"""Space [mm] before a front's inner end that counts as covered."""

WINDOW = LANDS[0] + MOVE * MOVES + 0.1
"""How far [mm] around a need it is asked what blocks the way: as far as any outline reaches, less than a view's pad."""


@dataclass(frozen=True)
class Found:
    """A front along a view's direction, as a region and levels in the view's frame, and what it leaves uncovered.

    start : where the space that it serves starts; near may lie deeper, in solid plastic
    rest : spaces of the need that are left to others, in the mold frame
    loose : steel of the prism that the plastic parts from its outer end, for the halves to carry, in the mold frame
    """

    view: View
    outline: Outline
    near: float
    start: float
    clear: float
    travel: float
    rest: tuple[MeshSolid, ...] = ()
    loose: tuple[MeshSolid, ...] = ()

    def front(self, pieces: tuple[int, ...], given: int = -1) -> Front:
        """Return the front as the model tells it."""
        x, y, z = (float(c) for c in self.view.direction)
        axis: Vector = (x, y, z)
        return Front(
            kind=SideKind.SLIDE,
            axis=axis,
            release=axis,
            outline=polygons_of(self.outline),
            near=self.near,
            far=self.view.far,
            clear=self.clear,
            travel=self.travel,
            pieces=pieces,
            rung=self.outline.rung,
            given=given,
        )

    def steel(self) -> MeshSolid:
        """Return the whole prism in the mold frame."""
        return self.view.back(prism(self.outline.shape, self.near, self.view.far))


def whole_front(view: View, space: MeshSolid, near: float | None = None) -> Found | None:
    """Return a front that lets all of a space out along the view's direction, or None.

    near : where it ends, along the direction; None: at the space's own end or the level face of the part beside it
    """
    seen = view.seen(space)
    near = flush(view, float(box_of(seen)[0][2])) if near is None else near
    need = shadow(seen)
    forbidden = obstacles(view, need, near)
    if is_free(need, forbidden):
        for outline in outlines(need, view, near):
            found = settled(view, seen, outline, near) if is_free(outline.shape, forbidden) else None
            if found is not None and not found.rest:
                return found
        return None
    return _through_front(view, seen, near)


def _through_front(view: View, seen: MeshSolid, near: float) -> Found | None:
    """Return a front for all of a space whose steel also stands beyond a wall, where the halves carry it, or None.

    Steel beyond the wall must not run round the wall's end to the front, so narrower windows are tried as well.
    """
    need = shadow(seen)
    low, high = bounds(need)
    for window in (WINDOW, LANDS[1] + 0.1, LANDS[2] + 0.05):
        forbidden = held_back(view, need, near, window)
        if not is_free(need, forbidden):
            continue
        for outline in outlines(need, view, near):
            least, most = bounds(outline.shape)
            if (least < low - window).any() or (most > high + window).any() or not is_free(outline.shape, forbidden):
                continue
            found = settled(view, seen, Outline(outline.shape, f"through a wall, {outline.rung}"), near, parted=True)
            if found is not None and not found.rest:
                return found
    return None


def part_fronts(view: View, space: MeshSolid) -> list[Found]:
    """Return fronts that let some of a space out: those that stop at a level inside it, then those that are carved."""
    seen = view.seen(space)
    low, high = (float(v[2]) for v in box_of(seen))
    levels = [float(v) for v in view.levels if low + OVER < v < high - OVER]
    highest = _lowest_free(view, seen, low, high)
    above = [v for v in levels if v >= highest - FLUSH][:2]
    found = []
    for level in [*above, *([highest] if not above and highest < high - 0.05 else [])]:
        upper, _ = split_level(seen, level)
        made = _level_front(view, seen, upper, level) if thick_pieces(upper) else None
        found += [made] if made is not None else []
    for level in [flush(view, low), *[v for v in levels if v < highest - FLUSH][:2]]:
        made = _carved_front(view, seen, level)
        found += [made] if made is not None else []
    return found


def _lowest_free(view: View, seen: MeshSolid, low: float, high: float) -> float:
    """Return the lowest level above which all of a space can leave, between its ends [mm]."""
    corner, other = box_of(seen)
    hooks = view.hooks_above(corner[:2], other[:2], low)
    tops = np.unique(np.round(np.clip(hooks[:, :, 2].max(axis=1), low, high), 4)) if len(hooks) else np.zeros(0)
    steps = [low, *(float(t) for t in tops if t > low + OVER)]
    first, last = 0, len(steps) - 1
    while first < last:
        middle = (first + last) // 2
        upper, _ = split_level(seen, steps[middle])
        need = shadow(upper)
        if need.is_empty() or is_free(need, obstacles(view, need, steps[middle])):
            last = middle
        else:
            first = middle + 1
    return steps[first]


def _level_front(view: View, seen: MeshSolid, upper: MeshSolid, level: float) -> Found | None:
    need = shadow(upper)
    forbidden = obstacles(view, need, level)
    for outline in outlines(need, view, level):
        if is_free(outline.shape, forbidden):
            found = settled(view, seen, Outline(outline.shape, f"to a level, {outline.rung}"), level)
            if found is not None:
                return found
    return None


def _carved_front(view: View, seen: MeshSolid, level: float) -> Found | None:
    upper, _ = split_level(seen, level - OVER)
    if not upper.num_tri():
        return None
    need = shadow(upper)
    shape = carved(need, obstacles(view, need, level))
    if shape.is_empty() or shape.area() < 0.05:
        return None
    return settled(view, seen, Outline(shape, "carved around what blocks it"), level)


def settled(view: View, seen: MeshSolid, outline: Outline, near: float, parted: bool = False) -> Found | None:
    """Return the front with this outline and inner end, or None if its steel could not leave.

    parted : the plastic may part some of its steel from its outer end, where it can leave with the halves
    """
    shape = outline.shape
    if shape.is_empty():
        return None
    plastic = view.plastic_within(shape, near - INTO_WALL[0])
    inner = near - next((deeper for deeper in INTO_WALL if _is_full(plastic, shape, near - deeper, near)), 0.0)
    clear = max(float(box_of(plastic)[1][2]) if plastic.num_tri() else near, near)
    rest = thick_pieces(seen - prism(shape, near - OVER, view.far))
    _, loose = steel_within(view, shape, inner) if parted else ([], [])
    rest += [r for piece in loose for r in thick_pieces(seen ^ piece)]
    loose = [view.back(piece) for piece in loose]
    if not leaves_with_halves(view.tracer, loose):
        return None
    travel = clear - max(float(box_of(seen)[0][2]), near)
    return Found(view, outline, inner, near, clear, travel, tuple(view.back(r) for r in rest), tuple(loose))


def flush(view: View, low: float) -> float:
    """Return the level face of the part nearest to a level, if within `FLUSH`, else the level."""
    gap = np.abs(view.levels - low)
    return float(view.levels[int(np.argmin(gap))]) if len(gap) and gap.min() < FLUSH else low


def _is_full(plastic: MeshSolid, shape: Region, low: float, high: float) -> bool:
    """Return whether a region is all plastic between two levels; its rim, 0.02 mm, is not asked."""
    core = grown(shape, -0.02)
    if core.is_empty() or not plastic.num_tri():
        return False
    room = core.area() * (high - low)
    return bool((plastic ^ prism(core, low, high)).volume() > (1.0 - 1e-4) * room)


def obstacles(view: View, need: Region, near: float) -> Region:
    """Return what blocks the way around a need, as far as any outline reaches, for steel that starts at a level."""
    low, high = bounds(need)
    return view.forbidden(low - WINDOW, high + WINDOW, near)
