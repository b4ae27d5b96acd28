"""From a manifest and the part to the accepted layout: every item in part coordinates, with the face it belongs to."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path
from typing import Any, TypeVar

import numpy as np

from moldgen.errors import SpecError
from moldgen.flow.folder import MANIFEST
from moldgen.flow.part_source import read_part
from moldgen.flow.side_plan import turned_back
from moldgen.flow.tell import Tell
from moldgen.flow.words import BUILD_AGAIN
from moldgen.kernel.face_signature import PartSigns, part_signs
from moldgen.model.accepted import Accepted, AcceptedBlocks, AcceptedCore, AcceptedGate, AcceptedPin, AcceptedSide
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.layout import Chooser, GateKind
from moldgen.model.part import MoldFrame, Vector, vector
from moldgen.model.side_action import SideKind
from moldgen.spec.load import LoadedSpec

OFF_LINE = 0.3
"""Share of a gate's depth over the parting line at which its face is looked for: on the line itself lie two."""

ON_AXIS = 0.02
"""mm: a round face is that of a core when its axis is no farther from the core's."""


def accepted_of(record: dict[str, Any], loaded: LoadedSpec, folder: Path, tell: Tell) -> Accepted:
    """Return the layout in a manifest, in the coordinates of the part of the spec.

    Raises
    ------
    SpecError : the part is not the one that the tool was built for, or the manifest is damaged
    PartError, KernelError : the part cannot be read
    """
    where = str(folder / MANIFEST)
    with tell.stage("read the part") as stage:
        part, _ = read_part(loaded)
        if part.source_sha256 != record["part"].get("source_sha256"):
            what = "the part has changed since this tool was built"
            raise SpecError(what, where=where, remedy=BUILD_AGAIN)
        signs = part_signs(part.solid)
        stage.detail = f"{len(signs.signs)} faces"
    try:
        return _accepted(record, _Places(record, signs), loaded.spec.name, part.source_sha256)
    except (KeyError, TypeError, ValueError, AttributeError, IndexError) as error:
        raise SpecError(f"{MANIFEST} is damaged: {error!r}", where=where, remedy=BUILD_AGAIN) from error


class _Places:
    """The way from the mold to the part, and to its faces."""

    def __init__(self, record: dict[str, Any], signs: PartSigns) -> None:
        shrink, pull = record["shrink"], record["pull"]
        rows = tuple(_finite(row, 3) for row in pull["part_to_mold_rotation"])
        factors = _finite([shrink[axis] for axis in "xyz"], 3)
        self.frame = MoldFrame(factors, _finite(shrink["fixed_point_mm"], 3), rows)  # type: ignore[arg-type]
        self.pull = vector(_finite(pull["direction"], 3))
        self._signs = signs

    def part(self, point: Any) -> Vector:
        """Return a mold point in part coordinates [mm]."""
        return self.frame.to_part(vector(_finite(point, 3)))

    def height(self, level: float) -> float:
        """Return a height of the mold as a part coordinate along the pull [mm]."""
        return self.frame.part_height(self.pull, level)

    def face(self, point: Any) -> FaceSign:
        """Return the face nearest to a mold point."""
        return self._signs.signs[self._signs.nearest(self.part(point))[0]]

    def hole(self, point: Any) -> FaceSign:
        """Return the round face of the part about the axis along the pull through a mold point."""
        at, along = np.array(self.part(point)), np.array(self.pull)
        found = []
        for number, sign in enumerate(self._signs.signs):
            if sign.kind not in (SurfaceKind.CYLINDER, SurfaceKind.CONE) or sign.side >= 0:
                continue
            off = np.cross(np.array(sign.at) - at, along)
            if abs(float(np.dot(sign.axis, along))) > 1.0 - 1e-6 and float(np.linalg.norm(off)) <= ON_AXIS:
                found.append((round(math.dist(sign.center, at), 6), number))
        return self._signs.signs[min(found)[1]] if found else self.face(point)


def _accepted(record: dict[str, Any], places: _Places, name: str, sha256: str) -> Accepted:
    layout, parting = record["layout"], record["parting"]
    level = float(parting["level_mm"])
    low, high = (_finite(corner, 3) for corner in parting["block_mm"])
    middle = ((low[0] + high[0]) / 2, (low[1] + high[1]) / 2, level)
    told = layout["ejector_pins"]
    pins, given = _by_spec([_pin(p, places) for p in told], told)
    cores, given_cores = _by_spec([_core_pin(c, places) for c in layout["core_pins"]], layout["core_pins"])
    x, y, z = places.pull
    return Accepted(
        name=name,
        part_sha256=sha256,
        pull=(x, y, z),
        fixed_point=places.frame.fixed_point,
        parting_height=places.height(level),
        blocks=AcceptedBlocks(places.part(middle), high[0] - low[0], high[1] - low[1], high[2] - level, level - low[2]),
        gate=_gate(layout["gate"], places),
        stroke=float(layout["stroke_mm"]),
        pressure=max(_finite([p["pressure_mpa"] for p in told], len(told)), default=0.0),
        ejector_pins=pins,
        core_pins=cores,
        cores_in_block=tuple(_core("round core", at, 0.0, places) for at in layout["cores_in_block"]),
        side_actions=tuple(_sides(record, places)),
        given_pins=tuple(replace(p, feature=None) for p in given),
        given_cores=tuple(replace(c, feature=None) for c in given_cores),
    )


_Item = TypeVar("_Item")


def _by_spec(items: list[_Item], told: list[dict[str, Any]]) -> tuple[tuple[_Item, ...], tuple[_Item, ...]]:
    """Return what moldgen chose, and what the spec gives."""
    given = [t["chosen_by"] == Chooser.GIVEN.value for t in told]
    own = (item for item, is_given in zip(items, given, strict=True) if not is_given)
    return tuple(own), tuple(item for item, is_given in zip(items, given, strict=True) if is_given)


def _pin(pin: dict[str, Any], places: _Places) -> AcceptedPin:
    at = (pin["x"], pin["y"], pin["tip_z"])
    end = places.height(float(pin["tip_z"]) - float(pin["tip_drop"]) - float(pin["fit_length"]))
    size = float(pin["diameter"]), float(pin["length"])
    return AcceptedPin(str(pin["name"]), places.part(at), *size, places.face(at), end)


def _core_pin(pin: dict[str, Any], places: _Places) -> AcceptedCore:
    core = _core(pin["name"], (pin["x"], pin["y"], pin["base_z"]), pin["diameter"], places)
    return replace(core, fit_end=places.height(float(pin["base_z"]) - float(pin["fit_length"])))


def _core(name: Any, at: Any, diameter: Any, places: _Places) -> AcceptedCore:
    return AcceptedCore(str(name), places.part(at), float(diameter), places.hole(at))


def _gate(gate: dict[str, Any], places: _Places) -> AcceptedGate:
    kind, (x, y, z) = GateKind(gate["kind"]), _finite(gate["at"], 3)
    off = OFF_LINE * float(gate["depth"]) if kind is GateKind.EDGE else 0.0
    face = places.face((x, y, z + off if gate["in_cavity"] else z - off))
    width, depth, land, diameter = (float(gate[key]) for key in ("width", "depth", "land", "diameter"))
    found = AcceptedGate(kind, places.part((x, y, z)), width, depth, land, diameter, face)
    if kind is not GateKind.EDGE:
        return found
    keys = ("runner_diameter", "runner_length", "sprue_foot_diameter")
    runner, length, foot = _finite([gate[key] for key in keys], 3)
    inward = turned_back(places.frame, vector(_finite(gate["inward"], 3)))
    return replace(found, runner_diameter=runner, runner_length=length, sprue_foot=foot, inward=inward)


def _sides(record: dict[str, Any], places: _Places) -> list[AcceptedSide]:
    """Return the side actions by their ways in the steps of the opening, without what the ejectors lift."""
    ways: dict[str, np.ndarray] = {}
    for step in record["claims"]["steps"]:
        for group, way in step["moves"]:
            name = str(group)
            if name.partition(" ")[0] in {kind.value for kind in SideKind}:
                ways[name] = ways.get(name, np.zeros(3)) + np.array(_finite(way, 3))
    found = []
    for name, way in ways.items():
        kind = SideKind(name.partition(" ")[0])
        if kind is SideKind.LIFTER:
            way = way * np.array([1.0, 1.0, 0.0])  # noqa: PLW2901  its motion relative to the part
        length = float(np.linalg.norm(way))
        if length > 0.0:
            x, y, z = (float(v) for v in way / length)
            found.append(AcceptedSide(name, kind, turned_back(places.frame, (x, y, z))))
    return found


def _finite(values: Any, count: int) -> tuple[float, ...]:
    """Return numbers of a manifest. Raises ValueError, TypeError where they are not finite or not so many."""
    numbers = tuple(float(v) for v in values)
    if len(numbers) != count or not all(map(math.isfinite, numbers)):
        raise ValueError(f"not {count} finite numbers: {values}")
    return numbers
