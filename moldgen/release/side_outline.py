"""Outlines of fronts: from what a toolmaker likes best to what always works, each kept off what it must not hold."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.mesh_prism import Region, bounds, grown, hull, polygons, rectangle, region
from moldgen.release.side_space import View

LANDS = (1.0, 0.5, 0.2, 0.06)
"""Land [mm] around the undercut on which the front shuts off, widest first: our choice; 1 mm wears longest."""

CURVED_LANDS = (0.2, 0.06)
"""Lands of outlines that follow the undercut's own shape."""

SMOOTH = 0.02
"""How far [mm] an outline may leave the shape it follows: less than what counts as an overlap."""

TOUCH = 0.01
"""How far [mm] an outline may reach over what it must not hold: less than half the thickness of an overlap."""

APART, MOVE, MOVES = 0.03, 0.13, 4
"""A wall of a rectangle nearer than APART [mm] to a parallel face of the part is moved out by MOVE [mm], MOVES times at
most: the kernel cuts two sheets that nearly coincide badly (measured)."""

GAP, LEAST_WIDTH = 0.04, 0.16
"""Carving: distance [mm] from what blocks the way; necks narrower than this [mm] are dropped."""


@dataclass(frozen=True)
class Outline:
    """A region across the release direction, and how it was found."""

    shape: Region
    rung: str


def outlines(need: Region, view: View, near: float) -> Iterator[Outline]:
    """Yield outlines around what must be covered, best first."""
    need = grown(need, 0.0, SMOOTH)
    low, high = bounds(need)
    for land in LANDS:
        yield Outline(_off_faces(low - land, high + land, view, near), f"rectangle, land {land:g} mm")
        yield Outline(grown(hull(need), land, 0.05), f"hull, land {land:g} mm")
        if land in CURVED_LANDS:
            yield Outline(grown(need, land, max(SMOOTH, land / 10.0)), f"own shape, land {land:g} mm")
    yield Outline(need, "own shape, no land")


def is_free(shape: Region, forbidden: Region) -> bool:
    """Return whether a region stays off the forbidden one, but for a rim of `TOUCH`."""
    if forbidden.is_empty():
        return True
    return bool((shape ^ grown(forbidden, -TOUCH)).area() < 1e-6)


def carved(need: Region, forbidden: Region) -> Region:
    """Return what may be covered of a need with a land, without what blocks it and without narrow necks."""
    low, high = bounds(need)
    return carved_from(rectangle(low - LANDS[2], high + LANDS[2]), need, forbidden)


def carved_from(shape: Region, need: Region, forbidden: Region) -> Region:
    """Return what is left of a shape without what blocks it and without narrow necks, where it serves the need."""
    left = shape - grown(forbidden, GAP, SMOOTH)
    opened = grown(grown(left, -0.5 * LEAST_WIDTH), 0.5 * LEAST_WIDTH, SMOOTH) ^ left
    kept = [p for p in opened.decompose() if (p ^ need).area() > 1e-3]
    joined = region([])
    for part in kept:
        joined = joined + part
    return joined


def _off_faces(low: np.ndarray, high: np.ndarray, view: View, near: float) -> Region:
    """Return the rectangle with its sides moved out where they nearly coincide with a face of the part."""
    low, high = low.copy(), high.copy()
    for axis in (0, 1):
        for end, sign in ((low, -1.0), (high, 1.0)):
            for _ in range(MOVES):
                start, stop = low.copy(), high.copy()
                start[axis] = stop[axis] = end[axis]
                if not view.walls_beside(start, stop, near, APART):
                    break
                end[axis] += sign * MOVE
    return rectangle(low, high)


def polygons_of(outline: Outline) -> tuple[np.ndarray, ...]:
    """Return the polygons of an outline, (k, 2) [mm]."""
    return polygons(outline.shape)
