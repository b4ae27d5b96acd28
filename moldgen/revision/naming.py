"""What faces are called in the trade: boss, hole, rib, wall, pocket, rounding; by their geometry alone."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from itertools import combinations
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import coaxial
from moldgen.kernel.face_signature import PartSigns
from moldgen.model.face_sign import FaceSign, SurfaceKind

ROUND_TURN: Final = 0.55
"""Share of a turn, of all faces of one cylinder or cone together, from which it is a boss or a hole; half a turn is the
end of a slot, a quarter a rounding (our choice)."""

THICKEST: Final = 8.0
"""mm: two faces further apart are no wall (our choice: molded walls are 1 to 4 mm, common practice)."""

FEW: Final = 0.3
"""Share of the area under which bosses and holes are told beside the wall that they are on (our choice)."""

MOST_LEAN: Final = 10.0
"""deg: two sides of a wall or rib lean against each other by at most this, twice a generous draft (our choice)."""

_ROUND: Final = (SurfaceKind.CYLINDER, SurfaceKind.CONE)


def length(value: float) -> str:
    """Return a length for the reader, to 1e-3 mm, without trailing zeros and without unit."""
    return f"{round(value, 3) + 0.0:g}"


def name_of(part: PartSigns, numbers: Collection[int]) -> str:
    """Return the trade's word for some faces, by the numbers of their signs, with its leading size."""
    ordered = sorted(numbers)
    whole = sum(part.signs[n].area_mm2 for n in ordered)
    rounds = _with_ends(part, ordered)
    if rounds and sum(part.signs[n].area_mm2 for n in rounds) < FEW * whole:
        wall = _wall_name(part, ordered) or "faces"
        return f"{wall} with {_round_name(part, ordered)}"
    for way in (_round_name, _end_name, _chamfer_name, _between_planes, _rounding_name, _wall_name):
        found = way(part, ordered)
        if found:
            return found
    if all(part.signs[n].kind is SurfaceKind.PLANE for n in ordered):
        return "flat face" if len(ordered) == 1 else "flat faces"
    return "curved face" if len(ordered) == 1 else "faces"


def side_name(part: PartSigns, numbers: Collection[int]) -> str:
    """Return the trade's word for sides that got thicker or lean otherwise: a wall or rib is no opening for that."""
    ordered = sorted(numbers)
    name = name_of(part, ordered)
    return _wall_name(part, ordered) or name if name in ("opening", "pocket") else name


def turn(part: PartSigns, number: int) -> float:
    """Return the share of a whole turn that a cylinder or cone covers about its axis."""
    sign = part.signs[number]
    low, high = ends(part, number)
    slant = (high - low) / max(float(np.cos(np.radians(sign.angle_deg))), 1e-6)
    mean = radius_at(sign, 0.5 * (low + high))
    return sign.area_mm2 / max(2.0 * np.pi * mean * slant, 1e-12)


def ends(part: PartSigns, number: int) -> tuple[float, float]:
    """Return where a round face begins and ends along its axis [mm], counted from `FaceSign.at`."""
    sign = part.signs[number]
    along = (part.vertices(number, 10**6) - np.array(sign.at)) @ np.array(sign.axis)
    return float(along.min()), float(along.max())


def radius_at(sign: FaceSign, along: float) -> float:
    """Return the radius of a cylinder or cone at a place of its axis, counted from `FaceSign.at` [mm]."""
    return sign.radius + along * float(np.tan(np.radians(sign.angle_deg)))


def told_at(part: PartSigns, number: int) -> float:
    """Return where along its axis a round face's diameter is told: a boss at its narrow end, a hole at its wide one.

    That is the free end and the mouth, if they have draft as they should.
    """
    low, high = ends(part, number)
    return low if part.signs[number].side > 0 else high


def is_round(part: PartSigns, number: int) -> bool:
    """True for a face of a boss or a hole: with the other faces of its cylinder it goes round by more than half."""
    sign = part.signs[number]
    if sign.kind not in _ROUND:
        return False
    same = [
        n
        for n, other in enumerate(part.signs)
        if other.kind is sign.kind and other.side == sign.side and n != number and _one_round(sign, other)
    ]
    return sum(turn(part, n) for n in (number, *same)) >= ROUND_TURN


def _one_round(a: FaceSign, b: FaceSign) -> bool:
    along = float((np.array(b.at) - np.array(a.at)) @ np.array(a.axis))
    near = abs(along) <= a.reach_mm + b.reach_mm
    return near and coaxial(a, b) and abs(radius_at(a, along) - b.radius) <= 1e-2


def diameter(part: PartSigns, number: int) -> float:
    """Return the diameter that a boss or hole is called by [mm], see `told_at`."""
    return 2.0 * radius_at(part.signs[number], told_at(part, number))


def _round_name(part: PartSigns, numbers: Sequence[int]) -> str:
    rounds = [n for n in numbers if is_round(part, n)]
    posts = [n for n in rounds if part.signs[n].side > 0]
    holes = [n for n in rounds if part.signs[n].side < 0]
    if posts:
        main = max(posts, key=lambda n: (part.signs[n].radius, -n))
        inside = [n for n in holes if coaxial(part.signs[main], part.signs[n])]
        text = f"boss d {length(diameter(part, main))}"
        if inside:
            text += f" with hole d {length(min(diameter(part, n) for n in inside))}"
        return _several(part, posts, text, "bosses")
    if not holes:
        return ""
    main = min(holes, key=lambda n: (part.signs[n].radius, n))
    kind = "blind hole" if any(_closes(part, n, main) for n in part.links[main]) else "hole"
    return _several(part, holes, f"{kind} d {length(diameter(part, main))}", "holes")


def _with_ends(part: PartSigns, numbers: Sequence[int]) -> set[int]:
    """Return the faces of bosses and holes among some faces, with the planes that end them."""
    rounds = {n for n in numbers if is_round(part, n)}
    return rounds | {k for n in rounds for k in part.links[n] & set(numbers) if _closes(part, k, n)}


def _several(part: PartSigns, rounds: Sequence[int], one: str, plural: str) -> str:
    axes: list[int] = []
    for n in rounds:
        if not any(coaxial(part.signs[n], part.signs[k]) for k in axes):
            axes.append(n)
    return one if len(axes) == 1 else f"{len(axes)} {plural}"


def _closes(part: PartSigns, plane: int, hole: int) -> bool:
    """True when a plane closes the end of a boss or hole: across its axis and within its circle."""
    flat, sign = part.signs[plane], part.signs[hole]
    if flat.kind is not SurfaceKind.PLANE or abs(float(np.dot(flat.axis, sign.axis))) < 0.99:
        return False
    beside = np.array(flat.center) - np.array(sign.at)
    along = float(beside @ np.array(sign.axis))
    off_axis = float(np.linalg.norm(beside - along * np.array(sign.axis)))
    return off_axis < 0.5 * sign.radius and flat.area_mm2 <= 1.05 * np.pi * max(radius_at(sign, along), 0.0) ** 2


def _end_name(part: PartSigns, numbers: Sequence[int]) -> str:
    """Return the name of a lone plane that ends a boss or closes a hole."""
    if len(numbers) != 1 or part.signs[numbers[0]].kind is not SurfaceKind.PLANE:
        return ""
    for near in sorted(part.links[numbers[0]]):
        if part.signs[near].kind in _ROUND and is_round(part, near) and _closes(part, numbers[0], near):
            hole = part.signs[near].side < 0
            return f"{'bottom of hole' if hole else 'end of boss'} d {length(diameter(part, near))}"
    return ""


def opposite(signs: Sequence[FaceSign], number: int) -> tuple[int, float] | None:
    """Return the plane at the other side of the plastic behind a plane, and how thick that is [mm], if it is a wall."""
    sign, best = signs[number], None
    if sign.kind is not SurfaceKind.PLANE:
        return None
    for other, far in enumerate(signs):
        thick = _apart(sign, far)
        if thick is None or not _thin(sign, far, -thick):
            continue
        if best is None or -thick < best[1]:
            best = other, -thick
    return best


def _apart(a: FaceSign, b: FaceSign) -> float | None:
    """Return how far plane b is in front of plane a [mm], None unless they face away from or to each other."""
    if b.kind is not SurfaceKind.PLANE:
        return None
    middle = np.array(a.axis) - np.array(b.axis)
    size = float(np.linalg.norm(middle))
    if size < 2.0 * np.cos(np.radians(MOST_LEAN) / 2.0):
        return None
    apart = np.array(b.center) - np.array(a.center)
    along = float(apart @ middle) / size
    beside = float(np.linalg.norm(apart - along * middle / size))
    return along if beside <= 0.5 * (a.reach_mm + b.reach_mm) else None


def _thin(a: FaceSign, b: FaceSign, thick: float) -> bool:
    """True when the plastic between two planes is a wall: thinner than `THICKEST` and than the planes are wide."""
    return 0.05 < thick <= min(THICKEST, 0.8 * a.reach_mm, 0.8 * b.reach_mm)


def _between_planes(part: PartSigns, numbers: Sequence[int]) -> str:
    """Return a rib where two planes of the group have plastic between them, a pocket or opening where they face."""
    flats = [n for n in numbers if part.signs[n].kind is SurfaceKind.PLANE]
    thin: list[float] = []
    facing = 0
    for a, b in combinations(flats, 2):
        apart = _apart(part.signs[a], part.signs[b])
        if apart is None:
            continue
        if _thin(part.signs[a], part.signs[b], -apart) and _has_back(part, a, b, -apart):
            thin.append(-apart)
        facing += apart > 0.0
    if thin:
        return f"rib {length(min(thin))} thick"
    if not facing:
        return ""
    floor = any(_is_floor(part, n, numbers) for n in flats)
    return "pocket" if floor else "opening"


def _has_back(part: PartSigns, a: int, b: int, thick: float) -> bool:
    """True when a plane no wider than the plastic between two others joins them: a rib's back, not a wall's rim."""
    across = np.array(part.signs[a].axis) - np.array(part.signs[b].axis)
    across = across / np.linalg.norm(across)
    for n in part.links[a] & part.links[b]:
        sign = part.signs[n]
        spread = np.array(sign.spread_rows)
        width = float(np.sqrt(max(12.0 * across @ spread @ across, 0.0)))  # of an even strip
        if sign.kind is SurfaceKind.PLANE and abs(float(np.dot(sign.axis, across))) < 0.2 and width <= 1.5 * thick:
            return True
    return False


def _is_floor(part: PartSigns, number: int, group: Sequence[int]) -> bool:
    """True when all neighbours of a plane belong to the group and stand up around it."""
    around = part.links[number]
    return bool(around) and around <= set(group)


def _chamfer_name(part: PartSigns, numbers: Sequence[int]) -> str:
    """Return "chamfer" where every plane of the group leans between two others that meet at an edge."""
    for n in numbers:
        if part.signs[n].kind is not SurfaceKind.PLANE:
            return ""
        beside = [part.signs[k] for k in part.links[n] - set(numbers) if part.signs[k].kind is SurfaceKind.PLANE]
        leaning = [s for s in beside if 0.34 < float(np.dot(s.axis, part.signs[n].axis)) < 0.94]  # 20 to 70 deg
        if not any(abs(float(np.dot(one.axis, other.axis))) < 0.34 for one, other in combinations(leaning, 2)):
            return ""
    return "chamfer"


def _rounding_name(part: PartSigns, numbers: Sequence[int]) -> str:
    radii = []
    for n in numbers:
        sign = part.signs[n]
        if sign.kind in (SurfaceKind.PLANE, SurfaceKind.FREE):
            return ""
        radii.append(sign.minor if sign.kind is SurfaceKind.TORUS else sign.radius)
    return f"rounding r {length(min(radii))}"


def _wall_name(part: PartSigns, numbers: Sequence[int]) -> str:
    across = [opposite(part.signs, n) for n in numbers if part.signs[n].kind is SurfaceKind.PLANE]
    thin = [found[1] for found in across if found is not None]
    return f"wall {length(min(thin))} thick" if thin else ""
