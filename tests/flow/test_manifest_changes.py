"""What a rebuild touched, from two manifests: one planted change at a time, and the line that it gives."""

from __future__ import annotations

import copy
from typing import Any

import pytest

from moldgen.flow.manifest_changes import manifest_changes

PINS = [{"name": f"ejector pin {n}", "x": 10.0 * n, "y": 0.0, "diameter": 3.0, "length": 100.0, "tip_z": 5.0}
        for n in (1, 2, 3)]  # fmt: skip
NAMES = ("part", "cavity", "core", "ejector pin")
FILES = {f"step/{n}.step": f"hash of {n}" for n in NAMES}

OLD: dict[str, Any] = {
    "moldgen": "0",
    "resin": "ABS",
    "pull": {"direction": [0.0, 0.0, 1.0]},
    "shrink": {"x": 1.0055},
    "parting": {"block_mm": [[-50.0, -40.0, -30.0], [50.0, 40.0, 30.0]]},
    "layout": {
        "core_pins": [],
        "ejector_pins": PINS,
        "gate": {"kind": "edge", "at": [20.0, 0.0, 0.0], "width": 1.2, "depth": 0.8, "land": 0.75},
        "stroke_mm": 20.0,
        "ejection_force_n": 400.0,
    },
    "components": [
        {"name": n, "file": f"step/{n}.step", "material": "1.2311", "positions": [[0, 0, 0]]} for n in NAMES
    ],
    "files": FILES,
    "proofs": [{"name": "the cavity half opens", "verdict": "passed"}],
    "findings": [{"code": "draft.too_small", "severity": "warning"}],
}


def changed(*changes: tuple[str, Any], old: dict[str, Any] = OLD) -> dict[str, Any]:
    """A copy of the manifest with values put at dotted paths; None deletes."""
    new = copy.deepcopy(old)
    for path, value in changes:
        *way, last = [int(k) if k.isdecimal() else k for k in path.split("/")]
        inner: Any = new
        for key in way:
            inner = inner[key]
        if value is None:
            del inner[last]
        else:
            inner[last] = value
    return new


CASES: dict[str, tuple[list[tuple[str, Any]], str]] = {
    "nothing": ([], "nothing changed"),
    "only the hash of the spec": ([("spec", {"sha256": "other"})], "nothing changed"),
    "a pin moved": (
        [("layout/ejector_pins/2/x", 32.0), ("files", {**FILES, "step/core.step": "other"})],
        "ejector pin 3 moved by 2.00, 0.00 mm; core recut; 3 others unchanged",
    ),
    "a gate widened": (
        [("layout/gate/width", 1.5), ("files", {**FILES, "step/cavity.step": "other"})],
        "gate width 1.2 -> 1.5 mm; cavity recut; 3 others unchanged",
    ),
    "a gate of another kind": ([("layout/gate/kind", "pin")], "gate: edge -> pin; 4 components unchanged"),
    "a gate moved": ([("layout/gate/at", [20, 3, 0])], "gate moved by 0.00, 3.00, 0.00 mm; 4 components unchanged"),
    "a thicker pin": (
        [("layout/ejector_pins/0/diameter", 4.0)],
        "ejector pin 1 diameter 3 -> 4 mm; 4 components unchanged",
    ),
    "a component gone": ([("components/3", None)], "ejector pin gone; 3 others unchanged"),
    "a steel": ([("components/2/material", "1.2343")], "core of 1.2311 -> 1.2343; 4 components unchanged"),
    "the resin": ([("resin", "PP")], "resin ABS -> PP; 4 components unchanged"),
    "the pull": (
        [("pull/direction", [0, 0, -1])],
        "pull 0.00, 0.00, 1.00 -> 0.00, 0.00, -1.00; 4 components unchanged",
    ),
    "a larger block": (
        [("parting/block_mm/1/0", 60.0)],
        "block 100.0 x 80.0 x 60.0 -> 110.0 x 80.0 x 60.0 mm; 4 components unchanged",
    ),
    "a force beyond noise": (
        [("layout/ejection_force_n", 410.0)],
        "ejection force 400 -> 410 N; 4 components unchanged",
    ),
    "a force within noise": ([("layout/ejection_force_n", 401.0)], "nothing changed"),
    "a proof that fails now": (
        [("proofs/0/verdict", "failed")],
        "proof 'the cavity half opens': passed -> failed; 4 components unchanged",
    ),
    "a finding gone": ([("findings/0", None)], "1 finding gone (warning draft.too_small); 4 components unchanged"),
}


@pytest.mark.parametrize("case", CASES)
def test_one_change_gives_its_words(case: str) -> None:
    changes, words = CASES[case]
    assert manifest_changes(OLD, changed(*changes)).line() == words


def test_a_pin_that_goes_does_not_move_the_others() -> None:
    """Pins are numbered anew when one goes: the second is the third now, where it was."""
    fewer = [{**PINS[0]}, {**PINS[2], "name": "ejector pin 2"}]
    found = manifest_changes(OLD, changed(("layout/ejector_pins", fewer)))
    assert found.items == ("ejector pin 2 gone from 20.00, 0.00",)
    back = manifest_changes(changed(("layout/ejector_pins", fewer)), OLD)
    assert back.items == ("ejector pin 2 new at 20.00, 0.00",)


def test_a_second_finding_of_a_code_is_new() -> None:
    twice = [*OLD["findings"], *OLD["findings"]]
    assert manifest_changes(OLD, changed(("findings", twice))).findings_new == ("warning draft.too_small",)


def test_one_more_of_equal_pins_is_no_unchanged_component() -> None:
    found = manifest_changes(OLD, changed(("components/3/positions", [[0, 0, 0], [1, 0, 0]])))
    assert found.recut == ("ejector pin",)


def test_many_names_are_counted() -> None:
    pins = [{**pin, "y": 1.0} for pin in PINS] + [
        {**PINS[0], "name": f"ejector pin {n}", "x": 90.0 + n} for n in (4, 5)
    ]
    line = manifest_changes(OLD, changed(("layout/ejector_pins", pins))).line()
    assert line.count("moved by") == 3
    assert "1 more" in line


def test_a_manifest_of_another_kind_is_no_crash() -> None:
    assert "part, cavity, core, ejector pin new" in manifest_changes({}, OLD).line()
    assert manifest_changes({"layout": [], "components": {}, "files": 3}, {}).line() == "nothing changed"
