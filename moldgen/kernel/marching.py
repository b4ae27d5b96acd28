"""Level curves of a face's slope where no closed form exists: walked through the face's own triangles, then made exact.

The triangulation only proposes which triangles the curve crosses, so the topology is settled before any iteration;
every point is then found on the surface itself.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.Geom2d import Geom2d_Curve
from OCP.Geom2dAPI import Geom2dAPI_Interpolate
from OCP.gp import gp_Pnt2d
from OCP.TColgp import TColgp_HArray1OfPnt2d
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS_Face

from moldgen.kernel.slope import Slope
from moldgen.tolerances import SHORT_EDGE

CURVE_ERROR = 2e-4
"""Distance [mm] from the true curve that is accepted between the exact points of a spline."""

MOST_POINTS = 200
"""Points of one curve at most."""

OVERSHOOT = 0.1
"""How far [mm] a curve runs past the mesh of its face, which may lie this much inside the true boundary."""


class Chain(NamedTuple):
    """A level curve as the triangles of a face see it.

    points : (k, 2) roots of the slope on the sides of the triangles, in surface parameters; a ring repeats its first
    closed : whether it is a ring
    ends : the two mesh nodes (counted from 0) of the side on which the chain begins, and of that on which it ends
    """

    points: np.ndarray
    closed: bool
    ends: tuple[tuple[int, int], tuple[int, int]]


def level_curves(face: TopoDS_Face, slope: Slope) -> list[Geom2d_Curve]:
    """Return the curves n.d = sine of a tessellated face in the parameters of its surface.

    They reach the boundary of the face or run a little past it; clipping is the caller's.
    """
    curves = []
    for chain in level_chains(face, slope):
        points = _exact(slope, chain.points, chain.closed)
        if points is not None:
            curves.append(interpolated(points, chain.closed))
    return curves


def curve_through(slope: Slope, points: np.ndarray, closed: bool) -> np.ndarray | None:
    """Return exact points of the level curve along a chain whose two ends stay where they are, None if too short.

    points : (k, 2) in surface parameters
    """
    return _exact(slope, points, closed, lead=False)


def level_chains(face: TopoDS_Face, slope: Slope) -> list[Chain]:
    """Return the chains of mesh sides that the level curves of a tessellated face cross."""
    mesh = BRep_Tool.Triangulation_s(face, TopLoc_Location())
    if mesh is None or not mesh.HasUVNodes():
        return []
    uv = np.array([mesh.UVNode(i).Coord() for i in range(1, mesh.NbNodes() + 1)])
    triangles = np.array([mesh.Triangle(i).Get() for i in range(1, mesh.NbTriangles() + 1)]) - 1
    value = np.array([slope(u, v) for u, v in uv])
    above = value > -1e-7  # a vertical stretch belongs to the upper side, so that its lower end is the curve
    ends = np.stack([triangles, np.roll(triangles, -1, axis=1)], axis=2)
    crossed = above[ends[:, :, 0]] != above[ends[:, :, 1]]
    keys = np.sort(ends, axis=2) @ np.array([len(uv), 1])
    links: dict[int, list[int]] = {}
    for triangle in np.flatnonzero(crossed.any(axis=1)):
        one, other = keys[triangle][crossed[triangle]]
        links.setdefault(int(one), []).append(int(other))
        links.setdefault(int(other), []).append(int(one))
    return [_rooted(slope, uv, chain) for chain in _walk(links)]


def _walk(links: dict[int, list[int]]) -> list[list[int]]:
    """Return the chains of a graph whose nodes have one or two neighbours; a ring repeats its first node."""
    chains, seen = [], set()
    order = sorted(links, key=lambda k: (len(links[k]) != 1, k))
    for start in order:
        if start in seen:
            continue
        chain = [start]
        seen.add(start)
        while True:
            onward = [k for k in links[chain[-1]] if k not in seen]
            if not onward:
                break
            chain.append(onward[0])
            seen.add(onward[0])
        if len(links[start]) == 2 and len(chain) > 2:
            chain.append(start)
        chains.append(chain)
    return chains


def _rooted(slope: Slope, uv: np.ndarray, chain: list[int]) -> Chain:
    points = []
    for key in chain:
        one, other = uv[key // len(uv)], uv[key % len(uv)]
        points.append(one + slope.along(one, other) * (other - one))
    ends = tuple((key // len(uv), key % len(uv)) for key in (chain[0], chain[-1]))
    return Chain(np.array(points), len(chain) > 2 and chain[0] == chain[-1], (ends[0], ends[1]))


def _exact(slope: Slope, chain: np.ndarray, closed: bool, lead: bool = True) -> np.ndarray | None:
    """Return points on the curve dense enough for a spline through them to keep to it, or None if it is too short."""
    scale = _scale(slope, chain)
    chain = chain / scale
    length = float(np.linalg.norm(np.diff(chain, axis=0), axis=1).sum())
    if length < SHORT_EDGE:
        return None
    if lead and not closed:
        chain = _extended(slope, chain, scale)
    count = max(5, min(MOST_POINTS, int(np.ceil(length / max(length / 12.0, 0.05))) + 1))
    last = np.inf
    while True:
        points = _resampled(slope, chain, scale, count)
        error = _strays(slope, points, closed, scale)
        # an end that was moved onto a vertex strays however many points there are
        if count >= MOST_POINTS or error < CURVE_ERROR or (not lead and error > 0.8 * last):
            return points
        last, count = error, min(MOST_POINTS, 2 * count - 1)


def _scale(slope: Slope, chain: np.ndarray) -> np.ndarray:
    """Return the parameter steps that make about 1 mm on the surface near the middle of the chain, (2,)."""
    u, v = chain[len(chain) // 2]
    slope(u, v)
    low_u, high_u, low_v, high_v = slope.bounds
    step = np.array([high_u - low_u, high_v - low_v]) * 1e-4
    here = slope.point(u, v)
    moved = [slope.point(u + step[0], v) - here, slope.point(u, v + step[1]) - here]
    size = np.maximum([np.linalg.norm(m) for m in moved], 1e-9 * np.abs(step).max() + 1e-12)
    return np.asarray(step / size)


def _extended(slope: Slope, chain: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """Lead both ends of a chain past the mesh, but not past a seam or the end of the surface."""
    low, high = (np.array(corner) / scale for corner in slope.room())
    for _ in range(2):
        chain = chain[::-1]
        behind = chain[-1] - chain[max(0, len(chain) - 3)]
        size = float(np.linalg.norm(behind))
        if size < 1e-12:
            continue
        way = behind / size
        left = np.where(way > 0.0, high - chain[-1], chain[-1] - low) / np.maximum(np.abs(way), 1e-12)
        step = min(OVERSHOOT, float(left.min()))
        if step < 1e-6:
            continue
        ahead = _corrected(slope, chain[-1] + step * way, way, scale)
        if ahead is not None:
            chain = np.vstack([chain, np.clip(ahead, low, high)])
    return chain


def _resampled(slope: Slope, chain: np.ndarray, scale: np.ndarray, count: int) -> np.ndarray:
    """Return `count` exact points spread evenly along a chain, in surface parameters."""
    steps = np.linalg.norm(np.diff(chain, axis=0), axis=1)
    along = np.append(0.0, np.cumsum(steps))
    wanted = np.linspace(0.0, along[-1], count)
    place = np.clip(np.searchsorted(along, wanted, side="right") - 1, 0, len(steps) - 1)
    share = (wanted - along[place]) / np.maximum(steps[place], 1e-12)
    guess = chain[place] + share[:, None] * (chain[place + 1] - chain[place])
    tangent = np.gradient(guess, axis=0)
    tangent /= np.maximum(np.linalg.norm(tangent, axis=1), 1e-12)[:, None]
    points = [chain[0]]
    for start, way in zip(guess[1:-1], tangent[1:-1], strict=True):
        found = _corrected(slope, start, way, scale)
        if found is not None:
            points.append(found)
    points.append(chain[-1])
    return np.asarray(np.multiply(points, scale))


def _corrected(slope: Slope, start: np.ndarray, way: np.ndarray, scale: np.ndarray) -> np.ndarray | None:
    """Return the root nearest to a guess across the direction of the curve, or None if the secants do not settle."""
    u, v = start * scale
    du, dv = -way[1] * scale[0], way[0] * scale[1]
    moved, last, value = 0.0, 1e-5, slope(u, v)
    before = slope(u + last * du, v + last * dv)
    for _ in range(30):
        if abs(value) < 1e-14 or value == before:
            break
        move = value * (last - moved) / (value - before)
        last, before = moved, value
        moved += max(-0.2, min(0.2, move))
        value = slope(u + moved * du, v + moved * dv)
    if abs(value) > 1e-10 or abs(moved) > 1.0:
        return None
    return np.array([start[0] - moved * way[1], start[1] + moved * way[0]])


def _strays(slope: Slope, points: np.ndarray, closed: bool, scale: np.ndarray) -> float:
    """Return the largest distance [mm] of the spline through the points from the curve, half way between them."""
    if len(points) < 3:
        return 0.0
    curve = interpolated(points, closed)
    knots = np.array([curve.Knot(i) for i in range(1, curve.NbKnots() + 1)])
    worst, step = 0.0, 1e-4
    for t in 0.5 * (knots[1:] + knots[:-1]):
        u, v = curve.Value(float(t)).Coord()
        value = slope(u, v)
        if abs(value) > 1e-9:
            rise = math.hypot(slope(u + step * scale[0], v) - value, slope(u, v + step * scale[1]) - value) / step
            worst = max(worst, abs(value) / max(rise, 1e-9))
    return worst


def interpolated(points: np.ndarray, closed: bool) -> Geom2d_Curve:
    """Return the spline through points in surface parameters, (k, 2); of a ring the first is repeated as the last."""
    kept = points[:-1] if closed else points
    array = TColgp_HArray1OfPnt2d(1, len(kept))
    for number, (u, v) in enumerate(kept, start=1):
        array.SetValue(number, gp_Pnt2d(float(u), float(v)))
    spline = Geom2dAPI_Interpolate(array, closed, 1e-12)
    spline.Perform()
    return spline.Curve()
