"""Where a pin may push: the part's underside, flat enough, and how much room there is round each place."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
from scipy.spatial import cKDTree

from moldgen.layout.view import PartView
from moldgen.rules.layout_practice import PIN_SLOPE

SPACING: Final = 0.25
"""mm: distance of the points that stand for the borders of the pushable area."""

GRID_PLACES: Final = 2500
"""Places tried over the part's box in plan."""

FINEST_GRID: Final = 0.8
"""mm: least distance of two places."""

FINE_PLACES: Final = 4000
FINE_GRID: Final = 0.2
"""The same for pins so small that the usual grid would step over their places."""

RING: Final = 24
"""Points on a pin's rim, and half as many on a ring of half its radius, that must meet the part."""


@dataclass(frozen=True)
class Disc:
    """What lies over the whole end face of a pin.

    low, high : extent of the core's surface there [mm]; slope : steepest [deg]
    whole : the part lies over all of it; core_side : the core half forms all of it; faces : numbers met
    aside : a side action forms some of it, or there is only its steel instead of the part
    """

    low: float
    high: float
    slope: float
    whole: bool
    core_side: bool
    faces: tuple[int, ...]
    aside: bool = False


class Underside:
    """The surface of the part that the core half forms and a pin can push on.

    no_pins : faces of the part that must stay free of pins; steepest : slope up to which a pin pushes [deg]
    """

    def __init__(
        self, view: PartView, no_pins: frozenset[int] = frozenset(), steepest: float = PIN_SLOPE.default
    ) -> None:
        self.view = view
        slope = np.degrees(np.arccos(np.clip(-view.normals[:, 2], -1.0, 1.0)))
        marked = np.isin(view.mesh.face, sorted(no_pins))
        self.slope = slope
        self.pushable: np.ndarray = view.core_side & (slope <= steepest) & ~marked & ~view.formed_aside
        """(t,) bool"""

    @cached_property
    def border(self) -> np.ndarray:
        """Segments in plan where the pushable area ends, (b, 2, 2) [mm]."""
        view = self.view
        edges = view.triangle_edges
        count = int(edges.max()) + 1
        users = np.bincount(edges[self.pushable].ravel(), minlength=count)
        row, corner = np.nonzero(self.pushable[:, None] & (users[edges] == 1))
        ends = view.mesh.triangles[row[:, None], np.stack([(corner + 1) % 3, (corner + 2) % 3], axis=1)]
        return np.asarray(view.mesh.vertices[ends][:, :, :2])

    @cached_property
    def _border_points(self) -> cKDTree:
        segments = self.border
        many = np.maximum(np.ceil(np.linalg.norm(segments[:, 1] - segments[:, 0], axis=1) / SPACING), 1).astype(int) + 1
        place = np.repeat(np.arange(len(segments)), many)
        turn = np.arange(len(place)) - np.repeat(np.cumsum(many) - many, many)
        share = (turn / (many[place] - 1))[:, None]
        return cKDTree(segments[place, 0] + share * (segments[place, 1] - segments[place, 0]))

    def room(self, places: np.ndarray) -> np.ndarray:
        """Return the distance of places (k, 2) on the pushable area from its border, 0 off the area, (k,) [mm]."""
        height, triangle = self.view.underside(places)
        on = (triangle >= 0) & self.pushable[np.maximum(triangle, 0)]
        on[on] = ~self.view.aside(np.column_stack([places, height])[on], triangle[on])
        room = np.zeros(len(places))
        if on.any():
            # a sampled border is at most half a spacing from the nearest sample: what that hides is taken off
            sampled = self._border_points.query(places[on])[0]
            room[on] = np.sqrt(np.maximum(sampled**2 - (SPACING / 2) ** 2, 0.0))
        return room

    @cached_property
    def grid(self) -> tuple[np.ndarray, np.ndarray]:
        """Places on a grid that is symmetric about the middle of the part, (k, 2) [mm], and their room, (k,) [mm]."""
        return self._grid(GRID_PLACES, FINEST_GRID)

    @cached_property
    def fine_grid(self) -> tuple[np.ndarray, np.ndarray]:
        """As `grid`, for small pins."""
        return self._grid(FINE_PLACES, FINE_GRID)

    def _grid(self, count: int, finest: float) -> tuple[np.ndarray, np.ndarray]:
        low, high = (v[:2] for v in self.view.body.box)
        step = max(float(np.sqrt(np.prod(high - low) / count)), finest)
        half = np.floor((high - low) / 2 / step).astype(int)
        x, y = (self.view.middle[k] + step * np.arange(-half[k], half[k] + 1) for k in (0, 1))
        places = np.stack(np.meshgrid(x, y, indexing="ij"), axis=-1).reshape(-1, 2)
        return places, self.room(places)

    def discs(self, places: np.ndarray, diameters: np.ndarray) -> list[Disc]:
        """Return what lies over pins of the given diameters (k,) [mm] at places (k, 2)."""
        turn = 2 * np.pi * np.arange(RING) / RING
        rim = np.column_stack([np.cos(turn), np.sin(turn)])
        pattern = np.vstack([[[0.0, 0.0]], 0.5 * rim[::2], 0.999 * rim])
        points = places[:, None] + 0.5 * diameters[:, None, None] * pattern
        height, triangle = self.view.underside(points.reshape(-1, 2))
        aside = self.view.aside(np.column_stack([points.reshape(-1, 2), height]), triangle)
        shape = (len(places), len(pattern))
        any_aside = np.asarray(aside.reshape(shape).any(axis=1))
        found = zip(height.reshape(shape), triangle.reshape(shape), any_aside, strict=True)
        return [self._disc(h, t, bool(a)) for h, t, a in found]

    def _disc(self, height: np.ndarray, triangle: np.ndarray, aside: bool) -> Disc:
        met = triangle[triangle >= 0]
        if len(met) == 0:
            return Disc(0.0, 0.0, 0.0, whole=False, core_side=False, faces=())
        finite = height[np.isfinite(height)]
        return Disc(
            low=float(finite.min()),
            high=float(finite.max()),
            slope=float(self.slope[met].max()),
            whole=len(met) == len(triangle),
            core_side=bool(self.view.core_side[met].all()),
            faces=tuple(int(f) for f in np.unique(self.view.mesh.face[met])),
            aside=aside,
        )

    def exact_room(self, place: np.ndarray) -> float:
        """Return the distance of one place from the border of the pushable area [mm]."""
        a, b = self.border[:, 0], self.border[:, 1]
        along = b - a
        share = ((place - a) * along).sum(axis=1) / np.maximum((along * along).sum(axis=1), 1e-18)
        nearest = a + np.clip(share, 0.0, 1.0)[:, None] * along
        return float(np.linalg.norm(nearest - place, axis=1).min()) if len(a) else 0.0
