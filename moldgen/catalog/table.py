"""How a data file becomes typed rows: every value with its unit, source and provenance, checked once on loading."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from importlib import resources
from typing import Any, TypeVar, get_type_hints

from moldgen.errors import StageError
from moldgen.quantity import Provenance, Quantity


@dataclass(frozen=True)
class Range:
    """Smallest and largest value that is usual; the default is the mean. A single value has low == high."""

    low: float
    high: float

    @property
    def mean(self) -> float:
        """The stated default: halfway between low and high."""
        return 0.5 * (self.low + self.high)

    def __contains__(self, value: float) -> bool:
        return self.low <= value <= self.high

    def __str__(self) -> str:
        return f"{self.low:g}" if self.low == self.high else f"{self.low:g} to {self.high:g}"


@dataclass(frozen=True)
class Fact:
    """What one column of one row means and where it comes from."""

    column: str
    meaning: str
    unit: str
    source: str
    provenance: Provenance


@dataclass(frozen=True, kw_only=True)
class Row:
    """One row of a table. `facts` holds one `Fact` for each column that carries a number."""

    name: str
    aliases: tuple[str, ...] = ()
    facts: tuple[Fact, ...] = ()

    def fact(self, column: str) -> Fact:
        """Return unit, source and provenance of a column.

        Raises
        ------
        KeyError : the column carries no number, or does not exist
        """
        for fact in self.facts:
            if fact.column == column:
                return fact
        raise KeyError(f"{self.name}: no column {column!r}")

    def line(self, column: str, drives: str = "") -> Quantity:
        """Return a column as a line of the calculation sheet: a range gives its mean and states its ends.

        Raises
        ------
        KeyError : the column carries no number, or does not exist
        """
        fact = self.fact(column)
        value = getattr(self, column)
        return Quantity(
            name=f"{fact.meaning}, {self.name}",
            value=value.mean if isinstance(value, Range) else float(value),
            unit=fact.unit,
            source=fact.source,
            provenance=fact.provenance,
            valid_range=f"{value} {fact.unit}".strip() if isinstance(value, Range) else "",
            drives=drives,
        )


R = TypeVar("R", bound=Row)


def read_rows(file: str, kind: type[R]) -> tuple[R, ...]:
    """Return the rows of `catalog/<file>` as frozen objects of `kind`, in the order of the file.

    Raises
    ------
    StageError : the file breaks its own rules (wrong type, missing column, low above high, no source, name twice)
    """
    text = resources.files(__package__).joinpath(file).read_text(encoding="utf-8")
    return rows_from_text(text, kind, file)


def rows_from_text(text: str, kind: type[R], file: str) -> tuple[R, ...]:
    """Return the rows in YAML `text`; `file` is only the name for messages.

    Raises
    ------
    StageError : the text breaks the rules of a catalog file
    """
    from ruamel.yaml import YAML  # noqa: PLC0415  (0.1 s: `--help` must not pay for it)

    table = YAML(typ="safe", pure=True).load(text)
    columns = _columns(table["columns"], kind, file)
    rows = tuple(_row(raw, columns, kind, file) for raw in table["rows"])
    names = [key_of(label) for row in rows for label in (row.name, *row.aliases)]
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise StageError(f"names used twice: {', '.join(twice)}", where=file)
    return rows


def key_of(name: str) -> str:
    """Return the form in which names are compared: lower case letters, digits and decimal points only."""
    return "".join(c for c in str(name).lower() if c.isalnum() or c == ".")


def _columns(raw: Mapping[str, Any], kind: type[Row], file: str) -> dict[str, Fact]:
    hints = get_type_hints(kind)
    numeric = {f.name for f in fields(kind) if hints[f.name] in _NUMERIC}
    if set(raw) != numeric:
        odd = ", ".join(sorted(set(raw) ^ numeric))
        raise StageError(f"columns of {kind.__name__} and of the file differ: {odd}", where=file)
    return {name: _fact(name, entry, f"{file}: {name}") for name, entry in raw.items()}


def _fact(column: str, raw: Mapping[str, str], where: str) -> Fact:
    try:
        provenance = Provenance(raw["provenance"])
        fact = Fact(column, raw["meaning"], raw["unit"], raw["source"], provenance)
    except (KeyError, ValueError) as error:
        raise StageError(f"needs meaning, unit, source and a known provenance: {error}", where=where) from error
    if not fact.source or not fact.meaning:
        raise StageError("source or meaning is empty", where=where)
    return fact


def _row(raw: Mapping[str, Any], columns: Mapping[str, Fact], kind: type[R], file: str) -> R:
    """Build one row. Its `sources` entry replaces source and provenance of single columns."""
    where = f"{file}: {raw.get('name', 'row without a name')}"
    own = raw.get("sources", {})
    hints = get_type_hints(kind)
    known = {f.name for f in fields(kind)} - {"facts"} | {"sources"}
    odd = sorted((set(raw) - known) | (set(own) - set(columns)) | (set(columns) - set(raw)))
    if odd:
        raise StageError(f"unknown or missing: {', '.join(odd)}", where=where)
    values = {k: _typed(v, hints[k], f"{where}, {k}") for k, v in raw.items() if k != "sources"}
    facts = [
        _fact(name, {"meaning": fact.meaning, "unit": fact.unit, **own[name]}, where) if name in own else fact
        for name, fact in columns.items()
    ]
    return kind(facts=tuple(facts), **values)


def _typed(value: Any, hint: Any, where: str) -> Any:
    if hint is Range:
        ends = value if isinstance(value, Sequence) and not isinstance(value, str) else (value, value)
        low, high = (_number(end, where) for end in ends)
        if low > high:
            raise StageError(f"low {low:g} is above high {high:g}", where=where)
        return Range(low, high)
    if hint is float:
        return _number(value, where)
    if hint == tuple[float, ...]:
        return tuple(_number(v, where) for v in value)
    if hint == tuple[str, ...] and isinstance(value, list) and all(isinstance(v, str) for v in value):
        return tuple(value)
    if hint in (str, bool) and isinstance(value, hint):
        return value
    raise StageError(f"{value!r} is not a {getattr(hint, '__name__', hint)}", where=where)


def _number(value: Any, where: str) -> float:
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not math.isfinite(value):
        raise StageError(f"{value!r} is not a number", where=where)
    return float(value)


_NUMERIC = (float, Range, tuple[float, ...])
