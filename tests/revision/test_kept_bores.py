"""What the accepted layout spares: the ceiling comes down, and no steel is missing round the pins."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from moldgen.flow.accept import accept_layout
from moldgen.flow.build import build_tool
from moldgen.flow.compare import compare_tools
from moldgen.flow.job import Options
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.memory import Forgetful
from moldgen.model.revision import Comparison
from moldgen.revision.tool_record import tool_record
from moldgen.spec.accepted import load_accepted
from moldgen.spec.load import load_spec
from tests.helpers.outputs import manifest
from tests.revision.part_changes import K3, Steel, Version
from tests.revision.wall_changes import LONGER_STUD, LOWER_CEILING, SHORTER_PINS, WALL_CHANGES

EXACT = 1e-3
"""Relative: what issue 4 asks for."""

(THICKER,) = (change for change in WALL_CHANGES if change.name == "floor thicker")

# As "floor thicker" without an accepted layout, where a ring of steel is missing round each pin because its fit keeps
# its length. Here the fits get shorter instead, from 10 to 10 - 0.6 K = 9.39 mm, which a fit that is cut may be (8 mm
# at least), and the wider bores behind them stay: nothing of the core is missing.
KEPT = {
    "core": Steel(cut=K3 * LOWER_CEILING - SHORTER_PINS),
    "ejector pin": Steel(cut=SHORTER_PINS),
    "cavity": Steel(weld=K3 * LONGER_STUD),
}


def build(folder: Path, name: str, version: Version) -> Path:
    spec, out = folder / "cap.yaml", folder / name
    spec.write_text(json.dumps(version.as_spec({"recipe": version.recipe()})), encoding="utf-8")
    out.mkdir()
    loaded = replace(load_spec(spec), accepted=load_accepted(spec))
    result = build_tool(loaded, out, Options(pictures=False), Stages(Forgetful(), silent()))
    assert [proof.name for proof in result.proofs if not proof.passed] == []
    return out


@pytest.fixture(scope="module")
def comparison(tmp_path_factory: pytest.TempPathFactory) -> Comparison:
    folder = tmp_path_factory.mktemp("kept")
    old = build(folder, "old", THICKER.old)
    accept_layout(load_spec(folder / "cap.yaml"), old, silent())
    new = build(folder, "new", THICKER.new)
    records: list[Any] = [tool_record(out, manifest(out)) for out in (old, new)]
    return compare_tools(records[0], records[1], silent(), ("old", "new")).comparison


def test_the_unchanged_part_gets_the_same_steel_byte_by_byte(tmp_path: Path) -> None:
    first = build(tmp_path, "first", THICKER.old)
    accept_layout(load_spec(tmp_path / "cap.yaml"), first, silent())
    again = build(tmp_path, "again", THICKER.old)
    for name in ("cavity.step", "core.step", "tool.step"):
        found = [next(out.rglob(name)).read_bytes() for out in (first, again)]
        assert found[0] == found[1], name


def test_without_it_rings_are_missing(comparison: Comparison) -> None:
    assert THICKER.steel["core"].weld > 1.0
    assert KEPT["core"].cut == THICKER.steel["core"].cut


def test_the_core_is_only_cut(comparison: Comparison) -> None:
    assert {c.new for c in comparison.components} == KEPT.keys()
    for component in comparison.components:
        steel = KEPT[component.new]
        assert component.fate is steel.fate, component.new
        assert component.cut_mm3 == pytest.approx(steel.cut, rel=EXACT), component.new
        assert component.weld_mm3 == pytest.approx(steel.weld, rel=EXACT), component.new
