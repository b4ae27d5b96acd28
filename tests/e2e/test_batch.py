"""Issue 3, point 9, on real builds: specs and bare STEP files together, broken ones among them."""

from __future__ import annotations

from pathlib import Path

import pytest
from helpers.bad_parts import block, write_step
from helpers.command import moldgen
from helpers.outputs import manifest, snapshot, table, unproved
from helpers.small_specs import PLAIN_CUP, spec

pytestmark = pytest.mark.slow

WORDS = ("batch", "parts", "--no-pictures", "--quiet", "--resin", "PP")


@pytest.fixture(scope="module")
def work(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a cup as a spec, a block as a bare STEP file, half a STEP file, a wrong spec: a batch."""
    folder = tmp_path_factory.mktemp("batch")
    (folder / "parts").mkdir()
    spec(folder / "parts", PLAIN_CUP, name="cup")
    spec(folder / "parts", "resn: ABS\n", name="wrong")
    whole = write_step(block(20, 16, 8), folder / "parts" / "block.step").read_bytes()
    (folder / "parts" / "half.step").write_bytes(whole[: len(whole) // 2])
    done = moldgen(*WORDS, "--jobs", "2", folder=folder, timeout=300)
    assert done.returncode == 3, done.stdout + done.stderr
    assert "Traceback" not in done.stdout + done.stderr
    return folder


def test_each_part_has_its_row_and_its_tool(work: Path) -> None:
    rows = table(work / "out" / "batch" / "summary.csv")
    assert [(r["name"], r["source"], r["result"], r["exit_code"]) for r in rows] == [
        ("block", "parts/block.step", "proved", "0"),
        ("cup", "parts/cup.yaml", "proved", "0"),
        ("half", "parts/half.step", "refused", "3"),
        ("wrong", "parts/wrong.yaml", "spec wrong", "2"),
    ]
    assert rows[2]["reason"].startswith("parts/half.step: the STEP file is cut short")
    assert rows[3]["reason"].startswith("parts/wrong.yaml:1:1: ")
    for row in rows[:2]:
        record = manifest(work / "out" / "batch" / row["name"])
        assert unproved(record) == []
        assert row["proofs_passed"] == row["proofs_total"] == str(len(record["proofs"]))
        assert row["components"] == str(sum(len(c["positions"]) for c in record["components"]))
        assert row["side_actions"] == "0"
        assert "parting surface: plane" in row["rungs"]
    assert [manifest(work / "out" / "batch" / name)["resin"] for name in ("block", "cup")] == ["PP", "ABS"]
    assert not (work / "out" / "batch" / "half").exists()


def test_one_at_a_time_gives_the_same_bytes_and_so_does_a_build_alone(work: Path) -> None:
    done = moldgen(*WORDS, "--jobs", "1", "--again", "--output", "out/other", folder=work, timeout=300)
    assert done.returncode == 3
    assert (work / "out/other/summary.csv").read_bytes() == (work / "out/batch/summary.csv").read_bytes().replace(
        b"out/batch", b"out/other"
    )
    for name in ("block", "cup"):
        assert snapshot(work / "out" / "other" / name) == snapshot(work / "out" / "batch" / name)
    moldgen("build", "parts/cup.yaml", "--no-pictures", "--quiet", folder=work)
    assert snapshot(work / "out" / "cup") == snapshot(work / "out" / "batch" / "cup")


def test_only_the_part_whose_file_has_changed_is_built_again(work: Path) -> None:
    outputs = {name: work / "out" / "batch" / name / "manifest.json" for name in ("block", "cup")}
    before = {name: path.stat().st_ino for name, path in outputs.items()}
    moldgen(*WORDS, folder=work)
    assert {name: path.stat().st_ino for name, path in outputs.items()} == before
    write_step(block(20, 16, 9), work / "parts" / "block.step")
    moldgen(*WORDS, folder=work)
    assert outputs["cup"].stat().st_ino == before["cup"]
    assert outputs["block"].stat().st_ino != before["block"]
    assert manifest(work / "out" / "batch" / "block")["part"]["volume_mm3"] == pytest.approx(20 * 16 * 9)


def test_a_step_file_that_a_spec_names_is_an_input_too(work: Path, tmp_path: Path) -> None:
    (tmp_path / "parts").mkdir()
    (tmp_path / "cad").mkdir()
    write_step(block(20, 16, 8), tmp_path / "cad" / "lid.step")
    spec(tmp_path / "parts", "resin: ABS\npart: {file: ../cad/lid.step}\n", name="lid")
    output = tmp_path / "out" / "batch" / "lid-check" / "manifest.json"
    volumes = []
    for height in (8, 0, 9):
        if height:
            write_step(block(20, 16, height), tmp_path / "cad" / "lid.step")
        assert moldgen(*WORDS, "--check", folder=tmp_path).returncode == 0
        volumes.append((output.stat().st_ino, round(manifest(output.parent)["part"]["volume_mm3"])))
    first, unchanged, changed = volumes
    assert first == unchanged
    assert (first[1], changed[1]) == (2560, 2880)
