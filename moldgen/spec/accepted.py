"""The accepted layout beside a spec: ``lid.accepted.yaml`` for ``lid.yaml``. Read with places for every mistake."""

from __future__ import annotations

import math
import os
from pathlib import Path
from typing import Annotated, Any, Final, Literal

from pydantic import BeforeValidator, Field, ValidationError

from moldgen.errors import SpecError, SpecErrors
from moldgen.model.accepted import (
    FORMAT,
    Accepted,
    AcceptedBlocks,
    AcceptedCore,
    AcceptedGate,
    AcceptedPin,
    AcceptedSide,
)
from moldgen.model.face_sign import FaceSign
from moldgen.model.layout import GateKind
from moldgen.model.side_action import SideKind
from moldgen.spec.fields import Coordinate, Gap, Length, Number, Section, Text, refuse
from moldgen.spec.load import decode, raise_all, read_bytes
from moldgen.spec.messages import plain_errors
from moldgen.spec.tree import read_tree
from moldgen.units import Measure

SUFFIX: Final = ".accepted.yaml"

REMEDY: Final = "or delete the file, or build with --fresh"

NEAR_UNIT: Final = 1e-4
"""By how much the length of a direction may differ from 1: it is written with nine decimals, or by hand with fewer."""

_PRESSURE: Final = Number(Measure.PRESSURE, least=0.0, most=10_000.0)


def accepted_file(spec: Path) -> Path:
    """Return where the accepted layout of a spec stands.

    >>> accepted_file(Path("parts/lid.yaml")).name
    'lid.accepted.yaml'
    """
    return spec.with_name(f"{spec.stem}{SUFFIX}")


def load_accepted(spec: Path) -> Accepted | None:
    """Return the accepted layout of a spec, None where there is none.

    Raises
    ------
    SpecError, SpecErrors : the file cannot be read, or is not as it should be; with file, line and column
    """
    path = accepted_file(spec)
    if not os.path.lexists(path):
        return None
    try:
        return _read(path)
    except SpecError as error:
        for one in getattr(error, "errors", None) or [error]:
            one.remedy = f"{one.remedy}; {REMEDY}" if one.remedy else REMEDY.removeprefix("or ")
        raise error if not isinstance(error, SpecErrors) else SpecErrors(error.errors) from None


def _read(path: Path) -> Accepted:
    file = str(path)
    tree = read_tree(decode(read_bytes(path, file), file), file)
    if not isinstance(tree.data, dict):
        raise SpecError("the accepted layout is not a mapping", where=tree.where((), value=True))
    try:
        text = _File.model_validate(tree.data)
    except ValidationError as error:
        raise_all(tree.mistakes + plain_errors(error, tree, _File), file)
    if tree.mistakes:
        raise_all(tree.mistakes, file)
    return text.layout()


# --- what may stand in the file --------------------------------------------------------------------------------------
def _three(value: object) -> object:
    if not isinstance(value, (list, tuple)) or len(value) != 3:
        refuse("this is not three numbers", "write three numbers, such as [0, 0, 1]")
    return value


def _unit(value: object) -> tuple[float, float, float]:
    """Return a direction, brought to length 1."""
    _three(value)
    try:
        x, y, z = (float(v) for v in value)  # type: ignore[attr-defined]
    except (TypeError, ValueError):
        refuse("this is not three numbers", "write three numbers, such as [0, 0, 1]")
    length = math.hypot(x, y, z)
    if not abs(length - 1.0) <= NEAR_UNIT:
        refuse(f"a direction of length {length:g} is no unit vector", "write three numbers of length 1")
    return (x / length, y / length, z / length) if abs(length - 1.0) > 1e-8 else (x, y, z)


def _feature(value: object) -> FaceSign:
    """Return the sign of a face that `FaceSign.to_plain` wrote."""
    remedy = "leave features as they were written, or delete this one: then the item stays where it is"
    if not isinstance(value, dict):
        refuse("a feature is a mapping", remedy)
    try:
        sign = FaceSign.from_plain(value)
    except (ValueError, AttributeError) as error:
        refuse(f"{error}".split("\n")[0], remedy)
    unknown = sorted(set(value) - set(sign.to_plain()))
    if unknown:
        refuse(f"unknown key `{unknown[0]}` in a feature", remedy)
    if not all(map(math.isfinite, _numbers(sign.to_plain()))):
        refuse("a number of this feature is not finite", remedy)
    return sign


def _numbers(value: Any) -> list[float]:
    if isinstance(value, dict):
        return [n for v in value.values() for n in _numbers(v)]
    if isinstance(value, list):
        return [n for v in value for n in _numbers(v)]
    return [value] if isinstance(value, (int, float)) else []


_Place = Annotated[tuple[Coordinate, Coordinate, Coordinate], BeforeValidator(_three)]
_Pressure = Annotated[float, _PRESSURE]
_Unit = Annotated[Any, BeforeValidator(_unit)]
_Feature = Annotated[Any, BeforeValidator(_feature)]


class _Blocks(Section):
    at: _Place
    length: Length
    width: Length
    cavity_height: Length
    core_height: Length


class _Pin(Section):
    name: Text
    at: _Place
    diameter: Length
    length: Length
    fit_end: Coordinate | None = None
    feature: _Feature = None


class _Core(Section):
    name: Text = "round core"
    at: _Place
    diameter: Gap = 0.0
    fit_end: Coordinate | None = None
    feature: _Feature = None


class _Gate(Section):
    kind: Literal["edge", "pin", "sprue"]
    at: _Place
    width: Gap = 0.0
    depth: Gap = 0.0
    land: Gap = 0.0
    diameter: Gap = 0.0
    runner_diameter: Gap = 0.0
    runner_length: Gap = 0.0
    sprue_foot: Gap = 0.0
    inward: _Unit = None
    feature: _Feature = None


class _Side(Section):
    name: Text
    kind: Literal["slide", "lifter"]
    direction: _Unit


class _Parting(Section):
    height: Coordinate


class _Ejection(Section):
    stroke: Length
    pressure: _Pressure = 0.0
    pins: tuple[_Pin, ...] = ()
    given_pins: tuple[_Pin, ...] = ()


def _pin(pin: _Pin) -> AcceptedPin:
    return AcceptedPin(pin.name, pin.at, pin.diameter, pin.length, pin.feature, pin.fit_end)


def _core(core: _Core) -> AcceptedCore:
    return AcceptedCore(core.name, core.at, core.diameter, core.feature, core.fit_end)


class _File(Section):
    accepted: Literal[1] = Field(description=f"version of the format, {FORMAT}")
    name: Text
    part_sha256: Text
    pull: _Unit
    fixed_point: _Place
    parting: _Parting
    blocks: _Blocks
    side_actions: tuple[_Side, ...] = ()
    core_pins: tuple[_Core, ...] = ()
    given_core_pins: tuple[_Core, ...] = ()
    cores_in_block: tuple[_Core, ...] = ()
    ejection: _Ejection
    gate: _Gate

    def layout(self) -> Accepted:
        """Return what stands in the file."""
        gate = self.gate.model_dump()
        return Accepted(
            name=self.name,
            part_sha256=self.part_sha256,
            pull=self.pull,
            fixed_point=self.fixed_point,
            parting_height=self.parting.height,
            blocks=AcceptedBlocks(**self.blocks.model_dump()),
            gate=AcceptedGate(**{**gate, "kind": GateKind(self.gate.kind), "feature": self.gate.feature}),
            stroke=self.ejection.stroke,
            pressure=self.ejection.pressure,
            ejector_pins=tuple(map(_pin, self.ejection.pins)),
            core_pins=tuple(map(_core, self.core_pins)),
            cores_in_block=tuple(AcceptedCore(c.name, c.at, 0.0, c.feature) for c in self.cores_in_block),
            side_actions=tuple(AcceptedSide(s.name, SideKind(s.kind), s.direction) for s in self.side_actions),
            given_pins=tuple(map(_pin, self.ejection.given_pins)),
            given_cores=tuple(map(_core, self.given_core_pins)),
        )
