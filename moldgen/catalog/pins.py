"""Ejector pins and core pins: the diameters on the market, their heads and lengths."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from moldgen.catalog.table import Row, read_rows


@dataclass(frozen=True, kw_only=True)
class Pin(Row):
    """One shank diameter of the series [mm]."""

    diameter: float
    head_diameter: float
    head_height: float
    lengths: tuple[float, ...]

    def length_up(self, length: float) -> float | None:
        """Return the shortest length on the market that is at least `length` [mm]; None when none is long enough.

        >>> ejector_pin_series()[2].length_up(130)
        160.0
        """
        return next((one for one in self.lengths if one >= length), None)


@dataclass(frozen=True, kw_only=True)
class ShoulderedPin(Row):
    """One shouldered ejector pin: a thin tip on a thicker shank [mm].

    shank_lengths : from the foot of the head to the shoulder, one for each of the lengths
    """

    diameter: float
    shank: float
    head_diameter: float
    head_height: float
    lengths: tuple[float, ...]
    shank_lengths: tuple[float, ...]


@cache
def shouldered_pin_series() -> tuple[ShoulderedPin, ...]:
    """Return the shouldered ejector pins, thinnest tip first.

    >>> [(pin.diameter, pin.shank) for pin in shouldered_pin_series()][:2]
    [(0.8, 2.0), (1.0, 2.0)]
    """
    return tuple(sorted(read_rows("pins_shouldered.yaml", ShoulderedPin), key=lambda pin: pin.diameter))


@cache
def ejector_pin_series() -> tuple[Pin, ...]:
    """Return the ejector pins, thinnest first.

    >>> [pin.diameter for pin in ejector_pin_series()][:5]
    [2.0, 2.5, 3.0, 4.0, 5.0]
    """
    return tuple(sorted(read_rows("pins.yaml", Pin), key=lambda pin: pin.diameter))


def ejector_pin_up(diameter: float) -> Pin | None:
    """Return the thinnest ejector pin of at least `diameter` [mm]; None when none is thick enough."""
    return next((pin for pin in ejector_pin_series() if pin.diameter >= diameter), None)


def ejector_pin_down(diameter: float) -> Pin | None:
    """Return the thickest ejector pin of at most `diameter` [mm]; None when none is thin enough."""
    return next((pin for pin in reversed(ejector_pin_series()) if pin.diameter <= diameter), None)


def core_pin_series() -> tuple[Pin, ...]:
    """Return the blanks that core pins are ground from, thinnest first: the straight pins of the ejector series."""
    return ejector_pin_series()


def core_pin_blank(diameter: float) -> Pin | None:
    """Return the thinnest blank for a core pin whose thickest section has `diameter` [mm]; None when none is.

    >>> core_pin_blank(5.2).head_diameter
    12.0
    """
    return ejector_pin_up(diameter)
