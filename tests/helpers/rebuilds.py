"""Specs that change a little between two builds, and builds as a user runs them: with a cache, elsewhere, later."""

from __future__ import annotations

import io
import json
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

from ruamel.yaml import YAML

from moldgen.catalog import all_resins, resin
from moldgen.model.part import MoldFrame
from tests.helpers.command import TESTS, moldgen
from tests.helpers.outputs import snapshot

SPECS = TESTS.parent / "specs"

DEMOS = tuple(sorted(path.parent.name for path in SPECS.glob("*/spec.yaml")))

BUILD_LIMIT_S = 400

REAL_PARTS = (
    "card_lid", "slide_button", "flat_clip", "connector_bezel", "ring_bracket",
    "latch_tongue", "hook_plate", "adapter_cup", "controller_base", "cross_gimbal",
)  # fmt: skip
"""Ten real parts that are built in some seconds: flat and uneven parting lines, holes, side actions, places filled."""

MOVED: dict[str, tuple[tuple[str, str, Any], ...]] = {
    "battery-door": (("tongue", "at", ["-length/2 - 1.4", 9]),),
    "battery-tray": (("ear_hole", "at", ["length/2 + 10.5", 2]),),
    "mast-clip": (("pad", "at", [0, 2]), ("pad_hole", "at", [0, 2])),
    "rain-funnel": (("lug_hole", "at", ["lug_radius - 2", 0]),),
    "sensor-lid": (("post", "at", ["boss_x - 2", "boss_y"]),),
    "shield-ring": (("gap", "at", [2, "sill + gap/2 + 0.2"]),),
    "strap-buckle": (("strap", "at", [2, 0]),),
    "thumb-knob": (("rib", "start", [1, -6.6]), ("rib", "end", [1, "-(radius - 1 - depth - wall + 0.6)"])),
    "vane-hub": (("post", "at", ["ring + 2", 0]),),
    "cup": (("post", "at", [8, 6]),),
}
"""Features of the demos and of the small cup that are moved by 2 mm (a rib by 1): (name, key, new value). The elbow has
none to move."""

Data = dict[str, Any]


def built(
    spec: Path, out: Path, cache: Path | str, *options: str, seed: int = 0, folder: Path | None = None
) -> subprocess.CompletedProcess[str]:
    """Build a spec in processes of their own; a tool must come of it, proved or with failures that it tells.

    cache : the folder of the cache, or "off"; folder : where moldgen is run; options : more of the command line
    """
    variables = {"MOLDGEN_CACHE": str(cache), "PYTHONHASHSEED": str(seed)}
    where = folder or spec.parent
    done = moldgen("build", spec, "--output", out, *options, folder=where, timeout=BUILD_LIMIT_S, **variables)
    assert done.returncode in (0, 1), done.stderr
    return done


def differing(one: Path, other: Path) -> list[str]:
    """Return the paths of two output folders whose bytes differ, or that only one of them has."""
    first, second = snapshot(one), snapshot(other)
    assert {"manifest.json", "tool.step"} <= first.keys(), f"{one} holds no tool"
    return sorted(path for path in first.keys() | second.keys() if first.get(path, b"-") != second.get(path, b"+"))


def real_spec(name: str, parts: Path, folder: Path) -> Path:
    """Write the spec of a real part, pulled along its best axis; small places that nothing releases are filled."""
    from tests.sweep.real_parts import real_parts  # noqa: PLC0415  the index is read for this alone

    (part,) = [p for p in real_parts(parts) if p.name == name]
    path = folder / f"{name}.yaml"
    path.write_text(
        f"name: {name}\npart: {{file: {json.dumps(str(part.path))}}}\nresin: ABS\npull: '+{part.axis}'\n"
        "parting: {undercuts: release_or_fill}\n",
        encoding="utf-8",
    )
    return path


def small_changes(spec: Path, record: Data) -> dict[str, str]:
    """Return changed specs by what changed, as texts.

    record : the manifest of the tool of `spec`, which tells where its pins and its gate are
    """
    text = spec.read_text(encoding="utf-8")
    data = YAML().load(text)
    changes: dict[str, Callable[[Data], None]] = {
        "a pin": lambda d: _move_a_pin(d, record),
        "the gate": lambda d: _change_gate(d, record),
        "the resin, same shrink": lambda d: _change_resin(d, record, same_shrink=True),
        "the resin, other shrink": lambda d: _change_resin(d, record, same_shrink=False),
    }
    moves = MOVED.get(data.get("name", ""))
    if moves is not None:
        changes["a feature of the part"] = lambda d: _move(d, moves)
    return {"a comment": f"{text}\n# a comment\n"} | {name: edited(text, change) for name, change in changes.items()}


def edited(text: str, change: Callable[[Data], None]) -> str:
    """Return a spec as text with a change made to its data."""
    yaml = YAML()
    yaml.width = 10000
    data = yaml.load(text)
    change(data)
    stream = io.StringIO()
    yaml.dump(data, stream)
    return stream.getvalue()


def frame_of(record: Data) -> MoldFrame:
    """Return the mold frame that a manifest tells."""
    shrink, rows = record["shrink"], record["pull"]["part_to_mold_rotation"]
    rotation = tuple(tuple(row) for row in rows)
    return MoldFrame(tuple(shrink[axis] for axis in "xyz"), tuple(shrink["fixed_point_mm"]), rotation)  # type: ignore[arg-type]


def pins_as_given(record: Data) -> list[Data]:
    """Return the ejector pins of a tool as a spec gives them."""
    frame = frame_of(record)
    return [
        {"at": [round(v, 6) for v in frame.to_part((p["x"], p["y"], p["tip_z"]))], "diameter": p["diameter"]}
        for p in record["layout"]["ejector_pins"]
    ]


def with_pins(spec: Path, record: Data) -> str:
    """Return the spec with all ejector pins given where moldgen put them."""
    return edited(spec.read_text(encoding="utf-8"), lambda d: _give_pins(d, pins_as_given(record)))


def _give_pins(data: Data, pins: list[Data]) -> None:
    data["ejection"] = {**data.get("ejection", {}), "pins": pins}


def _move_a_pin(data: Data, record: Data) -> None:
    """Give all pins as they are, but one 0.2 mm further along x."""
    pins = pins_as_given(record)
    pins[0]["at"][0] += 0.2
    _give_pins(data, pins)


def _change_gate(data: Data, record: Data) -> None:
    """Give the gate where it is, a tenth wider."""
    gate = record["layout"]["gate"]
    at = [round(v, 6) for v in frame_of(record).to_part(gate["at"])]
    key = "width" if gate["kind"] == "edge" else "diameter"
    data["gate"] = {"kind": gate["kind"], "at": at, key: round(1.1 * gate[key], 3)}


def _change_resin(data: Data, record: Data, *, same_shrink: bool) -> None:
    old = resin(str(data["resin"]))
    new = next(r.name for r in all_resins() if r.structure == old.structure and r.name != old.name)
    data["resin"] = new
    percent = 100.0 * (1.0 - 1.0 / record["shrink"]["x"])
    fixed = {k: v for k, v in data.get("shrink", {}).items() if k == "fixed_point"}
    data["shrink"] = {"all": round(percent if same_shrink else 1.1 * percent, 9), **fixed}


def _move(data: Data, moves: tuple[tuple[str, str, Any], ...]) -> None:
    for name, key, value in moves:
        (feature,) = [f for f in data["part"]["recipe"]["features"] if f["name"] == name]
        feature[key] = value
