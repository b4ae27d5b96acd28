"""The evaluator against Python's own arithmetic, and every way in which an expression is refused."""

from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from moldgen.spec.expression import Dimension, Expression, Sign, Value, check_name, evaluate, parse, resolve_parameters


def value(text: object, dimension: Dimension = Dimension.LENGTH, **names: float) -> float:
    return evaluate(parse(text, dimension=dimension), {k: Value(v) for k, v in names.items()})


leaves = st.one_of(
    st.floats(-100, 100).map(lambda x: repr(round(x, 3))),
    st.integers(0, 50).map(str),
    st.sampled_from(["a", "b", "pi"]),
)
formulas = st.recursive(
    leaves,
    lambda inner: st.one_of(
        st.tuples(inner, st.sampled_from(["+", "-", "*"]), inner).map(lambda t: f"({t[0]} {t[1]} {t[2]})"),
        st.tuples(st.sampled_from(["min", "max"]), inner, inner).map(lambda t: f"{t[0]}({t[1]}, {t[2]})"),
        inner.map(lambda x: f"(-{x})"),
        inner.map(lambda x: f"abs({x})"),
    ),
    max_leaves=6,
)


@given(formulas)
def test_arithmetic_is_pythons(text: str) -> None:
    expected = eval(text, {"a": 1.5, "b": -2.25, "pi": math.pi, "min": min, "max": max, "abs": abs})
    if abs(expected) < 1e9:
        assert value(text, a=1.5, b=-2.25) == pytest.approx(expected, rel=1e-12, abs=1e-12)


@given(st.text(max_size=40))
def test_any_text_gives_a_number_or_a_plain_message(text: str) -> None:
    try:
        assert math.isfinite(value(text))
    except ValueError as error:
        assert str(error)


@given(st.floats(-1e6, 1e6), st.sampled_from(["mm", "cm", "in", "mil", "um", "m"]))
def test_units_scale_as_defined(number: float, unit: str) -> None:
    factor = {"mm": 1, "cm": 10, "in": 25.4, "mil": 0.0254, "um": 0.001, "m": 1000}[unit]
    text = f"{number:.6f} {unit}"
    expected = float(f"{number:.6f}") * factor
    if abs(expected) <= 1e9:
        assert value(text) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("wall * 2", 4.0),
        ("length/2 - 3", 17.0),
        ("0.5 in + 1 mm", 13.7),
        ("(1 + 2) * 3 mm", 9.0),
        ("2 ** 3 % 5", 3.0),
        ("sqrt(wall**2 + 1.5**2)", 2.5),
        ("10 * sin(30 deg)", 5.0),
        ("10 * cos(60)", 5.0),
        ("tan(45)", 1.0),
        ("sin(pi/6 * 1 rad)", 0.5),
        ("1e1mm", 10.0),
        (7, 7.0),
    ],
)
def test_worked_by_hand(text: object, expected: float) -> None:
    assert value(text, wall=2.0, length=40.0) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("walll * 2", "nearest known: 'wall'"),
        ("1 / (wall - 2)", "divides by zero"),
        ("7 % 0", "divides by zero"),
        ("3 nm", "unknown unit 'nm'"),
        ("3 deg", "expected a length"),
        ("3 mm + 2 deg", "a length and an angle"),
        ("sin(3 mm)", "give an angle"),
        ("sqrt(-1)", "square root"),
        ("(-1) ** 0.5", "not a real number"),
        ("9 ** 99", "exponent"),
        ("10 ** 12", "largest value"),
        ("wall if wall else wall", "not allowed"),
        ("wall < 2", "not allowed"),
        ("().__class__", "not allowed"),
        ("open(1)", "unknown function 'open'"),
        ("2 wall", "unknown unit 'wall'"),
        ("1e-3 + 2e", "unknown unit 'e'"),
        ("min()", "at least one"),
        ("sin(1, 2)", "one argument"),
        ("'text'", "not a number"),
        ("", "not an expression"),
        ("1 +", "not an expression"),
        ("-" * 60 + "1", "nested deeper"),
        ("1" * 401, "the longest is"),
        (True, "expected a number"),
        (float("nan"), "expected a number"),
        (float("inf"), "expected a number"),
        (10**400, "expected a number"),
        ([1], "expected a number"),
    ],
)
def test_refusals_say_why(text: object, message: str) -> None:
    with pytest.raises(ValueError, match=re.escape(message)):
        value(text, wall=2.0)


def test_a_field_refuses_what_it_cannot_use() -> None:
    with pytest.raises(ValueError, match="'wall - 3' = -1 must be greater than zero"):
        evaluate(parse("wall - 3", dimension=Dimension.LENGTH, sign=Sign.POSITIVE), {"wall": Value(2.0)})
    with pytest.raises(ValueError, match="must be zero or more"):
        evaluate(parse(-1, sign=Sign.NOT_NEGATIVE), {})
    with pytest.raises(ValueError, match="whole number"):
        evaluate(parse(2.5, whole=True), {})
    with pytest.raises(ValueError, match="expected a plain number"):
        evaluate(parse("2 mm"), {})


def parameters(**texts: object) -> dict[str, Expression]:
    return {name: parse(text) for name, text in texts.items()}


def test_parameters_may_use_each_other_in_any_order() -> None:
    values, errors = resolve_parameters(parameters(outer="inner + 2*wall", inner="1 in", wall=2))
    assert not errors
    assert values["outer"].number == pytest.approx(29.4)
    assert values["outer"].dimension is Dimension.LENGTH


def test_a_cycle_is_named_once_and_what_needs_it_is_told() -> None:
    values, errors = resolve_parameters(parameters(a="b + 1", b="c", c="a", d="a * 2", e=5))
    assert "a -> b -> c -> a" in " ".join(errors.values())
    assert set(errors) == {"a", "b", "c", "d"}
    assert values["e"].number == 5


@given(st.dictionaries(st.sampled_from("abcdef"), st.sampled_from(["1", "a+1", "b*2", "c", "d-e", "f"]), min_size=1))
def test_every_parameter_has_a_value_or_an_error(texts: dict[str, str]) -> None:
    values, errors = resolve_parameters({k: parse(v) for k, v in texts.items()})
    assert set(values) | set(errors) == set(texts)
    assert not set(values) & set(errors)


@pytest.mark.parametrize("name", ["pi", "sin", "mm", "2x", "a b", "_unit_mm", ""])
def test_names_that_would_confuse_are_refused(name: str) -> None:
    with pytest.raises(ValueError, match="parameter name"):
        check_name(name)
