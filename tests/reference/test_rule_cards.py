"""What every rule promises: documented arguments, units, a source, and a printed formula that is the computed one."""

from __future__ import annotations

import doctest
import math
import re
from types import ModuleType
from typing import Any

import pytest

from moldgen.finding import Severity
from moldgen.quantity import Provenance
from moldgen.rules.rule import Rule
from moldgen.rules.shrink import mold_dimension_iso294_4
from reference.every_rule import all_rules, ordinary_input, rule_modules

RULES = all_rules()
ARGUMENT = re.compile(r"^(\w+) : .*\[(.+)\]$")
SOURCES = ("iso294_4", "pye", "menges", "kazmer", "crawford", "reuleaux", "lame", "levy", "euler", "rabinowitsch")


@pytest.fixture(params=sorted(RULES))
def rule(request: pytest.FixtureRequest) -> Rule[Any]:
    return RULES[request.param]


def section(rule: Rule[Any], title: str) -> list[str]:
    """Return the entries of one section of the docstring, each on one line."""
    lines = (rule.__doc__ or "").splitlines()
    heads = [i for i, line in enumerate(lines) if line.strip() == title]
    assert len(heads) == 1, f"{rule.__name__}: needs one section {title}"
    body = []
    for line in lines[heads[0] + 2 :]:
        if not line.strip():
            break
        body.append(line.strip())
    return body


def test_docstring_arguments_are_those_of_the_signature(rule: Rule[Any]) -> None:
    found = [ARGUMENT.match(line) for line in section(rule, "Parameters")]
    assert all(found), f"{rule.__name__}: an argument line is not 'name : meaning [unit]'"
    documented = {match[1]: match[2] for match in found if match}
    assert documented == {name: unit.text for name, unit in rule.units.items() if name != "return"}
    assert list(documented) == list(rule.signature.parameters)


def test_docstring_result_has_the_unit_of_the_signature(rule: Rule[Any]) -> None:
    text = " ".join(section(rule, "Returns"))
    assert text.endswith(f"[{rule.units['return'].text}]"), text


def test_docstring_says_what_is_impossible_and_shows_an_example(rule: Rule[Any]) -> None:
    assert section(rule, "Raises")
    assert ">>> " in (rule.__doc__ or "")


def test_the_card_names_a_source(rule: Rule[Any]) -> None:
    card = rule.card
    assert card.title
    assert card.source
    assert isinstance(card.provenance, Provenance)
    if card.provenance is Provenance.UNVERIFIED:
        assert "from memory" in card.source or "Rabinowitsch" in card.source
    named = [source for source in SOURCES if rule.__name__.endswith(source)]
    for source in named:
        if source != "iso294_4":
            assert source in (card.source + (rule.__doc__ or "")).lower(), f"{rule.__name__} does not cite {source}"


def evaluate(formula: str, values: dict[str, Any]) -> float:
    words = {
        name: getattr(math, name)
        for name in ("pi", "sqrt", "log", "sin", "cos", "tan", "tanh", "cosh", "radians", "degrees", "atan")
    }
    words |= {"min": min, "max": max, "sum": sum}
    return float(eval(formula, {"__builtins__": {}, **words, **RULES, **values}))


def test_the_printed_formula_is_the_computed_one(rule: Rule[Any]) -> None:
    """A reader with a calculator gets the number on the sheet: the formula text is evaluated, not trusted."""
    given = ordinary_input(rule)
    result = rule(**given)
    implicit = re.fullmatch(r"(\w+) where (.+) = (\w+)", rule.card.formula)
    if implicit:
        unknown, left, right = implicit.groups()
        assert evaluate(left, {**given, unknown: result}) == pytest.approx(given[right], rel=1e-6)
    else:
        assert evaluate(rule.card.formula, given) == pytest.approx(result, rel=1e-6)


def test_the_sheet_line_carries_everything(rule: Rule[Any]) -> None:
    given = ordinary_input(rule)
    line = rule.line("the layout", **given)
    assert line.value == rule(**given)
    assert (line.unit, line.source, line.drives) == (rule.units["return"].text, rule.card.source, "the layout")
    assert list(line.inputs) == list(given)
    for name, text in line.inputs.items():
        if isinstance(given[name], bool):
            assert text == ("yes" if given[name] else "no")
        else:
            assert float(text.split(" ")[0]) == pytest.approx(given[name], rel=1e-5)


def test_impossible_input_is_refused_by_name(rule: Rule[Any]) -> None:
    given = ordinary_input(rule)
    for name in given:
        for impossible in (math.nan, math.inf):
            with pytest.raises(ValueError, match=f"{rule.__name__}: {name} must be finite"):
                rule(**{**given, name: impossible})
        unit = rule.units[name]
        if unit.above == 0 or unit.least >= 0:
            with pytest.raises(ValueError, match=f"{rule.__name__}: {name} must be"):
                rule(**{**given, name: -1})
        if unit.above == 0 or unit.least == 1:
            with pytest.raises(ValueError, match=f"{rule.__name__}: {name} must be"):
                rule(**{**given, name: 0})


def test_ranges_speak_of_figures_that_the_rule_has(rule: Rule[Any]) -> None:
    """A range is about an argument, or brings its own measure; both ends in order; judged without an error."""
    for valid in rule.card.valid:
        assert valid.measure is not None or valid.of in rule.signature.parameters
        assert valid.low < valid.high
        assert math.isfinite(valid.low) or math.isfinite(valid.high)
    for finding in rule.outside(**ordinary_input(rule)):
        assert finding.severity is Severity.CAUTION


def test_out_of_range_gives_the_number_and_a_finding() -> None:
    """Neither clamped nor refused: 8 % is computed, and the finding carries value, limit and unit."""
    assert mold_dimension_iso294_4(92.0, 8.0) == pytest.approx(100.0)
    (finding,) = mold_dimension_iso294_4.outside(92.0, 8.0)
    assert (finding.code, finding.value, finding.limit, finding.unit) == ("rule.outside_range", 8.0, 5.0, "%")
    assert "shrink is 8 %" in finding.message
    assert mold_dimension_iso294_4.outside(92.0, 0.5) == ()


def test_infinite_limits_are_not_printed() -> None:
    texts = [str(valid) for one in RULES.values() for valid in one.card.valid]
    assert texts
    assert not [text for text in texts if "inf" in text]


@pytest.mark.parametrize("module", rule_modules(), ids=lambda module: module.__name__)
def test_examples_run(module: ModuleType) -> None:
    """Every example of the docstrings gives what it says; a module with rules has at least one for each."""
    result = doctest.testmod(module)
    assert result.failed == 0
    ours = [one for one in RULES.values() if one.__module__ == module.__name__]
    assert result.attempted >= len(ours)
