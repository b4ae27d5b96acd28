"""A number that knows its unit, its formula and where it came from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum


class Provenance(StrEnum):
    """How far a value can be trusted."""

    PUBLISHED = "published"
    DERIVED = "derived"
    COMMON_PRACTICE = "common practice"
    UNVERIFIED = "unverified (from memory)"
    MEASURED = "measured on the part"
    GIVEN = "given in the spec"


@dataclass(frozen=True)
class Quantity:
    """One line of the calculation sheet.

    `inputs` maps each symbol in `formula` to its value with unit, as text, so that a person can redo the line with
    a pocket calculator. `drives` says what in the layout depends on the number.
    """

    name: str
    value: float
    unit: str
    source: str
    provenance: Provenance
    symbol: str = ""
    formula: str = ""
    inputs: Mapping[str, str] = field(default_factory=dict)
    valid_range: str = ""
    drives: str = ""
