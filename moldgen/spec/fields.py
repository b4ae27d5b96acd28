"""The kinds of value a spec is made of: numbers with units, points, names, and `auto`."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Annotated, Any, Final, NoReturn

from pydantic import BaseModel, BeforeValidator, ConfigDict, GetCoreSchemaHandler, GetJsonSchemaHandler, Strict
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from moldgen.errors import SpecError
from moldgen.units import Measure, to_number

AUTO: Final = "auto"
"""The word for "let moldgen choose". In the loaded spec it is None."""

_JsonSchema = dict[str, Any]


class Section(BaseModel):
    """A mapping of the spec: immutable, no keys but its own, defaults held to the same rules as the user's values."""

    model_config = ConfigDict(frozen=True, extra="forbid", hide_input_in_errors=True)


def refuse(what: str, remedy: str) -> NoReturn:
    """Say inside a validator what is wrong with the value and what to write instead."""
    raise PydanticCustomError("moldgen", "{what}", {"what": what, "remedy": remedy})


def shown(value: object) -> str:
    """Return `value` as the user may have written it, shortened."""
    text = getattr(value, "text", None) or ("nothing" if value is None else str(value))
    return text if len(text) <= 40 else f"{text[:37]}..."


@dataclass(frozen=True)
class Number:
    """A finite number of one measure within limits; text may carry a unit. With `auto`, that word gives None."""

    measure: Measure
    above: float = -math.inf
    least: float = -math.inf
    most: float = math.inf
    below: float = math.inf
    auto: bool = False
    remedy: str = ""

    def __call__(self, value: object) -> float | None:
        """Return `value` in the unit of the measure, or None for `auto`."""
        return None if self.auto and value == AUTO else self.read(value)

    def read(self, value: object) -> float:
        """Return `value` in the unit of the measure."""
        if value is None:
            refuse("the value is missing", f"write {self._wanted()}, or delete the key")
        try:
            number = to_number(value, self.measure)
        except SpecError as error:
            refuse(error.what, f"write {self._wanted()}")
        limit = self._broken_limit(number)
        if limit:
            unit = self.measure.unit
            refuse(
                f"{number:g} {unit} is out of range: it must be {limit} {unit}",
                self.remedy or f"write {self._wanted()}",
            )
        return number

    def _wanted(self) -> str:
        return self.measure.wanted + (f", or {AUTO}" if self.auto else "")

    def _broken_limit(self, number: float) -> str:
        limits = (
            (number > self.above, f"more than {self.above:g}"),
            (number >= self.least, f"at least {self.least:g}"),
            (number <= self.most, f"at most {self.most:g}"),
            (number < self.below, f"less than {self.below:g}"),
        )
        return next((words for holds, words in limits if not holds), "")

    def __get_pydantic_core_schema__(self, _source: Any, _handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self)

    def __get_pydantic_json_schema__(self, _core: CoreSchema, _handler: GetJsonSchemaHandler) -> _JsonSchema:
        limits = {
            "exclusiveMinimum": self.above,
            "minimum": self.least,
            "maximum": self.most,
            "exclusiveMaximum": self.below,
        }
        number: _JsonSchema = {"type": "number"} | {k: v for k, v in limits.items() if math.isfinite(v)}
        text: _JsonSchema = {"type": "string", "pattern": r"^\s*[+-]?[0-9.]", "examples": [self.measure.value.example]}
        return {"anyOf": [number, text] + ([{"const": AUTO}] if self.auto else [])}


@dataclass(frozen=True, eq=False)
class Written:
    """Replaces the JSON Schema of a value by what the user may write for it."""

    schema: _JsonSchema

    def __get_pydantic_json_schema__(self, _core: CoreSchema, _handler: GetJsonSchemaHandler) -> _JsonSchema:
        return dict(self.schema)


@dataclass(frozen=True, eq=False)
class OrWritten:
    """Adds a second form, with its JSON Schema, in which the user may write a value."""

    schema: _JsonSchema

    def __get_pydantic_json_schema__(self, core: CoreSchema, handler: GetJsonSchemaHandler) -> _JsonSchema:
        return {"anyOf": [dict(self.schema), handler(core)]}


def none_if_auto(value: object) -> object:
    """Turn the word `auto` into None, and refuse a key without a value."""
    if value is None:
        refuse("the value is missing", f"write the value, or {AUTO}, or delete the key")
    return None if value == AUTO else value


OR_AUTO: Final = OrWritten({"const": AUTO})


def _three(value: object) -> object:
    if not isinstance(value, (list, tuple)) or len(value) != 3:
        refuse(f"{shown(value)} is not a point", "write three numbers, such as [12, 0, 4.5]")
    return value


def to_point(value: object) -> tuple[float, float, float]:
    """Return three numbers, lengths with or without a unit, as a point [mm]."""
    _three(value)
    x, y, z = (_COORDINATE.read(v) for v in value)  # type: ignore[attr-defined]
    return (x, y, z)


def as_text(value: object) -> object:
    """Return text; a number counts as the text it was written with, so the steel 1.2311 needs no quotes."""
    text = getattr(value, "text", value)
    if not isinstance(text, str):
        refuse(f"{shown(value)} is not text", "write a name, in quotes if need be")
    if not text.strip() or len(text) > 200 or not text.isprintable():
        refuse(f'"{shown(text)}" is not a name', "write 1 to 200 printable characters")
    return text


def catalog_name(find: Callable[[str], Any], name: str) -> str:
    """Return the catalog's own spelling of `name`; `find` returns the row or raises `SpecError`."""
    try:
        return str(find(name).name)
    except SpecError as error:
        refuse(error.what, error.remedy)


LARGEST: Final = 10_000.0
"""mm: ten metres. No mold is larger; a bigger number is a slip of unit (our choice)."""

_COORDINATE: Final = Number(Measure.LENGTH, least=-LARGEST, most=LARGEST)

Length = Annotated[float, Number(Measure.LENGTH, above=0.0, most=LARGEST)]
AutoLength = Annotated[float | None, Number(Measure.LENGTH, above=0.0, most=LARGEST, auto=True)]
Gap = Annotated[float, Number(Measure.LENGTH, least=0.0, most=LARGEST)]
Coordinate = Annotated[float, _COORDINATE]
AutoCoordinate = Annotated[float | None, Number(Measure.LENGTH, least=-LARGEST, most=LARGEST, auto=True)]
Point = Annotated[tuple[Coordinate, Coordinate, Coordinate], BeforeValidator(_three)]
AutoPoint = Annotated[Point | None, BeforeValidator(none_if_auto), OR_AUTO]
Text = Annotated[str, BeforeValidator(as_text), Written({"type": ["string", "number"]})]
Flag = Annotated[bool, Strict()]
