"""Where the pull is auto, a tool that is not proved gives way to the next pull, and leaves nothing behind."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest
from helpers.small_specs import NOTCHED, spec

import moldgen.flow.build as build
import moldgen.flow.write_tool as write_tool
from moldgen.canon import sha256_bytes
from moldgen.flow.job import JobResult, Options
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.memory import Forgetful
from moldgen.model.proof import Verdict
from moldgen.spec.load import load_spec

PLAIN = NOTCHED[: NOTCHED.index("      - feature: block\n        name: notch")].replace("pull: +z\n", "")
"""A plain block whose pull moldgen chooses."""

pytestmark = pytest.mark.slow


def built(monkeypatch: pytest.MonkeyPatch, tmp_path: Path, proved: list[bool]) -> tuple[JobResult, Path]:
    """Build the block in this process; the first proof of each tool in turn passes as `proved` says."""
    real, turn = write_tool.prove_tool, iter(proved)
    said = proved[-1]

    def judged(*asked: object) -> tuple[object, ...]:
        nonlocal said
        said = next(turn, said)
        first, *others = real(*asked)
        return (first if said else replace(first, verdict=Verdict.FAILED), *others)

    monkeypatch.setattr(write_tool, "prove_tool", judged)
    folder = tmp_path / "out"
    folder.mkdir()
    loaded = load_spec(spec(tmp_path, PLAIN))
    return build.build_tool(loaded, folder, Options(pictures=False), Stages(Forgetful(), silent())), folder


def found(folder: Path) -> dict[str, str]:
    """The STEP files and tables that lie in a folder, with their SHA-256."""
    paths = [p for p in folder.rglob("*") if p.suffix in (".step", ".csv")]
    return {p.relative_to(folder).as_posix(): sha256_bytes(p.read_bytes()) for p in paths}


def pull_of(folder: Path) -> dict[str, object]:
    """The decision about the pull in a manifest."""
    (pull,) = [d for d in json.loads((folder / write_tool.MANIFEST).read_text())["decisions"] if d["topic"] == "pull"]
    return pull


@pytest.mark.parametrize("proved", [[True], [False, True], [False]], ids=["first", "second", "none"])
def test_the_manifest_lists_the_files_that_are_there(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, proved: list[bool]
) -> None:
    result, folder = built(monkeypatch, tmp_path, proved)
    record = json.loads((folder / write_tool.MANIFEST).read_text())
    assert record["files"] == found(folder)
    assert "tool.step" in record["files"]
    assert not (folder / build.ASIDE).exists()
    assert all(p.passed for p in result.proofs) == proved[-1]


def test_the_second_pull_says_what_became_of_the_first(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    _, folder = built(monkeypatch, tmp_path, [False, True])
    pull = pull_of(folder)
    assert "a tool, but not proved: every component is a sound solid" in pull["refused"][0]
    assert "the other way round" in pull["why"]


def test_if_no_tool_is_proved_the_first_one_stands(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    _, folder = built(monkeypatch, tmp_path, [False])
    assert "the other way round" not in pull_of(folder)["why"]
