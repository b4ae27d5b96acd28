"""Sizes as the user writes them: numbers, text with a unit, and arithmetic on named parameters.

``12``, ``"0.5 in"``, ``"wall * 2"``, ``"length/2 - 3 mm"``, ``"sqrt(a**2 + b**2)"``. Nothing else of Python is
understood: no attributes, calls of other functions, strings or comparisons. Angles are in degrees.
"""

from __future__ import annotations

import ast
import difflib
import math
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from enum import StrEnum
from typing import Final

MAX_TEXT: Final = 400
"""Characters of one expression; longer text is a mistake or an attack."""

MAX_DEPTH: Final = 30
"""Nesting of one expression, so that the evaluator cannot exhaust the stack."""

LARGEST: Final = 1e9
"""Magnitude of any result; beyond it a power or a unit is wrong."""

UNITS: Final[Mapping[str, tuple[float, str]]] = {
    "um": (1e-3, "length"),
    "mm": (1.0, "length"),
    "cm": (10.0, "length"),
    "m": (1000.0, "length"),
    "in": (25.4, "length"),
    "inch": (25.4, "length"),
    "mil": (0.0254, "length"),
    "ft": (304.8, "length"),
    "deg": (1.0, "angle"),
    "rad": (180.0 / math.pi, "angle"),
}
"""Unit -> (factor to mm or deg, dimension). The inch is 25.4 mm exactly [published: yard and pound agreement 1959]."""

_WITH_UNIT = re.compile(
    r"(?<![\w.])(\d+\.?\d*(?:[eE][+-]?\d+)?|\.\d+(?:[eE][+-]?\d+)?)\s*(?![eE][+-]?\d)([A-Za-z]+)(?![\w(])"
)
_NAME = re.compile(r"[A-Za-z_][A-Za-z0-9_]*\Z")


class Dimension(StrEnum):
    """What a number measures. A plain number takes the dimension of what it meets."""

    NUMBER = "number"
    LENGTH = "length"
    ANGLE = "angle"


class Sign(StrEnum):
    """What a field accepts."""

    ANY = "any"
    POSITIVE = "greater than zero"
    NOT_NEGATIVE = "zero or more"


@dataclass(frozen=True)
class Value:
    """A number with its dimension: mm for a length, deg for an angle."""

    number: float
    dimension: Dimension = Dimension.NUMBER


@dataclass(frozen=True)
class Expression:
    """One size as written, with what its field accepts. Made by `parse`, worked out by `evaluate`."""

    source: str
    dimension: Dimension = Dimension.NUMBER
    sign: Sign = Sign.ANY
    whole: bool = False

    def names(self) -> tuple[str, ...]:
        """Return the parameters that the expression reads, sorted."""
        calls = set(_FUNCTIONS) | set(_CONSTANTS)
        tree = _tree(self.source)
        return tuple(sorted({n.id for n in ast.walk(tree) if isinstance(n, ast.Name)} - calls - set(_UNIT_NAMES)))


_CONSTANTS: Final = {"pi": math.pi}
_FUNCTIONS: Final = ("sin", "cos", "tan", "sqrt", "min", "max", "abs")
_UNIT_NAMES: Final = {f"_unit_{name}": name for name in UNITS}


def parse(
    source: object, *, dimension: Dimension = Dimension.NUMBER, sign: Sign = Sign.ANY, whole: bool = False
) -> Expression:
    """Return the expression in `source` (number or text) after checking its syntax.

    Raises
    ------
    ValueError : not a number or text, or not an expression of the allowed kind
    """
    if isinstance(source, Expression):
        return source
    if isinstance(source, bool) or not isinstance(source, (int, float, str)):
        raise ValueError(f"expected a number or an expression, got {type(source).__name__}")  # noqa: TRY004 (pydantic)
    if isinstance(source, (int, float)):
        if not abs(source) <= LARGEST:
            raise ValueError(f"expected a number of at most {LARGEST:g}, got {str(source)[:12]}")
        return Expression(repr(source), dimension, sign, whole)
    _tree(source)
    return Expression(source.strip(), dimension, sign, whole)


def evaluate(expression: Expression, parameters: Mapping[str, Value]) -> float:
    """Return the value of `expression` [mm, deg or plain].

    Raises
    ------
    ValueError : unknown name (with the nearest one), division by zero, wrong unit, or a value its field refuses
    """
    value = evaluate_value(expression, parameters)
    wanted = expression.dimension
    if Dimension.NUMBER not in (value.dimension, wanted) and value.dimension != wanted:
        raise ValueError(f"'{expression.source}' is a {value.dimension}, expected a {wanted}")
    if wanted is Dimension.NUMBER and value.dimension is not Dimension.NUMBER:
        raise ValueError(f"'{expression.source}' is a {value.dimension}, expected a plain number")
    _check_sign(expression, value.number)
    return value.number


def evaluate_value(expression: Expression, parameters: Mapping[str, Value]) -> Value:
    """Return the value with its dimension, without judging it against a field (see `evaluate`)."""
    try:
        value = _evaluate(_tree(expression.source), parameters, 0)
    except ZeroDivisionError:
        raise ValueError(f"'{expression.source}' divides by zero") from None
    except OverflowError:
        raise ValueError(f"'{expression.source}' is too large") from None
    if not math.isfinite(value.number) or abs(value.number) > LARGEST:
        raise ValueError(f"'{expression.source}' gives {value.number:g}; the largest value is {LARGEST:g}")
    return value


def resolve_parameters(parameters: Mapping[str, Expression]) -> tuple[dict[str, Value], dict[str, str]]:
    """Work out parameters that may use each other in any order.

    Returns
    -------
    The values of the parameters that could be worked out, and a message for each that could not.
    """
    values: dict[str, Value] = {}
    errors: dict[str, str] = {}

    def visit(name: str, path: tuple[str, ...]) -> None:
        if name in values or name in errors:
            return
        if name in path:
            loop = [*path[path.index(name) :], name]
            errors[name] = f"parameter '{name}' depends on itself: {' -> '.join(loop)}"
            return
        expression = parameters[name]
        for other in expression.names():
            if other in parameters:
                visit(other, (*path, name))
        if name in errors:
            return
        unknown = [n for n in expression.names() if n not in parameters]
        if unknown:
            known = [*parameters, *_CONSTANTS, *_FUNCTIONS]
            errors[name] = f"parameter '{name}': unknown name '{unknown[0]}'{_nearest(unknown[0], known)}"
            return
        broken = [n for n in expression.names() if n in errors]
        if broken:
            errors[name] = f"parameter '{name}' needs '{broken[0]}', which has no value"
            return
        try:
            values[name] = evaluate_value(expression, values)
        except ValueError as error:
            errors[name] = f"parameter '{name}': {error}"

    for name in parameters:
        visit(name, ())
    return values, errors


def check_name(name: str) -> str:
    """Return `name` if a parameter may be called so.

    Raises
    ------
    ValueError : not a plain identifier, or the name of a function, constant or unit
    """
    if not _NAME.match(name):
        raise ValueError(f"parameter name '{name}' must be letters, digits and _ , not starting with a digit")
    if name in _FUNCTIONS or name in _CONSTANTS or name in UNITS or name.startswith("_unit_"):
        raise ValueError(f"parameter name '{name}' is taken by a function, constant or unit; choose another")
    return name


def _check_sign(expression: Expression, number: float) -> None:
    shown = (
        f"{number:g}" if expression.source in (repr(number), f"{number:g}") else f"'{expression.source}' = {number:g}"
    )
    if expression.sign is Sign.POSITIVE and number <= 0.0:
        raise ValueError(f"{shown} must be {Sign.POSITIVE}")
    if expression.sign is Sign.NOT_NEGATIVE and number < 0.0:
        raise ValueError(f"{shown} must be {Sign.NOT_NEGATIVE}")
    if expression.whole and abs(number - round(number)) > 1e-9:
        raise ValueError(f"{shown} must be a whole number")


def _tree(source: str) -> ast.expr:
    """Return the syntax tree, after turning ``3 mm`` into a product with a unit."""
    if len(source) > MAX_TEXT:
        raise ValueError(f"expression of {len(source)} characters; the longest is {MAX_TEXT}")

    def with_unit(match: re.Match[str]) -> str:
        number, unit = match.groups()
        if unit not in UNITS:
            raise ValueError(f"unknown unit '{unit}' in '{source}'{_nearest(unit, UNITS)}")
        return f"({number}*_unit_{unit})"

    try:
        tree = ast.parse(_WITH_UNIT.sub(with_unit, source.strip()), mode="eval").body
    except (SyntaxError, MemoryError, RecursionError):
        raise ValueError(f"'{source}' is not an expression; example: 'wall * 2 + 0.5 mm'") from None
    for node in ast.walk(tree):
        if not isinstance(node, _ALLOWED):
            raise ValueError(f"'{source}': {type(node).__name__} is not allowed; use numbers, names and + - * / ** %")  # noqa: TRY004 (pydantic)
    return tree


_ALLOWED = (
    ast.BinOp,
    ast.UnaryOp,
    ast.Call,
    ast.Name,
    ast.Constant,
    ast.Load,
    ast.Add,
    ast.Sub,
    ast.Mult,
    ast.Div,
    ast.Pow,
    ast.Mod,
    ast.UAdd,
    ast.USub,
)


def _evaluate(node: ast.expr, parameters: Mapping[str, Value], depth: int) -> Value:
    if depth > MAX_DEPTH:
        raise ValueError(f"expression nested deeper than {MAX_DEPTH} levels")
    if isinstance(node, ast.Constant):
        return _constant(node)
    if isinstance(node, ast.Name):
        return _look_up(node.id, parameters)
    if isinstance(node, ast.UnaryOp):
        inner = _evaluate(node.operand, parameters, depth + 1)
        return Value(-inner.number if isinstance(node.op, ast.USub) else inner.number, inner.dimension)
    if isinstance(node, ast.BinOp):
        left = _evaluate(node.left, parameters, depth + 1)
        return _binary(node.op, left, _evaluate(node.right, parameters, depth + 1))
    if isinstance(node, ast.Call):
        return _call(node, [_evaluate(a, parameters, depth + 1) for a in node.args])
    raise ValueError(f"{type(node).__name__} is not allowed in an expression")


def _constant(node: ast.Constant) -> Value:
    if isinstance(node.value, bool) or not isinstance(node.value, (int, float)):
        raise ValueError(f"{node.value!r} is not a number")  # noqa: TRY004 (pydantic)
    return Value(float(node.value))


def _look_up(name: str, parameters: Mapping[str, Value]) -> Value:
    if name in _UNIT_NAMES:
        factor, dimension = UNITS[_UNIT_NAMES[name]]
        return Value(factor, Dimension(dimension))
    if name in _CONSTANTS:
        return Value(_CONSTANTS[name])
    if name in parameters:
        return parameters[name]
    raise ValueError(f"unknown name '{name}'{_nearest(name, [*parameters, *_CONSTANTS, *_FUNCTIONS])}")


def _nearest(name: str, known: Iterable[str]) -> str:
    close = difflib.get_close_matches(name, list(known), n=1, cutoff=0.4)
    return f"; nearest known: '{close[0]}'" if close else ""


def _binary(operator: ast.operator, left: Value, right: Value) -> Value:
    a, b = left.number, right.number
    if isinstance(operator, (ast.Add, ast.Sub, ast.Mod)):
        dimension = _same([left, right])
        if isinstance(operator, ast.Mod):
            return Value(a % b, dimension)
        return Value(a + b if isinstance(operator, ast.Add) else a - b, dimension)
    if isinstance(operator, ast.Mult):
        return Value(a * b, _product(left, right))
    if isinstance(operator, ast.Div):
        same = left.dimension == right.dimension
        return Value(a / b, Dimension.NUMBER if same or right.dimension is not Dimension.NUMBER else left.dimension)
    return _power(a, b)


def _product(left: Value, right: Value) -> Dimension:
    if left.dimension is Dimension.NUMBER:
        return right.dimension
    return left.dimension if right.dimension is Dimension.NUMBER else Dimension.NUMBER


def _power(a: float, b: float) -> Value:
    if abs(b) > 64:
        raise ValueError(f"exponent {b:g} is out of range; the largest is 64")
    result = a**b
    if isinstance(result, complex):
        raise ValueError(f"{a:g} ** {b:g} is not a real number")  # noqa: TRY004 (pydantic)
    return Value(result)


def _same(values: list[Value]) -> Dimension:
    found = {v.dimension for v in values} - {Dimension.NUMBER}
    if len(found) > 1:
        raise ValueError("a length and an angle cannot be added or compared")
    return found.pop() if found else Dimension.NUMBER


def _call(node: ast.Call, arguments: list[Value]) -> Value:
    name = node.func.id if isinstance(node.func, ast.Name) else "?"
    if name not in _FUNCTIONS:
        raise ValueError(f"unknown function '{name}'{_nearest(name, _FUNCTIONS)}")
    if node.keywords:
        raise ValueError(f"{name}() takes plain arguments only")
    numbers = [a.number for a in arguments]
    if name in ("min", "max"):
        if not numbers:
            raise ValueError(f"{name}() needs at least one argument")
        return Value(min(numbers) if name == "min" else max(numbers), _same(arguments))
    if len(numbers) != 1:
        raise ValueError(f"{name}() takes one argument, got {len(numbers)}")
    return _one_argument(name, arguments[0])


def _one_argument(name: str, value: Value) -> Value:
    if name == "abs":
        return Value(abs(value.number), value.dimension)
    if name == "sqrt":
        if value.number < 0:
            raise ValueError(f"square root of {value.number:g}")
        return Value(math.sqrt(value.number))
    if value.dimension is Dimension.LENGTH:
        raise ValueError(f"{name}() of a length; give an angle")
    functions: dict[str, Callable[[float], float]] = {"sin": math.sin, "cos": math.cos, "tan": math.tan}
    return Value(functions[name](math.radians(value.number)))
