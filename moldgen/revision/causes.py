"""What a piece of steel follows from: the pin, gate or bore that changed there, or the feature of the part."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.model.part import Box, MoldFrame, vector
from moldgen.model.revision import PartChange, PartChangeKind
from moldgen.revision.items import ItemPair

NEAR = 0.3
"""mm: a piece this close to a feature that changed follows from it (our choice)."""

MOST_SHARE = 0.98
"""A piece lies in the place of a pin or a gate when this share of its box does (our choice)."""


@dataclass(frozen=True)
class Causes:
    """What changed, with its boxes in the new mold. `whole` is what changed everywhere, such as the shrink, or ""."""

    frame: MoldFrame
    part: tuple[PartChange, ...]
    items: tuple[ItemPair, ...]
    whole: str = ""

    def of(self, piece: Box) -> str:
        """Return what a piece with this box follows from, "" if nothing that changed is there."""
        for pair in self.items:
            boxes = [i.box for i in (pair.old, pair.new) if i is not None]
            if pair.same or pair.either.kind == "block":
                continue
            if _share(piece, _around(boxes)) >= MOST_SHARE:
                return f"{pair.either.name} {_told(pair)}"
        near = [(_overlap(piece, box), -_size(box), n) for n, box in enumerate(self._boxes()) if _meets(piece, box)]
        if near:
            best = max(near, key=lambda m: (round(m[0], 6), m[1], -m[2]))
            return self.part[best[2]].told
        return self.whole

    def _boxes(self) -> list[Box]:
        return [_grown(_in_mold(c, self.frame), NEAR) for c in self.part]


def _told(pair: ItemPair) -> str:
    change = pair.change()
    if pair.old is None or pair.new is None:
        return "is new" if pair.old is None else "is no longer there"
    sizes = f"{change.was} to {change.now}" if change.was != change.now else ""
    return ", ".join(w for w in (change.note.replace("its end", "now ends").replace(" is ", " "), sizes) if w)


def _in_mold(change: PartChange, frame: MoldFrame) -> Box:
    """Return the box of a change in the mold, with the place where a feature that moved was."""
    low, high = np.array(change.box)
    if change.kind is PartChangeKind.MOVED and change.shift is not None:
        low, high = np.minimum(low, low - change.shift), np.maximum(high, high - change.shift)
    corners = [frame.to_mold((float(x), float(y), float(z))) for x in (low[0], high[0]) for y in (low[1], high[1])
               for z in (low[2], high[2])]  # fmt: skip
    return vector(np.min(corners, axis=0)), vector(np.max(corners, axis=0))


def _around(boxes: Sequence[Box]) -> Box:
    return vector(np.min([b[0] for b in boxes], axis=0)), vector(np.max([b[1] for b in boxes], axis=0))


def _grown(box: Box, by: float) -> Box:
    return vector(np.array(box[0]) - by), vector(np.array(box[1]) + by)


def _meets(one: Box, other: Box) -> bool:
    return all(a <= d and c <= b for a, b, c, d in zip(*one, *other, strict=True))


def _overlap(one: Box, other: Box) -> float:
    low, high = np.maximum(one[0], other[0]), np.minimum(one[1], other[1])
    return float(np.prod(np.maximum(high - low, 0.0)))


def _share(piece: Box, box: Box) -> float:
    return _overlap(piece, box) / max(_size(piece), 1e-12)


def _size(box: Box) -> float:
    return float(np.prod(np.maximum(np.subtract(box[1], box[0]), 1e-9)))
