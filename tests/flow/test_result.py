"""What a result says: the exit code of its checks, the gravest findings first, tables that line up."""

from __future__ import annotations

import pytest

from moldgen.errors import ExitCode, SpecError, SpecErrors
from moldgen.finding import Finding, Severity
from moldgen.flow.job import JobResult, Table, verdict_code
from moldgen.flow.report import MOST_OF_A_CODE, error_json, error_lines, result_json, result_lines, table_lines
from moldgen.model.proof import Proof, Verdict


def finding(severity: Severity, code: str = "draft.too_small") -> Finding:
    return Finding(code, severity, f"a {severity.value}")


@pytest.mark.parametrize("verdict", Verdict)
def test_only_a_proof_that_ran_and_held_is_well(verdict: Verdict) -> None:
    expected = ExitCode.OK if verdict is Verdict.PASSED else ExitCode.CHECK_FAILED
    assert verdict_code([], [Proof("opening", verdict, 0.0, 0.03, "mm")]) is expected


@pytest.mark.parametrize("severity", Severity)
def test_only_a_failure_fails_a_check(severity: Severity) -> None:
    expected = ExitCode.CHECK_FAILED if severity is Severity.FAILURE else ExitCode.OK
    assert verdict_code([finding(severity)]) is expected


def test_findings_come_gravest_first_and_many_of_a_kind_are_counted() -> None:
    many = [finding(Severity.NOTE)] * (MOST_OF_A_CODE + 3)
    result = JobResult(ExitCode.OK, "done", findings=(*many, finding(Severity.FAILURE, "part.open")))
    lines = result_lines(result)
    shown = [line for line in lines if "[draft.too_small]" in line]
    assert len(shown) == MOST_OF_A_CODE
    assert "          and 3 more of draft.too_small" in lines
    assert lines.index("  failure a failure [part.open]") < lines.index(shown[0])
    assert len(result_json(result)["findings"]) == MOST_OF_A_CODE + 4


def test_a_table_lines_up_with_numbers_to_the_right() -> None:
    table = Table("faces", ("kind", "area [mm^2]"), (("upper", 2.5), ("straddling", 1234567.89), ("lower", None)))
    assert table_lines(table) == [
        "faces",
        "  kind        area [mm^2]",
        "  upper               2.5",
        "  straddling      1234568",
        "  lower",
    ]
    assert table_lines(Table("faces", ("kind",), ())) == ["faces", "  none"]
    with pytest.raises(ValueError, match="2 columns"):
        Table("faces", ("kind", "area"), (("upper",),))


def test_every_mistake_of_a_spec_is_told_with_its_place() -> None:
    errors = SpecErrors([SpecError("no such key", where="lid.yaml:3:1", remedy="resin"), SpecError("too thin")])
    assert error_lines(errors) == ["moldgen: lid.yaml:3:1: no such key", "  try: resin", "moldgen: too thin"]
    assert [e["where"] for e in error_json(errors)["errors"]] == ["lid.yaml:3:1", ""]
