"""Issue 2, "Bad input": the right exit code, place and remedy, the earlier output untouched, nothing left behind."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from pathlib import Path

import pytest
from helpers.bad_parts import BAD_PARTS
from helpers.command import moldgen
from helpers.outputs import manifest, snapshot
from helpers.small_specs import PLAIN_CUP, spec

EARLIER = '{"moldgen": "earlier"}'

HEAD = "resin: ABS\npart: {file: part.step}\n"

BOMB = "a0: &a0 [x]\n" + "".join(f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 9)}]\n" for i in range(1, 11))

RECIPE = "resin: ABS\npart:\n  recipe:\n    features:\n      - {feature: block, name: cup, size: [40, %s, 16]}\n"

BAD_SPECS = {
    "zero size": (RECIPE % "0", "part.yaml:5:", "0 must be greater than zero"),
    "negative size": (RECIPE % "-30", "part.yaml:5:", "zero"),
    "shrink of 100 %": (HEAD + "shrink: 100 %\n", "part.yaml:3:9", "less than 50 %"),
    "pull of length zero": (HEAD + "pull: [0, 0, 0]\n", "part.yaml:3:7", "length zero"),
    "unknown resin": (HEAD.replace("ABS", "ABBS"), "part.yaml:1:8", "nearest: ABS"),
    "unknown key": (HEAD + "ejecton: {}\n", "part.yaml:3:1", "`ejection`"),
    "wrong unit": (HEAD + "gate: {land: 5 kg}\n", "part.yaml:3:14", '"5 kg" is not a length'),
    "YAML bomb": (BOMB, "part.yaml", "values"),
    "planned section": (HEAD + "inserts: auto\n", "part.yaml:3:1", "no effect"),
    "code without the flag": ("resin: ABS\npart: {function: 'p.py:f'}\n", "part.yaml:2:8", "--allow-code"),
}


def earlier_output(folder: Path, name: str = "part") -> dict[str, bytes | None]:
    """Lay down an earlier output, and return everything in the folder."""
    (folder / "out" / name / "step").mkdir(parents=True)
    (folder / "out" / name / "manifest.json").write_text(EARLIER)
    (folder / "out" / name / "step" / "core.step").write_bytes(b"steel")
    return snapshot(folder)


def refused(done: subprocess.CompletedProcess[str], code: int, *words: str) -> None:
    """Check exit code and message, and that no traceback and no bug is shown."""
    said = done.stdout + done.stderr
    assert done.returncode == code, said
    for word in (*words, "try: "):
        assert word in done.stderr, f"{word!r} is not in:\n{said}"
    assert "Traceback" not in said
    assert "bug" not in said


@pytest.mark.parametrize("case", BAD_SPECS)
def test_a_bad_spec_is_refused_at_its_place(case: str, tmp_path: Path) -> None:
    text, *words = BAD_SPECS[case]
    spec(tmp_path, text)
    before = earlier_output(tmp_path)
    refused(moldgen("build", "part.yaml", folder=tmp_path), 2, *words)
    assert snapshot(tmp_path) == before


@pytest.mark.slow
@pytest.mark.parametrize("case", BAD_PARTS)
def test_a_bad_part_is_refused_with_its_reason(case: str, tmp_path: Path) -> None:
    write, words = BAD_PARTS[case]
    write(tmp_path / "part.step")
    spec(tmp_path, HEAD, "pull: +z\n")
    before = earlier_output(tmp_path)
    refused(moldgen("build", "part.yaml", folder=tmp_path), 3, "part.yaml:2:", *words)
    assert snapshot(tmp_path) == before


@pytest.mark.slow
@pytest.mark.parametrize(("size", "words"), [("0.1, 0.08, 0.05", "too small: 0.1 mm"), ("3000, 200, 9", "too large")])
def test_a_recipe_is_held_to_the_same_limits_of_size(size: str, words: str, tmp_path: Path) -> None:
    spec(tmp_path, RECIPE.replace("40, %s, 16", size))
    refused(moldgen("check", "part.yaml", folder=tmp_path), 3, "part.yaml:3:3", words, "plain numbers are mm")


@pytest.mark.slow
def test_a_choice_of_two_solids_is_followed(tmp_path: Path) -> None:
    write, _ = BAD_PARTS["two solids"]
    write(tmp_path / "part.step")
    spec(tmp_path, "resin: ABS\npull: +z\npart: {file: part.step, solid: 2}\n")
    done = moldgen("check", "part.yaml", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    assert manifest(tmp_path / "out" / "part-check")["part"]["volume_mm3"] == pytest.approx(1000.0)


def test_several_mistakes_come_at_once(tmp_path: Path) -> None:
    spec(tmp_path, HEAD.replace("ABS", "ABBS"), "ejecton: {}\npull: [0, 0, 0]\n")
    done = moldgen("check", "part.yaml", "--json", folder=tmp_path)
    assert done.returncode == 2
    places = [error["where"] for error in json.loads(done.stdout)["errors"]]
    assert places == ["part.yaml:1:8", "part.yaml:3:1", "part.yaml:4:7"]


@pytest.mark.parametrize("command", ["build", "check"])
@pytest.mark.parametrize("stands", ["a file", "somebody's folder", "a file in the way of its parent"])
def test_an_output_folder_that_is_not_ours_is_left_alone(command: str, stands: str, tmp_path: Path) -> None:
    spec(tmp_path, PLAIN_CUP, "pull: +z\n")
    place = tmp_path / "given"
    if stands == "somebody's folder":
        place.mkdir()
        (place / "letter.txt").write_text("dear reader")
    else:
        place.write_text("dear reader")
    before = snapshot(tmp_path)
    output = place / "part" if stands.endswith("parent") else place
    refused(moldgen(command, "part.yaml", "--output", output, folder=tmp_path), 2, "given", "--output")
    assert snapshot(tmp_path) == before


@pytest.mark.slow
def test_a_full_disk_is_told_and_the_earlier_output_stays(tmp_path: Path) -> None:
    disk = tmp_path / "disk"
    disk.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=300k", "tmpfs", str(disk)]
    if os.geteuid() != 0 or shutil.which("mount") is None or subprocess.run(mount, check=False).returncode != 0:
        pytest.skip("only root can mount a small disk")
    try:
        spec(tmp_path, PLAIN_CUP, "pull: +z\n")
        before = earlier_output(disk)
        done = moldgen("build", "part.yaml", "--no-pictures", "--output", disk / "out" / "part", folder=tmp_path)
        refused(done, 2, "the disk is full", "--output")
        assert snapshot(disk) == before
    finally:
        subprocess.run(["umount", str(disk)], check=True)


@pytest.mark.slow
def test_a_read_only_place_is_told(tmp_path: Path) -> None:
    place = "/proc/moldgen" if os.geteuid() == 0 else "/moldgen"  # where not even root can make a folder
    spec(tmp_path, PLAIN_CUP, "pull: +z\n")
    refused(moldgen("check", "part.yaml", "--output", place, folder=tmp_path), 2, "cannot be written", place)


FUNCTION = """\
import cadquery

def make():
    return cadquery.Workplane().box(40, 30, 10, centered=(True, True, False)).faces("<Z").shell(-2)

def raises():
    raise ValueError("no such profile")

def number():
    return 7
"""


@pytest.mark.slow
@pytest.mark.parametrize(
    ("name", "code", "words"),
    [
        ("raises", 3, ["part.yaml:2:8", "part.py:raises raised ValueError: no such profile"]),
        ("number", 3, ["part.yaml:2:8", "returned int, not a solid"]),
        ("absent", 2, ["part.yaml:2:8", "has no function absent"]),
    ],
)
def test_a_part_function_that_fails_is_told(name: str, code: int, words: list[str], tmp_path: Path) -> None:
    (tmp_path / "part.py").write_text(FUNCTION)
    spec(tmp_path, f"resin: ABS\npart: {{function: 'part.py:{name}'}}\npull: +z\n")
    refused(moldgen("check", "part.yaml", "--allow-code", folder=tmp_path), code, *words)


@pytest.mark.slow
def test_a_part_function_runs_with_the_flag(tmp_path: Path) -> None:
    (tmp_path / "part.py").write_text(FUNCTION)
    spec(tmp_path, "resin: ABS\npart: {function: 'part.py:make'}\npull: +z\n")
    done = moldgen("check", "part.yaml", "--allow-code", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    shell = 40 * 30 * 10 - 36 * 26 * 8
    assert manifest(tmp_path / "out" / "part-check")["part"]["volume_mm3"] == pytest.approx(shell, rel=1e-9)
    assert "faces with too little draft" in done.stdout  # a shell with upright walls
