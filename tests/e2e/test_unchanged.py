"""A spec that has not changed is built by doing nothing, and for that no process loads the kernel: issue 4.

What is measured is which modules are imported, in every process of the run, not how long it takes.
"""

from __future__ import annotations

import os
import shutil
import subprocess
from pathlib import Path

import pytest
from helpers.command import environment, moldgen_command
from helpers.outputs import snapshot
from helpers.small_specs import CUP, spec

HEAVY = ("OCP", "cadquery", "manifold3d", "embreex", "trimesh", "scipy", "vtkmodules")

LISTENER = """\
import os
import sys

def hear(event, arguments):
    if event == "import":
        with open(os.environ["IMPORTED"], "a") as log:
            log.write(arguments[0] + "\\n")

sys.addaudithook(hear)
"""
"""Python loads a module of this name at the start of every process; it notes each import, even of a killed one."""


def imported(folder: Path, *options: str, output: str = "out") -> tuple[set[str], str]:
    """Build a spec with the cache beside it; return the top modules that all processes imported, and what was said."""
    (folder / "listener").mkdir(exist_ok=True)
    (folder / "listener" / "sitecustomize.py").write_text(LISTENER, encoding="utf-8")
    log = folder / "imported"
    log.unlink(missing_ok=True)
    ours = environment()
    done = subprocess.run(
        moldgen_command("build", "cup.yaml", "--no-pictures", "--output", output, *options),
        cwd=folder,
        env=ours
        | {"PYTHONPATH": os.pathsep.join([str(folder / "listener"), ours["PYTHONPATH"]])}
        | {"IMPORTED": str(log), "MOLDGEN_CACHE": str(folder / "cache")},
        capture_output=True,
        text=True,
        timeout=120,
        check=True,
    )
    names = {line.partition(".")[0] for line in log.read_text(encoding="utf-8").splitlines()}
    assert {"moldgen", "click"} <= names, "nothing was listened to"
    return names, done.stdout + done.stderr


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, set[str]]:
    """A cup that was built once, and what that imported; tests copy the folder."""
    folder = tmp_path_factory.mktemp("made")
    spec(folder, CUP, "pull: +z\n", name="cup")
    names, _ = imported(folder)
    return folder, names


def copied(made: tuple[Path, set[str]], tmp_path: Path) -> Path:
    return Path(shutil.copytree(made[0], tmp_path / "copy"))


def test_a_build_that_is_needed_loads_the_kernel(made: tuple[Path, set[str]]) -> None:
    """What the other tests look for can be seen."""
    assert "OCP" in made[1]


def test_an_unchanged_spec_loads_no_kernel_and_leaves_the_output(made: tuple[Path, set[str]], tmp_path: Path) -> None:
    folder = copied(made, tmp_path)
    before = {p: p.stat().st_mtime_ns for p in sorted((folder / "out").rglob("*"))}
    names, said = imported(folder)
    assert names.isdisjoint(HEAVY)
    assert "nothing has changed" in said
    assert {p: p.stat().st_mtime_ns for p in sorted((folder / "out").rglob("*"))} == before


def test_so_it_is_when_the_spec_was_only_saved_again(made: tuple[Path, set[str]], tmp_path: Path) -> None:
    """What counts is what a file holds, not when it was written."""
    folder = copied(made, tmp_path)
    os.utime(folder / "cup.yaml", (1e9, 1e9))
    names, said = imported(folder)
    assert names.isdisjoint(HEAVY)
    assert "nothing has changed" in said


@pytest.mark.parametrize("fault", ["a byte", "a file less", "another folder"])
def test_an_output_that_is_not_as_it_was_is_made_again(fault: str, made: tuple[Path, set[str]], tmp_path: Path) -> None:
    folder = copied(made, tmp_path)
    whole, out = snapshot(folder / "out"), folder / "out"
    if fault == "a byte":
        (out / "tool.step").write_bytes((out / "tool.step").read_bytes()[:-1] + b" ")
    elif fault == "a file less":
        (out / "holes.csv").unlink()
    names, said = imported(folder, output="other" if fault == "another folder" else "out")
    assert "nothing has changed" not in said
    assert snapshot(folder / "other" if fault == "another folder" else out) == whole
    assert "OCP" in names


def test_a_file_of_the_user_beside_the_output_stays(made: tuple[Path, set[str]], tmp_path: Path) -> None:
    folder = copied(made, tmp_path)
    (folder / "out" / "notes.txt").write_text("mine", encoding="utf-8")
    names, said = imported(folder)
    assert "nothing has changed" in said
    assert names.isdisjoint(HEAVY)
    assert (folder / "out" / "notes.txt").read_text(encoding="utf-8") == "mine"
