"""A result, or an error, as text for a person and as JSON for a program."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from typing import Any

from moldgen.canon import plain
from moldgen.errors import ExitCode, MoldgenError, SpecErrors
from moldgen.finding import Decision, Finding, Severity
from moldgen.flow.job import Cell, JobResult, Table
from moldgen.model.proof import Proof

MOST_OF_A_CODE = 5
"""So many findings of one code are shown on the terminal; the manifest and --json have them all."""

SHORT = 40
"""Characters of a detail that is shown although its proof held."""

MOST_OF_A_TOPIC = 22
"""Characters of the column of decided topics."""

INDENT = " " * 10
"""Before what follows the severity of a finding."""

CAUTIONS = (
    "This is a first-pass layout, not a released design: it is not for manufacture before qualified people, licensed "
    "where the law asks for it, have reviewed it. Strength, cooling, venting, wear and machine are theirs to judge.",
    "A closing mold crushes, hot melt burns and can spurt, stored springs and pressure let go without warning, and "
    "steel needs rated lifting gear. The rules and codes of your place come before anything said here.",
)
"""Own words; printed with every layout."""

_ORDER = {Severity.FAILURE: 0, Severity.WARNING: 1, Severity.CAUTION: 2, Severity.NOTE: 3}


def result_lines(result: JobResult, width: int = 100) -> list[str]:
    """Return the lines that the terminal shows for `result`; tables may be wider than `width`, text is not."""
    lines = [*_wrapped(result.headline, width)]
    for table in result.tables:
        lines += ["", *table_lines(table)]
    if result.proofs:
        lines += ["", *table_lines(_proof_table(result.proofs))]
    if result.findings:
        lines += ["", "findings", *_finding_lines(result.findings, width)]
    if result.decisions:
        lines += ["", "decided by moldgen", *_decision_table(result.decisions, width)]
    if result.output is not None:
        lines += ["", f"written: {result.output}"]
    if result.first_pass:
        lines += ["", *(line for text in CAUTIONS for line in _wrapped(text, width))]
    return lines


def table_lines(table: Table) -> list[str]:
    """Return `table` as lines: a title, column names, one line a row; numbers stand to the right."""
    texts = [[_cell(value) for value in row] for row in table.rows]
    columns = list(zip(table.columns, *texts, strict=True))
    widths = [max(map(len, column)) for column in columns]
    right = [_is_numeric([row[i] for row in table.rows]) for i in range(len(widths))]
    body = [table.columns, *texts] if texts else [("none",)]
    return [table.title, *("  " + _row(cells, widths, right) for cells in body)]


def error_lines(error: MoldgenError) -> list[str]:
    """Return the lines that the terminal shows for `error`; long ones are not broken, so that paths stay whole."""
    return [f"moldgen: {line}" if not line.startswith(" ") else line for line in str(error).splitlines()]


def result_json(result: JobResult) -> dict[str, Any]:
    """Return what ``--json`` prints for `result`."""
    return {
        "exit_code": int(result.exit_code),
        "headline": result.headline,
        "output": plain(result.output),
        "tables": [plain(table) for table in result.tables],
        "proofs": [plain(proof) | {"passed": proof.passed} for proof in result.proofs],
        "findings": [plain(finding) for finding in sorted_findings(result.findings)],
        "decisions": [plain(decision) for decision in result.decisions],
        "timings_s": [{"stage": name, "seconds": round(seconds, 3)} for name, seconds in result.timings_s],
        "cautions": list(CAUTIONS) if result.first_pass else [],
    }


def error_json(error: MoldgenError) -> dict[str, Any]:
    """Return what ``--json`` prints for `error`: several errors of one spec are listed one by one."""
    errors: list[MoldgenError] = list(error.errors) if isinstance(error, SpecErrors) and error.errors else [error]
    keys = ("what", "where", "remedy", "evidence")
    return {
        "exit_code": int(error.exit_code),
        "errors": [{"kind": type(e).__name__} | {key: getattr(e, key) for key in keys} for e in errors],
    }


def stopped_json() -> dict[str, Any]:
    """Return what ``--json`` prints for a run that was stopped."""
    return {"exit_code": int(ExitCode.STOPPED), "errors": [{"kind": "Stopped", "what": ExitCode.STOPPED.meaning}]}


def sorted_findings(findings: Sequence[Finding]) -> list[Finding]:
    """Return `findings` with the gravest first, else in the order the stages found them."""
    return sorted(findings, key=lambda finding: _ORDER[finding.severity])


def _proof_table(proofs: Sequence[Proof]) -> Table:
    """Return the proofs as a table; the detail of one that held is for the manifest, unless it is a few words."""
    rows: list[tuple[Cell, ...]] = []
    for p in proofs:
        detail = p.detail if not p.passed or len(p.detail) <= SHORT else ""
        figure = None if p.figure is None else _rounded(p.figure)
        rows.append((p.verdict.value, p.name, figure, _rounded(p.limit), p.unit, detail))
    columns = ("verdict", "proof", "figure", "limit", "unit", "detail")
    shown = len(columns) if any(row[-1] for row in rows) else len(columns) - 1
    return Table("proofs", columns[:shown], tuple(row[:shown] for row in rows))


def _finding_lines(findings: Sequence[Finding], width: int) -> Iterator[str]:
    """Yield the findings by code, the gravest first: the advice that they share stands once, below them."""
    groups: dict[tuple[Severity, str], list[Finding]] = {}
    for finding in sorted_findings(findings):
        groups.setdefault((finding.severity, finding.code), []).append(finding)
    for (severity, code), group in groups.items():
        remedies = list(dict.fromkeys(f.remedy for f in group[:MOST_OF_A_CODE] if f.remedy))
        head = f"  {severity.value:8}"
        for finding in group[:MOST_OF_A_CODE]:
            yield from _wrapped(f"{finding.message} [{code}]", width, first=head, rest=INDENT)
            facts = "; ".join(_facts(finding))
            if facts:
                yield from _wrapped(facts, width, first=INDENT, rest=INDENT)
            if finding.remedy and len(remedies) > 1:
                yield from _advice(finding.remedy, width)
            head = INDENT
        if len(group) > MOST_OF_A_CODE:
            yield f"{INDENT}and {len(group) - MOST_OF_A_CODE} more of {code}"
        if len(remedies) == 1:
            yield from _advice(remedies[0], width)


def _advice(remedy: str, width: int) -> list[str]:
    return _wrapped(f"try: {remedy}", width, first=INDENT, rest=f"{INDENT}     ")


def _facts(finding: Finding) -> Iterator[str]:
    """Yield where a finding is, without a place that the words name already, and its figure against the limit."""
    place = finding.where if finding.where not in finding.message else ""
    if finding.at is not None:
        point = ", ".join(f"{x + 0.0:.2f}" for x in finding.at)
        if point not in f"{place} {finding.message}":
            place = f"{place} (at {point})" if place else f"at {point}"
    if place:
        yield place
    if finding.value is not None:
        unit = "" if finding.unit == "1" else f" {finding.unit}".rstrip()
        limit = "" if finding.limit is None else f", limit {_figure(finding.limit)}{unit}"
        yield f"{_figure(finding.value)}{unit}{limit}"


def _decision_table(decisions: Sequence[Decision], width: int) -> Iterator[str]:
    """Yield what was decided, the topics in a column of their own, each with its reason."""
    column = min(max(len(d.topic) for d in decisions), MOST_OF_A_TOPIC) + 4
    for decision in decisions:
        words = f"{decision.choice} ({decision.why})" if decision.why else decision.choice
        first = f"  {decision.topic}".ljust(column)
        yield from _wrapped(words, width, first=first, rest=" " * column)


def _wrapped(text: str, width: int, first: str = "", rest: str = "") -> list[str]:
    return textwrap.wrap(
        text, width, initial_indent=first, subsequent_indent=rest, break_long_words=False, break_on_hyphens=False
    )


def _cell(value: Cell) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    return _number(value) if isinstance(value, float) else str(value)


def _number(value: float) -> str:
    """Return six digits, and an exponent only for what is tiny: a volume in mm^3 is read by people."""
    text = f"{value:.6g}"
    return f"{value:.0f}" if "e+" in text else text


def _rounded(value: float) -> float:
    """Return what a person compares with a limit: four digits, two if it is tiny; the manifest has all of them."""
    return float(f"{value:.2g}" if abs(value) < 1e-3 else f"{value:.4g}")


def _figure(value: float) -> str:
    return _number(_rounded(value))


def _is_numeric(values: Sequence[Cell]) -> bool:
    return all(value is None or (isinstance(value, int | float) and not isinstance(value, bool)) for value in values)


def _row(cells: Sequence[str], widths: Sequence[int], right: Sequence[bool]) -> str:
    padded = (c.rjust(w) if r else c.ljust(w) for c, w, r in zip(cells, widths, right, strict=False))
    return "  ".join(padded).rstrip()
