"""A data file that breaks its rules is our bug, found on loading and named with its row and column."""

from __future__ import annotations

import pytest

from moldgen.catalog.eyebolts import Eyebolt
from moldgen.catalog.pins import Pin
from moldgen.catalog.table import Range, rows_from_text
from moldgen.errors import StageError

GOOD = """
columns:
  axial: {meaning: mass, unit: kg, source: a standard, provenance: published}
  inclined: {meaning: mass askew, unit: kg, source: a standard, provenance: published}
rows:
  - {name: M8, axial: 140, inclined: 100}
  - {name: M10, axial: 230, inclined: 170, sources: {axial: {source: a page, provenance: common practice}}}
"""


def test_a_good_file_is_read() -> None:
    """A row's own source replaces that of its column, and only there."""
    first, second = rows_from_text(GOOD, Eyebolt, "eyebolts.yaml")
    assert (first.axial, first.fact("axial").source) == (140.0, "a standard")
    assert (second.fact("axial").source, second.fact("inclined").source) == ("a page", "a standard")
    assert second.fact("axial").unit == "kg"


@pytest.mark.parametrize(
    ("good", "bad", "message"),
    [
        (
            "provenance: published}\nrows",
            "provenance: heard}\nrows",
            "inclined: needs meaning, unit, source",
        ),
        ("source: a standard, provenance: published}\nrows", "provenance: published}\nrows", "inclined: needs meaning"),
        ("meaning: mass,", 'meaning: "",', "axial: source or meaning is empty"),
        ("axial: 140", "axial: heavy", "M8, axial: 'heavy' is not a number"),
        ("axial: 140", "axial: .nan", "M8, axial: nan is not a number"),
        ("axial: 140", "axial: true", "M8, axial: True is not a number"),
        ("axial: 140, ", "", "M8: unknown or missing: axial"),
        ("axial: 140", "axial: 140, colour: red", "M8: unknown or missing: colour"),
        ("{axial: {source", "{depth: {source", "M10: unknown or missing: depth"),
        ("name: M10", "name: m 8", "names used twice: m8"),
        ("  inclined: {", "  declined: {", "differ: declined, inclined"),
    ],
)
def test_a_bad_file_is_refused_with_its_place(good: str, bad: str, message: str) -> None:
    text = GOOD.replace(good, bad, 1)
    assert text != GOOD
    with pytest.raises(StageError) as caught:
        rows_from_text(text, Eyebolt, "eyebolts.yaml")
    assert message in str(caught.value)
    assert str(caught.value).startswith("eyebolts.yaml")


def test_a_list_of_numbers_holds_numbers() -> None:
    text = """
columns:
  diameter: {meaning: d, unit: mm, source: s, provenance: published}
  head_diameter: {meaning: d, unit: mm, source: s, provenance: published}
  head_height: {meaning: d, unit: mm, source: s, provenance: published}
  lengths: {meaning: l, unit: mm, source: s, provenance: published}
rows:
  - {name: a, diameter: 1, head_diameter: 2, head_height: 1, lengths: [100, long]}
"""
    with pytest.raises(StageError, match="a, lengths: 'long' is not a number"):
        rows_from_text(text, Pin, "pins.yaml")


def test_a_range_holds_both_its_ends() -> None:
    both = Range(0.5, 1.5)
    assert both.mean == 1.0
    assert 0.5 in both
    assert 1.5 in both
    assert 1.51 not in both
    assert (str(both), str(Range(2.0, 2.0))) == ("0.5 to 1.5", "2")
