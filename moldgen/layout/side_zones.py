"""The ways of slides and lifters as upright prisms: convex outlines in plan between two heights. Mold frame, mm."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np
from scipy.spatial import ConvexHull

from moldgen.kernel.polygon import signed_area
from moldgen.layout.side_drive import is_level
from moldgen.model.halves import Halves
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import AngledPinLayout, LifterLayout, SideLayout, SlideBody
from moldgen.rules.side_practice import (
    LEDGE_COVER,
    LEDGE_HEIGHT,
    LEDGE_WIDTH,
    LIFTER_CLEARANCE,
    LOCKING_HEIGHT,
    SLIDE_LAND,
    SLIDE_SHOULDER,
)

BANDS: Final = 8
"""Heights into which an outline is cut, so that a step or a slope in it counts only where it is."""

ALIKE: Final = 0.05
"""mm: bands whose widths differ by less are one."""

TOUCH: Final = 1e-6
"""mm: heights that differ by less are one."""

STRETCH: Final = 4.0
"""mm: length into which a prism that is neither level nor upright is cut; each stretch is taken as its hull in plan."""

ROUND: Final = 16
"""Corners of the polygon round an angled pin."""

UNDER_BLOCK: Final = 80.0
"""mm: how far under the block lifters are followed, down to the ejector plate."""


@dataclass(frozen=True)
class Zone:
    """What one side action sweeps. plan : convex outline, counterclockwise, (k, 2) [mm]; low, high : heights [mm]."""

    name: str
    kind: SideKind
    plan: np.ndarray
    low: float
    high: float


def side_zones(halves: Halves, sides: SideLayout | None) -> tuple[Zone, ...]:
    """Return the zones of all side actions.

    sides : bodies, angled pins and lifters of the layout; None: bodies as wide and as tall as the rules make them
    """
    low, high = np.asarray(halves.low, float), np.asarray(halves.high, float)
    far = 2.0 * float(np.linalg.norm(high - low)) + max((s.front.travel for s in halves.sides), default=0.0)
    lifters = {one.name: one for one in (() if sides is None else sides.lifters)}
    zones: list[Zone] = []
    for side in halves.sides:
        front = side.front
        if front.kind is SideKind.LIFTER:
            zones += _lifter(side.name, front, low, lifters.get(side.name))
        elif is_level(front):
            zones += _level_front(side.name, front, far)
            if sides is None:
                zones.append(_usual_body(side.name, front, halves, far))
        else:
            zones += _stretches(side.name, front, front.near, front.near + far, np.zeros(2))
    for slide in () if sides is None else sides.slides:
        if slide.body is not None:
            zones.append(_body(slide.name, slide.axis, slide.body, far))
        for pin in slide.pins:
            zones += _angled_pin(pin)
    return tuple(zones)


def outer_polygons(front: Front) -> list[np.ndarray]:
    """Return the polygons of an outline that are no holes."""
    return [np.asarray(polygon, float) for polygon in front.outline if signed_area(polygon) > 0.0]


def _level_front(name: str, front: Front, far: float) -> list[Zone]:
    """Return a level prism from its near end outward without end, band by band."""
    zones: list[Zone] = []
    for polygon in outer_polygons(front):
        edges = np.linspace(polygon[:, 1].min(), polygon[:, 1].max(), BANDS + 1)
        # a step that lies in the border of two bands belongs to the one that it widens
        bands = [(*_width(polygon, a + TOUCH, b - TOUCH), a, b) for a, b in pairwise(edges)]
        joined = [bands[0]]
        for left, right, low, high in bands[1:]:
            last = joined[-1]
            if abs(last[0] - left) < ALIKE and abs(last[1] - right) < ALIKE:
                joined[-1] = (min(last[0], left), max(last[1], right), last[2], high)
            else:
                joined.append((left, right, low, high))
        for left, right, low, high in joined:
            plan = _strip(front.axis, left, right, front.near, front.near + far)
            zones.append(Zone(name, front.kind, plan, float(low), float(high)))
    return zones


def _width(polygon: np.ndarray, low: float, high: float) -> tuple[float, float]:
    """Return the extent along x of the part of a polygon (k, 2) between two y."""
    start, end = polygon, np.roll(polygon, -1, axis=0)
    rise = end[:, 1] - start[:, 1]
    found = [polygon[(polygon[:, 1] >= low) & (polygon[:, 1] <= high), 0]]
    for level in (low, high):
        over = (start[:, 1] - level) * (end[:, 1] - level) <= 0.0
        cut = over & (np.abs(rise) > 1e-12)
        found.append(start[cut, 0] + (level - start[cut, 1]) / rise[cut] * (end[cut, 0] - start[cut, 0]))
    x = np.concatenate(found)
    return float(x.min()), float(x.max())


def _strip(axis: tuple[float, float, float], left: float, right: float, near: float, far: float) -> np.ndarray:
    """Return a rectangle in the frame across a level axis as its corners in plan, (4, 2)."""
    frame = across(axis)
    corners = [(left, near), (left, far), (right, far), (right, near)]
    return _hull(np.array([u * frame[0][:2] + s * frame[2][:2] for u, s in corners]))


def _usual_body(name: str, front: Front, halves: Halves, far: float) -> Zone:
    """Return the body that a slide will get by the rules, when its layout is not known: outside of the part."""
    points = np.vstack(outer_polygons(front))
    side = SLIDE_SHOULDER.default + LEDGE_WIDTH.default
    left, right = float(points[:, 0].min()) - side, float(points[:, 0].max()) + side
    low = min(
        float(points[:, 1].min()) - SLIDE_SHOULDER.default,
        halves.level - LEDGE_COVER.default - LEDGE_HEIGHT.default,
    )
    high = max(float(points[:, 1].max()) + SLIDE_SHOULDER.default, halves.level + LOCKING_HEIGHT.default)
    frame, body = across(front.axis), halves.body
    corners = body.mesh.vertices @ frame.T
    beside = (corners[:, 0] > left) & (corners[:, 0] < right) & (corners[:, 1] > low) & (corners[:, 1] < high)
    reach = max(front.clear, float(corners[beside, 2].max()) if beside.any() else -math.inf)
    start = reach + SLIDE_LAND.default
    return Zone(name, front.kind, _strip(front.axis, left, right, start, start + far), low, high)


def _body(name: str, axis: tuple[float, float, float], body: SlideBody, far: float) -> Zone:
    left, right = body.left - body.ledge_width, body.right + body.ledge_width
    return Zone(name, SideKind.SLIDE, _strip(axis, left, right, body.start, body.start + far), body.bottom, body.top)


def _lifter(name: str, front: Front, low: np.ndarray, lifter: LifterLayout | None) -> list[Zone]:
    """Return a lifter's shaft down to the ejector plate, moved sideways as far as it goes over the stroke.

    An ejector pin goes straight up with the same plate, so that the lifter moves past it by that way at every height.
    """
    travel = front.travel + LIFTER_CLEARANCE.default if lifter is None else max(lifter.travel, front.travel)
    points = np.vstack(outer_polygons(front)) @ across(front.axis)[:2]
    down = max(-front.axis[2], 1e-3)
    far = (float(points[:, 2].max()) - float(low[2]) + UNDER_BLOCK) / down
    sideways = travel * np.asarray(front.release[:2], float)
    return _stretches(name, front, front.near, max(far, front.far), sideways)


def _stretches(name: str, front: Front, near: float, far: float, sideways: np.ndarray) -> list[Zone]:
    """Return a prism along any axis stretch by stretch, each moved by `sideways` (2,) as well."""
    frame = across(front.axis)
    count = max(math.ceil((far - near) / STRETCH), 1)
    # an upright prism is one stretch: its outline in plan is the same everywhere
    ends = np.array([near, far]) if abs(front.axis[2]) > 1.0 - 1e-9 else np.linspace(near, far, count + 1)
    zones = []
    for polygon in outer_polygons(front):
        ring = polygon @ frame[:2]
        for start, end in pairwise(ends):
            both = np.vstack([ring + start * frame[2], ring + end * frame[2]])
            plan = _hull(np.vstack([both[:, :2], both[:, :2] + sideways]))
            zones.append(Zone(name, front.kind, plan, float(both[:, 2].min()), float(both[:, 2].max())))
    return zones


def _angled_pin(pin: AngledPinLayout) -> list[Zone]:
    """Return an angled pin and its head in the cavity half."""
    turn = 2 * np.pi * np.arange(ROUND) / ROUND
    ring = np.column_stack([np.cos(turn), np.sin(turn)])
    lean = 1.0 / max(abs(pin.along[2]), 1e-3)  # its level section is an ellipse: the round one over it is larger
    outside = lean / math.cos(math.pi / ROUND)
    top, head = pin.top[2], pin.top[2] + pin.head_depth * pin.along[2]
    stretches = [(top, head, pin.head_diameter)]
    heights = np.linspace(top, pin.tip_z, max(math.ceil((top - pin.tip_z) / STRETCH), 1) + 1)
    stretches += [(float(a), float(b), pin.bore) for a, b in pairwise(heights)]
    zones = []
    for high, low, diameter in stretches:
        circles = [np.array(pin.at(z)) + outside * diameter / 2 * ring for z in (high, low)]
        zones.append(Zone(pin.name, SideKind.SLIDE, _hull(np.vstack(circles)), low, high))
    return zones


def _hull(points: np.ndarray) -> np.ndarray:
    return np.asarray(points[ConvexHull(points).vertices])
