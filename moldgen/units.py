"""Units of measure: plain numbers are mm, deg, degC, MPa, N, s or percent; text with a unit is converted to them.

Only the form "number unit" is read ("0.5 in", "3/8 in", "25 MPa", "80 degC"): the text never reaches an evaluator.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from enum import Enum
from functools import lru_cache
from typing import TYPE_CHECKING, Final

from moldgen.errors import SpecError

if TYPE_CHECKING:
    from pint import Unit, UnitRegistry


@dataclass(frozen=True)
class _Kind:
    noun: str
    unit: str
    """Unit of a plain number, as users write it."""
    pint_unit: str
    example: str


class Measure(Enum):
    """What a number measures."""

    LENGTH = _Kind("a length", "mm", "millimeter", "0.5 in")
    ANGLE = _Kind("an angle", "deg", "degree", "1.5 deg")
    PERCENT = _Kind("a percentage", "%", "percent", "0.5 %")
    TEMPERATURE = _Kind("a temperature", "degC", "degree_Celsius", "80 degC")
    PRESSURE = _Kind("a pressure", "MPa", "megapascal", "25 MPa")
    FORCE = _Kind("a force", "N", "newton", "2 kN")
    TIME = _Kind("a time", "s", "second", "12 s")

    @property
    def unit(self) -> str:
        """Unit of a plain number."""
        return self.value.unit

    @property
    def wanted(self) -> str:
        """What was expected, in words: ``a length such as "0.5 in"``."""
        return f'{self.value.noun} such as "{self.value.example}"'


_DECIMAL: Final = r"(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_NUMBER: Final = re.compile(
    rf"(?P<sign>[+-]?)(?:(?:(?P<whole>\d+)\s+)?(?P<top>\d+)/(?P<bottom>\d+)|(?P<decimal>{_DECIMAL}))"
)
_UNIT: Final = re.compile(r"[A-Za-zµμ°%_]+[23]?(?:\s*[/*]\s*[A-Za-zµμ_]+[23]?)*")
_LONGEST: Final = 60

_SHOP_NAMES: Final = {
    '"': "inch",
    "in.": "inch",
    "mil": "thou",  # in the library a mil is an angle
    "mils": "thou",
    "°": "degree",
    "degs": "degree",
    "°C": "degree_Celsius",
    "°F": "degree_Fahrenheit",
}
_ANGLES: Final = frozenset({"degree", "radian", "arcminute", "arcsecond", "grade", "turn"})


def to_number(value: object, measure: Measure) -> float:
    """Return `value` as a finite number in the unit of `measure`.

    `value` is a number, then already in the unit of `measure`, or text: a number or a fraction, perhaps with a unit.

    Raises
    ------
    SpecError : not a number, not finite, an unknown unit, or a unit of something else
    """
    if isinstance(value, str):
        number = _from_text(value.strip(), measure)
    elif isinstance(value, (int, float)) and not isinstance(value, bool):
        number = _as_float(value)
    else:
        raise SpecError(f"{_shown(value)} is not {measure.value.noun}", remedy=f"write {measure.wanted}")
    if not math.isfinite(number):
        raise SpecError(f"{_shown(value)} is not a finite number", remedy=f"write {measure.wanted}")
    return number


def _from_text(text: str, measure: Measure) -> float:
    match = _NUMBER.match(text) if len(text) <= _LONGEST else None
    if match is None:
        raise SpecError(f"{_shown(text)} is not {measure.value.noun}", remedy=f"write {measure.wanted}")
    number, name = _magnitude(match), text[match.end() :].strip()
    if not name:
        return number
    unit = _unit(_SHOP_NAMES.get(name, name))
    if unit is None:
        raise SpecError(f"{_shown(text)}: no unit {_shown(name)}", remedy=f"write {measure.wanted}")
    if not _fits(unit, measure):
        raise SpecError(f"{_shown(text)} is not {measure.value.noun}", remedy=f"write {measure.wanted}")
    # the library's conversion is exact to a few ulp; twelve digits hide that from the reader
    return float(f"{_registry().Quantity(number, unit).to(measure.value.pint_unit).magnitude:.12g}")


def _magnitude(match: re.Match[str]) -> float:
    sign = -1.0 if match["sign"] == "-" else 1.0
    if match["decimal"] is not None:
        return sign * float(match["decimal"])
    bottom = int(match["bottom"])
    return sign * (int(match["whole"] or 0) + int(match["top"]) / bottom) if bottom else math.nan


def _unit(name: str) -> Unit | None:
    """Return the unit of that name, or None. Only names, "/", "*", and a trailing 2 or 3 as exponent get this far."""
    from pint.errors import PintError  # noqa: PLC0415  0.4 s, and most specs need no unit

    if not _UNIT.fullmatch(name):
        return None
    expression = re.sub(r"([23])(?=\s*[/*]|$)", r"**\1", name.replace("%", "percent"))
    try:
        return _registry().parse_units(expression)
    except (PintError, ValueError, TypeError, ArithmeticError, AssertionError):
        return None


def _fits(unit: Unit, measure: Measure) -> bool:
    """Angles and ratios have no dimension, so the library would turn 5 % into an angle: look at the names too."""
    if not unit.is_compatible_with(measure.value.pint_unit):
        return False
    angular = any(name in _ANGLES for name in map(str, unit._units))
    return angular if measure is Measure.ANGLE else not angular


@lru_cache(maxsize=1)
def _registry() -> UnitRegistry[float]:
    import pint  # noqa: PLC0415  see _unit

    return pint.UnitRegistry()


def _as_float(value: float) -> float:
    try:
        return float(value)
    except OverflowError:
        return math.inf


def _shown(value: object) -> str:
    text = f'"{value}"' if isinstance(value, str) else f"{value}"
    return text if len(text) <= _LONGEST else f"{text[: _LONGEST - 3]}..."
