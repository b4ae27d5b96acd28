"""`moldgen compare` on folders: what it writes, what it refuses, and that its bytes are always the same."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from moldgen.errors import ExitCode, PartError, SpecError
from moldgen.finding import Severity
from moldgen.flow.compare import compare_folders
from moldgen.flow.folder import is_output
from moldgen.flow.job import JobResult
from moldgen.flow.tell import silent
from moldgen.kernel.measure import volume_adaptive
from moldgen.kernel.step_read import read_assembly
from tests.helpers.command import moldgen
from tests.helpers.outputs import manifest, snapshot
from tests.revision.part_changes import Version, changed, post

OLD, NEW = Version(), Version(changed(post=post(at=(-6.0, 2.0))))

Folders = tuple[Path, Path]


@pytest.fixture(scope="module")
def folders(tool_of: Callable[[Version], Path]) -> Folders:
    """The tools of the cap and of the cap whose post moved."""
    return tool_of(OLD), tool_of(NEW)


@pytest.fixture(scope="module")
def answer(folders: Folders, tmp_path_factory: pytest.TempPathFactory) -> tuple[JobResult, Path]:
    """Their comparison, without pictures."""
    folder = tmp_path_factory.mktemp("answer")
    return compare_folders(*folders, folder, silent(), pictures=False), folder


def copy(folder: Path, to: Path) -> Path:
    return Path(shutil.copytree(folder, to))


def test_missing_steel_is_an_answer_with_a_caution(answer: tuple[JobResult, Path]) -> None:
    result, _ = answer
    assert result.exit_code is ExitCode.OK
    assert [(f.code, f.severity, f.where) for f in result.findings] == [("compare.weld", Severity.CAUTION, "core")]


def test_every_piece_is_a_step_file_with_its_volume(answer: tuple[JobResult, Path]) -> None:
    _, folder = answer
    record: dict[str, Any] = json.loads((folder / "compare.json").read_text(encoding="utf-8"))
    pieces = [p for c in record["components"] for p in c["pieces"]]
    assert sorted(p["work"] for p in pieces) == ["cut", "weld"]
    for piece in pieces:
        ((_, solid),) = read_assembly(folder / piece["file"])
        assert volume_adaptive(solid) == pytest.approx(piece["volume_mm3"], rel=1e-6)
        assert "boss" in piece["cause"]
        assert "moved by 0.000, 2.000, 0.000 mm" in piece["cause"]
    assert sorted(p.name for p in (folder / "step").iterdir()) == sorted(Path(p["file"]).name for p in pieces)
    assert {name for name, _ in read_assembly(folder / "pieces.step")} == {"cut core 1", "weld core 1"}


def test_the_page_is_there_and_the_folder_may_be_replaced(answer: tuple[JobResult, Path]) -> None:
    _, folder = answer
    assert is_output(folder)
    assert "core" in (folder / "compare.html").read_text(encoding="utf-8")


def test_the_same_bytes_wherever_the_folders_lie(
    folders: Folders, answer: tuple[JobResult, Path], tmp_path: Path
) -> None:
    old, new = (copy(folder, tmp_path / str(n) / "cap") for n, folder in enumerate(folders))
    again = tmp_path / "answer"
    again.mkdir()
    compare_folders(old, new, again, silent(), pictures=False)
    assert snapshot(again) == snapshot(answer[1])


def test_a_tool_and_itself_differ_in_nothing(folders: Folders, tmp_path: Path) -> None:
    result = compare_folders(folders[0], copy(folders[0], tmp_path / "copy"), tmp_path, silent(), pictures=False)
    record = json.loads((tmp_path / "compare.json").read_text(encoding="utf-8"))
    assert {c["fate"] for c in record["components"]} == {"unchanged"}
    assert (record["part"], record["items"], record["numbers"], result.findings) == ([], [], [], ())
    assert not (tmp_path / "pieces.step").exists()


def test_a_folder_without_a_tool_is_refused(folders: Folders, tmp_path: Path) -> None:
    """An empty folder, and what `check` writes: a manifest without components."""
    with pytest.raises(SpecError, match=r"no manifest\.json"):
        compare_folders(folders[0], tmp_path, tmp_path, silent())
    record = {k: v for k, v in manifest(folders[0]).items() if k not in ("components", "layout", "claims")}
    (tmp_path / "manifest.json").write_text(json.dumps(record), encoding="utf-8")
    with pytest.raises(SpecError, match="describes no tool"):
        compare_folders(folders[0], tmp_path, tmp_path, silent())


@pytest.mark.parametrize("key", ["shrink", "parting", "layout"])
def test_a_manifest_that_lacks_something_is_named(key: str, folders: Folders, tmp_path: Path) -> None:
    old = copy(folders[0], tmp_path / "old")
    record = manifest(old)
    del record[key]
    (old / "manifest.json").write_text(json.dumps(record), encoding="utf-8")
    with pytest.raises(SpecError, match=key):
        compare_folders(old, folders[1], tmp_path, silent())


@pytest.mark.parametrize(("name", "damage"), [("core.step", b"ISO-10303-21;\nHEADER;"), ("core.step", None)])
def test_a_damaged_or_missing_step_file_is_named(
    name: str, damage: bytes | None, folders: Folders, tmp_path: Path
) -> None:
    old = copy(folders[0], tmp_path / "old")
    path = old / "step" / name
    path.unlink() if damage is None else path.write_bytes(damage)
    with pytest.raises(PartError) as caught:
        compare_folders(old, folders[1], tmp_path, silent(), pictures=False)
    assert name in str(caught.value)


def test_steel_that_was_changed_by_hand_is_compared_as_it_is_and_told(folders: Folders, tmp_path: Path) -> None:
    """The core of the new tool is put in the place of that of the old one: nothing is left to cut or to weld."""
    old = copy(folders[0], tmp_path / "old")
    shutil.copy(folders[1] / "step" / "core.step", old / "step" / "core.step")
    result = compare_folders(old, folders[1], tmp_path, silent(), pictures=False)
    assert [(f.code, f.severity, f.where) for f in result.findings] == [
        ("compare.not_as_built", Severity.WARNING, "old")
    ]
    assert "core" in result.findings[0].message


@pytest.mark.slow
def test_the_command_answers_with_0_and_replaces_its_earlier_answer(folders: Folders, tmp_path: Path) -> None:
    words = ("compare", *folders, "--output", "answer", "--json", "--quiet", "--no-pictures")
    for _ in range(2):
        done = moldgen(*words, folder=tmp_path, timeout=120)
        assert (done.returncode, done.stderr) == (0, "")
        document = json.loads(done.stdout)
        assert (document["exit_code"], document["output"]) == (0, "answer")
    assert (tmp_path / "answer" / "step" / "weld_core_1.step").is_file()


def test_the_command_refuses_what_is_no_output_of_a_build(folders: Folders, tmp_path: Path) -> None:
    for old, new in ((folders[0], tmp_path), (tmp_path / "nowhere", folders[1])):
        done = moldgen("compare", old, new, "--quiet", folder=tmp_path)
        assert done.returncode == int(ExitCode.SPEC)
        assert "moldgen build" in done.stderr


@pytest.mark.slow
def test_the_answer_never_replaces_what_it_is_made_from(folders: Folders, tmp_path: Path) -> None:
    old = copy(folders[0], tmp_path / "old")
    done = moldgen("compare", old, folders[1], "--output", old, "--quiet", folder=tmp_path)
    assert done.returncode == int(ExitCode.SPEC)
    assert snapshot(old) == snapshot(folders[0])
