"""A tool as an output folder holds it: its components with their STEP files, and what its manifest says."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

from moldgen.canon import sha256_file
from moldgen.errors import PartError, SpecError
from moldgen.kernel.place import to_part
from moldgen.kernel.step_read import read_assembly
from moldgen.model.part import Box, MoldFrame, Vector, vector
from moldgen.model.tool import Role

SAME_AXIS = 1e-4
"""mm: a pin of the layout whose axis is this near to a component is that component."""

PIN_ROLES = ("ejector_pin", "core_pin")
"""Roles whose copies have names of their own in the layout."""


@dataclass(frozen=True, eq=False)
class SteelPart:
    """One component of a tool: its solid in its own frame is read when it is first asked for."""

    name: str
    role: Role
    material: str
    positions: tuple[Vector, ...]
    file: Path

    @cached_property
    def digest(self) -> str:
        """SHA-256 of its file."""
        return sha256_file(self.file)

    @cached_property
    def solid(self) -> Any:
        """The solid.

        Raises
        ------
        PartError : the file is missing, damaged, or does not hold one solid
        """
        found = read_assembly(self.file)
        if len(found) != 1:
            what = f"{self.file.name} holds {len(found)} solids, expected one"
            raise PartError(what, where=str(self.file), remedy="build the tool again")
        return found[0][1]


@dataclass(frozen=True, eq=False)
class ToolRecord:
    """One output folder. `record` is its manifest; `block` the closed block in its mold frame [mm]."""

    name: str
    record: Mapping[str, Any]
    frame: MoldFrame
    block: Box
    components: tuple[SteelPart, ...] = field(default=())

    def pin_at(self, part: SteelPart, number: int) -> str:
        """Return what the layout calls the copy of a component that stands at its place `number`, counted from 1."""
        x, y, _ = part.positions[number - 1]
        for pin in (*self.record["layout"]["ejector_pins"], *self.record["layout"]["core_pins"]):
            if math.hypot(float(pin["x"]) - x, float(pin["y"]) - y) < SAME_AXIS and part.role.value in PIN_ROLES:
                return str(pin["name"])
        return part.name if len(part.positions) == 1 else f"{part.name} {number}"

    def part_solid(self) -> Any:
        """Return the plastic part in its own coordinates, before shrink.

        Raises
        ------
        PartError : there is none, or its file is damaged
        """
        for component in self.components:
            if component.role is Role.PART:
                return to_part(component.solid, self.frame)
        raise PartError("the tool holds no part", where=self.name, remedy="build the tool again")


def tool_record(folder: Path, record: Mapping[str, Any]) -> ToolRecord:
    """Return the tool of an output folder from its manifest; no STEP file is read yet.

    Raises
    ------
    SpecError : the manifest lacks something
    """
    try:
        shrink, pull = record["shrink"], record["pull"]
        a, b, c = (vector(row) for row in pull["part_to_mold_rotation"])
        frame = MoldFrame(
            (float(shrink["x"]), float(shrink["y"]), float(shrink["z"])), vector(shrink["fixed_point_mm"]), (a, b, c)
        )
        low, high = record["parting"]["block_mm"]
        components = tuple(
            SteelPart(
                str(c["name"]),
                Role(c["role"]),
                str(c["material"]),
                tuple(vector(p) for p in c["positions"]),
                folder / str(c["file"]),
            )
            for c in record["components"]
        )
        name = str(record["part"]["name"])
        for key in ("ejector_pins", "core_pins", "gate"):
            _ = record["layout"][key]
    except (KeyError, TypeError, ValueError) as error:
        what = f"the manifest lacks what a comparison needs: {error!r}"
        raise SpecError(what, where=str(folder), remedy="build the tool again with this version") from error
    return ToolRecord(name, record, frame, (vector(low), vector(high)), components)
