"""Formulas of the trade: pure functions, one topic a file, each with unit, range and source. No geometry here."""
