"""Reading an output folder back: the exported STEP files and what the manifest claims about them."""

from __future__ import annotations

import json
import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from moldgen.errors import PartError, SpecError
from moldgen.flow.folder import MANIFEST, MANIFEST_KEY
from moldgen.kernel.step_read import read_assembly
from moldgen.memory import Memory
from moldgen.model.motion import Step
from moldgen.model.part import Vector
from moldgen.model.tool import Role
from moldgen.proof.bodies import ProofBody, asked_beside
from moldgen.proof.run import Claims

TOOL_FILE = "tool.step"


@dataclass(frozen=True)
class Entry:
    """One component as the manifest lists it: where each stands [mm], and the volume of one [mm^3], 0 if unknown."""

    name: str
    role: Role
    motion: str
    positions: tuple[Vector, ...]
    volume_mm3: float = 0.0

    @property
    def count(self) -> int:
        """How many of it the tool has."""
        return len(self.positions)


@dataclass(frozen=True)
class Listing:
    """What the manifest says was exported; `files` has the SHA-256 of each file by its path in the folder."""

    title: str
    entries: tuple[Entry, ...]
    claims: Claims
    files: dict[str, str]


def read_listing(folder: Path) -> Listing:
    """Return what the manifest of an output folder says.

    Raises
    ------
    SpecError : there is no manifest, or it is none of ours, or it describes no tool
    """
    path = folder / MANIFEST
    try:
        record: Any = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise SpecError(f"no {MANIFEST} here: {error.strerror}", where=str(folder), remedy="give a folder that "
                        "`moldgen build` wrote") from error  # fmt: skip
    except ValueError as error:
        raise SpecError(f"{MANIFEST} is damaged: {error}", where=str(path), remedy="build the tool again") from error
    if not isinstance(record, dict) or MANIFEST_KEY not in record or "components" not in record:
        raise SpecError("the manifest describes no tool", where=str(path), remedy="build the tool first")
    try:
        entries = tuple(
            Entry(
                str(c["name"]),
                Role(c["role"]),
                str(c["moves_with"]),
                tuple((float(x), float(y), float(z)) for x, y, z in c["positions"]),
                float(c["volume_mm3"]),
            )
            for c in record["components"]
        )
        claims = _claims(record["claims"])
        files = {str(path): str(digest) for path, digest in record["files"].items()}
        title = str(record["part"]["name"])
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        raise SpecError(f"{MANIFEST} is damaged: {error!r}", where=str(path), remedy="build the tool again") from error
    return Listing(title, entries, claims, files)


def _claims(record: dict[str, Any]) -> Claims:
    """Return what the manifest claims. Raises KeyError, TypeError, ValueError when it is damaged."""
    steps = tuple(
        Step(str(s["name"]), tuple((str(group), _vector(way)) for group, way in s["moves"])) for s in record["steps"]
    )
    if not steps:
        raise ValueError("it claims no steps of the opening")
    return Claims(float(record["block_mm3"]), float(record["bored_mm3"]), float(record["stroke_mm"]), steps)


def _vector(values: Any) -> Vector:
    x, y, z = (float(v) for v in values)
    if not all(map(math.isfinite, (x, y, z))):
        raise ValueError("a motion is not finite")
    return (x, y, z)


def read_bodies(file: Path, entries: tuple[Entry, ...], memory: Memory | None = None) -> list[ProofBody]:
    """Return the exported components where they stand, by the order and the names of the manifest.

    memory : where answers about them are remembered, for the versions that run

    Raises
    ------
    PartError : the file holds other components than the manifest lists
    """
    found = read_assembly(file)
    wanted = [(e, n) for e in entries for n in range(1, e.count + 1)]
    if [name for name, _ in found] != [e.name for e, _ in wanted]:
        raise PartError(
            f"{file.name} holds {_named(name for name, _ in found)}; the manifest lists "
            f"{_named(e.name for e, _ in wanted)}",
            where=str(file),
            remedy="build the tool again",
        )
    return asked_beside(
        [
            ProofBody(e.name if e.count == 1 else f"{e.name} {n}", e.role, e.motion, solid)
            for (e, n), (_, solid) in zip(wanted, found, strict=True)
        ],
        memory,
    )


def _named(names: Any) -> str:
    listed = list(names)
    more = f" and {len(listed) - 12} more" if len(listed) > 12 else ""
    return f"{len(listed)} components ({', '.join(listed[:12])}{more})"
