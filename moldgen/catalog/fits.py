"""Fits and bores: how a pin sits in the steel."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from moldgen.catalog.names import find_row
from moldgen.catalog.table import Range, Row, read_rows
from moldgen.errors import SpecError


@dataclass(frozen=True, kw_only=True)
class FitBand(Row):
    """Diametral clearances for one band of nominal diameters: above, up to [mm]; clearances [um]."""

    above: float
    up_to: float
    h7_g6: Range
    h6_g5: Range


@dataclass(frozen=True, kw_only=True)
class Bore(Row):
    """How one kind of pin sits: fit, then clearance bore, then counterbore for the head."""

    fit: str
    fit_length: Range
    """by the diameter [1]"""
    fit_length_min: Range
    """[mm]"""
    relief: Range
    """clearance bore minus diameter [mm]"""
    plate_hole: Range
    """hole in a plate that lets the pin float, minus diameter [mm]"""
    counterbore: Range
    """counterbore diameter minus head diameter [mm]"""
    head_play: Range
    """counterbore depth minus head height [mm]"""


@cache
def fit_bands() -> tuple[FitBand, ...]:
    """Return the bands, smallest diameters first."""
    return read_rows("fits.yaml", FitBand)


def fit_band(diameter: float) -> FitBand | None:
    """Return the band that holds `diameter` [mm]; None when the table does not reach that far."""
    return next((band for band in fit_bands() if band.above < diameter <= band.up_to), None)


def fit_clearance(diameter: float, fit: str = "H7/g6") -> Range | None:
    """Return smallest and largest diametral clearance [mm]; None when the table does not hold the diameter.

    Raises
    ------
    SpecError : the fit is neither H7/g6 nor H6/g5

    >>> fit_clearance(6.0)
    Range(low=0.004, high=0.024)
    """
    column = {"H7/g6": "h7_g6", "H6/g5": "h6_g5"}.get(fit)
    if column is None:
        raise SpecError(f"unknown fit {fit!r}", remedy="known: H7/g6, H6/g5")
    band = fit_band(diameter)
    if band is None:
        return None
    clearance: Range = getattr(band, column)
    return Range(clearance.low / 1000.0, clearance.high / 1000.0)


@cache
def bore(pin: str) -> Bore:
    """Return how an `ejector pin` or a `core pin` sits in the steel.

    Raises
    ------
    SpecError : no such kind of pin

    >>> bore("ejector pin").relief
    Range(low=0.5, high=1.0)
    """
    return find_row(read_rows("bores.yaml", Bore), pin, "kind of pin")
