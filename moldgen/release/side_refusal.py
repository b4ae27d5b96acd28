"""Why a trapped space has no side action, in the trade's words, and the smallest change of the part that would help."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh_prism import box_of
from moldgen.model.part import Vector
from moldgen.model.side_action import Unreleased
from moldgen.release.helical import lead_of
from moldgen.release.side_choice import as_vector, shares
from moldgen.release.side_lifter import CLEARANCE
from moldgen.release.side_search import Search, Space
from moldgen.release.trapped import TrapPiece

CLOSED = 0.05
"""Share of free rays, in the best direction, under which a space counts as closed."""

SHUT_IN = 0.5
"""Share of a space's points blocked every level way, from which a ring round an axis counts as one on the inside."""

LEANING = 5.0
"""Angle [deg] up to which an undercut is a wall that leans the wrong way, for draft to cure: our choice."""

MOST_OF = 0.9
"""Share of a space's touched area that must lean no more for that."""

NEARLY = 0.6
"""Share of a space that must be free along its best direction for the rest of it to be what is told (our choice)."""

ALL_BUT_RIMS = 0.97
"""Share of free rays from which only rays at its rims are blocked, and the rest of it is no place to be told."""

OPEN_BEFORE = 0.1
"""Gap [mm] before a space along a way from which it is open that way: less is its own wall."""

THREAD = 0.25
"""Share of a space's touched area on helical faces from which it is a thread."""


@dataclass(frozen=True)
class _Reason:
    """Words in which "{at}", "{way}" and "{change_at}" stand for places and a direction; no remedy: the usual one."""

    why: str
    at: Vector | None = None
    way: Vector | None = None
    remedy: str = ""
    change_at: Vector | None = None


def refusal(search: Search, space: Space, piece: TrapPiece, body: Body) -> Unreleased:
    """Return why a space stays trapped and what would help."""
    reason = _why(search, space, piece, body)
    remedy, where = (reason.remedy, reason.change_at) if reason.remedy else _remedy(search, space, piece, body)
    return Unreleased(space.piece, reason.why, remedy, tuple(space.tried), reason.at, reason.way, where)


def _why(search: Search, space: Space, piece: TrapPiece, body: Body) -> _Reason:
    lead = _thread(piece, body)
    if lead > 0.0:
        why = f"thread of {lead:.2f} mm lead: it turns out, no straight motion releases it"
        return _Reason(why, remedy="an unscrewing core, which moldgen does not make, or cut the thread after molding")
    tracer, level = search.tracer, search.directions.level
    shut = np.stack([tracer.blocked(space.points, way) for way in level]).all(axis=0)
    if space.solid.genus() > 0 and float(shut.mean()) > SHUT_IN:
        why = "closed undercut all the way round the inside: a collapsing core would be needed"
        return _Reason(why, remedy="leave it out, or break it into hooks with a slot below each")
    ways = np.vstack([level, search.directions.inclined])
    free = shares(tracer, space.points, ways)
    best = int(np.argmax(np.round(free, 6)))
    hook = _no_lifter(search, space) if free[: len(level)].max() < NEARLY else None
    return hook or _in_the_way(search, space, ways[best], float(free[best]))


def _in_the_way(search: Search, space: Space, way: np.ndarray, free: float) -> _Reason:
    """Return what stands before a space along its best direction."""
    if free < CLOSED:
        why = "closed undercut: no straight motion releases any of it; a collapsing core or a split part is needed"
        return _Reason(why)
    hit = search.tracer.first_triangle(space.points, way)
    hit = hit[hit >= 0]
    if len(hit) == 0:
        return _Reason("hollow with a small mouth: steel that leaves it would need more room than its mouth gives")
    share = f"{100.0 * free:.0f} %"
    if free > ALL_BUT_RIMS:
        why = "rays leave it along {way}, but no outline of steel fits between the walls beside it"
        return _Reason(why, None, as_vector(way))
    if free >= NEARLY:
        middle, size = _behind(search, space, way)
        why = f"along {{way}} steel leaves {share} of it; the rest, {size} about {{at}}, is behind the part's own wall"
        remedy = f"fill or straighten these {size} about {{change_at}}, a rounding or chamfer for instance"
        return _Reason(why, middle, as_vector(way), remedy, middle)
    places = search.shared.corners[hit].mean(axis=1)
    nearest = np.argmin(np.round(np.linalg.norm(places - np.median(places, axis=0), axis=1), 6))
    why = f"the part's own wall at {{at}} stands in the way: the best direction {{way}} frees {share} of it"
    return _Reason(why, as_vector(places[nearest]), as_vector(way))


def _behind(search: Search, space: Space, way: np.ndarray) -> tuple[Vector, str]:
    """Return the middle and the size in words of what of a space lies behind plastic along a way."""
    points = space.points[search.tracer.blocked(space.points, way)]
    low, high = points.min(axis=0), points.max(axis=0)
    return as_vector(0.5 * (low + high)), " x ".join(f"{v:.1f}" for v in high - low) + " mm"


def _thread(piece: TrapPiece, body: Body) -> float:
    """Return the lead of the screw surface that a piece mostly touches [mm], 0 if there is none."""
    leads = [(lead_of(body, face), area) for face, area in piece.faces]
    helical = sum(area for lead, area in leads if lead > 0.0)
    if helical <= THREAD * max(piece.area_mm2, 1e-9):
        return 0.0
    return max(leads, key=lambda pair: (pair[0] > 0.0) * pair[1])[0]


def _no_lifter(search: Search, space: Space) -> _Reason | None:
    """Return that a hook inside leaves a lifter no room or needs a longer stroke, with the figures; None if neither."""
    found = []
    for k, way in enumerate(search.directions.level):
        gap, need = search.lifting.gap(space.points, way), float(np.ptp(space.points @ way)) + CLEARANCE
        if gap > OPEN_BEFORE:
            found.append((round(need, 4), k, gap))
    if not found:
        return None
    need, k, gap = min(found)
    way, most = search.directions.level[k], search.lifting.most
    if gap < need:
        why = f"hook without room for a lifter: along {{way}} it needs {need:.2f} mm, the wall at {{at}} leaves"
        return _Reason(f"{why} {gap:.2f} mm", search.lifting.stop(space.points, way), as_vector(way))
    if need > most:
        why = f"hook for a lifter along {{way}} by {need:.2f} mm; the ejection stroke gives at most {most:.2f} mm"
        longer = math.ceil(search.lifting.stroke * need / most)
        remedy = f"a stroke of {longer} mm (ejection.stroke), or a slot below the hook"
        return _Reason(why, None, as_vector(way), remedy)
    return None


def _remedy(search: Search, space: Space, piece: TrapPiece, body: Body) -> tuple[str, Vector | None]:
    """Return the smallest change that would help, and where it belongs."""
    angle = math.degrees(math.atan2(piece.depth_mm, max(piece.height_mm, 1e-9)))
    if angle <= LEANING and _leans(piece, body):
        return (
            f"draft: the wall reaches {piece.depth_mm:.2f} mm over {piece.height_mm:.2f} mm of height; "
            f"lean it {angle:.1f} deg the other way"
        ), None
    low, high = box_of(space.solid)
    below, above = (float(search.tracer.blocked(space.points, (0.0, 0.0, z)).mean()) for z in (-1.0, 1.0))
    side, z = ("below", low[2]) if below <= above else ("above", high[2])
    width, length = high[0] - low[0], high[1] - low[1]
    x, y = (float(v) for v in 0.5 * (low + high)[:2])
    return (
        f"a slot of {width:.1f} x {length:.1f} mm along the pull through the wall {side} it, from {{change_at}}, "
        "opens it; or move the split of the part into it"
    ), (x, y, float(z))


def _leans(piece: TrapPiece, body: Body) -> bool:
    """Return whether nearly all that a piece touches is steep: walls, and no shoulder."""
    steep = 0.0
    for face, area in piece.faces:
        own = body.mesh.face == face
        normal = body.mesh.normals[own]
        up = np.abs(normal[:, 2]) / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)
        walls = up <= math.sin(math.radians(LEANING)) + 1e-9
        steep += area * float(np.average(walls, weights=body.triangle_areas[own]))
    return steep >= MOST_OF * piece.area_mm2
