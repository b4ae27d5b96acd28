"""What the layout decides about pins and gate, as numbers; the steel is cut from these. Mold frame, mm."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from moldgen.model.part import Vector


class Chooser(StrEnum):
    """Who decided."""

    GIVEN = "given in the spec"
    MOLDGEN = "placed by moldgen"
    KEPT = "kept from the accepted layout"


@dataclass(frozen=True)
class BlockLayout:
    """The closed block around the part: lower and upper corner."""

    low: Vector
    high: Vector


@dataclass(frozen=True)
class EjectorPinLayout:
    """One ejector pin, parallel to the pull, straight or shouldered.

    x, y : axis; tip_z : highest z that the pin may reach on the core surface under its whole face
    diameter : nominal, of the standard series, at the tip; fit_length : guided length in the core below the part;
    clearance_diameter : bore below the fit; head_diameter, head_height; length : catalog length before cutting
    seat_z : lower face of the head, where it rests on the ejector plate while the mold is closed
    force_n : share of the ejection force; pressure_mpa : on the part; buckling_n : Euler load
    tip_drop : how far the core surface falls below tip_z within the pin's face; 0 for a flat tip
    shank_diameter, shank_length : of a shouldered pin, from its foot to the shoulder; 0 for a straight pin
    """

    name: str
    x: float
    y: float
    tip_z: float
    diameter: float
    fit_length: float
    clearance_diameter: float
    head_diameter: float
    head_height: float
    seat_z: float
    length: float
    force_n: float
    pressure_mpa: float
    buckling_n: float
    chosen_by: Chooser
    tip_drop: float = 0.0
    shank_diameter: float = 0.0
    shank_length: float = 0.0

    @property
    def shoulder_z(self) -> float:
        """Height of the shoulder while the mold is closed [mm]."""
        return self.seat_z + self.shank_length


@dataclass(frozen=True)
class CorePinLayout:
    """One core pin: the round core inside a hole of the part, made as a component with head, seat and fit.

    diameter : of the shank, at least the largest diameter of the hole; top_z : highest z of the pin's tip
    base_z : z where the hole's core meets the core's surface; blind : the hole has a floor
    """

    name: str
    x: float
    y: float
    top_z: float
    base_z: float
    diameter: float
    fit_length: float
    clearance_diameter: float
    head_diameter: float
    head_height: float
    slenderness: float
    blind: bool
    chosen_by: Chooser


class GateKind(StrEnum):
    """How the melt enters the cavity."""

    EDGE = "edge"
    PIN = "pin"
    SPRUE = "sprue"


@dataclass(frozen=True)
class GateLayout:
    """The one gate, and the feed to it.

    at : where the melt enters the part, on its surface; inward : horizontal unit vector into the part (edge gate)
    width, depth, land : of an edge gate; diameter : at the part, of a pin or sprue gate
    runner_diameter, runner_length : from the sprue to the edge gate's land; 0 for pin and sprue gates
    sprue_foot_diameter, sprue_taper_deg : the channel through the cavity block, taper per side. A sprue (also the one
        that feeds an edge gate, land + runner_length behind `at`) widens downward and has this diameter at its foot;
        the channel of a pin gate widens upward from `diameter`.
    in_cavity : the edge gate is cut into the cavity half, above the parting plane; False: into the core half
    """

    kind: GateKind
    at: Vector
    inward: Vector
    width: float
    depth: float
    land: float
    diameter: float
    runner_diameter: float
    runner_length: float
    sprue_foot_diameter: float
    sprue_taper_deg: float
    flow_length: float
    chosen_by: Chooser
    in_cavity: bool = True


@dataclass(frozen=True)
class Layout:
    """Everything bored or cut into the halves.

    cores_in_block : feet of the round cores that are part of the core block, on their axes
    """

    core_pins: tuple[CorePinLayout, ...]
    ejector_pins: tuple[EjectorPinLayout, ...]
    gate: GateLayout
    stroke_mm: float
    ejection_force_n: float
    cores_in_block: tuple[Vector, ...] = ()
