"""Core pins of an accepted layout on the changed part: which round core is whose."""

from __future__ import annotations

import math
from dataclasses import dataclass

from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.carry_fits import SAME_HOLE
from moldgen.layout.kept import MOST_MOVED, REMEDY, KeptItem, Reason, dropped, followed, moved
from moldgen.layout.round_cores import RoundCore
from moldgen.layout.view import PartView
from moldgen.rules.layout_practice import STEEL_BETWEEN_BORES


@dataclass(frozen=True)
class Bore:
    """What must be kept clear under the part: axis, radius [mm], whose it is."""

    x: float
    y: float
    radius: float
    name: str


@dataclass(frozen=True)
class KeptCores:
    """Round cores of an accepted layout: those that are pins, those in the block, and the bores of kept ejectors.

    given : holes of pins that the spec gives
    """

    pins: tuple[KeptItem, ...] = ()
    in_block: tuple[KeptItem, ...] = ()
    ejectors: tuple[Bore, ...] = ()
    given: tuple[KeptItem, ...] = ()


@dataclass(frozen=True)
class Match:
    """Which of the round cores are accepted pins, by number, and which are to stay in the block."""

    pins: dict[int, KeptItem]
    in_block: frozenset[int]


def match_cores(view: PartView, cores: list[RoundCore], kept: KeptCores) -> tuple[Match, Notes]:
    """Return whose each round core is, with a finding for each accepted pin that moved or whose core is gone."""
    pins: dict[int, KeptItem] = {}
    in_block: set[int] = set()
    rest: list[KeptItem] = []
    notes = Notes()
    for item in kept.pins:
        found = _nearest(cores, item, set(pins), SAME_HOLE)
        if found is None:
            rest.append(item)
            continue
        pins[found] = item
        notes += followed(item.name, item.shift, view.place(item.at))
    for item in kept.in_block:
        found = _nearest(cores, item, {*pins, *in_block}, SAME_HOLE)
        if found is not None:
            in_block.add(found)
    for item in rest:
        taken = {*pins, *in_block}
        found = _nearest(cores, item, taken, MOST_MOVED)
        off = min((gap(c, item) for n, c in enumerate(cores) if n not in taken), default=None)
        if found is None:
            where = "there is none" if off is None else f"the nearest that is free is {off:.2f} mm away"
            text = f"the round core that it was is gone; {where}"
            notes += dropped(item.name, Reason("gone", text, off, MOST_MOVED, "mm"), view.place(item.at))
            continue
        pins[found] = item
        text = "no round core stands there any more, this is the nearest that is free"
        reason = Reason("gone", text, off, SAME_HOLE, "mm")
        notes += moved(item.name, gap(cores[found], item), reason, view.place(item.at))
    return Match(pins, frozenset(in_block)), notes


def _nearest(cores: list[RoundCore], item: KeptItem, taken: set[int], within: float) -> int | None:
    """Return the free core nearest to an item, at most `within` from its axis [mm]; of equals the one at its height."""
    free = [n for n, c in enumerate(cores) if n not in taken and gap(c, item) <= within]
    return min(free, key=lambda n: (round(gap(cores[n], item), 3), abs(cores[n].base_z - item.at[2])), default=None)


def gap(core: RoundCore, item: KeptItem) -> float:
    """Return how far the axis of a core is from that of an item [mm]."""
    return math.hypot(core.x - item.at[0], core.y - item.at[1])


def in_the_way(core: RoundCore, wide: float, ejectors: tuple[Bore, ...]) -> str:
    """Return which kept ejector pin a new core pin of a diameter over all [mm] would crowd; "" for none."""
    for bore in ejectors:
        steel = math.hypot(core.x - bore.x, core.y - bore.y) - wide / 2 - bore.radius
        if steel < STEEL_BETWEEN_BORES.default:
            return f"{steel:.2f} mm of steel to {bore.name}, which is kept"
    return ""


def resized(view: PartView, core: RoundCore, item: KeptItem, diameter: float) -> Notes:
    """Return the finding that a kept pin gets another diameter, if it does."""
    if math.isclose(diameter, item.diameter, abs_tol=1e-6):
        return Notes()
    finding = Finding(
        "accepted.resized",
        Severity.CAUTION,
        f"{item.name} gets a shank of {diameter:g} mm instead of {item.diameter:g} mm: its hole is now up to "
        f"{core.largest:.2f} mm wide",
        at=view.place((core.x, core.y, core.base_z)),
        value=round(diameter, 3),
        limit=round(item.diameter, 3),
        unit="mm",
        remedy=REMEDY,
    )
    return Notes((finding,))
