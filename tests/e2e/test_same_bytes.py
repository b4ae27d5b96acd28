"""The same input gives the same bytes, with whatever an earlier run left; nothing tells when or where.

Issue 2, item 8, and issue 4, items 1 and 6.
"""

from __future__ import annotations

import re
import shutil
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest
from helpers.command import TESTS
from helpers.outputs import manifest, snapshot
from helpers.small_specs import CUP, NOTCHED, spec

from moldgen.flow.build import build_tool
from moldgen.flow.job import Options
from moldgen.flow.stages import Stages
from moldgen.flow.store import open_store
from moldgen.flow.tell import silent
from moldgen.spec.load import load_spec
from tests.helpers.rebuilds import DEMOS, REAL_PARTS, SPECS, built, differing, real_spec, small_changes

pytestmark = pytest.mark.slow

Builder = Callable[[Path, Path, Path | str], object]

TEXTS = (".json", ".csv", ".step")

QUICK = ("thumb-knob",)
"""Demos of the default run; the others belong to the sweep."""

EVERY_DEMO = [pytest.param(name, marks=() if name in QUICK else pytest.mark.sweep) for name in DEMOS]


def builds_like(first: Path, spec_file: Path, folder: Path, *options: str) -> None:
    """Build a spec into an empty cache, from a full one, and over its output: all is as `first`, made without a cache.

    The runs differ in hash seed, working directory, output folder and place of the spec.
    """
    for name in ("two", "three"):
        (folder / name).mkdir()
        shutil.copy(spec_file, folder / name / "spec.yaml")
    cache, two, three = folder / "cache", folder / "two" / "elsewhere", folder / "three" / "an other name"
    built(Path("two/spec.yaml"), two, cache, *options, seed=20260401, folder=folder)
    assert differing(first, two) == []
    again = (Path("spec.yaml"), Path(three.name), cache, *options)
    built(*again, seed=7, folder=folder / "three")
    assert differing(first, three) == []
    before = {path: path.stat().st_mtime_ns for path in three.rglob("*")}
    built(*again, seed=8, folder=folder / "three")
    assert differing(first, three) == []
    assert {path: path.stat().st_mtime_ns for path in three.rglob("*")} == before, "an unchanged output was written"


@pytest.mark.parametrize("name", EVERY_DEMO)
def test_a_demo_has_the_same_bytes_with_and_without_a_cache(name: str, demo, tmp_path: Path) -> None:
    builds_like(demo(name).folder, SPECS / name / "spec.yaml", tmp_path)


@pytest.mark.sweep
@pytest.mark.parametrize("name", REAL_PARTS)
def test_a_real_part_has_the_same_bytes_with_and_without_a_cache(name: str, real_parts: Path, tmp_path: Path) -> None:
    (tmp_path / "one").mkdir()
    work = real_spec(name, real_parts, tmp_path / "one").rename(tmp_path / "one" / "spec.yaml")
    built(work, tmp_path / "one" / "out", "off", "--no-pictures", seed=1)
    builds_like(tmp_path / "one" / "out", work, tmp_path, "--no-pictures")


def changes_through_the_cache(spec_file: Path, folder: Path, build: Builder) -> None:
    """Change a spec again and again: what is built with what earlier runs left is what is built without."""
    work, cache, out, alone = folder / "spec.yaml", folder / "cache", folder / "out", folder / "alone"
    shutil.copy(spec_file, work)
    build(work, out, cache)
    for change, text in small_changes(work, manifest(out)).items():
        work.write_text(text, encoding="utf-8")
        build(work, out, cache)
        build(work, alone, "off")
        assert differing(out, alone) == [], f"{change} was changed"


def built_here(work: Path, out: Path, cache: Path | str) -> None:
    """Build a spec in this process, without pictures: the kernel is loaded already."""
    shutil.rmtree(out, ignore_errors=True)
    out.mkdir()
    store = open_store({"MOLDGEN_CACHE": str(cache)})
    build_tool(load_spec(work), out, Options(pictures=False), Stages(store, silent()))


@pytest.mark.sweep  # tests/flow/test_stages.py holds the same for single stages
def test_a_changed_spec_built_through_the_cache_has_the_bytes_of_a_build_without(tmp_path: Path) -> None:
    changes_through_the_cache(spec(tmp_path, "name: cup\n", CUP, "pull: +z\n"), tmp_path, built_here)


def test_a_finding_about_a_key_of_the_spec_does_not_tell_its_folder(tmp_path: Path) -> None:
    """A notch that is filled is told with file, line and column of the spec."""
    for place in ("one", "other"):
        (tmp_path / place).mkdir()
        built_here(spec(tmp_path / place, NOTCHED, "parting: {undercuts: fill}\n"), tmp_path / place / "out", "off")
    assert differing(tmp_path / "one" / "out", tmp_path / "other" / "out") == []
    places = [f["where"] for f in manifest(tmp_path / "one" / "out")["findings"]]
    assert any(place.startswith("part.yaml:") for place in places), places


@pytest.mark.sweep
@pytest.mark.parametrize("name", DEMOS)
def test_a_changed_demo_built_through_the_cache_has_the_bytes_of_a_build_without(name: str, tmp_path: Path) -> None:
    changes_through_the_cache(SPECS / name / "spec.yaml", tmp_path, built)


def test_two_builds_at_once_into_one_cache_have_the_same_bytes(tmp_path: Path) -> None:
    """Both write what the other one reads; neither sees half of it."""
    source, cache = spec(tmp_path, CUP, "pull: +z\n", name="cup"), tmp_path / "cache"
    outs = [tmp_path / name for name in ("one", "two")]
    with ThreadPoolExecutor(len(outs)) as pool:
        list(pool.map(lambda out: built(source, out, cache, "--no-pictures"), outs))
    built(source, tmp_path / "alone", "off", "--no-pictures")
    assert [differing(tmp_path / "alone", out) for out in outs] == [[], []]


def test_the_measure_sees_one_byte(tmp_path: Path) -> None:
    """A planted fault: one byte of one file."""
    for name in ("one", "other"):
        (tmp_path / name).mkdir()
        (tmp_path / name / "manifest.json").write_bytes(b"{}")
        (tmp_path / name / "tool.step").write_bytes(b"ISO")
    assert differing(tmp_path / "one", tmp_path / "other") == []
    (tmp_path / "other" / "tool.step").write_bytes(b"ISo")
    (tmp_path / "other" / "more").mkdir()
    assert differing(tmp_path / "one", tmp_path / "other") == ["more", "tool.step"]


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
