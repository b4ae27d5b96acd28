"""Numbers with units. Factors: 1 in = 25.4 mm and 1 lbf = 4.4482216152605 N exactly (NIST SP 811)."""

from __future__ import annotations

import math
import subprocess
import sys

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moldgen.errors import SpecError
from moldgen.units import Measure, to_number


@pytest.mark.parametrize(
    ("text", "measure", "expected"),
    [
        ("0.5 in", Measure.LENGTH, 12.7),
        ("0.5in", Measure.LENGTH, 12.7),
        ('3/8"', Measure.LENGTH, 9.525),
        ("1 3/8 in", Measure.LENGTH, 34.925),
        ("-1/2 in", Measure.LENGTH, -12.7),
        ("5 thou", Measure.LENGTH, 0.127),
        ("5 mil", Measure.LENGTH, 0.127),
        ("2 cm", Measure.LENGTH, 20.0),
        ("1e-3 m", Measure.LENGTH, 1.0),
        ("25 µm", Measure.LENGTH, 0.025),
        ("7", Measure.LENGTH, 7.0),
        (7, Measure.LENGTH, 7.0),
        ("1.5 deg", Measure.ANGLE, 1.5),
        ("1.5°", Measure.ANGLE, 1.5),
        ("30 arcmin", Measure.ANGLE, 0.5),
        ("1 rad", Measure.ANGLE, math.degrees(1.0)),
        ("0.5 %", Measure.PERCENT, 0.5),
        ("0.5%", Measure.PERCENT, 0.5),
        ("0.5 percent", Measure.PERCENT, 0.5),
        ("0.005 mm/mm", Measure.PERCENT, 0.5),
        ("0.005 in/in", Measure.PERCENT, 0.5),
        ("80 degC", Measure.TEMPERATURE, 80.0),
        ("176 degF", Measure.TEMPERATURE, 80.0),
        ("176 °F", Measure.TEMPERATURE, 80.0),
        ("25 MPa", Measure.PRESSURE, 25.0),
        ("25 N/mm2", Measure.PRESSURE, 25.0),
        ("250 bar", Measure.PRESSURE, 25.0),
        ("1000 psi", Measure.PRESSURE, 6.894757),
        ("10 lbf", Measure.FORCE, 44.482216152605),
        ("2 min", Measure.TIME, 120.0),
    ],
)
def test_text_is_converted(text, measure, expected):
    assert to_number(text, measure) == pytest.approx(expected, rel=1e-7)


@pytest.mark.parametrize(
    ("value", "measure", "said"),
    [
        ("5 kg", Measure.LENGTH, 'a length such as "0.5 in"'),
        ("5 %", Measure.ANGLE, 'an angle such as "1.5 deg"'),
        ("5 deg", Measure.PERCENT, 'a percentage such as "0.5 %"'),
        ("5 deg", Measure.TEMPERATURE, 'a temperature such as "80 degC"'),
        ("80 C", Measure.TEMPERATURE, 'a temperature such as "80 degC"'),
        ("5 mm/mm", Measure.ANGLE, "an angle"),
        ("5 mil", Measure.ANGLE, "an angle"),
        ("5 furlogs", Measure.LENGTH, 'no unit "furlogs"'),
        ("0,5 in", Measure.LENGTH, "a length"),
        ("wide", Measure.LENGTH, "a length"),
        ("", Measure.LENGTH, "a length"),
        ("1/0 in", Measure.LENGTH, "finite"),
        ("1e999", Measure.LENGTH, "finite"),
        (math.nan, Measure.LENGTH, "finite"),
        (10**400, Measure.LENGTH, "finite"),
        (True, Measure.LENGTH, "a length"),
        (None, Measure.LENGTH, "a length"),
        ([1], Measure.LENGTH, "a length"),
        ("9**9**9**9 mm", Measure.LENGTH, "no unit"),
        ("1 __import__('os')", Measure.LENGTH, "no unit"),
    ],
)
def test_wrong_measure_names_what_was_expected(value, measure, said):
    with pytest.raises(SpecError) as caught:
        to_number(value, measure)
    assert said in str(caught.value)
    assert measure.wanted in caught.value.remedy


@given(
    st.text(max_size=30) | st.from_regex(r"[0-9.]{1,5} ?[a-zA-Z%/*23]{1,8}", fullmatch=True), st.sampled_from(Measure)
)
@settings(deadline=None, derandomize=True)
def test_any_text_is_a_finite_number_or_a_spec_error(text, measure):
    try:
        number = to_number(text, measure)
    except SpecError:
        return
    assert math.isfinite(number)


@given(st.floats(-1e6, 1e6), st.sampled_from(Measure))
@settings(deadline=None, derandomize=True)
def test_a_plain_number_is_taken_as_it_is(number, measure):
    assert to_number(number, measure) == number


def test_the_unit_library_is_loaded_only_when_a_unit_is_written():
    code = "import sys; from moldgen.units import *; to_number('5', Measure.LENGTH); sys.exit('pint' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
