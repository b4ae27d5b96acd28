"""The gate of an accepted layout on the changed part: kept where it keeps the rules, else moved a little or left."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any, Final

import numpy as np

from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.gate_edge import edge_gate_near
from moldgen.layout.gate_task import Found, Task
from moldgen.layout.gate_top import top_gate_near
from moldgen.layout.kept import MOST_MOVED, REMEDY, KeptFeed, KeptGate, Reason, dropped, followed, moved
from moldgen.model.accepted import SNAP
from moldgen.model.layout import Chooser, GateKind, GateLayout
from moldgen.model.part import Vector
from moldgen.rules.filling import round_shear_rate, slot_shear_rate
from moldgen.rules.practice import SPRUE_TAPER

ON_LINE: Final = 0.05
"""mm: a point this close to the parting line of the mesh lies on it: half the sag of the mesh on round walls."""

TAPER: Final = math.tan(math.radians(SPRUE_TAPER.default))
"""How much a sprue widens on each side, by its length."""

MOVED: Final = "kind"
"""What is kept of a gate that is moved: its feed is another one."""

MOST_TURNED: Final = 5.0
"""deg: how far the way of a kept edge gate may lean from the square to the parting line (our choice: its mouth, a few
mm wide, then stands off the part by a few tenths of a mm at one end, which its land spans)."""

TOLD_TURN: Final = 0.1
"""deg: from here on it is told that a gate turned (our choice: 0.03 mm at the end of a usual runner)."""

SOURCE: Final = "the accepted layout"

SIZES: Final = {
    GateKind.EDGE: ("width", "depth", "land"),
    GateKind.PIN: ("diameter", "land"),
    GateKind.SPRUE: ("diameter",),
}


def yields(task: Task, kept: KeptGate) -> str:
    """Return why the spec has the accepted gate forgotten, "" if it does not."""
    if task.at is not None:
        return "the spec gives the place"
    if task.section.kind not in ("auto", kept.kind.value):
        return f"the spec asks for a gate of kind {task.section.kind}, the accepted one is of kind {kept.kind.value}"
    return ""


def found_again(gate: GateLayout, kept: KeptGate) -> bool:
    """Return whether a gate that was searched anew is the accepted one."""
    sizes = [abs(getattr(gate, name) - getattr(kept, name)) for name in SIZES[kept.kind]]
    sizes += [abs(now - then) for _, now, then in _feed(gate, kept.feed) if then > 0.0]
    if kept.inward is not None and gate.kind is GateKind.EDGE:
        sizes += [abs(a - b) for a, b in zip(gate.inward[:2], kept.inward, strict=True)]
    return gate.kind is kept.kind and max(*sizes, *(abs(a - b) for a, b in zip(gate.at, kept.at, strict=True))) < SNAP


def _feed(gate: GateLayout, feed: KeptFeed) -> list[tuple[str, float, float]]:
    """Return what belongs to the feed of an edge gate: name, as it is, as it was accepted [mm]."""
    if gate.kind is not GateKind.EDGE:
        return []
    return [
        ("diameter of the runner", gate.runner_diameter, feed.runner),
        ("length of the runner", gate.runner_length, feed.length),
        ("foot of the sprue", gate.sprue_foot_diameter, feed.foot),
    ]


def carry_gate(task: Task, kept: KeptGate) -> tuple[Found | None, Notes]:
    """Return the accepted gate as far as it can stay, None where it cannot, with the reason.

    Its sizes stay too, those of the spec aside; where the mouth has no room for them or the melt would shear too much,
    those of the rules are taken.
    """
    at = task.view.place(kept.at)
    notes = followed("the gate", kept.shift, at)
    task = replace(task, feed=_foot_at(kept, task.view.level))
    sized, plain = _sized(task, kept), replace(task, section=task.section.model_copy(update={"kind": kept.kind.value}))
    here, free = _at(sized, kept, 0.0), _at(plain, kept, 0.0)
    sized, here = _cone(task, kept, (sized, here))
    size = _size_trouble(sized, plain, here, free)
    if not here.broken and size is None:
        notes += _turned(task, here, kept)
        return _as_accepted(task, here, kept), notes + _kept(task, here, "place and size")
    if not free.broken:
        reason = size or Reason("gate", "; ".join(here.broken))
        notes += _resized(task, free, kept, reason) + _turned(task, free, kept)
        return free, notes + _kept(task, free, "place")
    reason = Reason("gate", "; ".join(here.broken or free.broken))
    if kept.gone:
        reason = replace(reason, text=f"the face that it stood on is gone; {reason.text}")
    for other in (_at(sized, kept, MOST_MOVED), _at(plain, kept, MOST_MOVED)):
        if not other.broken:
            off = math.dist(other.gate.at[:2], kept.at[:2])
            return _as_accepted(task, other, kept), notes + moved("the gate", off, reason, at) + _kept(
                task, other, MOVED
            )
    return None, dropped("the gate", reason, at)


def _sized(task: Task, kept: KeptGate) -> Task:
    """Return the task with the accepted sizes, as far as the spec gives none."""
    update: dict[str, Any] = {"kind": kept.kind.value}
    for name in SIZES[kept.kind]:
        if getattr(task.section, name) is None and getattr(kept, name) > 0.0:
            update[name] = getattr(kept, name)
    return replace(task, section=task.section.model_copy(update=update))


def _at(task: Task, kept: KeptGate, within: float) -> Found:
    place = np.array(kept.at)
    if kept.kind is not GateKind.EDGE:
        return top_gate_near(task, kept.kind, place, within)
    found = edge_gate_near(task, place, within)
    if within == 0.0:
        found = _as_it_looked(task, kept, found)
    off = math.dist(found.gate.at[:2], kept.at[:2])
    if off < ON_LINE:
        spot: Vector = (kept.at[0], kept.at[1], found.gate.at[2])
        return replace(found, gate=replace(found.gate, at=spot))
    if within == 0.0 or off > MOST_MOVED:
        return replace(found, broken=(f"the parting line runs {off:.2f} mm beside it", *found.broken))
    return found


def _as_it_looked(task: Task, kept: KeptGate, square: Found) -> Found:
    """Return the gate at its place with the accepted way into the part, where the rules hold with it as well.

    square : the gate square to the parting line. That of a mesh leans by tenths of a degree where the part changes
    elsewhere, and with it runner and sprue would stand elsewhere.
    """
    if kept.inward is None or not 0.0 < _turn(square.gate, kept) <= MOST_TURNED:
        return square
    found = edge_gate_near(task, np.array(kept.at), 0.0, kept.inward)
    smaller = found.gate.width < square.gate.width or found.gate.depth < square.gate.depth
    return square if found.broken or smaller else found


def _turn(gate: GateLayout, kept: KeptGate) -> float:
    """Return by how much the way of an edge gate turned from the accepted one [deg], 0 where that is not known."""
    if kept.inward is None or gate.kind is not GateKind.EDGE:
        return 0.0
    (x, y), (a, b) = kept.inward, gate.inward[:2]
    return abs(math.degrees(math.atan2(x * b - y * a, x * a + y * b)))


def _turned(task: Task, found: Found, kept: KeptGate) -> Notes:
    """Return the finding that the gate keeps its place, but not its way into the part."""
    turn = _turn(found.gate, kept)
    if turn <= TOLD_TURN:
        return Notes()
    far = turn > MOST_TURNED
    why = "it would lean too far from the square to the parting line" if far else "its old way breaks rules of the gate"
    finding = Finding(
        "accepted.turned",
        Severity.CAUTION,
        f"the gate of the accepted layout is turned by {turn:.1f} deg: {why}",
        where="gate",
        at=task.view.place(found.gate.at),
        value=round(turn, 3),
        limit=MOST_TURNED if far else None,
        unit="deg",
        remedy=REMEDY,
    )
    return Notes((finding,))


def _size_trouble(sized: Task, plain: Task, here: Found, free: Found) -> Reason | None:
    """Return whether the accepted sizes shear the melt more than it bears, and the rules' sizes less."""
    if here.broken or sized.section == plain.section:
        return None
    limit, own, other = sized.resin.shear_limit, _shear(sized, here.gate), _shear(plain, free.gate)
    if own <= limit * (1.0 + 1e-6) or other >= own * 0.999:
        return None
    return Reason("shear", f"the melt would shear in it with {own:.0f} 1/s", own, limit, "1/s")


def _shear(task: Task, gate: GateLayout) -> float:
    if gate.kind is GateKind.EDGE:
        return float(slot_shear_rate(task.melt.rate, gate.width, gate.depth))
    return float(round_shear_rate(task.melt.rate, gate.diameter))


def _as_accepted(task: Task, found: Found, kept: KeptGate) -> Found:
    """Return the gate with the accepted sizes told as such: they were handed on as if the spec gave them."""
    keys = {f"gate.{name}" for name in SIZES[kept.kind] if getattr(task.section, name) is None}
    lines = tuple(replace(q, source=SOURCE) if q.source in keys else q for q in found.notes.quantities)
    return replace(found, notes=replace(found.notes, quantities=lines))


def _kept(task: Task, found: Found, what: str) -> Notes:
    place = ", ".join(f"{v + 0.0:g}" for v in task.view.place(found.gate.at))
    text = f"{found.gate.kind.value} gate at {place}"
    here = () if task.feed is None or what == MOVED else _feed(found.gate, task.feed)
    told = (_other_feed(task, found, *one) for one in here)
    return Notes(
        tuple(f for f in told if f is not None),
        decisions=(Decision("gate", text, f"{Chooser.KEPT.value}: {what}"),),
    )


def _other_feed(task: Task, found: Found, name: str, now: float, then: float) -> Finding | None:
    """Return the finding that a size of the feed is not what it was, None if it is or was not recorded."""
    if then <= 0.0 or abs(now - then) <= SNAP:
        return None
    return Finding(
        "accepted.resized",
        Severity.CAUTION,
        f"the {name} becomes {now:.2f} mm instead of {then:.2f} mm: "
        + ("there is no room for it" if name.startswith("length") else "for this part and block the rules ask for it"),
        where="gate",
        at=task.view.place(found.gate.at),
        value=round(then, 3),
        limit=round(now, 3),
        unit="mm",
        remedy=REMEDY,
    )


def _foot_at(kept: KeptGate, level: float) -> KeptFeed:
    """Return the feed with the diameter that its sprue, as it is cut, has at a height [mm]."""
    feed = kept.feed
    if feed.foot <= 0.0 or abs(level - feed.stood) <= SNAP:
        return feed
    return replace(feed, foot=feed.foot + 2 * (feed.stood - level) * TAPER, stood=level)


def _cone(task: Task, kept: KeptGate, own: tuple[Task, Found]) -> tuple[Task, Found]:
    """Return the task and gate of a direct sprue whose cone stays where the part now ends lower: its foot is wider.

    own : with the accepted foot. A cone that would end in a narrower foot is cut wider instead: no steel is missing.
    """
    if kept.kind is not GateKind.SPRUE or task.section.diameter is not None or own[1].broken:
        return own
    foot = _foot_at(kept, own[1].gate.at[2]).foot
    if foot <= kept.diameter + SNAP:
        return own
    sized = replace(own[0], section=own[0].section.model_copy(update={"diameter": foot}))
    found = _at(sized, kept, 0.0)
    worse = {f.code for f in found.notes.findings} - {f.code for f in own[1].notes.findings}
    return own if found.broken or worse else (sized, found)


def _resized(task: Task, found: Found, kept: KeptGate, reason: Reason) -> Notes:
    def told(item: GateLayout | KeptGate) -> str:
        return f"{item.width:g} x {item.depth:g}" if kept.kind is GateKind.EDGE else f"{item.diameter:g}"

    finding = Finding(
        "accepted.resized",
        Severity.CAUTION,
        f"the gate becomes {told(found.gate)} mm instead of {told(kept)} mm: {reason.text}",
        where="gate",
        at=task.view.place(found.gate.at),
        value=reason.value,
        limit=reason.limit,
        unit=reason.unit,
        remedy=REMEDY,
    )
    return Notes((finding,))
