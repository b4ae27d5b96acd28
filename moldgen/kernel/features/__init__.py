"""Parametric features: a resolved recipe becomes one checked solid."""

from moldgen.kernel.features.build import build_recipe

__all__ = ["build_recipe"]
