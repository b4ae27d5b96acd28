"""Hostile and arbitrary text: nothing but `SpecError` may come out, and soon."""

from __future__ import annotations

import json
import tempfile
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from moldgen.errors import SpecError
from moldgen.spec.load import load_spec
from moldgen.spec.tree import MAX_ALIASES, MAX_DEPTH, MAX_VALUES, read_tree

SEARCH = settings(max_examples=300, suppress_health_check=[HealthCheck.too_slow], deadline=None, derandomize=True)
HEAD = "part: {file: lid.step}\nresin: ABS\n"


def _bomb(levels: int, width: int) -> str:
    """Each level names the one before `width` times: width**levels values in a few lines."""
    lines = ["a0: &a0 [x]"]
    lines += [f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * width)}]" for i in range(1, levels)]
    return "\n".join(lines) + "\n"


def test_an_alias_bomb_is_refused_by_its_written_out_size():
    assert 10 * 9 <= MAX_ALIASES < 9**9
    with pytest.raises(SpecError, match=f"more than {MAX_VALUES} values"):
        read_tree(_bomb(11, 9), "bomb.yaml")


def test_many_aliases_are_refused():
    aliases = ", ".join(["*a"] * (MAX_ALIASES + 1))
    with pytest.raises(SpecError, match=f"more than {MAX_ALIASES} aliases"):
        read_tree(f"a: &a 1\nb: [{aliases}]\n", "bomb.yaml")


@pytest.mark.parametrize("opening", ["[", "{a: ", "- "])
def test_deep_nesting_is_refused_without_recursion(opening):
    read_tree(
        opening * (MAX_DEPTH - 1) + ("" if opening == "- " else {"[": "]", "{a: ": "}"}[opening] * (MAX_DEPTH - 1)), "x"
    )
    with pytest.raises(SpecError, match=f"nested more than {MAX_DEPTH} deep") as caught:
        read_tree(opening * 100_000, "deep.yaml")
    assert caught.value.where == f"deep.yaml:1:{MAX_DEPTH * len(opening) + 1}"


def test_a_huge_number_is_no_huge_integer():
    with pytest.raises(SpecError, match="finite"):
        _load_text_of(HEAD + "gate: {land: " + "9" * 100_000 + "}\n")


def test_values_follow_the_core_schema_of_yaml():
    """YAML 1.2.2, section 10.3.2, example 10.9 and its table of regular expressions."""
    text = "[null, ~, true, FALSE, 0, -19, +12, 12e03, -2E+05, .5, 0., .inf, -.Inf, yes, no, 1_000, 12:30, 2020-01-01]"
    expected = [None, None, True, False, 0, -19, 12, 12e3, -2e5, 0.5, 0.0, float("inf"), -float("inf")]
    expected += ["yes", "no", "1_000", "12:30", "2020-01-01"]
    assert read_tree(text, "x").data == expected


def _load_text_of(text: str | bytes):
    with tempfile.TemporaryDirectory() as name:
        path = Path(name) / "any.yaml"
        path.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8", "surrogatepass"))
        return load_spec(path)


def _only_spec_errors(text: str | bytes) -> None:
    try:
        _load_text_of(text)
    except SpecError as error:
        assert str(error)


@given(st.binary(max_size=60) | st.text(max_size=120))
@SEARCH
def test_any_bytes(data):
    _only_spec_errors(data)


PIECES = [
    "part",
    "resin",
    "gate",
    "pull",
    "shrink",
    "at",
    "pins",
    "a.step",
    "ABS",
    "recipe",
    "features",
    "block",
    "auto",
]
PIECES += [
    ": ",
    ":\n  ",
    "\n",
    "\n- ",
    "- ",
    "[",
    "]",
    "{",
    "}",
    ", ",
    "&a ",
    "*a",
    "!t ",
    "'",
    '"',
    "#",
    "|\n",
    "? ",
    "---\n",
]
PIECES += ["\t", "0.5 in", "100 %", "-1", "1e999", ".nan", "%YAML 1.1\n", "\\x", "\u2028", "\x85", "<<"]


@given(st.lists(st.sampled_from(PIECES), max_size=25))
@SEARCH
def test_any_soup_of_yaml_signs(pieces):
    _only_spec_errors("".join(pieces))
    _only_spec_errors(HEAD + "".join(pieces))


KEYS = [
    "name",
    "part",
    "resin",
    "pull",
    "shrink",
    "draft",
    "parting",
    "blocks",
    "core_pins",
    "gate",
    "ejection",
    "marks",
]
KEYS += [
    "output",
    "file",
    "solid",
    "recipe",
    "function",
    "parameters",
    "features",
    "feature",
    "size",
    "at",
    "on",
    "profile",
]
KEYS += [
    "direction",
    "search",
    "all",
    "x",
    "fixed_point",
    "minimum",
    "length",
    "material",
    "kind",
    "pins",
    "add",
    "face",
]
LEAVES = st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=8)
LEAVES |= st.sampled_from(
    ["auto", "block", "extrude", "1 in", "50 %", "face at 1,2,3", "top of base", "+z", "[1", "edge"]
)
DATA = st.recursive(
    LEAVES,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.sampled_from(KEYS), inner, max_size=5),
    max_leaves=25,
)


@given(st.dictionaries(st.sampled_from(KEYS), DATA, max_size=8))
@SEARCH
def test_any_data_under_known_keys(data):
    _only_spec_errors(json.dumps({"part": {"file": "a.step"}, "resin": "ABS"} | data))
