"""Where pins, gates and runners must not be: the ways of slides and lifters, and the surfaces that they form."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.probe import Probe
from moldgen.layout.side_zones import Zone, side_zones
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.side_action import SideKind, across
from moldgen.model.slide import SideLayout
from moldgen.rules.layout_practice import STEEL_BETWEEN_BORES

OFF: Final = 0.05
"""mm: how far from a surface point the steel and the plastic beside it are looked for (sag of the working mesh)."""

AT_END: Final = 0.01
"""mm: heights that overlap by no more than this only touch."""

STEEL: Final = STEEL_BETWEEN_BORES.default
"""mm: steel wanted between a side action and any bore or channel: as between two bores."""


CANNOT_BE: Final = 10
"""A place in the way of a side action counts as so many broken rules: such a tool cannot be made."""


@dataclass(frozen=True)
class Nearest:
    """Distance to the nearest zone at the same height, (k,) [mm], inf without one; its name, "" without one, (k,)."""

    steel: np.ndarray
    names: tuple[str, ...]


class KeepOut:
    """The zones of all side actions of a tool; without side actions everything is free.

    sides : what the layout knows of bodies, angled pins and lifters; None: bodies as the rules make them
    """

    def __init__(self, halves: Halves, sides: SideLayout | None = None) -> None:
        self._halves = halves
        self.zones: tuple[Zone, ...] = side_zones(halves, sides) if halves.sides else ()

    @property
    def why(self) -> str:
        """What stands against a place near a zone, in words."""
        lifters = any(side.front.kind is SideKind.LIFTER for side in self._halves.sides)
        slides = any(side.front.kind is SideKind.SLIDE for side in self._halves.sides)
        return f"a {'slide or a lifter' if lifters and slides else 'lifter' if lifters else 'slide'} leaves here"

    def upright(self, places: np.ndarray, radius: float, low: np.ndarray | float, high: np.ndarray | float) -> Nearest:
        """Return the steel between upright cylinders at plan places (k, 2), between two heights, and the zones [mm]."""
        return self.channel(places, places, radius, low, high)

    def channel(
        self,
        starts: np.ndarray,
        ends: np.ndarray,
        half_width: float,
        low: np.ndarray | float,
        high: np.ndarray | float,
    ) -> Nearest:
        """Return the steel between level channels with round ends and the zones.

        Parameters
        ----------
        starts, ends : (k, 2) in plan [mm]; low, high : heights between which the channels lie, one or (k,) [mm]
        """
        lows, highs = (np.broadcast_to(np.asarray(v, float), (len(starts),)) for v in (low, high))
        least, which = np.full(len(starts), np.inf), np.full(len(starts), -1)
        for number, zone in enumerate(self.zones):
            rows = np.flatnonzero((highs > zone.low + AT_END) & (lows < zone.high - AT_END))
            if len(rows) == 0:
                continue
            gap = plan_distance(starts[rows], ends[rows], zone.plan)
            nearer = gap < least[rows]
            least[rows[nearer]], which[rows[nearer]] = gap[nearer], number
        return Nearest(least - half_width, tuple(self.zones[n].name if n >= 0 else "" for n in which))

    def forms(self, points: np.ndarray, normals: np.ndarray) -> np.ndarray:
        """Return whether a side action, not a half, meets the real part at points of the filled body's surface.

        Either the steel over the surface belongs to a front, or what lies under it is no plastic but the fill, which a
        front takes the place of.

        Parameters
        ----------
        points, normals : on the surface of the halves' body, outward, (k, 3) [mm]

        Returns
        -------
        (k,) bool
        """
        found = np.zeros(len(points), dtype=bool)
        if not self._halves.sides or len(points) == 0:
            return found
        under = points - OFF * normals
        filled = np.zeros(len(points), dtype=bool)
        for side in self._halves.sides:
            found |= in_front(side, points + OFF * normals)
            filled |= in_front(side, under)
        asked = np.flatnonzero(filled & ~found)
        found[asked] = ~self._in_plastic(under[asked])
        return found

    def _in_plastic(self, points: np.ndarray) -> np.ndarray:
        """Return whether points (k, 3) lie in the real part: the first surface over them is met from inside."""
        if len(points) == 0:
            return np.zeros(0, dtype=bool)
        up = np.array([0.0, 0.0, 1.0])
        _, triangle = self._real.first(points, up)
        return np.asarray((triangle >= 0) & (self._real_up[np.maximum(triangle, 0)] > 0.0))

    @cached_property
    def _real(self) -> Probe:
        return Probe(self._part.mesh)

    @cached_property
    def _real_up(self) -> np.ndarray:
        corners = self._part.mesh.corners
        return np.asarray(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])[:, 2])

    @cached_property
    def _part(self) -> Body:
        """The part as it is molded."""
        filled: Body = self._halves.body
        return filled if self._halves.part is None else Body(self._halves.part)


def is_side_rule(text: str) -> bool:
    """Return whether a rule about gate places is about side actions, by its words."""
    return "slide" in text or "lifter" in text


def weighed(rules: tuple[tuple[str, np.ndarray], ...]) -> np.ndarray:
    """Return the number of rules (text, broken (k,) bool) that each place breaks, (k,); see `CANNOT_BE`."""
    return np.asarray(sum(np.where(broken, CANNOT_BE if is_side_rule(text) else 1, 0) for text, broken in rules))


def in_front(side: SideSteel, points: np.ndarray) -> np.ndarray:
    """Return which points (k, 3) lie in a front's prism or beyond its far end, (k,) bool."""
    placed = points @ across(side.front.axis).T
    inside = np.zeros(len(points), dtype=bool)
    rows = np.flatnonzero(placed[:, 2] > side.front.near)
    for polygon in side.front.outline:
        low, high = polygon.min(axis=0), polygon.max(axis=0)
        near = rows[((placed[rows, :2] >= low) & (placed[rows, :2] <= high)).all(axis=1)]
        # holes are polygons too: what lies in an even number of polygons is outside
        inside[near] ^= _in_polygon(placed[near, :2], np.asarray(polygon, float))
    return inside


def _in_polygon(points: np.ndarray, polygon: np.ndarray) -> np.ndarray:
    """Return which points (k, 2) a closed polygon (n, 2) goes round, by crossings of a ray along x."""
    odd = np.zeros(len(points), dtype=bool)
    x, y = points[:, 0], points[:, 1]
    for (ax, ay), (bx, by) in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
        if ay == by:
            continue
        over = (ay > y) != (by > y)
        odd ^= over & (x < ax + (y - ay) / (by - ay) * (bx - ax))
    return odd


def plan_distance(starts: np.ndarray, ends: np.ndarray, plan: np.ndarray) -> np.ndarray:
    """Return the distance of segments (k, 2) from a convex polygon, counterclockwise, (n, 2): 0 where they meet, (k,).

    >>> square = np.array([[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]])
    >>> plan_distance(np.array([[3.0, 0.5], [-1.0, 0.5]]), np.array([[3.0, 5.0], [2.0, 0.5]]), square).tolist()
    [2.0, 0.0]
    """
    way = ends - starts
    enter, leave = np.zeros(len(starts)), np.ones(len(starts))
    least = np.full(len(starts), np.inf)
    for corner, after in zip(plan, np.roll(plan, -1, axis=0), strict=True):
        edge = after - corner
        inward = np.array([-edge[1], edge[0]])
        height, rise = (starts - corner) @ inward, way @ inward
        with np.errstate(divide="ignore", invalid="ignore"):
            at = -height / rise
        enter = np.where(rise > 0.0, np.maximum(enter, at), enter)
        leave = np.where(rise < 0.0, np.minimum(leave, at), leave)
        leave = np.where((rise == 0.0) & (height < 0.0), -1.0, leave)
        for point in (starts, ends):
            least = np.minimum(least, _to_segment(point, corner, edge))
        least = np.minimum(least, _to_segment(corner, starts, way))
    return np.asarray(np.where(enter <= leave, 0.0, least))


def _to_segment(points: np.ndarray, start: np.ndarray, way: np.ndarray) -> np.ndarray:
    """Return the distance of points from segments; one of both may be single, (k,)."""
    square = np.maximum((way * way).sum(axis=-1), 1e-18)
    share = np.clip(((points - start) * way).sum(axis=-1) / square, 0.0, 1.0)
    nearest = start + share[..., None] * way
    return np.asarray(np.linalg.norm(points - nearest, axis=-1))
