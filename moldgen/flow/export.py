"""Everything that is written of a tool besides manifest and pictures: STEP files and tables."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from pathlib import Path

from moldgen.canon import sha256_bytes
from moldgen.flow.record import component_files
from moldgen.flow.reread import TOOL_FILE, Entry, read_bodies
from moldgen.kernel.beside import Beside
from moldgen.kernel.step_write import Looks, StepExport
from moldgen.memory import Memory
from moldgen.model.tool import Tool
from moldgen.output.palette import ROLES
from moldgen.output.tables import holes_csv, parts_list_csv
from moldgen.proof.bodies import ProofBody

PARTS_LIST, HOLES = "parts_list.csv", "holes.csv"

CLEAR_ROLES = {"cavity": 0.55}
"""Share of light that passes a role in the STEP file: one looks through the cavity half at the part."""


def export_tool(tool: Tool, folder: Path, schema: str) -> Beside[None]:
    """Write the assembly, the parts list and the hole table.

    One STEP file a component is written by a process beside this one: they are there when its result is asked for.

    Raises
    ------
    KernelError : the kernel cannot translate the solids
    OSError : a file cannot be written
    """
    looks = Looks({role: ink.colour for role, ink in ROLES.items()}, CLEAR_ROLES)
    files = component_files(tool)
    export = StepExport(tool.components, looks, schema)
    export.write_assembly(folder / TOOL_FILE)
    (folder / "step").mkdir()

    def write_components() -> None:
        for component in tool.components:
            export.write_component(component.name, folder / files[component.name])

    listed = {name: path.as_posix() for name, path in files.items()}
    (folder / PARTS_LIST).write_bytes(parts_list_csv(tool, listed).encode())
    (folder / HOLES).write_bytes(holes_csv(tool).encode())
    return Beside(write_components)


def file_record(tool: Tool, folder: Path) -> dict[str, str]:
    """Return the SHA-256 of each STEP file and table that was written of a tool, by its path in the output folder."""
    return {path: sha256_bytes((folder / path).read_bytes()) for path in exported_files(tool)}


def exported_files(tool: Tool) -> list[str]:
    """Return the STEP files and tables of a tool by their path in the output folder, sorted."""
    paths = sorted([Path(TOOL_FILE), Path(PARTS_LIST), Path(HOLES), *component_files(tool).values()])
    return [path.as_posix() for path in paths]


def reread_bodies(tool: Tool, folder: Path, memory: Memory | None = None) -> list[ProofBody]:
    """Return the tool as the exported assembly holds it, for the proofs; `memory` as `read_bodies` takes it."""
    entries = tuple(Entry(c.name, c.role, c.motion, c.positions) for c in tool.components)
    return read_bodies(folder / TOOL_FILE, entries, memory)


def exported_volumes(tool: Tool, bodies: Sequence[ProofBody]) -> dict[str, float]:
    """Return the volume [mm^3] of each component by its name, of the solids as they were read back.

    Readers that integrate spline faces as the kernel does by default find up to 1 % else.
    """
    first = itertools.accumulate((len(c.positions) for c in tool.components[:-1]), initial=0)
    return {c.name: bodies[i].volume_mm3 for c, i in zip(tool.components, first, strict=True)}
