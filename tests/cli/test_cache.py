"""Issue 4, item 1: `moldgen cache` shows what is kept for later runs, and clears it."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from helpers.command import moldgen

from moldgen.flow.store import open_store


@pytest.fixture
def place(tmp_path: Path) -> str:
    """A cache with two entries and a note."""
    where = str(tmp_path / "cache")
    store = open_store({"MOLDGEN_CACHE": where})
    store.keep("a" * 64, bytes(2**20))
    store.keep("b" * 64, b"")
    store.note("out/lid", "text")
    return where


def test_it_shows_place_entries_size_and_limit(place: str, tmp_path: Path) -> None:
    done = moldgen("cache", folder=tmp_path, MOLDGEN_CACHE=place, MOLDGEN_CACHE_SIZE="0.5")
    assert (done.returncode, done.stderr) == (0, "")
    title, columns, row = done.stdout.splitlines()
    assert title == f"cache: {place}, at most 512 MiB"
    assert columns.split() == ["entries", "notes", "size", "[MiB]"]
    assert row.split() == ["now", "2", "1", "1.01"]
    assert open_store({"MOLDGEN_CACHE": place}).summary().entries == 2


def test_it_clears(place: str, tmp_path: Path) -> None:
    done = moldgen("cache", "--clear", "--json", folder=tmp_path, MOLDGEN_CACHE=place)
    told = json.loads(done.stdout)
    assert done.returncode == told["exit_code"] == 0
    assert (told["entries"], told["notes"], told["size_bytes"]) == (0, 0, 0)
    assert (told["cleared"]["entries"], told["cleared"]["notes"]) == (2, 1)
    assert [p for p in Path(place).rglob("*") if p.is_file()] == []
    again = moldgen("cache", "--clear", folder=tmp_path, MOLDGEN_CACHE=place)
    assert again.stdout.split()[-8:] == ["before", "0", "0", "0", "now", "0", "0", "0"]


def test_where_there_is_none_it_says_why_and_clears_nothing(tmp_path: Path) -> None:
    shown = moldgen("cache", folder=tmp_path, MOLDGEN_CACHE="off")
    assert (shown.returncode, shown.stdout) == (0, "cache: none, MOLDGEN_CACHE=off\n")
    assert json.loads(moldgen("cache", "--json", folder=tmp_path, MOLDGEN_CACHE="/dev/null").stdout)["why_not"]
    cleared = moldgen("cache", "--clear", folder=tmp_path, MOLDGEN_CACHE="off")
    assert cleared.returncode == 2
    assert "no cache to clear" in cleared.stderr


def test_a_limit_that_makes_no_sense_is_a_wrong_command_line(tmp_path: Path) -> None:
    done = moldgen("cache", folder=tmp_path, MOLDGEN_CACHE_SIZE="plenty")
    assert done.returncode == 2
    assert "MOLDGEN_CACHE_SIZE" in done.stderr
