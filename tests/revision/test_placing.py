"""Where the old steel stands in the new mold, which pins are which, and what numbers follow from."""

from __future__ import annotations

import math
from copy import deepcopy
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from moldgen.errors import SpecError
from moldgen.model.part import UPRIGHT, MoldFrame
from moldgen.model.revision import Alignment
from moldgen.revision.items import paired_items
from moldgen.revision.numbers import choice_changes, number_changes
from moldgen.revision.placing import Placing, place_old
from moldgen.revision.tool_record import ToolRecord, tool_record

STILL = Alignment(UPRIGHT, (0.0, 0.0, 0.0), "as drawn", 10, 10, 0.0)
QUARTER = ((0.0, -1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0))
ON_SIDE = ((0.0, 1.0, 0.0), (0.0, 0.0, 1.0), (1.0, 0.0, 0.0))
"""A pull along +x of the part."""


def frame(factor: float = 1.01, fixed: tuple[float, float, float] = (3.0, 2.0, 1.0), turn: Any = UPRIGHT) -> MoldFrame:
    return MoldFrame((factor, factor, factor), fixed, turn)


def test_an_untouched_tool_stays_to_the_last_digit() -> None:
    assert place_old(frame(), frame(), STILL).still


def test_with_equal_shrink_steel_goes_with_the_part() -> None:
    """Old mold -> old part -> new part -> new mold, for any point: part turned and moved, pull along another axis."""
    alignment = replace(STILL, rotation=QUARTER, translation=(5.0, -4.0, 2.5))
    old, new = frame(fixed=(1.0, 1.0, 0.0)), frame(fixed=(-7.0, 0.5, 3.0), turn=ON_SIDE)
    placing = place_old(old, new, alignment)
    for point in ((0.0, 0.0, 0.0), (12.0, -3.0, 7.0), (-20.0, 11.0, 4.0)):
        aligned = np.array(QUARTER) @ old.to_part(point) + alignment.translation
        x, y, z = (float(v) for v in aligned)
        assert placing.point(point) == pytest.approx(new.to_mold((x, y, z)), abs=1e-12)


def test_with_another_shrink_the_fixed_point_stays_on_the_part_and_steel_keeps_its_size() -> None:
    old, new = frame(1.005), frame(1.02)
    placing = place_old(old, new, STILL)
    assert placing.point(old.to_mold(old.fixed_point)) == pytest.approx(new.to_mold(old.fixed_point), abs=1e-12)
    assert math.dist(placing.point((0, 0, 0)), placing.point((10, 0, 0))) == pytest.approx(10.0, abs=1e-12)


def test_turns_that_no_box_survives_are_told() -> None:
    c, s = math.cos(0.3), math.sin(0.3)
    assert Placing(QUARTER).square
    assert not Placing(((c, -s, 0.0), (s, c, 0.0), (0.0, 0.0, 1.0))).square
    assert not Placing(ON_SIDE).upright


def pin(name: str, x: float, y: float, diameter: float = 3.0, tip: float = 10.0) -> dict[str, Any]:
    sizes = {"clearance_diameter": diameter + 0.5, "head_diameter": 2 * diameter, "seat_z": -60.0}
    return {"name": name, "x": x, "y": y, "tip_z": tip, "diameter": diameter, **sizes}


def record(*pins: dict[str, Any], **more: Any) -> dict[str, Any]:
    gate = {"kind": "sprue", "at": [0, 0, 12], "inward": [0, 0, -1], "diameter": 3.0, "land": 0, "runner_length": 0}
    gate |= {"runner_diameter": 0, "sprue_foot_diameter": 4, "depth": 0, "width": 0, "flow_length": 40.0}
    return {
        "part": {"name": "cap", "volume_mm3": 1000.0, "faces": 20},
        "resin": "ABS",
        "shrink": {"x": 1.005, "y": 1.005, "z": 1.005, "fixed_point_mm": [0, 0, 0]},
        "pull": {"direction": [0, 0, 1], "part_to_mold_rotation": [list(row) for row in UPRIGHT]},
        "parting": {"block_mm": [[-30, -25, -40], [30, 25, 30]], "contacts": []},
        "layout": {"ejector_pins": list(pins), "core_pins": [], "gate": gate, "ejection_force_n": 500.0},
        "components": [],
        **more,
    }


def tool(*pins: dict[str, Any], **more: Any) -> ToolRecord:
    return tool_record(Path(), record(*pins, **more))


def told(old: ToolRecord, new: ToolRecord) -> list[tuple[str, str, str, str]]:
    pairs = paired_items(old, new, Placing())
    return [(c.name, c.was, c.now, c.note) for c in (p.change() for p in pairs if not p.same)]


def test_pins_are_known_by_their_place_whatever_they_are_called() -> None:
    old = tool(pin("ejector pin 1", 0, 0), pin("ejector pin 2", 10, 0))
    assert told(old, tool(pin("ejector pin 1", 10, 0), pin("ejector pin 2", 0, 0))) == []


def test_pins_move_change_come_and_go() -> None:
    old = tool(pin("a", 0, 0), pin("b", 10, 0), pin("c", -10, 0), pin("d", 0, 10))
    new = tool(pin("a", 0, 3), pin("b", 10, 0, 4.0), pin("c", -10, 0, tip=10.5), pin("e", 25, 20))
    assert told(old, new) == [
        ("a", "d 3 mm", "d 3 mm", "moved by 3.000 mm"),
        ("b", "d 3 mm", "d 4 mm", "other size"),
        ("c", "d 3 mm", "d 3 mm", "its end is 0.500 mm higher"),
        ("e", "", "d 3 mm", "new"),
        ("d", "d 3 mm", "", "no longer there"),
    ]


@pytest.mark.parametrize(
    ("turn", "x", "notes"),
    [
        (0.05, 0.0, []),
        (0.4, 0.0, ["turned by 0.4 deg"]),
        (-0.4, 2.0, ["moved by 2.000 mm, turned by 0.4 deg"]),
    ],
)
def test_an_edge_gate_that_turned_is_told(turn: float, x: float, notes: list[str]) -> None:
    def edge(turn: float, x: float) -> ToolRecord:
        found = record()
        way = [math.cos(math.radians(turn)), math.sin(math.radians(turn)), 0.0]
        found["layout"]["gate"] |= {"kind": "edge", "at": [x, 0, 12], "inward": way, "runner_length": 12.0}
        return tool_record(Path(), found)

    assert [note for *_, note in told(edge(0.0, 0.0), edge(turn, x))] == notes
    turned_alike = paired_items(edge(0.0, 0.0), edge(90.0, 0.0), Placing(QUARTER))
    assert all(p.same for p in turned_alike if p.either.kind == "gate"), "the old gate turns with the part"


def test_numbers_beyond_noise_are_told_with_their_cause() -> None:
    old, new = record(pin("a", 0, 0)), record(pin("a", 0, 0), pin("b", 9, 0), resin="PP")
    new["shrink"] |= {"x": 1.015}
    new["layout"]["ejection_force_n"] = 560.0
    new["part"]["volume_mm3"] = 1000.0 * (1 + 1e-9)
    found = {n.name: (n.was, n.now, n.cause) for n in number_changes(old, new)}
    assert found == {
        "shrink factor x": (1.005, 1.015, "resin PP instead of ABS"),
        "ejection force": (500.0, 560.0, "resin PP instead of ABS"),
        "number of ejector pins": (1.0, 2.0, ""),
    }
    assert [(c.topic, c.was, c.now) for c in choice_changes(old, new)] == [("resin", "ABS", "PP")]


@pytest.mark.parametrize(("grown", "told"), [(1.0 + 1e-4, False), (1.01, True)])
def test_what_is_measured_on_a_mesh_differs_by_more_before_it_is_told(grown: float, told: bool) -> None:
    old, new = record(), record()
    old["release"] = {"draft": {"area_below_mm2": 102.9}}
    new["release"] = {"draft": {"area_below_mm2": 102.9 * grown}}
    assert bool(number_changes(old, new)) is told


def test_equal_manifests_have_no_number_to_tell() -> None:
    one = record(pin("a", 0, 0))
    assert number_changes(one, deepcopy(one)) == ()
    assert choice_changes(one, deepcopy(one)) == ()


def test_a_proof_that_no_longer_passes_is_told() -> None:
    proof = {"name": "nothing overlaps", "figure": 0.01, "unit": "mm", "passed": True}
    old, new = record(proofs=[proof]), record(proofs=[proof | {"figure": 0.2, "passed": False}])
    assert [(n.name, n.was, n.now) for n in number_changes(old, new)] == [("proof: nothing overlaps", 0.01, 0.2)]


def test_what_a_manifest_lacks_is_an_error_of_the_input() -> None:
    broken = record()
    del broken["layout"]["gate"]
    with pytest.raises(SpecError, match="gate"):
        tool_record(Path("folder"), broken)
