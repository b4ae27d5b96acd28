"""Choice of the pull: the direction along which the part leaves the mold with least in the way."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.tracer import Tracer
from moldgen.model.part import Vector
from moldgen.release.candidates import pull_axes
from moldgen.release.hollow import Hull, convex_hull, hollows

SAMPLES = 6000
"""Points of the surface that are asked whether steel can reach them."""

WALL_SINE = 0.0087
"""|n.d| below which a point lies on a wall that either half can form (half a degree)."""

LOPSIDED = 0.02
"""Relative difference of the hollows of both sides from which it decides which way up the part lies."""

OUTLINE_WAYS = 90
"""Directions in which the outline of the part is looked at for the height of its parting line."""

TRAPPED_WEIGHT, LEVEL_WEIGHT, DEPTH_WEIGHT, SHADOW_WEIGHT = 1.0, 0.05, 0.02, 0.01
"""What a trapped share of the surface, an uneven parting line (share of the diagonal), depth (share of the diagonal)
and projected area (share of the surface) cost. Our choice: trapped surface needs slides and decides, an uneven parting
line costs steel, depth and clamp force only break ties."""


@dataclass(frozen=True)
class PullCandidate:
    """One direction that was tried, in part coordinates; the cavity half leaves along it.

    source : where the direction comes from ("axis z", "principal axis", "flat face")
    score : lower is better
    trapped_mm2 : area that no steel moving along the pull can reach, and its share of the surface
    unevenness_mm : mean distance of the outline from the best level parting plane
    depth_mm : extent of the part along the pull
    projected_mm2 : area seen along the pull, undercuts counted twice
    core_hollow_mm3, cavity_hollow_mm3 : room inside the convex hull that is open to the core and to the cavity side
    why : the reasons in words
    """

    direction: Vector
    source: str
    score: float
    trapped_mm2: float
    trapped_share: float
    unevenness_mm: float
    depth_mm: float
    projected_mm2: float
    core_hollow_mm3: float
    cavity_hollow_mm3: float
    why: str


@dataclass(frozen=True)
class _Figures:
    axis: np.ndarray
    source: str
    score: float
    trapped: float
    share: float
    uneven: float
    depth: float
    projected: float


def search_pull(part: Body, *, axes_only: bool = False) -> tuple[PullCandidate, ...]:
    """Return the directions worth trying, best first, each turned so that the hollow side of the part faces the core.

    Parameters
    ----------
    part : the part in its own coordinates
    axes_only : try x, y and z only; else also the principal axes and the normals of the largest flat faces
    """
    points, normals, area = _surface_points(part.mesh, part.triangle_areas)
    off = 0.02 + 1e-4 * part.diagonal
    tracer, hull = Tracer(part.mesh), convex_hull(part)
    found = []
    for source, axis in pull_axes(part, axes_only=axes_only):
        reach = _trapped_share(tracer, points + off * normals, normals, axis)
        found.append(_figures(part, hull, source, axis, (reach, area)))
    found.sort(key=lambda f: round(f.score, 9))  # stable: equal scores keep the order in which they were proposed
    best = found[0]
    return tuple(_candidate(part, hull, tracer, f, best) for f in found)


def _surface_points(mesh: SurfaceMesh, areas: np.ndarray) -> tuple[np.ndarray, np.ndarray, float]:
    """Return points spread over the surface, each for the same area, their unit normals, and the area in all."""
    total = np.cumsum(areas)
    place = (np.arange(SAMPLES) + 0.5) * (total[-1] / SAMPLES)
    triangle = np.searchsorted(total, place)
    turn = np.arange(1, SAMPLES + 1)
    u, v = (0.5 + 0.7548776662466927 * turn) % 1.0, (0.5 + 0.5698402909980532 * turn) % 1.0
    fold = u + v > 1.0
    u, v = np.where(fold, 1.0 - u, u)[:, None], np.where(fold, 1.0 - v, v)[:, None]
    corners = mesh.corners[triangle]
    points = corners[:, 0] + u * (corners[:, 1] - corners[:, 0]) + v * (corners[:, 2] - corners[:, 0])
    normals = mesh.normals[triangle]
    normals = normals / np.maximum(np.linalg.norm(normals, axis=1), 1e-30)[:, None]
    return points, normals, float(total[-1])


def _trapped_share(tracer: Tracer, points: np.ndarray, normals: np.ndarray, axis: np.ndarray) -> float:
    """Return the share of points that cannot be left along +axis or -axis, whichever way they look."""
    sine = normals @ axis
    trapped = np.ones(len(points), dtype=bool)
    for sign in (1.0, -1.0):
        asked = np.flatnonzero(sign * sine > -WALL_SINE)
        asked = asked[trapped[asked]]
        trapped[asked] = tracer.blocked(points[asked], sign * axis)
    return float(trapped.mean())


def _figures(part: Body, hull: Hull, source: str, axis: np.ndarray, reach: tuple[float, float]) -> _Figures:
    share, area = reach
    height = hull.corners @ axis
    depth = float(np.ptp(height))
    uneven = _unevenness(hull.corners, axis, height, part.diagonal)
    corners = part.mesh.corners
    facet = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    projected = 0.25 * float(np.abs(facet @ axis).sum())
    score = (
        TRAPPED_WEIGHT * share
        + LEVEL_WEIGHT * uneven / part.diagonal
        + DEPTH_WEIGHT * depth / part.diagonal
        + SHADOW_WEIGHT * projected / area
    )
    return _Figures(axis, source, score, share * area, share, uneven, depth, projected)


def _unevenness(vertices: np.ndarray, axis: np.ndarray, height: np.ndarray, diagonal: float) -> float:
    """Return the mean distance [mm] of the outline from the level plane that suits it best.

    In each direction square to the axis the outermost vertices leave the parting line a range of heights; a plane
    inside the range costs nothing there.
    """
    across = np.cross(axis, np.eye(3)[np.argmin(np.abs(axis))])
    across /= np.linalg.norm(across)
    angle = np.arange(OUTLINE_WAYS) * (2.0 * np.pi / OUTLINE_WAYS)
    ways = np.outer(np.cos(angle), across) + np.outer(np.sin(angle), np.cross(axis, across))
    reach = vertices @ ways.T
    outer = reach > reach.max(axis=0) - 1e-3 * diagonal
    low = np.where(outer, height[:, None], np.inf).min(axis=0)
    high = np.where(outer, height[:, None], -np.inf).max(axis=0)
    levels = np.unique(np.round(np.concatenate([low, high]), 6))
    miss = np.maximum(low - levels[:, None], 0.0) + np.maximum(levels[:, None] - high, 0.0)
    return float(miss.mean(axis=1).min())


def _candidate(part: Body, hull: Hull, tracer: Tracer, figures: _Figures, best: _Figures) -> PullCandidate:
    """Turn the axis so that the hollow side faces the core, and put the reasons into words."""
    up, down = hollows(part, hull, tracer, figures.axis)
    clear = abs(up - down) > LOPSIDED * max(up, down, part.diagonal**3 * 1e-4)
    turned = clear and up > down
    axis = -figures.axis if turned else figures.axis
    core, cavity = (up, down) if turned else (down, up)
    x, y, z = (round(float(c), 12) + 0.0 for c in axis)
    return PullCandidate(
        (x, y, z),
        figures.source,
        figures.score,
        figures.trapped,
        figures.share,
        figures.uneven,
        figures.depth,
        figures.projected,
        core,
        cavity,
        _why(figures, best, (core, cavity) if clear else None),
    )


def _why(figures: _Figures, best: _Figures, rooms: tuple[float, float] | None) -> str:
    trapped = (
        f"{100.0 * figures.share:.2g} % of the surface is out of reach along it"
        if figures.trapped > 0.0
        else "no surface is out of reach along it"
    )
    line = (
        "its outline lies in one plane"
        if figures.uneven < 0.01
        else f"its outline leaves the best plane by {figures.uneven:.2g} mm on average"
    )
    side = (
        f"the hollow side ({rooms[0]:.3g} mm3 against {rooms[1]:.3g} mm3) faces the core, so that the part stays on it"
        if rooms
        else "neither side is more hollow than the other, so the cavity is where the axis points"
    )
    lead = "" if figures is best else f"costs {figures.score - best.score:.2g} more than the best: "
    return f"{lead}{trapped}; {line}; {figures.depth:.3g} mm deep; {side}"
