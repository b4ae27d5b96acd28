"""Every rule of the package, and input that each of them takes."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
from types import ModuleType
from typing import Any

import moldgen.rules
from moldgen.rules.rule import Rule

BY_UNIT = {
    "mm": 3.0,
    "mm^2": 50.0,
    "MPa": 20.0,
    "N": 300.0,
    "deg": 2.0,
    "deg per 0.025 mm": 1.5,
    "%": 1.5,
    "mm^2/s": 0.085,
    "mm^3/s": 5e3,
    "1/s": 5e4,
    "Pa s^n": 4e3,
    "g": 20.0,
    "1/K": 8e-5,
    "K": 75.0,
    "1": 0.4,
}
"""An ordinary value for each unit."""

BY_NAME: dict[str, Any] = {
    "melt": 235.0,
    "mold": 60.0,
    "eject": 95.0,
    "outer": 9.0,
    "bore": 1.0,
    "start": 1.0,
    "ratio": 2.5,
    "modulus": 2e5,
    "limit": 0.01,
    "pins": 4,
    "branches": 3,
    "tip_supported": False,
    "part": 59.0,
}
"""Arguments that need a value of their own to be possible together."""


def rule_modules() -> list[ModuleType]:
    names = sorted(info.name for info in pkgutil.iter_modules(moldgen.rules.__path__))
    return [importlib.import_module(f"moldgen.rules.{name}") for name in names]


def all_rules() -> dict[str, Rule[Any]]:
    found = {}
    for module in rule_modules():
        for name, value in inspect.getmembers(module, lambda member: isinstance(member, Rule)):
            if value.__module__ == module.__name__:
                found[name] = value
    return found


def ordinary_input(rule: Rule[Any]) -> dict[str, Any]:
    units = rule.units
    given = {
        name: BY_NAME[name] if name in BY_NAME else BY_UNIT[units[name].text] for name in rule.signature.parameters
    }
    if rule.__name__ == "shrinkage_iso294_4":
        given["mold"] = 60.0
    return given
