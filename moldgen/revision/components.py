"""Which component of the old tool is which of the new one."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.measure import bounding_box
from moldgen.model.part import Vector
from moldgen.model.tool import Role
from moldgen.revision.items import MOST_MOVED, SAME_PIN
from moldgen.revision.pairing import nearest_pairs
from moldgen.revision.placing import Placing
from moldgen.revision.tool_record import SteelPart, ToolRecord

PLASTIC = frozenset({Role.PART, Role.SPRUE})
"""No steel: nothing is cut or welded."""

ROUND_PARTS = frozenset({Role.CORE_PIN, Role.EJECTOR_PIN, Role.SIDE_CORE_PIN, Role.ANGLED_PIN})
"""Bought round parts, ground to length: when steel is missing one takes another, nobody welds a pin."""

SMALL_PARTS = ROUND_PARTS | {Role.LOCKING_BLOCK, Role.GUIDE}
"""Components that are made anew sooner than welded (our choice)."""

BLOCKS = frozenset({Role.CAVITY, Role.CORE})
"""Components that fill the block: their outsides say nothing of the part."""


@dataclass(frozen=True)
class Standing:
    """One component at one of its places: `number` counts them; `at` is its position, placed in the new mold [mm].

    Of what is built where it stands, `at` stays the origin.

    name : of this copy, such as "ejector pin 3"
    """

    part: SteelPart
    number: int
    at: Vector
    name: str


@dataclass(frozen=True)
class Match:
    """Components that are one and the same in both tools, and stand alike: places go pairwise."""

    old: SteelPart | None
    new: SteelPart | None
    was: tuple[Standing, ...]
    now: tuple[Standing, ...]

    @property
    def names(self) -> tuple[str, str]:
        """What to call them in the old and in the new tool: the component if all copies are meant, else these."""
        return _called(self.old, self.was), _called(self.new, self.now)

    @property
    def shift(self) -> Vector | None:
        """How far the first stands from where it stood [mm]."""
        if not self.was or not self.now:
            return None
        x, y, z = (b - a for a, b in zip(self.was[0].at, self.now[0].at, strict=True))
        return (x, y, z)


def matched(old: ToolRecord, new: ToolRecord, placing: Placing) -> list[Match]:
    """Return all steel components, matched by role and place, as the new tool lists them; those that are gone last."""
    pairs: list[tuple[Standing | None, Standing | None]] = []
    for role in Role:
        if role in PLASTIC:
            continue
        before = [s for c in old.components if c.role is role for s in _standing(old, c, placing)]
        after = [s for c in new.components if c.role is role for s in _standing(new, c, Placing())]
        placed = role in ROUND_PARTS and all(any(s.at) for s in (*before, *after))  # angled pins are built in place
        pairs += _pinned(before, after) if placed else _built_in(before, after, placing)
    names = dict.fromkeys(c.name for c in (*new.components, *old.components))
    order = {name: n for n, name in enumerate(names)}
    groups: dict[tuple[object, ...], list[tuple[Standing | None, Standing | None]]] = {}
    for was, now in pairs:
        groups.setdefault(_group(was, now), []).append((was, now))
    found = [_match(members) for members in groups.values()]
    return sorted(found, key=lambda m: (m.new is None, order[_either(m).name], (m.now or m.was)[0].number))


def _either(match: Match) -> SteelPart:
    part = match.new or match.old
    if part is None:
        raise LookupError("a match of nothing")
    return part


def _called(part: SteelPart | None, copies: Sequence[Standing]) -> str:
    if part is None:
        return ""
    return part.name if len(copies) == len(part.positions) else ", ".join(c.name for c in copies)


def _standing(tool: ToolRecord, part: SteelPart, placing: Placing) -> Iterator[Standing]:
    for number, at in enumerate(part.positions, start=1):
        # the origin is the place of what is built where it stands: elsewhere it would feign that a half moved
        yield Standing(part, number, placing.point(at) if any(at) else at, tool.pin_at(part, number))


def _group(was: Standing | None, now: Standing | None) -> tuple[object, ...]:
    """Return what members of one group share: both definitions, and how far they moved."""
    shift = None
    if was is not None and now is not None:
        shift = tuple(float(v) + 0.0 for v in np.round(np.subtract(now.at, was.at), 4))
    return (was and was.part.name, now and now.part.name, now is None and was and was.part.role, shift)


def _match(members: Sequence[tuple[Standing | None, Standing | None]]) -> Match:
    was = tuple(w for w, _ in members if w is not None)
    now = tuple(n for _, n in members if n is not None)
    return Match(was[0].part if was else None, now[0].part if now else None, was, now)


def _pinned(before: list[Standing], after: list[Standing]) -> list[tuple[Standing | None, Standing | None]]:
    """Match round parts by their axes: at one place, else equal ones wherever they stand, else the nearest."""
    found: list[tuple[Standing | None, Standing | None]] = []
    before, after = list(before), list(after)

    def take(reach: float, *, alike: bool) -> None:
        gaps = [
            (float(np.hypot(b.at[0] - a.at[0], b.at[1] - a.at[1])), m, n)
            for m, a in enumerate(before)
            for n, b in enumerate(after)
            if not alike or a.part.digest == b.part.digest
        ]
        pairs = nearest_pairs(g for g in gaps if g[0] <= reach)
        found.extend((before[m], after[n]) for m, n in pairs)
        before[:], after[:] = _left(before, after, pairs)

    take(SAME_PIN, alike=False)
    take(float("inf"), alike=True)
    take(MOST_MOVED, alike=False)
    return [*found, *((s, None) for s in before), *((None, s) for s in after)]


def _built_in(
    before: list[Standing], after: list[Standing], placing: Placing
) -> list[tuple[Standing | None, Standing | None]]:
    """Match components that are built where they stand by the middles of their boxes; a block always meets its like."""
    if len(before) == len(after) == 1:
        return [(before[0], after[0])]
    low_high = {s: bounding_box(s.part.solid) for s in (*before, *after)}
    middle = {s: 0.5 * (low + high) for s, (low, high) in low_high.items()}
    for s in before:
        middle[s] = np.array(placing.point(tuple(middle[s])))
    size = {s: float(np.linalg.norm(high - low)) for s, (low, high) in low_high.items()}
    gaps = [
        (float(np.linalg.norm(middle[a] - middle[b])), m, n)
        for m, a in enumerate(before)
        for n, b in enumerate(after)
        if np.linalg.norm(middle[a] - middle[b]) < 0.5 * min(size[a], size[b])
    ]
    pairs = nearest_pairs(gaps)
    gone, come = _left(before, after, pairs)
    return [*((before[m], after[n]) for m, n in pairs), *((s, None) for s in gone), *((None, s) for s in come)]


def _left(
    before: Sequence[Standing], after: Sequence[Standing], pairs: Sequence[tuple[int, int]]
) -> tuple[list[Standing], list[Standing]]:
    """Return those that are in no pair."""
    old, new = {m for m, _ in pairs}, {n for _, n in pairs}
    return [s for m, s in enumerate(before) if m not in old], [s for n, s in enumerate(after) if n not in new]
