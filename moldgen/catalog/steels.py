"""Tool materials by EN material number."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from moldgen.catalog.names import find_row
from moldgen.catalog.table import Range, Row, read_rows


@dataclass(frozen=True, kw_only=True)
class Steel(Row):
    """One tool material. Units and sources: `fact(column)`."""

    hardness: str
    kind: str
    """unalloyed, prehardened, hardened, copper or aluminium"""
    use: str
    conductivity: Range
    """[W/(m K)]"""
    modulus: Range
    """[MPa]"""
    poisson: float
    yield_strength: float
    """[MPa]"""
    contact_pressure: float
    """largest on a shut-off or parting land [MPa]"""
    expansion: float
    """[1e-6/K]"""
    density: float
    """[g/cm^3]"""


@cache
def all_steels() -> tuple[Steel, ...]:
    """Return every tool material, in the order of the data file."""
    return read_rows("steels.yaml", Steel)


def steel_numbers() -> tuple[str, ...]:
    """Return the numbers that a spec may use, without aliases.

    >>> steel_numbers()[1]
    '1.2311'
    """
    return tuple(row.name for row in all_steels())


@cache
def steel(number: str) -> Steel:
    """Return the tool material with this EN number (or alias such as P20 or H13).

    Raises
    ------
    SpecError : no such material; the remedy names the nearest ones

    >>> steel("H13").name
    '1.2344'
    """
    return find_row(all_steels(), number, "tool material")
