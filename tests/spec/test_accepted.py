"""The accepted layout beside a spec: written and read back the same, and every mistake in it told with its place."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from moldgen.errors import SpecError
from moldgen.model.accepted import (
    Accepted,
    AcceptedBlocks,
    AcceptedCore,
    AcceptedGate,
    AcceptedPin,
    AcceptedSide,
)
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.layout import GateKind
from moldgen.model.side_action import SideKind
from moldgen.spec.accepted import accepted_file, load_accepted
from moldgen.spec.accepted_text import accepted_text

FLOOR = FaceSign(
    SurfaceKind.PLANE,
    12.5,
    (1.0, 2.0, 3.25),
    (1.0, 2.0, 0.0, 0.5, 0.0, 0.0),
    axis=(0.0, 0.0, 1.0),
    twins=((4.0, 2.0, 3.0),),
)
LAYOUT = Accepted(
    name="lid",
    part_sha256="0123",
    pull=(0.0, 0.6, 0.8),
    fixed_point=(1.0, 2.0, 3.0),
    parting_height=-4.5,
    blocks=AcceptedBlocks((0.5, 0.0, -4.5), 100.0, 80.0, 36.0, 46.0),
    gate=AcceptedGate(
        GateKind.EDGE, (1.0, 2.0, 3.0), 3.0, 1.0, 0.75, 0.0, FLOOR, 4.5, 12.0, 5.123456789, (0.6, -0.64, 0.48)
    ),
    stroke=25.0,
    ejector_pins=(AcceptedPin("ejector pin 1", (1.0, 2.0, 0.1), 3.0, 100.0, FLOOR, -9.876543211),),
    core_pins=(AcceptedCore("core pin 1", (1.0, 2.0, 3.0), 4.0, None, 0.0),),
    cores_in_block=(AcceptedCore("round core", (7.0, 2.0, 3.0), 0.0),),
    side_actions=(AcceptedSide("slide 1", SideKind.SLIDE, (1.0, 0.0, 0.0)),),
    given_pins=(AcceptedPin("ejector pin 2", (5.0, 2.0, 0.1), 3.0, 100.0, None, -9.5),),
    given_cores=(AcceptedCore("core pin 2", (6.0, 2.0, 3.0), 4.0, None, -10.0),),
    pressure=48.75,
)


def read(folder: Path, text: str) -> Accepted | None:
    accepted_file(folder / "lid.yaml").write_text(text, encoding="utf-8")
    return load_accepted(folder / "lid.yaml")


def test_what_is_written_is_read_back(tmp_path: Path) -> None:
    assert read(tmp_path, accepted_text(LAYOUT)) == LAYOUT


def test_lengths_have_nine_decimals_and_no_exponent(tmp_path: Path) -> None:
    text = accepted_text(replace(LAYOUT, stroke=1e-10 + 20.0, fixed_point=(-1e-10, 1.23456789012, 2e-5)))
    assert "fixed_point: [0, 1.23456789, 0.00002]\n" in text
    assert "stroke: 20\n" in text
    again = read(tmp_path, text)
    assert again is not None
    assert accepted_text(again) == text


def test_a_file_of_before_without_fits_and_feed_is_read(tmp_path: Path) -> None:
    text = accepted_text(replace(LAYOUT, given_pins=(), given_cores=()))
    kept = [line for line in text.splitlines(keepends=True) if not line.lstrip().startswith(NEW_KEYS)]
    assert len(text.splitlines()) - len(kept) == 7
    assert not any(line.lstrip().startswith("given") for line in kept)
    found = read(tmp_path, "".join(kept))
    assert found is not None
    assert [p.fit_end for p in (*found.ejector_pins, *found.core_pins)] == [None, None]
    gate = found.gate
    assert (gate.runner_diameter, gate.runner_length, gate.sprue_foot) == (0.0, 0.0, 0.0)
    assert gate.inward is None
    assert found.pressure == 0.0
    feed = {"runner_diameter": 4.5, "runner_length": 12.0, "sprue_foot": 5.123456789}
    assert replace(gate, **feed, inward=(0.6, -0.64, 0.48)) == LAYOUT.gate


NEW_KEYS = ("fit_end:", "runner_diameter:", "runner_length:", "sprue_foot:", "inward:", "pressure:")


def test_without_a_file_there_is_no_layout(tmp_path: Path) -> None:
    assert load_accepted(tmp_path / "lid.yaml") is None


@pytest.mark.parametrize(
    ("old", "new", "place", "words"),
    [
        ("diameter: 3\n", "diameter: -3\n", "ejection.pins[0].diameter", "more than 0"),
        ("fit_end: -9.876543211", "fit_end: deep", "ejection.pins[0].fit_end", "is not a length"),
        ("sprue_foot: 5.123456789", "sprue_foot: -1", "gate.sprue_foot", "0"),
        ("inward: [0.6", "inward: [0.7", "gate.inward", "no unit vector"),
        ("pressure: 48.75", "pressure: -1", "ejection.pressure", "0"),
        ("stroke: 25", "strokes: 25", "strokes", "did you mean `stroke`?"),
        ("accepted: 1", "accepted: 2", "accepted", "2 is not one of 1"),
        ('{kind: "plane"', '{kind: "plain"', "ejection.pins[0].feature", "SurfaceKind"),
        ("{kind:", "{color: red, kind:", "ejection.pins[0].feature", "unknown key `color`"),
        ("area_mm2: 12.5", "area_mm2: .nan", "ejection.pins[0].feature", "not finite"),
        ("pull: [0, 0.6, 0.8]", "pull: [0, 0.6, 0.9]", "pull", "no unit vector"),
        ("pull: [0, 0.6, 0.8]", "pull: [0, 1]", "pull", "three numbers"),
        ("  length: 100\n", "", "length", "missing in blocks"),
        ('name: "lid"', 'name: "lid"\nname: lid', "name", "written twice"),
        ("gate:", "\tgate:", "", "tab"),
        ("gate:", "gate: [", "", ""),
    ],
)
def test_a_mistake_is_told_with_its_line_and_all_ways_out(
    tmp_path: Path, old: str, new: str, place: str, words: str
) -> None:
    text = accepted_text(LAYOUT)
    assert old in text
    broken = text.replace(old, new, 1)
    with pytest.raises(SpecError) as caught:
        read(tmp_path, broken)
    told = str(caught.value)
    assert place in told
    assert words in told
    assert "or build with --fresh" in told
    name, line, _ = told.split(": ", maxsplit=1)[0].rsplit(":", 2)
    assert name.endswith("lid.accepted.yaml")
    assert 1 <= int(line) <= broken.count("\n") + 1


@pytest.mark.parametrize("data", [b"\xff\xfe", b"", b"- 1\n", b"accepted", b"\0\0"])
def test_rubbish_is_a_mistake_of_the_file_not_of_ours(tmp_path: Path, data: bytes) -> None:
    accepted_file(tmp_path / "lid.yaml").write_bytes(data)
    with pytest.raises(SpecError, match="--fresh"):
        load_accepted(tmp_path / "lid.yaml")
