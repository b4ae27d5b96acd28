"""The section `steel_safe`: what may be written, and where a mistake in it is told."""

from __future__ import annotations

from pathlib import Path

import pytest

from moldgen.errors import SpecError
from moldgen.spec.load import load_spec
from moldgen.spec.starter import starter

HEAD = "part: {file: lid.step}\nresin: ABS\n"


def loaded(folder: Path, text: str):
    path = folder / "lid.yaml"
    path.write_text(HEAD + text, encoding="utf-8")
    return load_spec(path)


def test_places_with_their_own_allowance(tmp_path):
    text = "steel_safe:\n  allowance: 0.005 in\n  places:\n  - {at: [1, 2, 3], fit: press, allowance: 80 um}\n"
    section = loaded(tmp_path, text + "  - {at: [0, 0, 1 cm], face: true}\n").spec.steel_safe
    assert section.find == "auto"
    assert section.allowance == pytest.approx(0.127)
    one, other = section.places
    assert (one.fit, one.face, one.allowance) == ("press", False, pytest.approx(0.08))
    assert (other.fit, other.face, other.allowance, other.at[2]) == ("other", True, None, pytest.approx(10.0))


@pytest.mark.parametrize(
    ("text", "place", "words"),
    [
        ("steel_safe: {allowance: 3}\n", "3:25", "3 mm is out of range: it must be at most 2 mm"),
        ("steel_safe: {allowance: 0}\n", "3:25", "it must be more than 0 mm"),
        ("steel_safe: {allowance: 2 deg}\n", "3:25", "deg"),
        ("steel_safe: {find: some}\n", "3:20", "find"),
        ("steel_safe:\n  places:\n  - {at: [1, 2, 3], fit: loose}\n", "5:26", "fit"),
        ("steel_safe:\n  places:\n  - {fit: press}\n", "5:5", "at"),
        ("steel_safe:\n  places:\n  - {at: [1, 2], fit: snap}\n", "5:10", "is not a point"),
        ("steel_safe:\n  places:\n  - {at: [1, 2, 3], tune: true}\n", "5:21", "`tune`"),
        ("steel_safe:\n  allowence: 0.1\n", "4:3", "`allowance`"),
    ],
)
def test_mistakes_are_told_with_their_place(tmp_path, text, place, words):
    with pytest.raises(SpecError) as caught:
        loaded(tmp_path, text)
    assert caught.value.where == f"{tmp_path}/lid.yaml:{place}"
    assert words in str(caught.value)


def test_the_starter_shows_the_section():
    text = starter("lid.step", "lid")
    assert "# steel_safe:" in text
    for key in ("find: auto", "allowance: auto", "places: []"):
        assert f"#   {key} " in text
