"""What the terminal shows is for people: directions by name, numbers against limits, advice once."""

from __future__ import annotations

import pytest

from moldgen.errors import ExitCode
from moldgen.finding import Decision, Finding, Severity
from moldgen.flow.job import JobResult
from moldgen.flow.report import result_lines
from moldgen.flow.words import direction_text, told_note
from moldgen.model.proof import Proof, Verdict


def lines_of(**what: object) -> list[str]:
    return result_lines(JobResult(ExitCode.OK, "done", **what))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("direction", "text"),
    [((1, 0, 0), "+x"), ((0, -1.0, 1e-12), "-y"), ((0, 0.6, -0.8), "0, 0.6, -0.8"), ((-0.0, 1e-9, 1), "+z")],
)
def test_an_axis_is_written_as_in_a_spec(direction: tuple[float, float, float], text: str) -> None:
    assert direction_text(direction) == text


@pytest.mark.parametrize(
    ("note", "told"),
    [
        ("tip level; 2 alike: ejector pin 1, ejector pin 14", "tip level; numbers 1, 14"),
        ("3 alike: core pin 1, core pin 2, core pin 3", "numbers 1 to 3"),
        ("edge gate 2.3 x 1.55 mm, land 0.75 mm", "edge gate 2.3 x 1.55 mm, land 0.75 mm"),
        ("", ""),
    ],
)
def test_equals_are_told_by_their_numbers(note: str, told: str) -> None:
    assert told_note(note) == told


def test_a_ratio_has_no_unit_and_shared_advice_stands_once() -> None:
    pins = [
        Finding(
            "core_pin.slender", Severity.WARNING, f"core pin {i} is slender", "", (i, 0, 0), 6.58, 5.0, "1", "guide it"
        )
        for i in (1, 2)
    ]
    lines = lines_of(findings=tuple(pins))
    assert "          at 2.00, 0.00, 0.00; 6.58, limit 5" in lines
    assert [line for line in lines if "try:" in line] == ["          try: guide it"]


def test_a_place_is_told_once() -> None:
    finding = Finding("a.b", Severity.WARNING, "steep", "shut-off at 1.00, 2.00, 3.00", (1, 2, 3))
    assert "          shut-off at 1.00, 2.00, 3.00" in lines_of(findings=(finding,))
    named = Finding("a.b", Severity.NOTE, "nothing holds the sprue", "sprue")
    assert "          sprue" not in lines_of(findings=(named,))


def test_a_held_proof_keeps_its_long_detail_for_the_manifest() -> None:
    detail = "a detail that is much longer than a few words would be"
    held = Proof("balance", Verdict.PASSED, 8.55049e-12, 1e-6, "of the block", detail)
    failed = Proof("opening", Verdict.FAILED, 0.551655, 0.03, "mm", detail)
    text = "\n".join(lines_of(proofs=(held,)))
    assert "8.6e-12" in text
    assert detail not in text
    assert detail in "\n".join(lines_of(proofs=(held, failed)))


def test_decisions_stand_in_two_columns() -> None:
    lines = lines_of(decisions=(Decision("pull", "+z", "given"), Decision("parting line", "flat", "")))
    assert "  pull          +z (given)" in lines
    assert "  parting line  flat" in lines
