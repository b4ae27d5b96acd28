"""Preferred sizes of blocks and plates."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from typing import Final

from moldgen.catalog.names import find_row
from moldgen.catalog.table import Row, read_rows

_PREFERRED: Final = {
    "R10": (1.0, 1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3, 8.0),
    "R20": (1, 1.12, 1.25, 1.4, 1.6, 1.8, 2, 2.24, 2.5, 2.8, 3.15, 3.55, 4, 4.5, 5, 5.6, 6.3, 7.1, 8, 9),
}
"""One decade of each series of preferred numbers (ISO 3)."""


@dataclass(frozen=True, kw_only=True)
class SizeSeries(Row):
    """Sizes on the market [mm], and the series of ISO 3 that goes on beyond them."""

    beyond: str
    sizes: tuple[float, ...]


@cache
def size_series(name: str = "edge") -> SizeSeries:
    """Return the series `edge` (length and width of blocks) or `thickness` (height of blocks, plates).

    Raises
    ------
    SpecError : no such series
    """
    return find_row(read_rows("sizes.yaml", SizeSeries), name, "series of sizes")


def preferred_size_up(value: float, series: str = "edge") -> float:
    """Return the smallest preferred size of at least `value` [mm].

    Above the largest size of the list, preferred numbers of ISO 3 are used, so there is always an answer.

    Raises
    ------
    SpecError : no such series
    ValueError : value is not a positive finite number

    >>> preferred_size_up(201.0), preferred_size_up(801.0), preferred_size_up(33.0, "thickness")
    (250.0, 900.0, 40.0)
    """
    if not (math.isfinite(value) and value > 0):
        raise ValueError(f"a size must be positive and finite, got {value} mm")
    table = size_series(series)
    listed = next((size for size in table.sizes if size >= value), None)
    return listed if listed is not None else _preferred_number_up(value, table.beyond)


def _preferred_number_up(value: float, series: str) -> float:
    decade = 10.0 ** math.floor(math.log10(value))
    steps = [*(round(step * decade, 6) for step in _PREFERRED[series]), round(10 * decade, 6)]
    return next(step for step in steps if step >= value)
