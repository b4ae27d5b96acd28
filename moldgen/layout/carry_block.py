"""The block of an accepted layout on the changed part: it stays where it stands, and grows only where it must."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import preferred_size_up
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.body import Body
from moldgen.model.accepted import SNAP
from moldgen.model.layout import BlockLayout, Chooser
from moldgen.model.part import Vector
from moldgen.spec.sections import Blocks

ENOUGH: Final = 0.98
"""Share of the rules' least steel with which an accepted wall or floor stays (our choice: 2 % are less than what the
thumb rules behind them are good to, and a block that grows is a new one)."""

INSIDE: Final = 0.5
"""Share of the part's box in the accepted block, of what could lie in it at most, under which the part stands elsewhere
(our choice: half)."""


@dataclass(frozen=True)
class KeptBlock:
    """The block of an accepted layout. at : its middle in plan, at the accepted parting plane, in the mold frame."""

    at: Vector
    length: float
    width: float
    cavity_height: float
    core_height: float

    @property
    def low(self) -> Vector:
        """Lower corner."""
        return (self.at[0] - self.length / 2, self.at[1] - self.width / 2, self.at[2] - self.core_height)

    @property
    def high(self) -> Vector:
        """Upper corner."""
        return (self.at[0] + self.length / 2, self.at[1] + self.width / 2, self.at[2] + self.cavity_height)


@dataclass(frozen=True)
class Least:
    """Steel that the rules want: beside the part along x and along y, over it, under it [mm]."""

    x: float
    y: float
    over: float
    under: float


def block_between(low: Iterable[float], high: Iterable[float]) -> BlockLayout:
    """Return the block between two corners [mm]."""
    one, other = (tuple(float(v) for v in corner) for corner in (low, high))
    return BlockLayout(one, other)  # type: ignore[arg-type]


def found_again(layout: BlockLayout, kept: KeptBlock) -> bool:
    """Return whether a block that was sized anew is the accepted one, to the digits in which that is written."""
    pairs = zip((*layout.low, *layout.high), (*kept.low, *kept.high), strict=True)
    return max(abs(a - b) for a, b in pairs) <= SNAP


def stands_in(kept: KeptBlock, body: Body) -> bool:
    """Return whether the part stands in the accepted block, if only with its larger share.

    A part that outgrew the block stands in it; one that was moved or turned to another place of its file does not.
    """
    (low, high), one, other = body.box, np.array(kept.low), np.array(kept.high)
    common = np.minimum(high, other) - np.maximum(low, one)
    share = np.clip(common, 0.0, None) / np.maximum(np.minimum(high - low, other - one), SNAP)
    return bool(share.prod() >= INSIDE)


def sized_anew(fresh: BlockLayout, kept: KeptBlock) -> Notes:
    """Return the notes that the block is not the accepted one, since the part does not stand in that."""
    text = f"the part does not stand in the accepted block of {size_text(block_between(kept.low, kept.high))} mm"
    finding = Finding(
        "accepted.dropped",
        Severity.CAUTION,
        f"the block of the accepted layout is not kept: {text}",
        where="blocks",
        remedy="put the part where it stood in its file, or accept the new layout with 'moldgen accept'",
    )
    return Notes((finding,), decisions=(Decision("blocks", f"{size_text(fresh)} mm closed", f"sized anew: {text}"),))


def keep_block(
    fresh: BlockLayout, kept: KeptBlock, least: Least, body: Body, blocks: Blocks
) -> tuple[BlockLayout, Notes]:
    """Return the accepted block, grown at the sides where the rules ask for more steel, and where that is.

    fresh : the block without an accepted one: what the spec gives, and heights that must grow, are taken from it
    A wall or floor with nearly what the rules ask for stays, with a caution; what the spec asks for is kept in full.
    """
    part = [(float(a), float(b)) for a, b in zip(*body.box, strict=True)]
    low, high, grown, thin = list(kept.low), list(kept.high), list[str](), list[Finding]()
    enough = ENOUGH if blocks.wall is None else 1.0
    for axis, wall, given in ((0, least.x, blocks.length), (1, least.y, blocks.width)):
        if given is not None:
            low[axis], high[axis] = fresh.low[axis], fresh.high[axis]
            continue
        left = (part[axis][0] - low[axis], high[axis] - part[axis][1])
        by = _growth(high[axis] - low[axis], [0.0 if s >= enough * wall else wall - s for s in left])
        low[axis], high[axis] = low[axis] - by[0], high[axis] + by[1]
        for side, steel, more in zip("-+", left, by, strict=True):
            if more:
                grown.append(_told(f"{side}{'xy'[axis]} side", more, steel, wall, "beside"))
            else:
                thin += _thin(f"at the {side}{'xy'[axis]} side of", steel, wall, ("length", "width")[axis])
    for where, end, corner, new, steel, floor in (
        ("over", "top", high, fresh.high, high[2] - part[2][1], least.over),
        ("under", "bottom", low, fresh.low, part[2][0] - low[2], least.under),
    ):
        key = "cavity_height" if where == "over" else "core_height"
        if getattr(blocks, key) is None:
            if steel >= ENOUGH * floor:
                thin += _thin(where, steel, floor, key)
                continue
            grown.append(_told(end, abs(new[2] - corner[2]), steel, floor, where))
        corner[2] = new[2]
    layout = BlockLayout((low[0], low[1], low[2]), (high[0], high[1], high[2]))
    fits = (
        f"at least {100 * ENOUGH:.0f} % of the least walls of the rules are left"
        if thin
        else "the least walls of the rules fit"
    )
    why = f"{Chooser.KEPT.value}, grown at the {'; at the '.join(grown)}" if grown else f"{Chooser.KEPT.value}: {fits}"
    return layout, Notes(tuple(thin), decisions=(Decision("blocks", f"{size_text(layout)} mm closed", why),))


def _thin(where: str, steel: float, needed: float, key: str) -> tuple[Finding, ...]:
    """Return the caution that a kept wall or floor has a little less steel than the rules ask for, if it has."""
    if steel >= needed - SNAP:
        return ()
    finding = Finding(
        "accepted.thin_wall",
        Severity.CAUTION,
        f"{steel:.2f} mm of steel are left {where} the part in the accepted block, the rules ask for {needed:.2f} mm: "
        f"it stays, since that is at least {100 * ENOUGH:.0f} %",
        where=f"blocks.{key}",
        value=round(steel, 3),
        limit=round(needed, 3),
        unit="mm",
        remedy=f"bear with it, or give blocks.{key} in the spec",
    )
    return (finding,)


def _growth(size: float, missing: list[float]) -> list[float]:
    """Return by how much each end grows, so that nothing is missing and the size is a preferred one [mm]."""
    missing = [m if m > SNAP else 0.0 for m in missing]
    ends = sum(m > 0.0 for m in missing)
    if not ends:
        return missing
    needed = size + sum(missing)
    spare = (preferred_size_up(round(needed, 6), "edge") - needed) / ends
    return [m + spare if m else 0.0 for m in missing]


def _told(side: str, by: float, steel: float, needed: float, where: str) -> str:
    return f"{side} by {by:.2f} mm: {steel:.2f} mm of steel {where} the part, {needed:.2f} mm are needed"


def size_text(layout: BlockLayout) -> str:
    """Return length, width and height of a block, such as ``100 x 80 x 63.5``."""
    size = [b - a for a, b in zip(layout.low, layout.high, strict=True)]
    return " x ".join(f"{math.floor(v * 100 + 0.5) / 100:g}" for v in size)
