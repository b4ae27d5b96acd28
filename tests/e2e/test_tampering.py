"""Issue 2, item 9: `moldgen prove FOLDER` proves the exported files; whoever changes them afterwards is found out."""

from __future__ import annotations

import json
import re
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from helpers.command import moldgen
from helpers.outputs import PROOFS, manifest

pytestmark = pytest.mark.slow


@pytest.fixture
def prove(cup, tmp_path: Path) -> Callable[[Callable[[Path], object]], tuple[int, dict[str, Any]]]:
    """Change a copy of the built cup, prove it, and return exit code and result."""

    def run(change: Callable[[Path], object]) -> tuple[int, dict[str, Any]]:
        assert cup.done.returncode == 0, cup.done.stderr
        folder = tmp_path / "cup"
        shutil.copytree(cup.folder, folder)
        change(folder)
        done = moldgen("prove", "cup", "--json", "--quiet", folder=tmp_path)
        assert "Traceback" not in done.stderr
        return done.returncode, json.loads(done.stdout)

    return run


def failed(result: dict[str, Any]) -> list[str]:
    return [p["name"] for p in result["proofs"] if not p["passed"]]


def shift(x: float = 0.0, z: float = 0.0) -> Callable[[Path], None]:
    """Return a change that moves the first ejector pin, by the point of its placement in the assembly."""

    def change(folder: Path) -> None:
        file = folder / "tool.step"
        text = file.read_text(encoding="ascii")
        pins = next(c for c in manifest(folder)["components"] if c["role"] == "ejector_pin")
        for number, place in re.findall(r"^#(\d+) = CARTESIAN_POINT\('',\(([^()]*)\)\);", text, re.MULTILINE):
            values = [float(v) for v in place.split(",")]
            if values == pytest.approx(pins["positions"][0], abs=1e-6):
                moved = ",".join(f"{v + d:.9f}" for v, d in zip(values, (x, 0.0, z), strict=True))
                old, new = (f"#{number} = CARTESIAN_POINT('',({p}));" for p in (place, moved))
                file.write_text(text.replace(old, new), encoding="ascii")
                return
        pytest.fail("no placement found")

    return change


def edit(change: Callable[[dict[str, Any]], object]) -> Callable[[Path], None]:
    """Return a change of the manifest."""

    def apply(folder: Path) -> None:
        record = manifest(folder)
        change(record)
        (folder / "manifest.json").write_text(json.dumps(record), encoding="utf-8")

    return apply


def exchange(one: str, other: str) -> Callable[[Path], None]:
    """Return a change that gives two files each other's names."""

    def change(folder: Path) -> None:
        first = (folder / one).read_bytes()
        (folder / one).write_bytes((folder / other).read_bytes())
        (folder / other).write_bytes(first)

    return change


def test_untouched_it_passes(prove) -> None:
    code, result = prove(lambda folder: None)
    assert (code, failed(result), result["findings"]) == (0, [], [])
    assert [p["name"] for p in result["proofs"]] == PROOFS


def test_a_pin_moved_aside_overlaps_its_bore(prove) -> None:
    code, result = prove(shift(x=0.1))
    assert code == 1
    assert "nothing overlaps in the closed tool" in failed(result)
    codes = {f["code"] for f in result["findings"]}
    assert codes == {"proof.failed", "prove.changed_file", "prove.not_as_listed"}


def test_a_pin_moved_down_its_bore_is_found_out_though_nothing_overlaps(prove) -> None:
    code, result = prove(shift(z=-0.5))
    assert code == 1
    said = {f["code"]: f for f in result["findings"]}
    assert said["prove.changed_file"]["where"] == "tool.step"
    assert said["prove.not_as_listed"]["value"] == pytest.approx(0.5)
    assert "folder is not as it was built" in result["headline"]


def test_exchanged_files_are_found_out(prove) -> None:
    code, result = prove(exchange("step/cavity.step", "step/core.step"))
    assert code == 1
    assert failed(result) == []
    assert [f["where"] for f in result["findings"]] == ["step/cavity.step", "step/core.step"]


def test_a_component_in_place_of_the_assembly_is_refused(prove) -> None:
    code, result = prove(exchange("tool.step", "step/core.step"))
    assert code == 3
    (error,) = result["errors"]
    assert "the manifest lists" in error["what"]
    assert error["remedy"]


def test_a_missing_assembly_is_refused(prove) -> None:
    code, result = prove(lambda folder: (folder / "tool.step").unlink())
    assert code == 3
    assert "no such file" in result["errors"][0]["what"]


def test_a_missing_component_file_is_found_out(prove) -> None:
    code, result = prove(lambda folder: (folder / "step" / "part.step").unlink())
    assert code == 1
    assert [(f["code"], f["where"]) for f in result["findings"]] == [("prove.changed_file", "step/part.step")]


@pytest.mark.parametrize(
    ("change", "proof"),
    [
        (lambda r: r["claims"].update(block_mm3=r["claims"]["block_mm3"] * (1 + 1e-5)), PROOFS[1]),
        (lambda r: r["claims"].update(bored_mm3=r["claims"]["bored_mm3"] + 10.0), PROOFS[1]),
        (lambda r: r["claims"].update(stroke_mm=1000.0), PROOFS[5]),
        (lambda r: r["claims"].update(stroke_mm=r["claims"]["stroke_mm"] - 0.1), PROOFS[5]),
        (lambda r: r["claims"]["steps"].pop(1), PROOFS[5]),
        (lambda r: r["claims"]["steps"][0]["moves"][0].__setitem__(1, [0.0, 60.0, 200.0]), PROOFS[3]),
        (lambda r: r["components"][1].update(volume_mm3=r["components"][1]["volume_mm3"] * 1.01), ""),
    ],
    ids=["block", "bores", "stroke", "shorter stroke", "no ejection", "opens askew", "volume"],
)
def test_an_edited_claim_is_found_out(prove, change: Callable[[dict[str, Any]], object], proof: str) -> None:
    code, result = prove(edit(change))
    assert code == 1
    assert failed(result) == ([proof] if proof else [])
    assert result["findings"]


@pytest.mark.parametrize(
    "change",
    [
        lambda c: c.update(steps=[]),
        lambda c: c.pop("steps"),
        lambda c: c["steps"][0].update(moves=[["cavity half", [0.0, 0.0]]]),
        lambda c: c["steps"][0].update(moves=[["cavity half", [0.0, 0.0, float("nan")]]]),
    ],
    ids=["none", "missing", "flat", "nan"],
)
def test_steps_that_are_none_are_refused(prove, change: Callable[[dict[str, Any]], object]) -> None:
    code, result = prove(edit(lambda r: change(r["claims"])))
    assert code == 2
    assert "is damaged" in result["errors"][0]["what"]


def test_a_manifest_that_describes_no_tool_is_refused(prove) -> None:
    code, result = prove(lambda folder: (folder / "manifest.json").write_text('{"moldgen": "0.1"}'))
    assert code == 2
    assert "describes no tool" in result["errors"][0]["what"]
