"""What became of each face of a part that was laid onto its new version: the same, moved, another size, gone or new."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import SAME_PLACE, on_same_surface, same_form, surface_gap
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.part import UPRIGHT, Vector, vector
from moldgen.revision.laid import SAME_FREE, Laid
from moldgen.revision.partners import Partner, partners

SAME_SHIFT: Final = 2e-3
"""mm: shifts that differ by less are one (our choice: twice the tolerance of one place)."""


@dataclass(frozen=True)
class MovedFaces:
    """Faces that belong together and moved by one vector [mm]."""

    old: tuple[int, ...]
    new: tuple[int, ...]
    shift: Vector


@dataclass
class Fates:
    """What became of every face, by the numbers of their signs.

    Those that stayed, or kept to their surface within another boundary, are in none.

    moved : groups; partners : pairs that changed otherwise; gone, added : faces without a partner
    """

    moved: list[MovedFaces] = field(default_factory=list)
    partners: list[Partner] = field(default_factory=list)
    gone: set[int] = field(default_factory=set)
    added: set[int] = field(default_factory=set)


def face_fates(laid: Laid) -> Fates:
    """Return what became of the faces.

    In this order: in place; moved together, at least one of them off its own surface; on the same surface with another
    boundary, or a free face that lies wholly on free faces; changed in place; gone and added.
    """
    found = Fates()
    old, new = set(range(len(laid.placed))), set(range(len(laid.new.signs)))
    for i, j in zip(*(side.tolist() for side in laid.in_place()), strict=True):
        if i in old and j in new:
            old.discard(i)
            new.discard(j)
    found.moved = _moved(laid, old, new)
    for group in found.moved:
        old -= set(group.old)
        new -= set(group.new)
    pairs = [(i, j) for i in sorted(old) for j in sorted(new) if laid.trimmed(i, j)]
    old -= {i for i, _ in pairs} | {i for i in sorted(old) if laid.old_lies_on_new(i)}
    new -= {j for _, j in pairs} | {j for j in sorted(new) if laid.new_lies_on_old(j)}
    found.partners = partners(laid.placed, laid.new.signs, sorted(old), sorted(new))
    found.gone = old - {p.old for p in found.partners}
    found.added = new - {p.new for p in found.partners}
    return found


def _moved(laid: Laid, old: set[int], new: set[int]) -> list[MovedFaces]:
    """Return groups of touching faces that moved by one vector, those of most faces first, then the nearest."""
    free_old, free_new = set(old), set(new)
    pairs = _congruent(laid, sorted(old), sorted(new))
    found: list[MovedFaces] = []
    while True:
        best = _best_group(laid, [p for p in pairs if p[0] in free_old and p[1] in free_new])
        if best is None:
            return found
        group = _with_trimmed(laid, best, free_old, free_new)
        if any(_leaves_its_surface(laid.placed[i], group.shift) for i in group.old):
            found.append(group)
            free_old -= set(group.old)
            free_new -= set(group.new)
        dropped = set(zip(best.old, best.new, strict=True))
        pairs = [p for p in pairs if (p[0], p[1]) not in dropped]


_Pair = tuple[int, int, Vector]


def _congruent(laid: Laid, old: Sequence[int], new: Sequence[int]) -> list[_Pair]:
    """Return the pairs of one form, turned the same way, with the vector from one to the other."""
    before, after = [laid.placed[i] for i in old], [laid.new.signs[j] for j in new]
    found = []
    for m, n in np.argwhere(same_form(before, after, laid.tolerance)):
        a, b = before[m], after[n]
        x, y, z = (q - p for p, q in zip(a.center, b.center, strict=True))
        there = a.placed(UPRIGHT, (x, y, z))
        rims = float(np.linalg.norm(np.array(there.rim) - np.array(b.rim)))
        spread = float(np.abs(np.array(a.spread) - np.array(b.spread)).max())
        if rims > 2.0 * laid.tolerance or spread > 4.0 * laid.tolerance * max(a.reach_mm, laid.tolerance):
            continue
        if a.kind is SurfaceKind.FREE or on_same_surface(there, b, laid.tolerance):
            found.append((old[m], new[n], (x, y, z)))
    return found


def _best_group(laid: Laid, pairs: Sequence[_Pair]) -> MovedFaces | None:
    """Return the largest group of touching faces with one shift; of equally large ones the one that moved least."""
    best: tuple[tuple[int, float, int], MovedFaces] | None = None
    for cluster in _clusters(pairs):
        image = {i: j for i, j, _ in cluster}
        for group in components(image, lambda i: laid.old.links[i]):
            numbers = sorted(group)
            shift = _shift(laid, numbers, [image[i] for i in numbers])
            cost = (-len(numbers), round(float(np.linalg.norm(shift)), 6), numbers[0])
            if best is None or cost < best[0]:
                best = cost, MovedFaces(tuple(numbers), tuple(image[i] for i in numbers), shift)
    return None if best is None else best[1]


def _clusters(pairs: Sequence[_Pair]) -> list[list[_Pair]]:
    """Return pairs by their shift; one image a face in each."""
    clusters: list[list[_Pair]] = []
    cells: dict[tuple[int, ...], list[int]] = {}
    for pair in pairs:
        cell = tuple(int(v) for v in np.floor(np.array(pair[2]) / SAME_SHIFT))
        near = [k for step in np.ndindex(3, 3, 3) for k in cells.get(_beside(cell, step), ())]
        home = next((k for k in near if _close(clusters[k][0][2], pair[2])), None)
        if home is None:
            home = len(clusters)
            clusters.append([])
            cells.setdefault(cell, []).append(home)
        if all(pair[0] != p[0] and pair[1] != p[1] for p in clusters[home]):
            clusters[home].append(pair)
    return clusters


def _beside(cell: tuple[int, ...], step: tuple[int, ...]) -> tuple[int, ...]:
    return tuple(c + d - 1 for c, d in zip(cell, step, strict=True))


def _close(a: Vector, b: Vector) -> bool:
    return float(np.linalg.norm(np.array(a) - np.array(b))) <= SAME_SHIFT


def _shift(laid: Laid, old: Sequence[int], new: Sequence[int]) -> Vector:
    """Return the mean shift of some faces, by their areas: of surfaces with numbers of their own, if there are any."""
    exact = [k for k, i in enumerate(old) if laid.placed[i].kind is not SurfaceKind.FREE] or list(range(len(old)))
    weights = np.array([laid.placed[old[k]].area_mm2 for k in exact])
    shifts = [np.array(laid.new.signs[new[k]].center) - np.array(laid.placed[old[k]].center) for k in exact]
    return vector(weights @ np.array(shifts) / weights.sum())


def _with_trimmed(laid: Laid, group: MovedFaces, old: set[int], new: set[int]) -> MovedFaces:
    """Return the group with the faces that touch it and moved likewise, but have another boundary now."""
    first, second = list(group.old), list(group.new)
    for i in first:  # grows while it is walked
        near = {k for j in second for k in laid.new.links[j]}
        for k in sorted((laid.old.links[i] & old) - set(first)):
            there = laid.placed[k].placed(UPRIGHT, group.shift)
            if not _leaves_its_surface(laid.placed[k], group.shift):
                continue
            image = [n for n in sorted(near & new | set(second)) if on_same_surface(there, laid.new.signs[n])]
            if image:  # which may be there already: two old faces became one
                first.append(k)
                second += [n for n in image if n not in second]
    return MovedFaces(tuple(first), tuple(second), group.shift)


def _leaves_its_surface(sign: FaceSign, shift: Vector) -> bool:
    """True when a face that moves so does not only slide along its own surface.

    Centers of free faces are integrated less well: what moved by less than `SAME_FREE` is looked at point by point.
    """
    if sign.kind is SurfaceKind.FREE:
        return float(np.linalg.norm(shift)) > SAME_FREE
    return surface_gap(sign, sign.placed(UPRIGHT, shift)) > SAME_PLACE


def components(numbers: Iterable[int], links: Callable[[int], Iterable[int]]) -> list[set[int]]:
    """Return which of some numbers hang together, groups in the order of their lowest number."""
    left, found = set(numbers), []
    while left:
        start = min(left)
        group, front = {start}, [start]
        left.discard(start)
        while front:
            more = set(links(front.pop())) & left
            left -= more
            group |= more
            front += sorted(more)
        found.append(group)
    return found
