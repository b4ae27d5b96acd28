"""The cavity half with the feed taken out of it, made by a process beside this one, which bores the core meanwhile."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cache
from typing import Any

from moldgen.kernel.beside import Beside, packed, unpacked
from moldgen.kernel.measure import volume_adaptive
from moldgen.model.halves import Halves
from moldgen.model.layout import GateKind, GateLayout
from moldgen.steel.cutting import Cut, Wanted, cut_half
from moldgen.steel.feed import Feed, make_feed
from moldgen.steel.ground import Ground

SURE = 1e-7
"""Relative error of the volumes of what is taken out: the default integration errs by 1e-4 on some plugs (measured)."""


@dataclass(frozen=True)
class FedCavity:
    """The feed, the cavity half without it, and the volume of each plug that it left [mm^3]."""

    feed: Feed
    cut: Cut
    plugs_mm3: tuple[float, ...]


def of_feed(halves: Halves, gate: GateLayout, ground: Ground, which: str, feed: Feed) -> Wanted:
    """Return the feed in one half, `in_cavity` or `in_core`; with its seams turned it is made again."""

    def make(seam: float) -> Any:
        return getattr(feed if seam == 0.0 else make_feed(halves, gate, ground, seam), which)

    return Wanted("sprue", make)


def fed_cavity(halves: Halves, gate: GateLayout, ground: Ground) -> FedCavity:
    """Return the cavity half without the feed.

    Raises
    ------
    PartError : the feed does not fit block or part; KernelError : the kernel cannot make it, or take it out
    """
    feed = make_feed(halves, gate, ground)
    cut = cut_half(halves.cavity, [of_feed(halves, gate, ground, "in_cavity", feed)], "cavity")
    return FedCavity(feed, cut, tuple(volume_adaptive(p, SURE) for p in cut.plugs))


class FedCavityBeside:
    """The same, being made by another process with `apart`; where the core takes part of the feed, in this one.

    The rays of `ground` must have been used before: their library starts threads of its own at the first.
    """

    def __init__(self, halves: Halves, gate: GateLayout, ground: Ground, *, apart: bool) -> None:
        self._work = cache(lambda: fed_cavity(halves, gate, ground))
        self.in_core = gate.kind is GateKind.EDGE and not gate.in_cavity
        self._beside = Beside(self._packed) if apart and not self.in_core else None

    def _packed(self) -> tuple[FedCavity, bytes]:
        made = self._work()
        bare = replace(made, feed=replace(made.feed, in_cavity=None), cut=Cut(None, (), made.cut.refused))
        return bare, packed([made.cut.half, *made.cut.plugs])

    def result(self) -> FedCavity:
        """Return what was made; raises as `fed_cavity` does."""
        if self._beside is None:
            return self._work()
        bare, shapes = self._beside.result()
        half, *plugs = unpacked(shapes)
        return replace(bare, cut=replace(bare.cut, half=half, plugs=tuple(plugs)))

    def stop(self) -> None:
        """End the process that makes it."""
        if self._beside is not None:
            self._beside.stop()
