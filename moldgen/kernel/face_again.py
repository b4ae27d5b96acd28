"""Where a face that is known by its sign lies on another version of the part: for what was placed on it."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import SAME_PLACE, coaxial, in_same_place, on_same_surface, same_form
from moldgen.kernel.face_signature import PartSigns
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.part import Vector, vector

FARTHEST: Final = 20.0
"""mm: a face of the same form further away than this is taken for another one (our choice)."""

NEAR_PLANE: Final = 5.0
"""mm: a plane that moved along its normal is looked for this far (our choice: walls and floors move by less)."""

ALIKE: Final = 0.2
"""Relative difference in area of a parallel plane that may be the same one, trimmed by drafted walls (our choice)."""

ON_FACE: Final = 0.1
"""mm: twice the sag of the working mesh, by which a place on a round face may be off."""

_ANY: Final = (0.0, 0.0, 0.0)


class Found(StrEnum):
    """How a face was found again."""

    SAME = "same place, same face"
    TRIMMED = "same place, other boundary"
    MOVED = "same form, moved"
    SHIFTED = "plane moved along its normal"
    RESIZED = "same axis, other size"


@dataclass(frozen=True)
class Again:
    """A face found again.

    number : of its sign in the new part
    how : SAME and TRIMMED lie where they lay; shift : how far it moved [mm], 0 then
    holds_point : True when the place asked for, moved by `shift`, lies on this face within `ON_FACE`; False where
        something else is now. A face's own center often lies beside it: give `near`
    """

    number: int
    how: Found
    shift: Vector
    holds_point: bool


def find_again(sign: FaceSign, part: PartSigns, near: Vector | None = None, within: float = FARTHEST) -> Again | None:
    """Return where the face with this sign is on another version of the part, None where it is gone.

    Tried: the same face in place; the same form moved without turning, by at most `within` [mm], to where no equal face
    of the old part (`FaceSign.twins`) was; its surface with another boundary (round faces: before the form, since
    along its axis a hole is the same hole); a parallel plane of about the same area beside it; a cylinder or cone
    about the same axis.

    Parameters
    ----------
    sign : of the old part, in the same coordinates (see `FaceSign.placed`); may come out of a lock file
    near : the place on the old face that is of interest, such as the middle of a pin; else the face's center
    """
    place = sign.center if near is None else near
    order = (_moved, _trimmed) if sign.kind is SurfaceKind.PLANE else (_trimmed, _moved)
    for find in (_same, *order, _shifted, _resized):
        found = find(sign, part, place, within)
        if found is not None:
            number, how, shift = found
            to = vector(np.array(place) + np.array(shift))
            return Again(number, how, shift, _holds(part, number, to))
    return None


_Hit = tuple[int, Found, Vector]


def _holds(part: PartSigns, number: int, place: Vector) -> bool:
    return part.distance(number, place) <= ON_FACE


def _same(sign: FaceSign, part: PartSigns, _place: Vector, _within: float) -> _Hit | None:
    for number, other in enumerate(part.signs):
        if in_same_place(sign, other):
            return number, Found.SAME, _ANY
    return None


def _trimmed(sign: FaceSign, part: PartSigns, place: Vector, _within: float) -> _Hit | None:
    """Return the face on the same surface; of several the one under the place, else the one with the nearest center."""
    if sign.kind is SurfaceKind.FREE:
        return None
    those = [n for n, other in enumerate(part.signs) if on_same_surface(sign, other)]
    twins = _twins_in_place(sign, part)
    those = [n for n in those if n not in twins]
    if not those:
        return None
    under, gap = part.nearest(place)
    if under in those and gap <= ON_FACE:
        return under, Found.TRIMMED, _ANY
    return min(those, key=lambda n: (_gap(sign, part.signs[n]), n)), Found.TRIMMED, _ANY


def _moved(sign: FaceSign, part: PartSigns, _place: Vector, within: float) -> _Hit | None:
    alike = np.flatnonzero(same_form([sign], part.signs)[0])
    taken = _twins_in_place(sign, part)
    those = [int(n) for n in alike if n not in taken and _same_turn(sign, part.signs[n])]
    those = [n for n in those if _gap(sign, part.signs[n]) <= within]
    if not those:
        return None
    best = min(those, key=lambda n: (round(_gap(sign, part.signs[n]), 6), n))
    return best, Found.MOVED, vector(np.array(part.signs[best].center) - np.array(sign.center))


def _shifted(sign: FaceSign, part: PartSigns, _place: Vector, _within: float) -> _Hit | None:
    """Return a parallel plane over or under the place."""
    if sign.kind is not SurfaceKind.PLANE:
        return None
    normal, best = np.array(sign.axis), None
    for number, other in enumerate(part.signs):
        if other.kind is not SurfaceKind.PLANE or abs(other.area_mm2 / sign.area_mm2 - 1.0) > ALIKE:
            continue
        apart = np.array(other.center) - np.array(sign.center)
        if float(np.linalg.norm(normal - np.array(other.axis))) * sign.reach_mm > SAME_PLACE:
            continue
        along = float(apart @ normal)
        beside = float(np.linalg.norm(apart - along * normal))
        if abs(along) > NEAR_PLANE or beside > 0.25 * sign.reach_mm:
            continue
        if best is None or abs(along) < abs(best[1]):
            best = number, along
    if best is None:
        return None
    number, along = best
    return number, Found.SHIFTED, vector(along * normal)


def _resized(sign: FaceSign, part: PartSigns, _place: Vector, _within: float) -> _Hit | None:
    """Return a cylinder or cone of the same side about the same axis, with the nearest radius."""
    round_kinds = (SurfaceKind.CYLINDER, SurfaceKind.CONE)
    if sign.kind not in round_kinds:
        return None
    those = []
    for number, other in enumerate(part.signs):
        if other.kind not in round_kinds or other.side != sign.side:
            continue
        if coaxial(sign, other) and _gap(sign, other) <= sign.reach_mm + other.reach_mm:
            those.append((round(abs(other.radius - sign.radius), 6), number))
    return (min(those)[1], Found.RESIZED, _ANY) if those else None


def _twins_in_place(sign: FaceSign, part: PartSigns) -> set[int]:
    """Return the signs of the new part that lie where an equal face of the old part lay: those are not this one."""
    if not sign.twins:
        return set()
    twins = np.array(sign.twins)
    alike = np.flatnonzero(same_form([sign], part.signs)[0])
    centers = np.array([part.signs[n].center for n in alike]).reshape(-1, 3)
    gaps = np.linalg.norm(centers[:, None] - twins[None], axis=2)
    return {int(n) for n, gap in zip(alike, gaps, strict=True) if gap.min() <= SAME_PLACE}


def _same_turn(a: FaceSign, b: FaceSign) -> bool:
    """True when two faces of one form are also turned the same way."""
    if float(np.abs(np.array(a.spread) - np.array(b.spread)).max()) > 4.0 * SAME_PLACE * max(a.reach_mm, SAME_PLACE):
        return False
    rims = [np.array(s.rim) - np.array(s.center) for s in (a, b)]
    if float(np.linalg.norm(rims[0] - rims[1])) > 2.0 * SAME_PLACE:
        return False
    if a.kind in (SurfaceKind.PLANE, SurfaceKind.CONE):
        return float(np.linalg.norm(np.array(a.axis) - np.array(b.axis))) * a.reach_mm <= 10.0 * SAME_PLACE
    return True


def _gap(a: FaceSign, b: FaceSign) -> float:
    return float(np.linalg.norm(np.array(a.center) - np.array(b.center)))
