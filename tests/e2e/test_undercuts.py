"""Issue 2, items 4 and 5: what holds the part is named with place, area and depth; filled only when asked for.

The part is a block with a notch in its side, so that every figure is a closed form; the shrink is nil, so that mold and
part have the same size.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from helpers.command import moldgen
from helpers.outputs import findings, manifest, unproved
from helpers.small_specs import NOTCHED, spec

pytestmark = pytest.mark.slow

LOW, HIGH = (11.9, -3.0, 6.0), (15.0, 7.0, 10.0)
"""Corners of the notch: 3.1 mm deep, 10 mm long, 4 mm high."""

FACES = sorted([3.1 * 10, 3.1 * 10, 10 * 4, 3.1 * 4, 3.1 * 4])
"""Floor, roof, back and both ends of the notch [mm^2]."""

NO_SHRINK = "shrink: 0\n"
TWO_HALVES = "parting: {undercuts: refuse}\n"


def near(point: list[float], slack: float = 0.1) -> bool:
    """True if the point lies on a wall of the notch: inside its box, and on one side of it that is not the open one."""
    inside = all(a - slack <= p <= b + slack for a, p, b in zip(LOW, point, HIGH, strict=True))
    sides = [point[0] - LOW[0], point[1] - LOW[1], HIGH[1] - point[1], point[2] - LOW[2], HIGH[2] - point[2]]
    return inside and min(abs(s) for s in sides) <= slack


def test_a_build_refuses_and_names_place_area_and_depth(tmp_path: Path) -> None:
    done = moldgen("build", spec(tmp_path, NOTCHED, NO_SHRINK, TWO_HALVES), "--quiet", folder=tmp_path)
    assert done.returncode == 3
    assert re.search(r"part\.yaml:2:\d+: 1 undercuts? hold", done.stderr)
    found = re.search(
        r"face at (\S+), (\S+), (\S+): (\S+) mm\^2 of 5 faces, (\S+) mm deep, (\S+) mm high, (\S+) mm\^3", done.stderr
    )
    assert found, done.stderr
    x, y, z, area, depth, height, volume = map(float, found.groups())
    assert near([x, y, z]), "the place of the trapped face"
    assert area == pytest.approx(sum(FACES), abs=0.2)
    assert depth == pytest.approx(3.1, abs=0.02)
    assert height == pytest.approx(4.0, abs=0.02)
    assert volume == pytest.approx(3.1 * 10 * 4, rel=0.01)
    assert "parting.undercuts: fill" in done.stderr
    assert not (tmp_path / "out").exists() or not list((tmp_path / "out").iterdir())


def test_check_gives_the_same_as_a_table_and_in_the_manifest(tmp_path: Path) -> None:
    done = moldgen("check", spec(tmp_path, NOTCHED, NO_SHRINK), "--quiet", folder=tmp_path)
    assert done.returncode == 1
    assert re.search(r"^part: 1 undercut", done.stdout)
    assert re.search(r"^  face at +grip +faces +area \[mm2\] +depth \[mm\]", done.stdout, re.MULTILINE)
    assert re.search(r"undercut +5 +126\.[78]\d* +3\.1\d? ", done.stdout), done.stdout
    record = manifest(tmp_path / "out" / "part-check")
    (place,) = record["release"]["trapped"]
    assert place["grip"] == "undercut"
    assert near(place["at"])
    assert place["area_mm2"] == pytest.approx(sum(FACES), abs=0.2)
    assert place["depth_mm"] == pytest.approx(3.1, abs=0.02)
    assert sorted(f["area_mm2"] for f in place["faces"]) == pytest.approx(FACES, abs=0.05)
    assert all(near(f["at"]) and f["surface"] == "plane" for f in place["faces"])
    (finding,) = findings(record, "release.trapped")
    assert finding["severity"] == "failure"
    assert near(finding["at"])


def test_the_places_named_do_not_move_with_shrink_and_pull(tmp_path: Path) -> None:
    text = NOTCHED.replace("pull: +z", "pull: -z") + "shrink: {all: 2 %, fixed_point: [100, 50, 20]}\n"
    done = moldgen("check", spec(tmp_path, text), "--quiet", folder=tmp_path)
    assert done.returncode == 1
    (place,) = manifest(tmp_path / "out" / "part-check")["release"]["trapped"]
    assert near(place["at"])
    assert all(near(f["at"]) for f in place["faces"])


def test_filling_builds_proves_and_warns(tmp_path: Path) -> None:
    text = NOTCHED + NO_SHRINK + "parting: {undercuts: fill}\n"
    done = moldgen("build", spec(tmp_path, text), "--quiet", "--no-pictures", folder=tmp_path)
    assert done.returncode in (0, 1), done.stderr
    record = manifest(tmp_path / "out" / "part")
    assert unproved(record) == []
    (warning,) = findings(record, "release.filled")
    assert warning["severity"] == "warning"
    assert warning["value"] == pytest.approx(3.1 * 10 * 4, rel=0.01)
    molded = next(c["volume_mm3"] for c in record["components"] if c["role"] == "part")
    assert record["part"]["volume_mm3"] == pytest.approx(30 * 24 * 16 - 124, rel=1e-9)
    assert molded == pytest.approx(30 * 24 * 16, rel=1e-9), "the notch is molded full"
    assert done.returncode == (1 if any(f["severity"] == "failure" for f in record["findings"]) else 0)


def slide_of(folder: Path) -> tuple[dict[str, object], list[str]]:
    """Return the one slide of a built tool, and the names of the proofs that passed."""
    record = manifest(folder / "out" / "part")
    (slide,) = [c for c in record["components"] if c["role"] == "slide"]
    return slide, [p["name"] for p in record["proofs"] if p["passed"]]


@pytest.mark.slow
def test_a_side_action_given_by_hand_is_obeyed_and_proved(tmp_path: Path) -> None:
    wish = 'side_actions: {given: [{at: [14, 2, 8], direction: "+x", width: 11.5, height: 5.5}], add: false}\n'
    done = moldgen("build", spec(tmp_path, NOTCHED, NO_SHRINK, wish), "--quiet", "--no-pictures", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    slide, passed = slide_of(tmp_path)
    assert slide["moves_with"] == "slide 1"
    assert len(passed) == 7
    steps = manifest(tmp_path / "out" / "part")["claims"]["steps"]
    ways = [move for step in steps for group, move in step["moves"] if group == "slide 1"]
    way = [sum(w[k] for w in ways) for k in range(3)]
    assert way[0] >= 3.1, "out of the notch, which is 3.1 mm deep"
    assert way[1:] == pytest.approx([0.0, 0.0], abs=1e-9)


@pytest.mark.slow
def test_a_side_action_given_the_wrong_way_is_refused_with_what_stands_in_its_way(tmp_path: Path) -> None:
    wish = 'side_actions: {given: [{at: [14, 2, 8], direction: "-x"}], add: false}\n'
    done = moldgen("build", spec(tmp_path, NOTCHED, NO_SHRINK, wish), "--quiet", "--no-pictures", folder=tmp_path)
    assert done.returncode == 3, done.stderr
    assert "1 undercut holds the part" in done.stderr
    assert "no side action releases" in done.stderr
    assert not list((tmp_path / "out").glob("part"))
