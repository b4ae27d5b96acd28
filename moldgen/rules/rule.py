"""What a rule is: a pure formula that knows its units, its source, and where it holds.

    @rule(title="...", formula="force / area", source="...", provenance=Provenance.DERIVED)
    def mean_pressure(force: Force, area: Area) -> Pressure: ...

    mean_pressure(100.0, 50.0)                          the number
    mean_pressure.line("pin count", 100.0, 50.0)        the same as a line of the calculation sheet
    mean_pressure.outside(100.0, 50.0)                  findings where the source does not reach

Units stand in the signature (`Length` is a float in mm, above zero), so they are written once. An impossible input is a
ValueError; an input that is merely outside the range of the source gives the number all the same, and a finding.
"""

from __future__ import annotations

import inspect
import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property, update_wrapper
from typing import Annotated, Any, Generic, ParamSpec, get_type_hints

from moldgen.finding import Finding, Severity
from moldgen.quantity import Provenance, Quantity

P = ParamSpec("P")


@dataclass(frozen=True)
class Unit:
    """Unit of an argument or result, and which values are possible at all."""

    text: str
    above: float = -math.inf
    least: float = -math.inf
    below: float = math.inf

    def refusal(self, value: float) -> str:
        """Return why `value` is impossible, or nothing."""
        if not math.isfinite(value):
            return "must be finite"
        if value <= self.above:
            return f"must be above {self.above:g} {self.text}"
        if value < self.least:
            return f"must be at least {self.least:g} {self.text}"
        return f"must be below {self.below:g} {self.text}" if value >= self.below else ""


Length = Annotated[float, Unit("mm", above=0)]
LengthOrZero = Annotated[float, Unit("mm", least=0)]
Area = Annotated[float, Unit("mm^2", above=0)]
Pressure = Annotated[float, Unit("MPa", above=0)]
PressureOrZero = Annotated[float, Unit("MPa", least=0)]
Force = Annotated[float, Unit("N", above=0)]
ForceOrZero = Annotated[float, Unit("N", least=0)]
Angle = Annotated[float, Unit("deg", above=0, below=90)]
AngleOrZero = Annotated[float, Unit("deg", least=0, below=90)]
Slope = Annotated[float, Unit("deg per 0.025 mm", least=0)]
Ratio = Annotated[float, Unit("1", above=0)]
RatioOrZero = Annotated[float, Unit("1", least=0)]
Poisson = Annotated[float, Unit("1", least=0, below=0.5000001)]
Percent = Annotated[float, Unit("%", above=-100, below=100)]
Temperature = Annotated[float, Unit("degC", above=-273.15)]
TemperatureChange = Annotated[float, Unit("K")]
Diffusivity = Annotated[float, Unit("mm^2/s", above=0)]
FlowRate = Annotated[float, Unit("mm^3/s", above=0)]
ShearRate = Annotated[float, Unit("1/s", above=0)]
Consistency = Annotated[float, Unit("Pa s^n", above=0)]
Seconds = Annotated[float, Unit("s")]
Mass = Annotated[float, Unit("g", above=0)]
Expansion = Annotated[float, Unit("1/K")]
Roughness = Annotated[float, Unit("um", above=0)]
Count = Annotated[int, Unit("1", least=1)]
Flag = Annotated[bool, Unit("1")]


@dataclass(frozen=True)
class Valid:
    """Where the source of a rule holds. `measure` makes the figure from the arguments when it is not one of them."""

    of: str
    low: float = -math.inf
    high: float = math.inf
    unit: str = ""
    why: str = ""
    measure: Callable[..., float] | None = None

    def figure(self, arguments: dict[str, Any]) -> float:
        """Return the figure that low and high speak of."""
        return float(arguments[self.of] if self.measure is None else self.measure(**arguments))

    def __str__(self) -> str:
        if math.isinf(self.low):
            return f"{self.of} up to {self.high:g} {self.unit}".rstrip()
        if math.isinf(self.high):
            return f"{self.of} from {self.low:g} {self.unit}".rstrip()
        return f"{self.of} {self.low:g} to {self.high:g} {self.unit}".rstrip()


@dataclass(frozen=True)
class Card:
    """What the calculation sheet says about a rule. `formula` is written in the names of the arguments."""

    title: str
    formula: str
    source: str
    provenance: Provenance
    valid: tuple[Valid, ...] = ()


class Rule(Generic[P]):
    """A formula with its card. Called, it checks that the input is possible and gives the number."""

    def __init__(self, function: Callable[P, float], card: Card) -> None:
        self.card = card
        self._function = function
        update_wrapper(self, function)
        self.__name__: str = function.__name__

    @cached_property
    def signature(self) -> inspect.Signature:
        """Names, defaults and kinds of the arguments."""
        return inspect.signature(self._function)

    @cached_property
    def units(self) -> dict[str, Unit]:
        """Unit of each argument, and of the result under `return`."""
        hints = get_type_hints(self._function, include_extras=True)
        return {name: hint.__metadata__[0] for name, hint in hints.items()}

    def __call__(self, *args: P.args, **kwargs: P.kwargs) -> float:
        """Return the number, in the unit of the result.

        Raises
        ------
        ValueError : an argument is impossible, such as a negative thickness
        """
        for name, value in self._arguments(*args, **kwargs).items():
            refusal = self.units[name].refusal(value)
            if refusal:
                raise ValueError(f"{self.__name__}: {name} {refusal}, got {value:g}")
        return self._function(*args, **kwargs)

    def line(self, drives: str, /, *args: P.args, **kwargs: P.kwargs) -> Quantity:
        """Return the result as a line of the calculation sheet.

        Parameters
        ----------
        drives : what in the layout depends on the number

        Raises
        ------
        ValueError : an argument is impossible
        """
        arguments = self._arguments(*args, **kwargs)
        return Quantity(
            name=self.card.title,
            value=self(*args, **kwargs),
            unit=self.units["return"].text,
            source=self.card.source,
            provenance=self.card.provenance,
            symbol=self.__name__,
            formula=self.card.formula,
            inputs={name: _with_unit(value, self.units[name].text) for name, value in arguments.items()},
            valid_range="; ".join(str(valid) for valid in self.card.valid),
            drives=drives,
        )

    def outside(self, *args: P.args, **kwargs: P.kwargs) -> tuple[Finding, ...]:
        """Return a finding for each figure that is outside the range in which the source holds; the number stays.

        Raises
        ------
        ValueError : an argument is impossible
        """
        self(*args, **kwargs)
        arguments = self._arguments(*args, **kwargs)
        figures = [(valid, valid.figure(arguments)) for valid in self.card.valid]
        return tuple(self._finding(valid, figure) for valid, figure in figures if not valid.low <= figure <= valid.high)

    def _finding(self, valid: Valid, figure: float) -> Finding:
        limit = valid.low if figure < valid.low else valid.high
        return Finding(
            code="rule.outside_range",
            severity=Severity.CAUTION,
            message=f"{self.card.title}: {valid.of} is {figure:.4g} {valid.unit}".rstrip()
            + f", but the rule holds for {valid}"
            + (f" ({valid.why})" if valid.why else ""),
            where=self.__name__,
            value=figure,
            limit=limit,
            unit=valid.unit,
            remedy="check this number by other means, or give it in the spec",
        )

    def _arguments(self, *args: P.args, **kwargs: P.kwargs) -> dict[str, Any]:
        bound = self.signature.bind(*args, **kwargs)
        bound.apply_defaults()
        return dict(bound.arguments)


def rule(
    *, title: str, formula: str, source: str, provenance: Provenance, valid: tuple[Valid, ...] = ()
) -> Callable[[Callable[P, float]], Rule[P]]:
    """Return the decorator that makes a formula a `Rule` (the parameters are those of `Card`)."""
    card = Card(title, formula, source, provenance, valid)
    return lambda function: Rule(function, card)


def _with_unit(value: float, unit: str) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    number = f"{value:.6g}"
    return number if unit == "1" else f"{number} {unit}"
