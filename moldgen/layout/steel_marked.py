"""What the points of `steel_safe.places` mean: a face, or a hole, slot, pin, wall or lip."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.kernel.nearest import nearest_triangle
from moldgen.layout.steel_former import Ends, FormedPart
from moldgen.layout.steel_round import RoundFeature
from moldgen.layout.steel_snap import ONE_LIP, SnapLip

NEAR: Final = 0.5
"""mm: a point that means a face lies at most this far from it (our choice)."""

ROUND_OFF: Final = 0.1
"""mm: how far a point may lie outside the round hole or pin that it means."""

WIDEST: Final = 30.0
"""mm: a wider slot or thicker wall is no fit that one tunes (our choice)."""

ON_FACE: Final = 0.02
"""mm: a point this close to a face is taken to mean the plastic under it."""

INTO: Final = 0.05
"""mm: so far under the face."""

WAYS: Final = 16


@dataclass(frozen=True)
class Meant:
    """What a point means: one of these, or nothing. `off` : distance of the nearest face [mm].

    round : a round hole, boss or pin; lip : of a snap fit; slot, wall : a width of air, or of plastic
    face : the wall behind one face, from that face on
    """

    off: float
    round: RoundFeature | None = None
    lip: SnapLip | None = None
    slot: Ends | None = None
    wall: Ends | None = None
    face: Ends | None = None


def meant_face(part: FormedPart, rounds: list[RoundFeature], point: np.ndarray) -> Meant:
    """Return the face nearest to a point (3,): the whole of a round one, else with the wall behind it."""
    triangle, off = nearest_triangle(part.mesh, point)
    if off > NEAR:
        return Meant(off)
    number = int(part.mesh.face[triangle])
    own = next((r for r in rounds if number in r.faces and r.whole), None)
    if own is not None:
        return Meant(off, round=own)
    normal = part.mesh.facet_normals[triangle]
    start = point - float((point - part.mesh.corners[triangle, 0]) @ normal) * normal
    (depth,), (behind,) = part.probe.first((start - ON_FACE * normal)[None, :], -normal)
    if not np.isfinite(depth):
        return Meant(off)
    return Meant(off, face=Ends(start, start - (depth + ON_FACE) * normal, normal, part.mesh.facet_normals[behind]))


def meant_feature(
    part: FormedPart, rounds: list[RoundFeature], lips: list[SnapLip], point: np.ndarray, *, snap: bool
) -> Meant:
    """Return the hole, pin, slot, wall or lip that a point (3,) lies in.

    snap : a lip is looked for first, the nearest up to 3 mm away
    """
    triangle, off = nearest_triangle(part.mesh, point)
    near = sorted(lips, key=lambda lip: float(np.linalg.norm(lip.catch - point)))
    if snap and near and np.linalg.norm(near[0].catch - point) <= ONE_LIP:
        return Meant(off, lip=near[0])
    if off <= ON_FACE:
        point = point - INTO * part.mesh.facet_normals[triangle]
    own = [r for r in rounds if _within(r, point)]
    if own:
        return Meant(off, round=min(own, key=lambda r: (r.large, r.faces)))
    width = _narrowest(part, point)
    if width is None or width.length > WIDEST:
        return Meant(off)
    return Meant(off, wall=width) if part.inside(point) else Meant(off, slot=width)


def _within(feature: RoundFeature, point: np.ndarray) -> bool:
    if not feature.whole or not feature.low - ROUND_OFF <= point[2] <= feature.high + ROUND_OFF:
        return False
    return math.hypot(point[0] - feature.x, point[1] - feature.y) <= feature.large / 2 + ROUND_OFF


def _narrowest(part: FormedPart, point: np.ndarray) -> Ends | None:
    """Return the least width, of air or of plastic, through a point (3,), level or along the pull."""
    turn = np.pi * np.arange(WAYS) / WAYS
    ways = np.vstack([np.column_stack([np.cos(turn), np.sin(turn), np.zeros(WAYS)]), [[0.0, 0.0, 1.0]]])
    found = [w for w in part.across(np.tile(point, (len(ways), 1)), ways) if w is not None]
    if not found:
        return None
    best = min(found, key=lambda w: round(w.length, 6))
    for normal in (best.one_normal, best.other_normal):  # square to a wall it is narrowest
        (straight,) = part.across(point[None, :], normal[None, :])
        if straight is not None and straight.length < best.length:
            best = straight
    return best
