"""An accepted layout: what the next build keeps wherever the changed part allows it. Part coordinates, mm."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from moldgen.model.face_sign import FaceSign
from moldgen.model.layout import GateKind
from moldgen.model.part import Vector
from moldgen.model.side_action import SideKind

FORMAT: Final = 1
"""Version of the file in which it is written."""

PLACE_DIGITS: Final = 9
"""Decimals of places and sizes: files are written and read back without moving anything that steel shows."""

SNAP: Final = 2e-6
"""mm: what was accepted and what was worked out anew are the same within this: older files have six decimals."""


@dataclass(frozen=True)
class AcceptedPin:
    """One ejector pin. at : the middle of its end face; length : from the catalog, before cutting.

    feature : the face that it pushes on; None if nothing is known of it, then it stays where it is
    fit_end : height along the pull at which its fit ends and the bore widens; None if it is not recorded
    """

    name: str
    at: Vector
    diameter: float
    length: float
    feature: FaceSign | None = None
    fit_end: float | None = None


@dataclass(frozen=True)
class AcceptedCore:
    """One round core. at : on its axis, at its foot; diameter : of its pin's shank, 0 where it is part of the block.

    fit_end : as of an ejector pin
    """

    name: str
    at: Vector
    diameter: float
    feature: FaceSign | None = None
    fit_end: float | None = None


@dataclass(frozen=True)
class AcceptedGate:
    """The gate: its kind, where it opens into the part, and its sizes; those that its kind has not are 0.

    runner_diameter, runner_length, sprue_foot : of the feed of an edge gate; 0 where they are not recorded
    inward : unit vector square to the pull, into the part, of an edge gate; None where it is not recorded
    """

    kind: GateKind
    at: Vector
    width: float
    depth: float
    land: float
    diameter: float
    feature: FaceSign | None = None
    runner_diameter: float = 0.0
    runner_length: float = 0.0
    sprue_foot: float = 0.0
    inward: Vector | None = None


@dataclass(frozen=True)
class AcceptedSide:
    """One side action. direction : unit vector along which it releases: of a lifter, square to the pull."""

    name: str
    kind: SideKind
    direction: Vector


@dataclass(frozen=True)
class AcceptedBlocks:
    """The closed block. at : its middle in plan, in the parting plane; the sizes are those of the steel."""

    at: Vector
    length: float
    width: float
    cavity_height: float
    core_height: float


@dataclass(frozen=True)
class Accepted:
    """A whole layout.

    part_sha256 : of the part that it was made for
    pull : unit vector; fixed_point : of the shrink; parting_height : part coordinate along the pull
    cores_in_block : round cores that stay in the core block; stroke : travel of the ejectors
    pressure : highest of an ejector pin on the part [MPa], 0 where it is not recorded
    given_pins, given_cores : pins that the spec places: only what their holes and the pins bought for them are
    """

    name: str
    part_sha256: str
    pull: Vector
    fixed_point: Vector
    parting_height: float
    blocks: AcceptedBlocks
    gate: AcceptedGate
    stroke: float
    ejector_pins: tuple[AcceptedPin, ...] = ()
    core_pins: tuple[AcceptedCore, ...] = ()
    cores_in_block: tuple[AcceptedCore, ...] = ()
    side_actions: tuple[AcceptedSide, ...] = ()
    given_pins: tuple[AcceptedPin, ...] = ()
    given_cores: tuple[AcceptedCore, ...] = ()
    pressure: float = 0.0
