"""Choice of the pull: the direction along which the part leaves the mold with least in the way."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer
from moldgen.model.part import Vector
from moldgen.release.candidates import PartFrame, part_frame, pull_axes, same_axis
from moldgen.release.hollow import Hull, convex_hull, hollows
from moldgen.release.outline import unevenness
from moldgen.release.reach import WALL_SINE, Samples, surface_samples, trapped_points, trapped_room
from moldgen.release.side_estimate import SideEstimate, estimate_sides
from moldgen.release.sphere import free_directions

SAMPLES, FINE_SAMPLES, ROUGH_SAMPLES = 12000, 2500, 1000
"""Points of the surface that are asked whether steel can reach them: of the few best directions, of those that the
search refines, and of all others."""

FINALISTS, LISTED = 12, 8
"""Directions that are looked at closely, and of these the distinct ones that are returned. Our choice."""

ALIKE = 0.9986
"""Cosine (3 deg) from which the worse of two directions is not listed."""

LOPSIDED = 0.02
"""Relative difference of the hollows of both sides from which it decides which way up the part lies."""

TRAPPED_WEIGHT, LEVEL_WEIGHT, DEPTH_WEIGHT, SHADOW_WEIGHT = 1.0, 0.1, 0.02, 0.01
"""What a trapped share of the surface, an uneven parting line (share of the diagonal), depth (share of the diagonal)
and projected area (share of the surface) cost. Our choice: trapped surface needs slides and decides, an uneven parting
line costs steel, depth and clamp force only break ties."""

SIDE_WEIGHT, UNRELEASED_WEIGHT, ROOM_WEIGHT = 0.05, 3.0, 1.0
"""What each side action costs, the share of the surface that no side action releases, besides being trapped, and the
trapped room as a share of the part's volume. Our choice: one slide is worth a twentieth of the surface. Were slides
merely counted, a tub with windows in three sides would be laid on its side with its whole inside for a slide."""

ASKEW, NOT_DRAWN = 0.02, 0.01
"""What it costs that none of the surface is square or parallel to the direction, and that no feature of the part points
along it at all. Our choice: a direction between the part's own ones must free a hundredth of the surface more."""


@dataclass(frozen=True)
class PullCandidate:
    """One direction that was tried, in part coordinates; the cavity half leaves along it.

    source : where the direction comes from ("axis z", "flat face", "axis of round faces", "principal axis",
        "along flat walls", "search")
    score : lower is better
    trapped_mm2 : area that no steel moving along the pull can reach, and its share of the surface
    unevenness_mm : mean distance of the outline from the best level parting plane
    depth_mm : extent of the part along the pull
    projected_mm2 : area seen along the pull, undercuts counted twice
    core_hollow_mm3, cavity_hollow_mm3 : room inside the convex hull that is open to the core and to the cavity side
    why : the reasons in words
    level_mm : coordinate along `direction` of the level plane that suits the outline best
    trapped_mm3 : room that no steel moving along the pull can leave, an estimate
    side_actions : how many side actions it seems to need, an estimate
    side_ways : the ways in which they would leave, unit vectors square to the pull
    unreleased_mm2 : area that no straight way square to the pull seems to free
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
    level_mm: float = 0.0
    trapped_mm3: float = 0.0
    side_actions: int = 0
    side_ways: tuple[Vector, ...] = ()
    unreleased_mm2: float = 0.0


@dataclass(frozen=True)
class _Figures:
    axis: np.ndarray
    source: str
    score: float
    trapped: np.ndarray
    uneven: float
    level: float
    depth: float
    projected: float
    room: float = 0.0
    sides: SideEstimate | None = None

    @property
    def share(self) -> float:
        return float(self.trapped.mean())


@dataclass(frozen=True)
class _Scene:
    """What every direction is asked about."""

    part: Body
    volume: float
    frame: PartFrame
    hull: Hull
    tracer: Tracer
    samples: Samples
    rough: Samples


def search_pull(part: Body, *, axes_only: bool = False) -> tuple[PullCandidate, ...]:
    """Return the distinct directions worth trying, best first, each with the hollow side of the part to the core.

    Directions that the part itself suggests are tried, and the best that a search over the whole half-sphere finds
    between them. All but the axes of coordinates turn with the part.

    Parameters
    ----------
    part : the part in its own coordinates
    axes_only : try x, y and z only

    Raises
    ------
    KernelError : the part cannot be meshed
    """
    frame = part_frame(part)
    tracer = Tracer(part.mesh)
    samples, rough = surface_samples(part, tracer, SAMPLES), surface_samples(part, tracer, ROUGH_SAMPLES)
    hull, volume = convex_hull(part, frame.rows), part.mesh.volume()
    scene = _Scene(part, volume, frame, hull, tracer, samples, rough)
    proposed = pull_axes(frame, axes_only=axes_only)
    if not axes_only:
        fine = surface_samples(part, tracer, FINE_SAMPLES)
        proposed += [("search", axis) for axis in free_directions(tracer, rough, fine, frame)]
    first = sorted((_figures(scene, rough, way) for way in proposed), key=_rank)[:FINALISTS]
    close = sorted((_figures(scene, samples, (f.source, f.axis)) for f in first), key=_rank)
    best = sorted((_with_sides(scene, f) for f in _distinct(close)), key=_rank)
    return tuple(_candidate(scene, f, best[0]) for f in best)


def _rank(figures: _Figures) -> float:
    return round(figures.score, 6)  # sorting is stable: equal scores keep the order in which they were proposed


def _distinct(figures: list[_Figures]) -> list[_Figures]:
    kept: list[_Figures] = []
    for one in figures:
        if all(not same_axis(one.axis, other.axis, ALIKE) for other in kept):
            kept.append(one)
    return kept[:LISTED]


def _figures(scene: _Scene, samples: Samples, way: tuple[str, np.ndarray]) -> _Figures:
    source, axis = way
    part, corners = scene.part, scene.hull.corners
    trapped = trapped_points(scene.tracer, samples, axis)
    depth = float(np.ptp(corners @ axis))
    uneven, level = unevenness(corners, axis, scene.frame.across(axis), part.diagonal)
    sine = np.abs(scene.samples.normals @ axis)
    square = float(((sine < WALL_SINE) | (sine > 1.0 - 0.5 * WALL_SINE**2)).mean())
    area = samples.area_mm2
    projected = 0.5 * float(sine.mean()) * area
    score = (
        TRAPPED_WEIGHT * float(trapped.mean())
        + LEVEL_WEIGHT * uneven / part.diagonal
        + DEPTH_WEIGHT * depth / part.diagonal
        + SHADOW_WEIGHT * projected / area
        + ASKEW * (1.0 - square)
        + (NOT_DRAWN if source == "search" else 0.0)
    )
    return _Figures(axis, source, score, trapped, uneven, level, depth, projected)


def _with_sides(scene: _Scene, figures: _Figures) -> _Figures:
    pull = (figures.axis, figures.trapped)
    sides = estimate_sides(scene.part, scene.frame, scene.tracer, scene.samples, pull)
    left = sides.unreleased_mm2 / scene.samples.area_mm2
    room = trapped_room(scene.part, scene.tracer, scene.samples, figures.axis)
    cost = SIDE_WEIGHT * len(sides.directions) + UNRELEASED_WEIGHT * left + ROOM_WEIGHT * room / scene.volume
    return replace(figures, sides=sides, room=room, score=figures.score + cost)


def _candidate(scene: _Scene, figures: _Figures, best: _Figures) -> PullCandidate:
    """Turn the axis so that the hollow side faces the core, and put the reasons into words."""
    axis, sides = figures.axis, figures.sides
    assert sides is not None  # noqa: S101 - `_with_sides` made them
    across = scene.frame.across(axis)
    up, down = hollows(scene.part, scene.hull, scene.tracer, np.vstack([across, axis]))
    clear = abs(up - down) > LOPSIDED * max(up, down, scene.part.diagonal**3 * 1e-4)
    turned = up > down if clear else _stands_on_its_head(scene, axis)
    core, cavity = (up, down) if turned else (down, up)
    return PullCandidate(
        direction=_vector(-axis if turned else axis),
        source=figures.source,
        score=figures.score,
        trapped_mm2=figures.share * scene.samples.area_mm2,
        trapped_share=figures.share,
        unevenness_mm=figures.uneven,
        depth_mm=figures.depth,
        projected_mm2=figures.projected,
        core_hollow_mm3=core,
        cavity_hollow_mm3=cavity,
        why=_why(figures, sides, best, (core, cavity) if clear else None),
        level_mm=-figures.level if turned else figures.level,
        trapped_mm3=figures.room,
        side_actions=len(sides.directions),
        side_ways=tuple(_vector(way) for way in sides.directions),
        unreleased_mm2=sides.unreleased_mm2,
    )


def _stands_on_its_head(scene: _Scene, axis: np.ndarray) -> bool:
    """Return whether more of the surface lies towards +axis, of a part that is no hollower on one side.

    The wide side of a part faces the core, where ejector pins leave their marks; even parts follow the coordinates.
    """
    height = scene.samples.points @ axis
    share = (height.mean() - height.min()) / max(float(np.ptp(height)), 1e-9)
    if abs(share - 0.5) > LOPSIDED:
        return bool(share > 0.5)
    return bool(axis[int(np.argmax(np.round(np.abs(axis), 9)))] < 0.0)


def _vector(axis: np.ndarray) -> Vector:
    x, y, z = (round(float(c), 12) + 0.0 for c in axis)
    return (x, y, z)


def _why(figures: _Figures, sides: SideEstimate, best: _Figures, rooms: tuple[float, float] | None) -> str:
    trapped = (
        f"{100.0 * figures.share:.2g} % of the surface is out of reach along it"
        if figures.share > 0.0
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
        else "neither side is more hollow than the other, so the wider one faces the core"
    )
    lead = "" if figures is best else f"costs {figures.score - best.score:.2g} more than the best: "
    return f"{lead}{trapped}{_sides_text(figures, sides)}; {line}; {figures.depth:.3g} mm deep; {side}"


def _sides_text(figures: _Figures, sides: SideEstimate) -> str:
    if figures.share == 0.0:
        return ""
    count = len(sides.directions)
    words = f", which {count} side action{'s' if count != 1 else ''} would reach" if count else ""
    if not sides.places:
        words = ", too little for a side action"
    if sides.unreleased_mm2 > 0.0:
        words += f"{' but for' if count else ', and'} {sides.unreleased_mm2:.3g} mm2"
        words += " that no straight way square to it frees"
    return words + " (estimate)"
