"""Issue 4, item 5: rebuild on save, one line each, and a broken spec in between. The worker's job is a stand-in."""

from __future__ import annotations

import json
import os
import signal
import time
from pathlib import Path

import pytest
from helpers.small_specs import NOTCHED, spec
from helpers.watching import Watching, gone

from moldgen.errors import ExitCode, SpecError, SpecErrors
from moldgen.flow.job import JobResult
from moldgen.flow.manifest_changes import ManifestChanges
from moldgen.flow.watch import Round
from moldgen.flow.watched import READ_AGAIN, RESTS, RESTS_ABSENT, SMALL, Watched
from moldgen.model.proof import Proof, Verdict


def runs(folder: Path) -> int:
    return (folder / "runs").read_text(encoding="utf-8").count("\n")


def until(true, seconds: float = 30.0) -> None:
    end = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < end, "waited in vain"
        time.sleep(0.02)


def test_a_broken_spec_is_one_line_with_its_place_and_the_watch_goes_on(tmp_path: Path) -> None:
    path = spec(tmp_path, NOTCHED, name="well")
    with Watching(tmp_path, "well.yaml", "--quiet", job="by_name") as watching:
        assert "proved" in watching.line()
        path.write_text(NOTCHED.replace("pull: +z", "pull: up"), encoding="utf-8")
        broken = watching.line()
        assert "broken" in broken
        assert "well.yaml:2:7: " in broken
        assert "; try: " in broken
        assert (tmp_path / "out" / "manifest.json").is_file()
        path.write_text(NOTCHED + "# mended\n", encoding="utf-8")
        assert "nothing changed" in watching.line()
        assert runs(tmp_path) == 2, "a broken spec starts no worker"
        watching.end()
        assert watching.process.returncode == 130


def test_saving_the_same_text_builds_nothing(tmp_path: Path) -> None:
    path = spec(tmp_path, NOTCHED, name="well")
    with Watching(tmp_path, "well.yaml", "--quiet", job="by_name") as watching:
        watching.line()
        path.write_text(NOTCHED, encoding="utf-8")
        aside = tmp_path / "aside"
        aside.write_text(NOTCHED, encoding="utf-8")
        aside.replace(path)
        assert watching.silent(2.0)
        aside.write_text(NOTCHED + "# another\n", encoding="utf-8")
        aside.replace(path)  # as editors save
        watching.line()
        assert runs(tmp_path) == 2


@pytest.mark.parametrize("beside", ["lid.step", "well.accepted.yaml"])
def test_the_part_and_the_accepted_layout_are_watched_too(beside: str, tmp_path: Path) -> None:
    (tmp_path / "lid.step").write_text("ISO-10303-21;", encoding="utf-8")
    (tmp_path / "well.yaml").write_text("part: {file: lid.step}\nresin: ABS\n", encoding="utf-8")
    with Watching(tmp_path, "well.yaml", "--quiet", job="by_name") as watching:
        watching.line()
        (tmp_path / beside).write_text("ISO-10303-21; another", encoding="utf-8")
        watching.line()
        assert runs(tmp_path) == 2


def test_a_change_during_a_build_stops_it_and_starts_again(tmp_path: Path) -> None:
    path = spec(tmp_path, NOTCHED, name="hangs")
    with Watching(tmp_path, "hangs.yaml", "--quiet", job="by_name") as watching:
        until((tmp_path / "hanging").exists)
        first = watching.workers()
        path.write_text(NOTCHED + "# changed\n", encoding="utf-8")
        until(lambda: runs(tmp_path) == 2)
        assert gone(first)
        second = watching.workers()
        assert second
        watching.end()
        assert watching.process.returncode == 130
        assert gone(second)
        assert list((tmp_path / "out").iterdir()) == [], "what was half written is gone"


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_ends_it_with_130_and_json_says_so_in_a_line(number: signal.Signals, tmp_path: Path) -> None:
    spec(tmp_path, NOTCHED, name="well")
    with Watching(tmp_path, "well.yaml", "--json", "--quiet", job="by_name") as watching:
        made = json.loads(watching.line())
        assert (made["exit_code"], made["headline"], made["changes"]) == (0, "well", None)
        told = watching.end(number)
        assert watching.process.returncode == 130
        assert json.loads(watching.line(5.0))["exit_code"] == 130
        assert told == "moldgen: stopped by Ctrl-C or by a signal; the earlier output is untouched\n"


# --- files -----------------------------------------------------------------------------------------------------------
def test_what_is_still_being_written_is_waited_for(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("one", encoding="utf-8")
    files = Watched([path])
    seen = []
    for text in ("one", "on", "o", "one two", "one two"):
        path.write_text(text, encoding="utf-8")
        seen.append(files.look())
    assert seen[:-1] == [None] * 4
    assert RESTS == 2
    assert seen[-1] is not None


def test_a_file_that_is_away_for_a_moment_is_waited_for_longer(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("one", encoding="utf-8")
    files = Watched([path, tmp_path / "never there"])
    assert [files.look() is None for _ in range(RESTS)] == [True, False]
    path.unlink()
    assert [files.look() is None for _ in range(RESTS_ABSENT)] == [True] * (RESTS_ABSENT - 1) + [False]


def test_a_large_file_is_found_changed_although_its_times_lie(tmp_path: Path) -> None:
    path = tmp_path / "large"
    path.write_bytes(b"a" * (SMALL + 1))
    stat = path.stat()
    files = Watched([path])
    first = [files.look() for _ in range(RESTS)][-1]
    path.write_bytes(b"b" * (SMALL + 1))
    os.utime(path, ns=(stat.st_atime_ns, stat.st_mtime_ns))
    later = [files.look() for _ in range(READ_AGAIN + RESTS + 1)]
    assert later[0] == first, "not read again at once: that is what the hint is for"
    assert later[-1] != first


# --- lines -----------------------------------------------------------------------------------------------------------
def test_a_line_says_what_did_not_hold() -> None:
    proofs = (Proof("the cavity half opens", Verdict.FAILED, 1.0, 0.03, "mm"),)
    result = JobResult(ExitCode.CHECK_FAILED, "lid: 9 components, NOT proved", proofs=proofs)
    made = Round(3.21, result, changes=ManifestChanges(recut=("core",), unchanged=4))
    assert made.line() == "   3.2 s  failed   core recut; 4 others unchanged; not proved: the cavity half opens"
    assert made.as_json()["not_proved"] == ["the cavity half opens"]


def test_of_several_mistakes_the_first_is_told_and_the_others_counted() -> None:
    error = SpecErrors([SpecError("no such key", where=f"a.yaml:{n}:1", remedy="delete\nit") for n in (1, 2, 3)])
    line = Round(0.04, error=error).line()
    assert line == "   0.0 s  broken   a.yaml:1:1: no such key (and 2 more); try: delete it"
