"""Pins, gate and block of a tool as single things with a place, a size and a box."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from moldgen.model.part import Box, Vector
from moldgen.model.revision import ItemChange
from moldgen.revision.placing import Placing
from moldgen.revision.tool_record import ToolRecord

SAME_PLACE = 1e-3
"""mm: what stands this near to its old place did not move. Our choice, a fifth of a jig borer's 0.005 mm."""

SAME_PIN = 0.05
"""mm: pins whose axes are this near are one pin, whatever their sizes (our choice)."""

MOST_MOVED = 15.0
"""mm: a pin farther away is another pin, not this one moved (our choice: about the pitch of pins on a small part)."""

MOST_TURNED = 0.1
"""deg: an edge gate that looks this near to its old way did not turn (our choice: 0.03 mm at the end of a runner)."""

BLOCK = "block"
"""Kind of the closed block: its size is told along the axes of the mold."""


@dataclass(frozen=True)
class Item:
    """One thing of a layout in the mold [mm]: a point of it, its sizes in words, the box of the steel it needs.

    way : unit vector along which an edge gate enters the part; None of everything else
    """

    kind: str
    name: str
    at: Vector
    size: str
    box: Box
    way: Vector | None = None

    def placed(self, placing: Placing) -> Item:
        """Return the thing where the old tool stands in the new mold."""
        box = placing.box(self.box)
        size = _box_size(box) if self.kind == BLOCK and placing.square else self.size
        way = None if self.way is None else placing.way(self.way)
        return replace(self, at=placing.point(self.at), box=box, size=size, way=way)


@dataclass(frozen=True)
class ItemPair:
    """One thing in the old tool, placed, and in the new one; None where it has none."""

    old: Item | None
    new: Item | None

    @property
    def either(self) -> Item:
        """The new one, else the old one."""
        found = self.new or self.old
        if found is None:
            raise LookupError("a pair of nothing")
        return found

    @property
    def shift(self) -> Vector | None:
        """How far it moved [mm], None if it came or went."""
        if self.old is None or self.new is None:
            return None
        x, y, z = (b - a for a, b in zip(self.old.at, self.new.at, strict=True))
        return (x, y, z)

    @property
    def same(self) -> bool:
        """True when neither place nor size changed, nor the way of an edge gate."""
        still = self.shift is not None and max(map(abs, self.shift)) <= SAME_PLACE
        same_size = self.old is not None and self.new is not None and self.old.size == self.new.size
        return still and same_size and self.turn <= MOST_TURNED

    @property
    def turn(self) -> float:
        """By how much the way of an edge gate turned [deg]; 0 of everything else."""
        if self.old is None or self.new is None or self.old.way is None or self.new.way is None:
            return 0.0
        across = float(np.linalg.norm(np.cross(self.old.way, self.new.way)))
        return math.degrees(math.atan2(across, float(np.dot(self.old.way, self.new.way))))

    def change(self) -> ItemChange:
        """Return what is told of it."""
        old, new, shift = self.old, self.new, self.shift
        if shift is None:
            note = "new" if old is None else "no longer there"
        elif max(abs(shift[0]), abs(shift[1])) <= SAME_PLACE < abs(shift[2]):
            note = f"its end is {abs(shift[2]):.3f} mm {'higher' if shift[2] > 0 else 'lower'}"
        elif max(map(abs, shift)) > SAME_PLACE:
            note = f"moved by {float(np.linalg.norm(shift)):.3f} mm"
        elif old is not None and new is not None and old.size == new.size:
            note = ""
        else:
            note = "other size"
        if self.turn > MOST_TURNED:
            note += f"{', ' if note else ''}turned by {self.turn:.1f} deg"
        return ItemChange(
            self.either.kind,
            self.either.name,
            old.at if old else None,
            new.at if new else None,
            old.size if old else "",
            new.size if new else "",
            note,
        )


def items_of(tool: ToolRecord) -> tuple[Item, ...]:
    """Return everything of a tool's layout that has a place."""
    layout = tool.record["layout"]
    low, high = tool.block
    found = [_ejector_pin(p) for p in layout["ejector_pins"]]
    found += [_core_pin(p, low[2]) for p in layout["core_pins"]]
    found.append(_gate(layout["gate"], high[2]))
    middle = (0.5 * (low[0] + high[0]), 0.5 * (low[1] + high[1]), low[2])
    return (*found, Item(BLOCK, "closed block", middle, _box_size(tool.block), tool.block))


def _box_size(box: Box) -> str:
    return " x ".join(f"{round(b - a, 3):g}" for a, b in zip(*box, strict=True)) + " mm"


def paired_items(old: ToolRecord, new: ToolRecord, placing: Placing) -> tuple[ItemPair, ...]:
    """Return all things of both tools, those that are the same together: equal place first, then the nearest."""
    before = [i.placed(placing) for i in items_of(old)]
    after = list(items_of(new))
    pairs: list[ItemPair] = []
    for reach in (SAME_PIN, MOST_MOVED):
        for gap, one, other in sorted(_gaps(before, after), key=lambda g: g[0]):
            if one in before and other in after and (gap <= reach or one.kind in ("gate", BLOCK)):
                pairs.append(ItemPair(one, other))
                before.remove(one)
                after.remove(other)
    pairs += [ItemPair(None, i) for i in after] + [ItemPair(i, None) for i in before]
    names = dict.fromkeys(i.name for i in (*items_of(new), *items_of(old)))
    order = {name: n for n, name in enumerate(names)}
    return tuple(sorted(pairs, key=lambda p: (p.new is None, order[p.either.name], p.either.at)))


def _gaps(before: Sequence[Item], after: Sequence[Item]) -> list[tuple[float, Item, Item]]:
    return [
        (float(np.hypot(a.at[0] - b.at[0], a.at[1] - b.at[1])), a, b) for a in before for b in after if a.kind == b.kind
    ]


def _ejector_pin(pin: Mapping[str, Any]) -> Item:
    x, y, diameter = float(pin["x"]), float(pin["y"]), float(pin["diameter"])
    shank = float(pin.get("shank_diameter", 0.0))
    size = f"d {diameter:g} mm" + (f", shank d {shank:g} mm" if shank else "")
    at = (x, y, float(pin["tip_z"]))
    return Item("ejector pin", str(pin["name"]), at, size, _round(pin, float(pin["seat_z"]), "tip_z"))


def _core_pin(pin: Mapping[str, Any], foot: float) -> Item:
    at = (float(pin["x"]), float(pin["y"]), float(pin["top_z"]))
    return Item("core pin", str(pin["name"]), at, f"d {float(pin['diameter']):g} mm", _round(pin, foot, "top_z"))


def _round(pin: Mapping[str, Any], foot: float, top: str) -> Box:
    """Return the box round a pin with head and clearance."""
    radius = 0.5 * max(float(pin[k]) for k in ("diameter", "clearance_diameter", "head_diameter")) + 0.3
    x, y = float(pin["x"]), float(pin["y"])
    return (x - radius, y - radius, foot), (x + radius, y + radius, float(pin[top]) + 0.1)


def _gate(gate: Mapping[str, Any], top: float) -> Item:
    x, y, z = (float(v) for v in gate["at"])
    kind = str(gate["kind"])
    if kind == "edge":
        size = f"{gate['width']:g} x {gate['depth']:g} mm, runner d {gate['runner_diameter']:g} mm"
    else:
        size = f"d {gate['diameter']:g} mm"
    back = float(gate["land"]) + float(gate["runner_length"])
    end = (x - back * float(gate["inward"][0]), y - back * float(gate["inward"][1]))
    foot = 0.5 * max(float(gate["sprue_foot_diameter"]), float(gate["runner_diameter"]), float(gate["diameter"])) + 1.0
    deep = max(float(gate["runner_diameter"]), float(gate["depth"])) + 0.5
    low = (min(x, end[0]) - foot, min(y, end[1]) - foot, z - deep)
    high = (max(x, end[0]) + foot, max(y, end[1]) + foot, top + 0.1)
    way = tuple(float(v) for v in gate["inward"]) if kind == "edge" else None
    return Item("gate", f"{kind} gate", (x, y, z), size, (low, high), way)  # type: ignore[arg-type]
