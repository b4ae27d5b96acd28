"""What an accepted layout asks to keep, in the mold frame [mm], each item where its feature stands now."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.finding import Finding, Notes, Point, Severity
from moldgen.model.layout import GateKind
from moldgen.model.part import Vector

MOST_MOVED: Final = 5.0
"""mm: how far a kept pin or gate is moved to a place that keeps the rules (our choice: about the head of a pin; what
would have to go farther is another pin)."""

REMEDY: Final = "accept the new layout with 'moldgen accept', or fix this item in the spec"


@dataclass(frozen=True)
class KeptItem:
    """A pin or round core. shift : how far its feature moved, in part coordinates; gone : the feature is no more.

    fit_end : mold z at which its fit ends and its bore widens, None if that is not known
    length : of an ejector pin on the market, 0 if not known
    """

    name: str
    at: Vector
    diameter: float
    shift: Vector = (0.0, 0.0, 0.0)
    gone: bool = False
    fit_end: float | None = None
    length: float = 0.0


@dataclass(frozen=True)
class KeptFeed:
    """The feed of a gate [mm]: runner of an edge gate, and foot of its sprue or of a direct one; 0: not known.

    stood : mold z of the foot when it was recorded: the sprue is narrower above it, wider below
    """

    runner: float = 0.0
    length: float = 0.0
    foot: float = 0.0
    stood: float = 0.0


@dataclass(frozen=True)
class KeptGate:
    """The gate. Sizes that its kind has not are 0.

    inward : unit vector in plan into the part, of an edge gate; None: not known
    """

    kind: GateKind
    at: Vector
    width: float = 0.0
    depth: float = 0.0
    land: float = 0.0
    diameter: float = 0.0
    shift: Vector = (0.0, 0.0, 0.0)
    gone: bool = False
    feed: KeptFeed = KeptFeed()
    inward: tuple[float, float] | None = None


@dataclass(frozen=True)
class Kept:
    """A whole layout.

    same_part : it was made for this very part: then a layout that moldgen finds again is taken to the last digit
    cores_in_block : round cores that are no pins
    pressure : highest of an ejector pin on the part when it was accepted [MPa], 0: not known
    given_pins, given_cores : pins of the spec, which stand where it places them now: how their holes are cut
    """

    ejector_pins: tuple[KeptItem, ...] = ()
    core_pins: tuple[KeptItem, ...] = ()
    cores_in_block: tuple[KeptItem, ...] = ()
    gate: KeptGate | None = None
    stroke: float = 0.0
    same_part: bool = False
    given_pins: tuple[KeptItem, ...] = ()
    given_cores: tuple[KeptItem, ...] = ()
    pressure: float = 0.0


@dataclass(frozen=True)
class Reason:
    """A rule that a place breaks: code, words, value against limit."""

    code: str
    text: str
    value: float | None = None
    limit: float | None = None
    unit: str = ""


def steps_around(step: float, within: float) -> np.ndarray:
    """Return the steps in plan from a place to those of a grid around it, itself first, then by distance, (k, 2) [mm].

    step : of the grid; within : largest distance from the place [mm]
    """
    count = int(within / step)
    steps = step * np.arange(-count, count + 1)
    ways = np.stack(np.meshgrid(steps, steps, indexing="ij"), axis=-1).reshape(-1, 2)
    far = np.round(np.linalg.norm(ways, axis=1), 6)
    order = np.lexsort((ways[:, 1], ways[:, 0], far))
    return np.asarray(ways[order[far[order] <= within]])


def followed(name: str, shift: Vector, at: Point) -> Notes:
    """Return the note that an item moved with its feature, if it did."""
    if max(map(abs, shift)) == 0.0:
        return Notes()
    way = ", ".join(f"{v:g}" for v in shift)
    return Notes(
        (
            Finding(
                "accepted.follows",
                Severity.NOTE,
                f"{name} follows the face that it belongs to, which moved by {way} mm",
                at=at,
            ),
        )
    )


def still_held(name: str, at: Point) -> Notes:
    """Return the note that an item stays although its feature is gone: what is there now bears it as well."""
    text = f"the face that {name} belongs to is gone; what is there now bears it as well, so it stays where it was"
    return Notes((Finding("accepted.face_gone", Severity.NOTE, text, at=at),))


def moved(name: str, by: float, reason: Reason, at: Point) -> Notes:
    """Return the finding that an item stands `by` mm from where it was accepted, and why."""
    text = f"{name} of the accepted layout is moved by {by:.2f} mm: {reason.text}"
    return Notes((_told("accepted.moved", text, reason, at),))


def dropped(name: str, reason: Reason, at: Point) -> Notes:
    """Return the finding that an item is not kept, and why."""
    return Notes((_told("accepted.dropped", f"{name} of the accepted layout is not kept: {reason.text}", reason, at),))


def _told(code: str, text: str, reason: Reason, at: Point) -> Finding:
    return Finding(
        code,
        Severity.CAUTION,
        text,
        where=reason.code,
        at=at,
        value=None if reason.value is None else round(reason.value, 3),
        limit=None if reason.limit is None else round(reason.limit, 3),
        unit=reason.unit,
        remedy=REMEDY,
    )


def free_name(role: str, taken: set[str]) -> str:
    """Return the first numbered name of a role after all that are taken, and enter it there.

    >>> free_name("core pin", {"core pin 1", "core pin 4"})
    'core pin 5'
    """
    numbers = [int(t) for t in (name.removeprefix(f"{role} ") for name in taken) if t.isdecimal()]
    name = f"{role} {max(numbers, default=0) + 1}"
    taken.add(name)
    return name
