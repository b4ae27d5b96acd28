"""Resins, steels, pins and sizes: data files with a source and a provenance for every value, and typed access to them.

The data are loaded and checked once, on first use. Nothing here is imported by `moldgen --help`.
"""

from __future__ import annotations

from moldgen.catalog.resins import Resin, resin, resin_names, resins
from moldgen.catalog.table import Fact, Range, Row

__all__ = ["Fact", "Range", "Resin", "Row", "resin", "resin_names", "resins"]
