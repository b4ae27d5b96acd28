"""Design, section 2: output is written aside, then renamed; an interrupted run leaves the previous folder whole."""

from __future__ import annotations

import errno
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from moldgen.errors import KernelError, SpecError
from moldgen.flow import folder as module
from moldgen.flow.folder import check_replaceable, clear_leftovers, fresh_folder, write_new_file


@pytest.fixture
def dead_pid() -> int:
    """The number of a process that is gone."""
    process = subprocess.Popen([sys.executable, "-c", ""])
    process.wait()
    return process.pid


def ours(folder: Path, text: str = "old") -> Path:
    folder.mkdir(parents=True)
    (folder / "manifest.json").write_text(json.dumps({"moldgen": text}), encoding="utf-8")
    return folder


def names(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


def test_a_folder_is_made_with_its_parents_and_nothing_stays_beside_it(tmp_path: Path) -> None:
    final = tmp_path / "out" / "lid"
    with fresh_folder(final) as aside:
        (aside / "manifest.json").write_text("{}", encoding="utf-8")
        assert not final.exists()
    assert names(final) == ["manifest.json"]
    assert names(tmp_path / "out") == ["lid"]


def test_an_earlier_output_is_replaced_as_a_whole(tmp_path: Path) -> None:
    final = ours(tmp_path / "lid")
    (final / "stale.step").touch()
    with fresh_folder(final) as aside:
        (aside / "new.step").touch()
    assert names(final) == ["new.step"]
    assert names(tmp_path) == ["lid"]


@pytest.mark.parametrize("stop", [KernelError("x"), KeyboardInterrupt(), ZeroDivisionError()])
def test_a_block_that_fails_leaves_the_earlier_output(tmp_path: Path, stop: BaseException) -> None:
    final = ours(tmp_path / "lid")
    with pytest.raises(type(stop)), fresh_folder(final) as aside:
        (aside / "half.step").touch()
        raise stop
    assert names(final) == ["manifest.json"]
    assert names(tmp_path) == ["lid"]


def test_a_folder_that_moldgen_did_not_make_is_left_alone(tmp_path: Path) -> None:
    mine = tmp_path / "thesis"
    mine.mkdir()
    (mine / "chapter.txt").write_text("years of work", encoding="utf-8")
    with pytest.raises(SpecError, match=r"not empty and has no manifest\.json"), fresh_folder(mine):
        pass
    (mine / "manifest.json").write_text('{"name": "of another program"}', encoding="utf-8")
    with pytest.raises(SpecError, match="left alone"), fresh_folder(mine):
        pass
    assert (mine / "chapter.txt").read_text(encoding="utf-8") == "years of work"
    assert names(tmp_path) == ["thesis"]


def test_an_empty_folder_may_be_filled(tmp_path: Path) -> None:
    (tmp_path / "lid").mkdir()
    with fresh_folder(tmp_path / "lid") as aside:
        (aside / "a").touch()
    assert names(tmp_path / "lid") == ["a"]


def test_an_output_that_holds_what_the_run_reads_is_refused(tmp_path: Path) -> None:
    final = ours(tmp_path / "lid")
    spec = final / "lid.yaml"
    spec.touch()
    with pytest.raises(SpecError, match=r"holds lid\.yaml, which this run reads"):
        check_replaceable(final, [spec])


def test_an_output_that_holds_the_current_folder_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ours(tmp_path / "lid"))
    with pytest.raises(SpecError, match="the folder you are in"):
        check_replaceable(Path())


def test_a_file_in_the_place_of_the_folder_is_refused(tmp_path: Path) -> None:
    (tmp_path / "lid").write_text("mine", encoding="utf-8")
    with pytest.raises(SpecError, match="is a file"), fresh_folder(tmp_path / "lid"):
        pass
    assert (tmp_path / "lid").read_text(encoding="utf-8") == "mine"


def test_a_link_is_followed_and_stays_a_link(tmp_path: Path) -> None:
    ours(tmp_path / "disk" / "lid")
    link = tmp_path / "lid"
    link.symlink_to(tmp_path / "disk" / "lid")
    with fresh_folder(link) as aside:
        (aside / "new").touch()
    assert link.is_symlink()
    assert names(tmp_path / "disk" / "lid") == ["new"]


@pytest.mark.parametrize("place", ["/dev/null/lid", "/proc/lid", "/sys/lid", "/dev/null", "x" * 300])
def test_a_place_that_cannot_be_written_is_a_wrong_command_line(
    place: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(SpecError) as caught, fresh_folder(Path(place)):
        pass
    assert caught.value.exit_code == 2
    assert caught.value.where == place
    assert "--output" in caught.value.remedy


def test_a_full_disk_is_told_as_such_wherever_it_is_met(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    final = ours(tmp_path / "lid")
    with pytest.raises(SpecError, match="the disk is full"), fresh_folder(final):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    monkeypatch.setattr(module, "LEAST_FREE_BYTES", 2**80)  # every disk is full
    with pytest.raises(SpecError, match=r"the disk is full \(the STEP writer failed\)"), fresh_folder(final):
        raise KernelError("the STEP writer failed")
    assert names(final) == ["manifest.json"]


def test_a_refusal_elsewhere_is_not_blamed_on_the_output(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError), fresh_folder(tmp_path / "lid"):
        (tmp_path / "no such part.step").read_bytes()


def test_a_swap_cut_in_two_is_undone_by_the_next_run(tmp_path: Path, dead_pid: int) -> None:
    final = tmp_path / "lid"
    ours(tmp_path / f".lid.old-{dead_pid}", "previous")
    (tmp_path / f".lid.new-{dead_pid}").mkdir()
    clear_leftovers(final)
    assert json.loads((final / "manifest.json").read_text(encoding="utf-8")) == {"moldgen": "previous"}
    assert names(tmp_path) == ["lid"]


def test_a_killed_run_s_leftovers_go_but_a_living_one_s_stay(tmp_path: Path, dead_pid: int) -> None:
    final = ours(tmp_path / "lid", "current")
    ours(tmp_path / f".lid.old-{dead_pid}", "older")
    (tmp_path / f".lid.new-{os.getppid()}").mkdir()
    (tmp_path / ".lid.new-notes").mkdir()
    clear_leftovers(final)
    assert json.loads((final / "manifest.json").read_text(encoding="utf-8")) == {"moldgen": "current"}
    assert names(tmp_path) == [f".lid.new-{os.getppid()}", ".lid.new-notes", "lid"]


def test_a_rename_that_fails_puts_the_earlier_output_back(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    final = ours(tmp_path / "lid")
    rename = Path.rename

    def failing(self: Path, target: Path) -> Path:
        if ".new-" in self.name:
            raise OSError(errno.EIO, "input/output error")
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", failing)
    with pytest.raises(SpecError, match="input/output error"), fresh_folder(final):
        pass
    assert names(tmp_path) == ["lid"]
    assert names(final) == ["manifest.json"]


def test_a_new_file_is_never_written_over_another(tmp_path: Path) -> None:
    path = tmp_path / "lid.yaml"
    write_new_file(path, "part: {file: lid.step}\n")
    with pytest.raises(SpecError, match="exists already"):
        write_new_file(path, "other")
    assert path.read_text(encoding="utf-8") == "part: {file: lid.step}\n"
    assert names(tmp_path) == ["lid.yaml"]
    with pytest.raises(SpecError, match="cannot be written"):
        write_new_file(tmp_path / "no folder" / "lid.yaml", "")
