"""Numbers of two manifests that differ beyond noise, each with what it follows from."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.model.part import UPRIGHT
from moldgen.model.revision import Alignment, NumberChange, PartChange
from moldgen.revision.placing import Placing

NOISE = 1e-6
"""Relative change below which a number is the same (our choice: rounding to twelve digits leaves far less)."""

NOISE_OF = {
    "flow length": 0.02,
    "area with too little draft": 1e-3,
    "least shut-off angle": 5e-3,
    "apparent shear rate in a slot": 1e-4,
}
"""Relative change of numbers that are measured on a mesh: the same part with other faces, or turned in its file,
differed by 0.6 %, 0.005 %, 0.13 % and 0.0002 % (measured on a small cap and on a real lid)."""

LEAST = 1e-9
"""Absolute change below which a number is the same, in its unit."""

KEYS = (
    ("part volume", "mm^3", ("part", "volume_mm3")),
    ("part area", "mm^2", ("part", "area_mm2")),
    ("faces of the part", "1", ("part", "faces")),
    ("shrink factor x", "1", ("shrink", "x")),
    ("shrink factor y", "1", ("shrink", "y")),
    ("shrink factor z", "1", ("shrink", "z")),
    ("least draft", "deg", ("release", "draft", "least_deg")),
    ("area with too little draft", "mm^2", ("release", "draft", "area_below_mm2")),
    ("height of the parting line", "mm", ("parting", "level_mm")),
    ("loops of the parting line", "1", ("parting", "loops")),
    ("least shut-off angle", "deg", ("parting", "least_shut_off_deg")),
    ("ejection force", "N", ("layout", "ejection_force_n")),
    ("ejector stroke", "mm", ("layout", "stroke_mm")),
    ("flow length", "mm", ("layout", "gate", "flow_length")),
)
"""Name, unit and place in the manifest of the numbers that are looked at one by one."""

QUANTITIES = (
    "clamp force",
    "cycle time",
    "cooling time",
    "fill time",
    "mass",
    "mass of the shot",
    "thinnest wall",
    "usual wall of the part",
    "hold of the cavity half",
    "pressure of the pins on the part",
    "punch-through shear stress",
    "apparent shear rate in a slot",
    "thickness of a rectangular cavity floor",
)
"""Lines of the calculation sheet that are looked at where both manifests have them, each once."""


FROM_BOTH = ("ejection force", "hold of", "pressure", "punch", "fill time", "cooling", "cycle", "clamp")
"""Numbers that follow from the resin as well as from the part."""


@dataclass(frozen=True)
class Choice:
    """A choice in words that differs: resin, pull, how the parting was made."""

    topic: str
    was: str
    now: str


def number_changes(
    old: Mapping[str, Any], new: Mapping[str, Any], part: tuple[PartChange, ...] = ()
) -> tuple[NumberChange, ...]:
    """Return every number worth telling that changed; one that only one manifest has is told as coming or gone.

    part : what changed of the part, for the cause
    """
    before, after = _numbers(old), _numbers(new)
    causes = _Causes(old, new, part)
    found = []
    for name in dict.fromkeys((*after, *before)):
        (unit, was), (_, now) = before.get(name, ("", None)), after.get(name, ("", None))
        unit = unit or after.get(name, ("", None))[0]
        if was is not None and now is not None and abs(now - was) <= _noise(name, was, now):
            continue
        if was is None and now is None:
            continue
        found.append(NumberChange(name, unit, was, now, causes.of(name)))
    return (*found, *_proofs(old, new))


def _noise(name: str, was: float, now: float) -> float:
    return max(NOISE_OF.get(name, NOISE) * max(abs(was), abs(now)), LEAST)


def placed_record(record: Mapping[str, Any], alignment: Alignment, placing: Placing) -> dict[str, Any]:
    """Return the old tool's manifest with what is told in coordinates as the new tool tells it.

    These are the pull, the block and the height of the parting line; the last two only where both tools open alike and
    stand square to each other. All else is the same wherever a part lies in its file.
    """
    if placing.still and alignment.rotation == UPRIGHT:
        return dict(record)
    way = np.array(alignment.rotation) @ np.array(record["pull"]["direction"])
    placed: dict[str, Any] = {**record, "pull": {**record["pull"], "direction": [round(float(v), 9) for v in way]}}
    if placing.upright and placing.square:
        parting = record["parting"]
        low, high = ((float(x), float(y), float(z)) for x, y, z in parting["block_mm"])
        box = [list(corner) for corner in placing.box((low, high))]
        placed["parting"] = {**parting, "block_mm": box}
        if parting["level_mm"] is not None:
            placed["parting"]["level_mm"] = placing.point((0.0, 0.0, float(parting["level_mm"])))[2]
    return placed


def choice_changes(old: Mapping[str, Any], new: Mapping[str, Any]) -> tuple[Choice, ...]:
    """Return the choices in words that differ."""
    pairs = (
        ("resin", _text(old, "resin"), _text(new, "resin")),
        ("pull", _way(old), _way(new)),
        ("parting surface", _made(old), _made(new)),
    )
    return tuple(Choice(topic, was, now) for topic, was, now in pairs if was != now)


def _numbers(record: Mapping[str, Any]) -> dict[str, tuple[str, float]]:
    """Return (unit, value) of all that is looked at, by name."""
    found: dict[str, tuple[str, float]] = {}
    for name, unit, path in KEYS:
        value = _at(record, path)
        if value is not None:
            found[name] = (unit, value)
    layout = record.get("layout", {})
    for kind in ("ejector_pins", "core_pins"):
        found[f"number of {kind.replace('_', ' ')}"] = ("1", float(len(layout.get(kind, ()))))
    for axis, side in enumerate(("length", "width", "height")):
        low, high = record["parting"]["block_mm"]
        found[f"block {side}"] = ("mm", float(high[axis]) - float(low[axis]))
    for name, travel in _travels(record).items():
        found[f"travel of {name}"] = ("mm", travel)
    for line in record.get("quantities", ()):
        name, value = str(line.get("name", "")), line.get("value")
        wanted = name.partition(",")[0] in QUANTITIES
        if wanted and name not in found and isinstance(value, int | float) and math.isfinite(value):
            found[name] = (str(line.get("unit", "")), float(value))
    return found


def _travels(record: Mapping[str, Any]) -> dict[str, float]:
    """Return how far each side action goes sideways while the tool opens [mm]."""
    found: dict[str, float] = {}
    for step in record.get("claims", {}).get("steps", ()):
        for group, (x, y, _) in step["moves"]:
            sideways = math.hypot(float(x), float(y))
            if sideways > 0.0 and str(group).startswith(("slide", "lifter")):
                found[str(group)] = found.get(str(group), 0.0) + sideways
    return found


def _proofs(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[NumberChange]:
    """Return the figures of proofs that passed before and do not now, or the other way round."""
    before = {p["name"]: p for p in old.get("proofs", ())}
    found = []
    for proof in new.get("proofs", ()):
        was = before.get(proof["name"])
        if was is not None and bool(was["passed"]) != bool(proof["passed"]):
            verdict = "passed before, no longer" if was["passed"] else "failed before, passes now"
            found.append(
                NumberChange(f"proof: {proof['name']}", str(proof["unit"]), was["figure"], proof["figure"], verdict)
            )
    return found


class _Causes:
    """What a number follows from, as far as the two manifests tell."""

    def __init__(self, old: Mapping[str, Any], new: Mapping[str, Any], part: tuple[PartChange, ...]) -> None:
        self._resin = ""
        if _text(old, "resin") != _text(new, "resin"):
            self._resin = f"resin {_text(new, 'resin')} instead of {_text(old, 'resin')}"
        shrinks = [tuple(r["shrink"][k] for k in "xyz") for r in (old, new)]
        self._shrink = "another shrink" if shrinks[0] != shrinks[1] else ""
        self._part = part[0].told if len(part) == 1 else f"{len(part)} changes of the part" if part else ""
        gates = [(_at(r, ("layout", "gate", "flow_length")), r["layout"]["gate"]["at"]) for r in (old, new)]
        self._gate = "the gate moved" if gates[0][1] != gates[1][1] and not part else ""

    def of(self, name: str) -> str:
        """Return the cause of a change of the number `name`, "" if it is not known."""
        if name.startswith("shrink factor"):
            return self._resin or "shrink given in the spec"
        if name.startswith("flow length"):
            return self._gate or self._part or self._shrink
        if name.startswith(("part ", "faces", "least draft", "area with", "loops", "usual wall", "thinnest")):
            return self._part or (self._shrink if name.startswith("usual wall") else "")
        if name.startswith(FROM_BOTH):
            return "; ".join(w for w in (self._resin, self._part) if w)
        if name.startswith(("block", "ejector stroke", "height", "mass", "apparent")):
            return self._part or self._resin or self._shrink
        return self._part


def _at(record: Mapping[str, Any], path: tuple[str, ...]) -> float | None:
    value: Any = record
    for key in path:
        value = value.get(key) if isinstance(value, Mapping) else None
    return float(value) if isinstance(value, int | float) and math.isfinite(value) else None


def _text(record: Mapping[str, Any], key: str) -> str:
    return str(record.get(key, ""))


def _way(record: Mapping[str, Any]) -> str:
    return ", ".join(f"{float(v) + 0.0:.4f}" for v in record["pull"]["direction"])


def _made(record: Mapping[str, Any]) -> str:
    contacts = record["parting"].get("contacts", ())
    return next((str(c["made_as"]) for c in contacts if c["name"] == "parting surface"), "")
