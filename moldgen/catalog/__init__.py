"""Resins, steels, pins and sizes: data files with a source and a provenance for every value, and typed access to them.

The data are loaded and checked once, on first use. Nothing here is imported by `moldgen --help`.
"""

from __future__ import annotations

from moldgen.catalog.eyebolts import Eyebolt, all_eyebolts, eyebolt_for
from moldgen.catalog.fits import Bore, FitBand, bore, fit_band, fit_bands, fit_clearance
from moldgen.catalog.pins import (
    Pin,
    ShoulderedPin,
    core_pin_blank,
    core_pin_series,
    ejector_pin_down,
    ejector_pin_series,
    ejector_pin_up,
    shouldered_pin_series,
)
from moldgen.catalog.resins import Resin, all_resins, resin, resin_names
from moldgen.catalog.sizes import SizeSeries, preferred_size_up, size_series
from moldgen.catalog.steels import Steel, all_steels, steel, steel_numbers
from moldgen.catalog.table import Fact, Range, Row

__all__ = [
    "Bore",
    "Eyebolt",
    "Fact",
    "FitBand",
    "Pin",
    "Range",
    "Resin",
    "Row",
    "ShoulderedPin",
    "SizeSeries",
    "Steel",
    "all_eyebolts",
    "all_resins",
    "all_steels",
    "bore",
    "core_pin_blank",
    "core_pin_series",
    "ejector_pin_down",
    "ejector_pin_series",
    "ejector_pin_up",
    "eyebolt_for",
    "fit_band",
    "fit_bands",
    "fit_clearance",
    "preferred_size_up",
    "resin",
    "resin_names",
    "shouldered_pin_series",
    "size_series",
    "steel",
    "steel_numbers",
]
