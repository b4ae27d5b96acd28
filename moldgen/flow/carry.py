"""An accepted layout brought to the part as it is now: what each stage of a build may take of it."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np

from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.flow.carry_pull import KEPT, SAME_WAY
from moldgen.flow.review import Reviewed
from moldgen.flow.side_plan import turned_back
from moldgen.flow.words import direction_text
from moldgen.kernel.face_again import find_again
from moldgen.kernel.face_signature import PartSigns, part_signs
from moldgen.layout.carry_block import KeptBlock
from moldgen.layout.kept import REMEDY, Kept, KeptFeed, KeptGate, KeptItem
from moldgen.model.accepted import SNAP, Accepted, AcceptedBlocks, AcceptedCore, AcceptedPin
from moldgen.model.face_sign import AXIS_DIGITS, FaceSign
from moldgen.model.halves import Halves
from moldgen.model.part import MoldFrame, Vector
from moldgen.model.side_action import SideKind
from moldgen.parting.halves import Parted

ALIKE = 0.985
"""Cosine (10 deg) from which a side action counts as an accepted one that turned (our choice)."""


PLAN = 0.5
"""Share of the way of a gate into the part that must lie in plan: what is edited to point along the pull is no way
(our choice)."""


def kept_layout(reviewed: Reviewed) -> tuple[Kept | None, Notes]:
    """Return pins and gate of the accepted layout in the mold frame, each where its feature is now.

    None without an accepted layout, and where the tool opens another way: then nothing of it fits.
    """
    accepted = reviewed.accepted
    if accepted is None:
        return None, Notes()
    if not _same_pull(reviewed, accepted):
        why = f"the tool opens along {direction_text(reviewed.pull.direction)}, the accepted one along "
        why += direction_text(accepted.pull)
        return None, Notes(decisions=(Decision("accepted layout", "nothing is kept", why),))
    same = reviewed.part.source_sha256 == accepted.part_sha256
    notes = Notes()
    find: _Find = _stays
    if not same:
        try:
            find = _finder(part_signs(reviewed.part.solid))
        except KernelError as error:
            why = f"the faces of the part cannot be read, so every item stays where it was: {error.what}"
            notes += Notes(decisions=(Decision("accepted layout", "features are not followed", why),))
    frame = reviewed.frame
    kept = Kept(
        ejector_pins=tuple(_item(p, accepted, frame, find) for p in accepted.ejector_pins),
        core_pins=tuple(_item(c, accepted, frame, find) for c in accepted.core_pins),
        cores_in_block=tuple(_item(c, accepted, frame, find) for c in accepted.cores_in_block),
        given_pins=tuple(_item(p, accepted, frame, _stays) for p in accepted.given_pins),
        given_cores=tuple(_item(c, accepted, frame, _stays) for c in accepted.given_cores),
        gate=_gate(accepted, frame, find),
        stroke=accepted.stroke,
        pressure=accepted.pressure,
        same_part=same,
    )
    return kept, notes


_Find = Callable[[FaceSign | None, Vector], tuple[Vector, bool]]
"""From a feature and the place on it to how far it moved [mm] and whether it is gone."""


def _stays(_sign: FaceSign | None, _at: Vector) -> tuple[Vector, bool]:
    return (0.0, 0.0, 0.0), False


def _finder(part: PartSigns) -> _Find:
    def find(sign: FaceSign | None, at: Vector) -> tuple[Vector, bool]:
        if sign is None:
            return _stays(sign, at)
        again = find_again(sign, part, near=at)
        if again is None:
            return (0.0, 0.0, 0.0), True
        x, y, z = (round(v, 6) + 0.0 for v in again.shift)  # the accepted place is known to six decimals
        return (x, y, z), False

    return find


def _moved(at: Vector, shift: Vector) -> Vector:
    x, y, z = (a + s for a, s in zip(at, shift, strict=True))
    return (x, y, z)


def _item(item: AcceptedPin | AcceptedCore, accepted: Accepted, frame: MoldFrame, find: _Find) -> KeptItem:
    shift, gone = find(item.feature, item.at)
    at, shift = _placed(item.at, shift, frame)
    end = None if item.fit_end is None else frame.mold_height(accepted.pull, item.fit_end)
    length = item.length if isinstance(item, AcceptedPin) else 0.0
    return KeptItem(item.name, at, item.diameter, shift, gone, end, length)


def _placed(at: Vector, shift: Vector, frame: MoldFrame) -> tuple[Vector, Vector]:
    """Return where a place is in the mold now, and its shift as far as it counts: along the pull nothing moves."""
    then, now = frame.to_mold(at), frame.to_mold(_moved(at, shift))
    in_plan = max(abs(a - b) for a, b in zip(then[:2], now[:2], strict=True))
    return now, shift if in_plan > SNAP else (0.0, 0.0, 0.0)


def _gate(accepted: Accepted, frame: MoldFrame, find: _Find) -> KeptGate:
    gate = accepted.gate
    shift, gone = find(gate.feature, gate.at)
    stood = frame.to_mold(gate.at)[2]
    at, shift = _placed(gate.at, shift, frame)
    feed = KeptFeed(gate.runner_diameter, gate.runner_length, gate.sprue_foot or gate.diameter, stood)
    inward = None if gate.inward is None else _inward(gate.inward, frame)
    return KeptGate(gate.kind, at, gate.width, gate.depth, gate.land, gate.diameter, shift, gone, feed, inward)


def _inward(direction: Vector, frame: MoldFrame) -> tuple[float, float] | None:
    """Return a direction of the part in the mold's plan; steel does not shrink, so it only turns. None: along the pull.

    In the digits in which it is written, so that it stays to the last one from one accepted layout to the next.
    """
    x, y, _ = (float(v) for v in np.array(frame.rotation) @ np.array(direction))
    length = math.hypot(x, y)
    if length < PLAN:
        return None
    return round(x / length, AXIS_DIGITS) + 0.0, round(y / length, AXIS_DIGITS) + 0.0


# --- parting, blocks, side actions -----------------------------------------------------------------------------------
def _same_pull(reviewed: Reviewed, accepted: Accepted) -> bool:
    return float(np.dot(reviewed.pull.direction, accepted.pull)) >= 1.0 - SAME_WAY


def block_of(accepted: Accepted | None) -> tuple[Vector, float, AcceptedBlocks] | None:
    """Return what of an accepted layout parting and blocks depend on: pull, height of the parting plane, block."""
    return None if accepted is None else (accepted.pull, accepted.parting_height, accepted.blocks)


def accepted_level(reviewed: Reviewed) -> float | None:
    """Return the height of the accepted parting plane in the mold [mm].

    None without an accepted layout along this pull, or where the spec gives the height.
    """
    accepted = reviewed.accepted
    if accepted is None or reviewed.loaded.spec.parting.height is not None or not _same_pull(reviewed, accepted):
        return None
    return reviewed.frame.mold_height(accepted.pull, accepted.parting_height)


def at_accepted_level(reviewed: Reviewed, free: Parted, part_at: Callable[[float], Parted]) -> tuple[Parted, Notes]:
    """Return the halves parted at the accepted height where that works, else `free`, and why.

    free : parted as the part alone suggests; part_at : parts at a height of the mold [mm]
    """
    level = accepted_level(reviewed)
    if level is None or abs(free.level - level) <= SNAP:
        return free, Notes()
    try:
        parted = part_at(level)
    except (PartError, KernelError) as error:
        why = error.what.split("\n")[0]
    else:
        off = abs(parted.level - level)
        if off <= SNAP and (parted.check.proved or not free.check.proved):
            decision = Decision("parting height", f"{level:.3f} mm (mold)", KEPT)
            return replace(parted, asked=None), Notes(decisions=(decision,))
        why = f"the parting line settles {off:.3f} mm from it" if off > SNAP else parted.check.complaint
    finding = Finding(
        "accepted.parting_moved",
        Severity.CAUTION,
        f"the mold no longer parts at the accepted height, it parts {free.level - level:+.3f} mm from it: {why}",
        where="parting.height",
        value=round(free.level, 3),
        limit=round(level, 3),
        unit="mm",
        remedy=REMEDY,
    )
    return free, Notes((finding,))


def accepted_block(reviewed: Reviewed) -> KeptBlock | None:
    """Return the accepted block in the mold frame, None without an accepted layout along this pull."""
    accepted = reviewed.accepted
    if accepted is None or not _same_pull(reviewed, accepted):
        return None
    block = accepted.blocks
    x, y, _ = reviewed.frame.to_mold(block.at)
    z = reviewed.frame.mold_height(accepted.pull, accepted.parting_height)
    return KeptBlock((x, y, z), block.length, block.width, block.cavity_height, block.core_height)


def compare_sides(reviewed: Reviewed, halves: Halves) -> Notes:
    """Return which side actions are those of the accepted layout, which turned, which are new and which are gone."""
    accepted = reviewed.accepted
    if accepted is None or not _same_pull(reviewed, accepted) or not (accepted.side_actions or halves.sides):
        return Notes()
    left = list(accepted.side_actions)
    told = []
    for side in halves.sides:
        front = side.front
        release = front.release if front.kind is SideKind.LIFTER else front.axis
        way = turned_back(reviewed.frame, release)
        near = [one for one in left if one.kind is front.kind and float(np.dot(one.direction, way)) >= ALIKE]
        best = max(
            near, key=lambda one: (round(float(np.dot(one.direction, way)), 9), one.name == side.name), default=None
        )
        text = f"{side.name} along {direction_text(way)}"
        if best is None:
            told.append(f"{text} is new")
            continue
        left.remove(best)
        turned = float(np.dot(best.direction, way)) < 1.0 - 1e-6
        was = f"turned from {direction_text(best.direction)}" if turned else "as accepted"
        told.append(f"{text} {was}" + ("" if best.name == side.name else f" ({best.name})"))
    told += [f"{one.name} along {direction_text(one.direction)} is gone" for one in left]
    why = "side actions follow the undercuts of the part; by kind and direction"
    return Notes(decisions=(Decision("side actions kept", "; ".join(told), why),))
