"""The tool: its components, and how each moves when the mold opens."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum

from moldgen.model.motion import Step
from moldgen.model.part import Solid, Vector


class Role(StrEnum):
    """What a component is, in the words of ISO 12165."""

    PART = "part"
    CAVITY = "cavity"
    CORE = "core"
    CORE_PIN = "core_pin"
    EJECTOR_PIN = "ejector_pin"
    SPRUE = "sprue"  # the solidified feed system, plastic
    SLIDE = "slide"  # steel that leaves the part sideways before it is ejected
    LIFTER = "lifter"  # steel that leaves the part sideways while it is ejected
    SIDE_CORE_PIN = "side_core_pin"  # a round core that a slide holds
    ANGLED_PIN = "angled_pin"  # drives a slide out while the mold opens
    LOCKING_BLOCK = "locking_block"  # holds a slide against the melt while the mold is closed
    GUIDE = "guide"  # what a slide or a lifter runs along


class Motion(StrEnum):
    """The groups of every mold that opens along +z: the core half is the one that stands still.

    A side action is a group of its own, named "slide 1", "lifter 2", ...
    """

    CAVITY_HALF = "cavity half"
    CORE_HALF = "core half"
    EJECTOR = "ejector"
    PART = "part"


@dataclass(frozen=True)
class Component:
    """One definition and every place where it stands in the mold.

    `solid` is in the definition's own frame; `positions` are the translations [mm] that put it into the mold (a
    component built in place has the single position 0, 0, 0). Identical components share one definition. `motion` is
    the group that it moves with: a `Motion`, or the name of a side action.
    """

    name: str
    role: Role
    solid: Solid
    material: str
    motion: str
    positions: tuple[Vector, ...] = ((0.0, 0.0, 0.0),)
    note: str = ""


@dataclass(frozen=True)
class Hole:
    """One row of the hole table: a bore in a component, axis parallel to the pull, mold coordinates [mm]."""

    component: str
    purpose: str
    x_mm: float
    y_mm: float
    z_from_mm: float
    z_to_mm: float
    diameter_mm: float
    fit: str = ""


@dataclass(frozen=True)
class Tool:
    """Everything that is exported, in mold coordinates (pull along +z) [mm], and the steps in which it opens."""

    components: tuple[Component, ...]
    holes: tuple[Hole, ...] = field(default=())
    steps: tuple[Step, ...] = ()

    def by_role(self, role: Role) -> tuple[Component, ...]:
        """Return the components of one role, in order."""
        return tuple(c for c in self.components if c.role is role)

    def only(self, role: Role) -> Component:
        """Return the single component of a role.

        Raises
        ------
        LookupError : there is none, or more than one
        """
        found = self.by_role(role)
        if len(found) != 1:
            raise LookupError(f"{len(found)} components with role {role}, expected one")
        return found[0]
