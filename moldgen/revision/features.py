"""What changed between two versions of a part, one entry a feature: moved, resized, drafted, added, gone, reshaped."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import coaxial
from moldgen.kernel.face_signature import PartSigns
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.part import Box, Vector
from moldgen.model.revision import Alignment, PartChange, PartChangeKind
from moldgen.revision.face_fates import SAME_SHIFT, Fates, MovedFaces, components, face_fates
from moldgen.revision.laid import Laid
from moldgen.revision.naming import is_round, length, name_of, opposite, radius_at, side_name, told_at
from moldgen.revision.partners import SAME_LEAN, Partner, Way

BESIDE: Final = 3.0
"""mm: faces that moved alike and are no further apart belong together: both sides of a wall (our choice)."""

STEEPEST: Final = 45.0
"""deg from the pull: a face that leans more is a floor, and its angle is no draft (our choice)."""

SAME_SIZE: Final = 1e-3
"""mm: thicknesses and radii that differ by less are one."""


def part_changes(
    old: PartSigns, new: PartSigns, alignment: Alignment, pull: Vector | None = None
) -> tuple[PartChange, ...]:
    """Return what changed on the part, the largest first; () if nothing did.

    Faces whose boundary alone changed, such as a floor under a boss that moved, are no change of their own.

    Parameters
    ----------
    old, new : signs of both versions, each in its own coordinates, before shrink
    alignment : as `moldgen.revision.align.align` found it
    pull : opening direction in the new part's coordinates; without it, a flat face that leans otherwise is "reshaped"
    """
    laid = Laid.of(old, new, alignment)
    found = face_fates(laid)
    items = _grouped(laid, [*_moved(laid, found), *_changed(laid, found, pull), *_lone(laid, found)])
    changes = sorted(
        ((-_size(laid, item), item.old, item.new, _told(laid, item)) for item in items), key=lambda c: c[:3]
    )
    whole = [_whole(laid)] if alignment.scale != 1.0 else []
    return (*whole, *(c[3] for c in changes))


@dataclass(frozen=True)
class _Item:
    """Faces that changed in one way: items with one `key` that touch are one feature."""

    kind: PartChangeKind
    key: tuple[object, ...]
    old: tuple[int, ...] = ()
    new: tuple[int, ...] = ()
    shift: Vector | None = None
    was: str = ""
    now: str = ""
    across: tuple[int, ...] = ()  # new faces on the other side of the wall: they count as touching


def _moved(laid: Laid, found: Fates) -> list[_Item]:
    """Return what moved; a lone side of a wall that did not move along is told by the wall's thickness instead."""
    items = []
    for group in found.moved:
        flat = all(laid.placed[i].kind is SurfaceKind.PLANE for i in group.old)
        thick = [_thicker(laid, i, j) for i, j in zip(group.old, group.new, strict=False)] if flat else []
        if thick and all(t is not None for t in thick) and len(group.old) == len(group.new):
            items += [t for t in thick if t is not None]
        else:
            items.append(_one_moved(group))
    return items


def _one_moved(group: MovedFaces) -> _Item:
    return _Item(PartChangeKind.MOVED, ("moved",), group.old, group.new, group.shift)


def _thicker(laid: Laid, old: int, new: int) -> _Item | None:
    """Return the change of a wall's or rib's thickness by a plane that moved, None where it is no wall or kept it."""
    before, after = opposite(laid.placed, old), opposite(laid.new.signs, new)
    if before is None or after is None or abs(before[1] - after[1]) <= SAME_SIZE:
        return None
    key = ("thick", round(before[1], 3), round(after[1], 3))
    was, now = (f"{length(t)} mm thick" for t in (before[1], after[1]))
    return _Item(PartChangeKind.RESIZED, key, (old,), (new,), None, was, now, (after[0],))


def _changed(laid: Laid, found: Fates, pull: Vector | None) -> list[_Item]:
    return [_partner(laid, p, pull) for p in found.partners]


def _partner(laid: Laid, pair: Partner, pull: Vector | None) -> _Item:
    before, after = laid.placed[pair.old], laid.new.signs[pair.new]
    own = ((pair.old,), (pair.new,))
    if pair.way is Way.SHIFTED:
        thicker = _thicker(laid, pair.old, pair.new)
        return thicker or _Item(PartChangeKind.MOVED, ("moved",), *own, pair.shift)
    if pair.way is Way.RADIUS:
        was, now = _sizes(laid, pair)
        return _Item(PartChangeKind.RESIZED, ("size", was, now), *own, None, was, now)
    if pair.way is Way.LEANING:
        leans = _leans(before, after, pull)
        if leans is not None:
            was, now = (f"{round(lean, 3) + 0.0:g} deg" for lean in leans)
            return _Item(PartChangeKind.DRAFT, ("draft", was, now), *own, None, was, now)
    return _Item(PartChangeKind.RESHAPED, ("reshaped",), *own)


def _leans(before: FaceSign, after: FaceSign, pull: Vector | None) -> tuple[float, float] | None:
    """Return old and new draft [deg], None where it is not known or did not change.

    Round faces lean against their own axis. A cone that now narrows the other way leans by less than nothing.
    """
    if before.kind is not SurfaceKind.PLANE:
        other_way = float(np.dot(before.axis, after.axis)) < 0.0 and before.angle_deg > 0.0
        return before.angle_deg, -after.angle_deg if other_way else after.angle_deg
    if pull is None:
        return None
    was, now = (float(np.degrees(np.arcsin(min(abs(float(np.dot(s.axis, pull))), 1.0)))) for s in (before, after))
    return (was, now) if abs(was - now) > SAME_LEAN and min(was, now) < STEEPEST else None


def _sizes(laid: Laid, pair: Partner) -> tuple[str, str]:
    """Return both sizes for the reader. Diameters of cones are taken at one place of the axis, the old one's end."""
    before, after = laid.placed[pair.old], laid.new.signs[pair.new]
    if before.kind in (SurfaceKind.CYLINDER, SurfaceKind.CONE) and coaxial(before, after):
        there = told_at(laid.old, pair.old) * laid.alignment.scale
        place = np.array(before.at) + there * np.array(before.axis)
        along = float((place - np.array(after.at)) @ np.array(after.axis))
        radii = radius_at(before, there), radius_at(after, along)
        if is_round(laid.old, pair.old):
            return f"d {length(2.0 * radii[0])} mm", f"d {length(2.0 * radii[1])} mm"
        return f"r {length(radii[0])} mm", f"r {length(radii[1])} mm"
    if before.kind is SurfaceKind.TORUS and abs(before.minor - after.minor) > SAME_SIZE:
        return f"r {length(before.minor)} mm", f"r {length(after.minor)} mm"
    if before.kind is SurfaceKind.TORUS:
        return f"ring r {length(before.radius)} mm", f"ring r {length(after.radius)} mm"
    return f"r {length(before.radius)} mm", f"r {length(after.radius)} mm"


def _lone(laid: Laid, found: Fates) -> list[_Item]:
    gone = components(found.gone, lambda n: laid.old.links[n])
    added = components(found.added, lambda n: laid.new.links[n])
    items = [_Item(PartChangeKind.GONE, ("gone",), old=tuple(sorted(c))) for c in gone]
    return items + [_Item(PartChangeKind.ADDED, ("added",), new=tuple(sorted(c))) for c in added]


def _grouped(laid: Laid, items: Sequence[_Item]) -> list[_Item]:
    """Return items with those joined that touch and changed in one way."""
    boxes = [laid.box(item.old, item.new) for item in items]

    def links(a: int) -> Iterable[int]:
        return (b for b in range(len(items)) if b != a and _belong(laid, items, boxes, a, b))

    return [_joined([items[n] for n in sorted(group)]) for group in components(range(len(items)), links)]


def _belong(laid: Laid, items: Sequence[_Item], boxes: Sequence[Box], a: int, b: int) -> bool:
    one, other = items[a], items[b]
    if one.key != other.key:
        return False
    if one.key == ("moved",):
        return _near(boxes[a], boxes[b]) and _alike(laid, one, other)
    return _touch(laid, one, other) or bool(set(one.across) & set(other.new) or set(other.across) & set(one.new))


def _touch(laid: Laid, one: _Item, other: _Item) -> bool:
    in_old = any(laid.old.links[i] & set(other.old) for i in one.old)
    return in_old or any(laid.new.links[j] & set(other.new) for j in one.new)


def _near(a: Box, b: Box) -> bool:
    return all(a[0][k] <= b[1][k] + BESIDE and b[0][k] <= a[1][k] + BESIDE for k in range(3))


def _alike(laid: Laid, one: _Item, other: _Item) -> bool:
    """True when one shift explains both: they are equal, or one is only known along the normal of a lone plane."""
    first, second = np.array(one.shift), np.array(other.shift)
    if float(np.linalg.norm(first - second)) <= SAME_SHIFT:
        return True
    for item, whole in ((one, second), (other, first)):
        if len(item.old) == 1 and laid.placed[item.old[0]].kind is SurfaceKind.PLANE:
            normal = np.array(laid.placed[item.old[0]].axis)
            along = float(np.array(item.shift) @ normal)
            flat = float(np.linalg.norm(np.array(item.shift) - along * normal)) <= SAME_SHIFT
            if flat and abs(along - float(whole @ normal)) <= SAME_SHIFT:
                return True
    return False


def _joined(items: Sequence[_Item]) -> _Item:
    """Return one item for all; the shift is that of the one with most faces."""
    lead = max(items, key=lambda i: len(i.old) + len(i.new))
    old, new = ({n for i in items for n in getattr(i, side)} for side in ("old", "new"))
    return replace(lead, old=tuple(sorted(old)), new=tuple(sorted(new)))


def _size(laid: Laid, item: _Item) -> float:
    sides = (sum(laid.placed[n].area_mm2 for n in item.old), sum(laid.new.signs[n].area_mm2 for n in item.new))
    return round(max(sides), 6)


def _told(laid: Laid, item: _Item) -> PartChange:
    part, numbers = (laid.old, item.old) if item.old else (laid.new, item.new)
    name = side_name if item.kind in (PartChangeKind.RESIZED, PartChangeKind.DRAFT) else name_of
    return PartChange(
        kind=item.kind,
        feature=name(part, numbers),
        old_faces=_numbers(laid.old, item.old),
        new_faces=_numbers(laid.new, item.new),
        at=laid.place(item.old, item.new),
        box=laid.box(item.old, item.new),
        shift=item.shift,
        was=item.was,
        now=item.now,
    )


def _numbers(part: PartSigns, signs: Iterable[int]) -> tuple[int, ...]:
    return tuple(sorted(f for n in signs for f in part.signs[n].faces))


def _whole(laid: Laid) -> PartChange:
    """Return the one change of a part that was grown or shrunk as a whole."""
    old, new = tuple(range(len(laid.placed))), tuple(range(len(laid.new.signs)))
    return PartChange(
        kind=PartChangeKind.RESIZED,
        feature="whole part",
        old_faces=_numbers(laid.old, old),
        new_faces=_numbers(laid.new, new),
        at=laid.place(old, new),
        box=laid.box(old, new),
        was="1",
        now=f"{laid.alignment.scale:.6g} times as large",
    )
