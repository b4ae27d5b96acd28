"""What a build leaves behind, seen from outside: bytes, manifest, tables, and STEP files through a second reader."""

from __future__ import annotations

import csv
import json
import re
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

PROOFS = [
    "every component is a sound solid",
    "the halves and the part fill the block",
    "nothing overlaps in the closed tool",
    "the cavity half opens",
    "the part leaves the core",
    "the ejectors move through their stroke",
]


def snapshot(folder: Path) -> dict[str, bytes | None]:
    """Every file below `folder` with its bytes, every folder with None."""
    paths = sorted(folder.rglob("*"))
    return {p.relative_to(folder).as_posix(): p.read_bytes() if p.is_file() else None for p in paths}


def manifest(folder: Path) -> dict[str, Any]:
    """The manifest of an output folder."""
    record: dict[str, Any] = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    return record


def unproved(record: dict[str, Any]) -> list[str]:
    """Proofs of a manifest that did not pass, and those that are missing."""
    names = [p["name"] for p in record["proofs"]]
    failed = [f"{p['name']}: {p['figure']} {p['detail']}" for p in record["proofs"] if not p["passed"]]
    return [*failed, *(f"{name}: missing" for name in PROOFS if name not in names)]


def findings(record: dict[str, Any], code: str) -> list[dict[str, Any]]:
    """Findings of one code."""
    return [f for f in record["findings"] if f["code"] == code]


def quantity(record: dict[str, Any], name: str) -> dict[str, Any]:
    """The first line of the calculation sheet with this name."""
    return next(q for q in record["quantities"] if q["name"] == name)


def table(path: Path) -> list[dict[str, str]]:
    """The rows of a CSV file."""
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def products(step: str) -> list[str]:
    """Names of the PRODUCT entities of a STEP text, in its order: one for each definition."""
    return re.findall(r"= PRODUCT\(\s*'([^']*)'", step)


@dataclass(frozen=True)
class Seen:
    """One solid as gmsh sees it: name, volume [mm^3], centre of mass [mm], colour (red, green, blue, 0-255)."""

    name: str
    volume: float
    centre: tuple[float, float, float]
    colour: tuple[int, int, int]


def gmsh_solids(path: Path) -> list[Seen]:
    """Read a STEP file with gmsh."""
    with _gmsh() as gmsh:
        shapes = gmsh.model.occ.importShapes(str(path))
        gmsh.model.occ.synchronize()
        assert {dim for dim, _ in shapes} == {3}, "something other than solids"
        return [
            Seen(
                gmsh.model.getEntityName(dim, tag).rpartition("/")[2],
                gmsh.model.occ.getMass(dim, tag),
                tuple(gmsh.model.occ.getCenterOfMass(dim, tag)),
                tuple(gmsh.model.getColor(dim, tag)[:3]),
            )
            for dim, tag in shapes
        ]


@contextmanager
def _gmsh() -> Iterator[Any]:
    gmsh = pytest.importorskip("gmsh")
    gmsh.initialize(interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 0)
        yield gmsh
    finally:
        gmsh.finalize()
