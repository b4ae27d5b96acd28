"""The same input gives the same bytes: design, section 2 and issue 2, item 8. And nothing tells when or where."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest
from helpers.command import TESTS, moldgen
from helpers.outputs import snapshot

pytestmark = pytest.mark.slow

TEXTS = (".json", ".csv", ".step")


def test_other_process_hash_seed_folder_and_output_give_the_same_bytes(demo, tmp_path: Path) -> None:
    first = demo("sensor-lid")
    (tmp_path / "elsewhere").mkdir()
    shutil.copy(TESTS.parent / "specs" / "sensor-lid" / "spec.yaml", tmp_path / "elsewhere" / "spec.yaml")
    done = moldgen(
        "build",
        "elsewhere/spec.yaml",
        "--output",
        "another name",
        folder=tmp_path,
        timeout=300,
        PYTHONHASHSEED="20260401",
        TZ="Asia/Tokyo",
        LANG="C",
    )
    assert done.returncode == 0, done.stderr
    one, other = snapshot(first.folder), snapshot(tmp_path / "another name")
    assert one.keys() == other.keys()
    assert [path for path in one if one[path] != other[path]] == []


def test_nothing_tells_the_date_or_a_place_of_this_machine(demo) -> None:
    first = demo("sensor-lid")
    places = [str(TESTS.parent), str(first.folder.parents[1]), str(Path.home()) if Path.home() != Path("/") else "//"]
    for path, data in snapshot(first.folder).items():
        if data is None:
            continue
        found = [place for place in places if place.encode() in data]
        assert not found, f"{path} names {found}"
        if path.endswith(TEXTS):
            dates = set(re.findall(rb"\b(?:19|20)\d\d-\d\d-\d\d(?:T[\d:]+)?", data)) - {b"1970-01-01T00:00:00"}
            assert not dates, f"{path} holds a date"
        else:
            assert not re.search(rb"tIME|tEXt|iTXt", data[:200]), f"{path} holds a note of its writer"
