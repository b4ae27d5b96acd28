"""Eyebolts: the mass that one may carry."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from moldgen.catalog.table import Row, read_rows


@dataclass(frozen=True, kw_only=True)
class Eyebolt(Row):
    """One thread size; masses [kg] with a safety factor of 6 (DIN 580:2003, annex A)."""

    axial: float
    inclined: float


@cache
def all_eyebolts() -> tuple[Eyebolt, ...]:
    """Return the eyebolts, smallest first."""
    return read_rows("eyebolts.yaml", Eyebolt)


def eyebolt_for(mass: float) -> Eyebolt | None:
    """Return the eyebolt for a tool of `mass` [kg]; None when the table ends before.

    Chosen by the lower column (45 deg), because a tool may hang askew, and then one thread larger, as is advised for
    repeated use on changing loads.

    Raises
    ------
    ValueError : mass is not positive

    >>> eyebolt_for(185.0).name
    'M16'
    """
    if not mass > 0:
        raise ValueError(f"a mass must be positive, got {mass} kg")
    fitting = [bolt for bolt in all_eyebolts() if bolt.inclined >= mass]
    return fitting[1] if len(fitting) > 1 else None
