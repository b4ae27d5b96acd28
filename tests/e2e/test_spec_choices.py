"""What the spec decides is what is built: each choice shows in the manifest and in the steel with its right number.

All on one small cup (see `helpers.small_specs`), 40 x 30 mm and 16 mm high, opening downward. Numbers by hand; shrink
by ISO 294-4 (S refers to the mold): mold = part / (1 - S).
"""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from helpers.command import moldgen
from helpers.outputs import findings, manifest, quantity, table, unproved
from helpers.small_specs import CUP, PLAIN_CUP, spec

from moldgen.kernel.measure import bounding_box
from moldgen.kernel.step_read import read_assembly

pytestmark = pytest.mark.slow

K = 1 / (1 - 0.0055)
"""ABS in the catalog: 0.4 to 0.7 % both ways, mean 0.55 %."""


@pytest.fixture
def build(tmp_path: Path, shared_cache: str) -> Callable[..., dict[str, Any]]:
    """Build the cup with more lines of spec, and return the manifest (its folder under "folder")."""

    def run(text: str, code: int = 0, part: str = CUP) -> dict[str, Any]:
        words = ("build", spec(tmp_path, part, text), "--no-pictures", "--quiet")
        done = moldgen(*words, folder=tmp_path, MOLDGEN_CACHE=shared_cache)
        assert done.returncode == code, done.stdout + done.stderr
        return {**manifest(tmp_path / "out" / "part"), "folder": tmp_path / "out" / "part"}

    return run


@pytest.fixture
def refusal(tmp_path: Path, shared_cache: str) -> Callable[[str], str]:
    """Return what a build that must end with exit code 2 says."""

    def run(text: str) -> str:
        words = ("build", spec(tmp_path, CUP, text), "--no-pictures", "--quiet")
        done = moldgen(*words, folder=tmp_path, MOLDGEN_CACHE=shared_cache)
        assert done.returncode == 2, done.stdout + done.stderr
        assert "Traceback" not in done.stderr
        return done.stderr

    return run


def box(record: dict[str, Any], name: str = "part") -> tuple[list[float], list[float]]:
    """The corners of a component as exported [mm]."""
    ((_, solid),) = read_assembly(record["folder"] / "step" / f"{name}.step")
    low, high = bounding_box(solid)
    return list(low), list(high)


def size(record: dict[str, Any]) -> list[float]:
    """The closed block [mm]."""
    low, high = record["parting"]["block_mm"]
    return [b - a for a, b in zip(low, high, strict=True)]


def decision(record: dict[str, Any], topic: str) -> dict[str, Any]:
    return next(d for d in record["decisions"] if d["topic"] == topic)


def test_pull_auto_shrink_by_axis_and_blocks_with_units(build) -> None:
    record = build(
        "pull: auto\nshrink: {x: 0.4 %, y: 0.5, z: 0.006 mm/mm}\n"
        "blocks: {length: 4 in, width: 9 cm, cavity_height: 36, core_height: 46, core_material: 1.2343}\n"
    )
    assert unproved(record) == []
    assert record["pull"]["direction"] == pytest.approx([0, 0, 1], abs=1e-9)
    assert "along" in record["pull"]["how_chosen"]
    assert decision(record, "pull")["refused"], "the others are named, with their reasons"
    factors = [1 / (1 - 0.004), 1 / (1 - 0.005), 1 / (1 - 0.006)]
    assert [record["shrink"][axis] for axis in "xyz"] == pytest.approx(factors, rel=1e-11)
    assert record["shrink"]["rule"] == "mold = part / (1 - S)"
    low, high = box(record)
    assert [b - a for a, b in zip(low, high, strict=True)] == pytest.approx(
        [40 * factors[0], 30 * factors[1], 16 * factors[2]], abs=1e-3
    )
    assert findings(record, "shrink.not_uniform")
    assert size(record) == pytest.approx([101.6, 90.0, 36 + 46], abs=1e-9)
    assert box(record, "cavity")[1][2] == pytest.approx(36.0, abs=1e-3)
    assert box(record, "core")[0][2] == pytest.approx(-46.0, abs=1e-3)
    steel = {c["role"]: c["material"] for c in record["components"]}
    assert (steel["cavity"], steel["core"]) == ("1.2311", "1.2343")


def test_pull_by_a_face_shrink_of_the_part_about_a_point_edge_gate_and_no_core_pins(build) -> None:
    record = build(
        "pull: face at 0, 0, 16.2\n"
        "shrink: {all: 1 %, convention: part, fixed_point: [10, 5, 2]}\n"
        "gate: {kind: edge, at: [20, 0, 0], width: 0.08 in, depth: 1, land: 0.8 mm}\ncore_pins: {pick: none}\n"
    )
    assert unproved(record) == []
    assert record["pull"]["direction"] == pytest.approx([0, 0, 1], abs=1e-9)
    assert "nearest to 0.00, 0.00, 16.20" in record["pull"]["how_chosen"]
    assert [record["shrink"][axis] for axis in "xyz"] == pytest.approx([1.01] * 3, rel=1e-12)
    assert record["shrink"]["rule"] == "mold = part * (1 + S)"
    # x: 10 + 1.01 (-20 - 10) to 10 + 1.01 (20 - 10); y: 5 + 1.01 (-15 - 5) to ...; z: 2 + 1.01 (0 - 2) to ...
    low, high = box(record)
    assert low == pytest.approx([-20.3, -15.2, -0.02], abs=1e-3)
    assert high == pytest.approx([20.1, 15.1, 16.14], abs=1e-3)
    assert record["parting"]["level_mm"] == pytest.approx(-0.02, abs=1e-9)
    gate = record["layout"]["gate"]
    assert [gate[k] for k in ("kind", "width", "depth", "land")] == ["edge", pytest.approx(2.032), 1.0, 0.8]
    assert gate["at"] == pytest.approx([20.1, -0.05, -0.02], abs=0.6)  # the nearest of the places tried, 1 mm apart
    assert gate["chosen_by"] == "given in the spec"
    assert gate["in_cavity"] is True
    assert record["layout"]["core_pins"] == []
    assert not any(c["role"] == "core_pin" for c in record["components"])


def test_given_pins_a_pin_gate_and_a_core_pin_asked_for(build) -> None:
    record = build(
        "pull: +z\ngate: {kind: pin, at: [0, 0, 16], diameter: 1.2}\ncore_pins: {pick: none, at: [[8, 4, 8]]}\n"
        "ejection:\n  stroke: 30\n  pins:\n    - {at: [-12, -8, 14], diameter: 4}\n"
        "    - {at: [12, -8, 14], diameter: 4}\n    - {at: [-12, 8, 14]}\n    - {at: [1, 9, 14], diameter: 3 mm}\n"
    )
    assert unproved(record) == []
    pins, places = record["layout"]["ejector_pins"], [(-12, -8), (12, -8), (-12, 8), (1, 9)]
    assert len(pins) == 4, "none is added to those given"
    for x, y in places:
        pin = next(p for p in pins if [p["x"], p["y"]] == pytest.approx([K * x, K * y], abs=1e-9))
        assert pin["chosen_by"] == "given in the spec"
        assert pin["tip_z"] == pytest.approx(14 * K, abs=1e-6), "at the ceiling"
        assert pin["diameter"] == 3.0 if (x, y) == (1, 9) else pin["diameter"] == 4.0 or (x, y) == (-12, 8)
    total = record["layout"]["ejection_force_n"]
    assert sum(p["force_n"] for p in pins) == pytest.approx(total, rel=1e-6), "the pins share the whole force"
    assert record["layout"]["stroke_mm"] == record["claims"]["stroke_mm"] == 30.0
    gate = record["layout"]["gate"]
    assert (gate["kind"], gate["diameter"]) == ("pin", 1.2)
    assert gate["at"] == pytest.approx([0.0, 0.0, 16 * K], abs=1e-3)
    (core_pin,) = record["layout"]["core_pins"]
    assert [core_pin["x"], core_pin["y"]] == pytest.approx([8 * K, 4 * K], abs=1e-6)
    assert core_pin["chosen_by"] == "given in the spec"
    # the boss ends 12 mm under its plane z = 14.2, so at 2.2; its hole is 11 mm deep: its floor is at 13.2
    assert core_pin["top_z"] == pytest.approx(13.2 * K, abs=1e-6)
    # its bore ends where the core does: under the end of the boss
    rows = [r for r in table(record["folder"] / "holes.csv") if r["purpose"] == "core pin 1, fit"]
    assert [float(rows[0]["x_mm"]), float(rows[0]["z_to_mm"])] == pytest.approx([8 * K, 2.2 * K], abs=1e-4)


def test_illegal_pins_and_core_pins_fail_with_their_place_and_a_sprue_gate_is_built(build) -> None:
    pins = "ejection: {pins: [{at: [0, 0, 14], diameter: 4}, {at: [19.5, 0, 0], diameter: 4}, {at: [60, 0, 0]}]}\n"
    text = "pull: +z\ngate: {kind: sprue, at: [5, 0, 16]}\ncore_pins: {pick: none, at: [[-8, 4, 8]]}\n"
    record = build(text + pins, code=1)
    line = CUP.count("\n") + text.count("\n") + 1
    second, third = (
        f"part.yaml:{line}:{pins.index(at) + 1} (ejection.pins[{number}])"
        for number, at in ((1, "{at: [19.5"), (2, "{at: [60"))
    )
    failures = {(f["code"], f["where"]): f for f in record["findings"] if f["severity"] == "failure"}
    assert ("ejector_pin.no_part", third) in failures
    assert ("ejector_pin.step", second) in failures, "half of the pin lies under the rim, 14 mm lower"
    assert failures["ejector_pin.step", second]["value"] == pytest.approx(14.0, abs=0.2)
    (no_core,) = findings(record, "core_pin.no_core")
    assert no_core["at"] == pytest.approx([-8, 4, 8], abs=1e-6)
    gate = record["layout"]["gate"]
    assert gate["kind"] == "sprue"
    assert gate["at"] == pytest.approx([5 * K, 0.0, 16 * K], abs=1e-3)
    (row,) = [r for r in table(record["folder"] / "holes.csv") if r["purpose"] == "sprue"]
    assert float(row["diameter_mm"]) == pytest.approx(gate["diameter"], abs=1e-4)


def test_marked_faces_stay_free(build) -> None:
    text = "pull: +z\nmarks: [{face: [0, 15, 1], no_gate: true}, {face: [20, 0, 1], no_gate: true}]\n"
    record = build(text, part=PLAIN_CUP)
    assert unproved(record) == []
    x, y, _ = record["layout"]["gate"]["at"]
    assert (x, y) == (pytest.approx(0.0, abs=1.0), pytest.approx(-15 * K, abs=0.01)), "opposite, as without marks"


def test_pins_stay_off_a_marked_ceiling_or_their_lack_is_a_failure(build) -> None:
    text = "pull: +z\nmarks: [{face: [0, 0, 14], no_pins: true}]\nejection: {diameter: 4}\n"
    record = build(text, code=1, part=PLAIN_CUP)
    assert [p for p in record["layout"]["ejector_pins"] if p["tip_z"] > 13] == []
    assert findings(record, "ejection.no_room"), "no pin of 4 mm fits under a rim of 2 mm"
    assert [p["name"] for p in record["proofs"] if not p["passed"]] == ["the ejectors move through their stroke"]


def test_a_parting_height_is_kept_where_the_walls_are_upright(build) -> None:
    record = build("pull: +z\nparting: {height: 0.25 in}\n", part=PLAIN_CUP.replace("draft: 2", "draft: 0"))
    assert unproved(record) == []
    assert record["parting"]["level_mm"] == pytest.approx(6.35 * K, abs=1e-9)
    assert box(record, "cavity")[0][2] == pytest.approx(6.35 * K, abs=1e-3)
    assert decision(record, "parting surface")["choice"] == "flat"
    assert record["layout"]["gate"]["at"][2] == pytest.approx(6.35 * K, abs=1e-9)


def test_a_parting_height_that_leaning_walls_forbid_is_told(build) -> None:
    record = build("pull: +z\nparting: {height: 3 mm}\n", part=PLAIN_CUP)
    assert unproved(record) == []
    (moved,) = findings(record, "parting.level_moved")
    assert record["parting"]["level_mm"] == pytest.approx(0.0, abs=1e-9)
    assert moved["severity"] == "caution"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("pull: +z\nparting: {height: 30}\n", [r"part\.yaml:16:\d+: .*30 mm", "from 0 to 16 mm"]),
        ("pull: +z\nblocks: {length: 41}\n", [r"part\.yaml:16:\d+: blocks\.length: .*41 mm", "try: give at least"]),
    ],
)
def test_what_cannot_be_is_refused_at_its_place(refusal, text: str, words: list[str]) -> None:
    said = refusal(text)
    for word in words:
        assert re.search(word, said), said


def test_the_catalogs_shrink_is_told_with_its_source(cup) -> None:
    record = manifest(cup.folder)
    assert record["shrink"]["x"] == pytest.approx(K, rel=1e-11)
    line = quantity(record, "shrink factor")
    assert line["value"] == pytest.approx(1.00553, abs=1e-5)
    assert "ISO 294-4" in line["source"]
    assert line["inputs"] == {"shrink": "0.55 %"}
