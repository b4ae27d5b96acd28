"""Accept a layout and keep it, as a user does it at the command line (issue 4, item 2)."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest
from helpers.command import moldgen
from helpers.small_specs import CUP, spec

from moldgen.errors import ExitCode
from moldgen.spec.accepted import accepted_file, load_accepted

pytestmark = pytest.mark.slow

DEMOS = Path(__file__).resolve().parents[2] / "specs"
BUILD = ("--no-pictures", "--quiet")
EVERY_DEMO = [
    pytest.param(path.parent.name, marks=() if path.parent.name == "thumb-knob" else pytest.mark.sweep)
    for path in sorted(DEMOS.glob("*/spec.yaml"))
]


def files(folder: Path) -> dict[str, bytes]:
    """STEP files and tables of an output; the manifest and the table of pins say who chose, and so differ."""
    found = [p for p in sorted(folder.rglob("*")) if p.suffix in (".step", ".csv")]
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in found}


@pytest.mark.parametrize("name", EVERY_DEMO)
def test_the_unchanged_part_gets_the_same_tool_byte_by_byte(tmp_path: Path, name: str) -> None:
    path = Path(shutil.copytree(DEMOS / name, tmp_path / name)) / "spec.yaml"
    accepted_file(path).unlink(missing_ok=True)

    def build(out: str, *options: str) -> dict[str, bytes]:
        done = moldgen(
            "build", path, "--output", out, *BUILD, *options, folder=tmp_path, timeout=280, MOLDGEN_CACHE="off"
        )
        assert done.returncode == ExitCode.OK, done.stdout + done.stderr
        return files(tmp_path / out)

    first = build("first", "--accept")
    assert load_accepted(path) is not None
    assert any(file.endswith(".step") for file in first)
    assert build("again") == first
    chosen = {
        p["chosen_by"] for p in json.loads((tmp_path / "again" / "manifest.json").read_text())["layout"]["ejector_pins"]
    }
    assert chosen <= {"kept from the accepted layout", "given in the spec"}


def test_accept_build_and_fresh(tmp_path: Path) -> None:
    path, out = spec(tmp_path, CUP, name="cup"), tmp_path / "out" / "cup"

    def run(*words: object, code: ExitCode = ExitCode.OK) -> str:
        done = moldgen(*words, folder=tmp_path, timeout=120)
        assert done.returncode == code, done.stdout + done.stderr
        return done.stdout + done.stderr

    def chosen() -> set[str]:
        layout = json.loads((out / "manifest.json").read_text())["layout"]
        return {p["chosen_by"] for p in layout["ejector_pins"]}

    told = run("accept", path, "--quiet", code=ExitCode.SPEC)
    assert "there is no tool to accept" in told
    run("build", path, *BUILD)
    assert chosen() == {"placed by moldgen"}
    assert not accepted_file(path).exists(), "a plain build writes nothing beside the spec"
    assert "layout accepted" in run("accept", path, "--quiet")
    text = accepted_file(path).read_bytes()

    run("build", path, *BUILD)
    assert chosen() == {"kept from the accepted layout"}
    run("build", path, *BUILD, "--fresh")
    assert chosen() == {"placed by moldgen"}
    assert accepted_file(path).read_bytes() == text, "no build rewrites what was accepted"

    accepted_file(path).write_bytes(text + b"colour: red\n")
    broken = run("build", path, *BUILD, code=ExitCode.SPEC)
    line = text.count(b"\n") + 1
    assert f"cup.accepted.yaml:{line}:1: unknown key `colour`" in broken
    assert "--fresh" in broken
    assert "Traceback" not in broken
    assert chosen() == {"placed by moldgen"}, "the earlier output stays"
    run("build", path, *BUILD, "--fresh")
