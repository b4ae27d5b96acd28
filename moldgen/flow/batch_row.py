"""The summary of a batch: one row a part, as CSV, as JSON and for the terminal."""

from __future__ import annotations

import csv
import io
import json
import re
import textwrap
from collections import Counter
from collections.abc import Sequence
from dataclasses import asdict, dataclass, fields
from pathlib import Path
from typing import Any

from moldgen.errors import ExitCode, MoldgenError, SpecErrors
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import Cell, JobKind, JobResult, Table
from moldgen.flow.report import sorted_findings

SHORT_REASON = 100
"""Characters of a reason in the lines that are no terminal's table; the CSV has all of them (our choice)."""

_SIDE_ACTION = re.compile(r"(slide|lifter) \d+")
"""The groups of side actions in the manifest's ``moves_with``, see `moldgen.model.motion.Step`."""

_FAILURES = {
    ExitCode.SPEC: "spec wrong",
    ExitCode.PART: "refused",
    ExitCode.KERNEL: "kernel failed",
    ExitCode.BUG: "bug",
}


@dataclass(frozen=True)
class Row:
    """What came of one part. Counts are None where nothing was built, so that no empty figure reads as a zero.

    result : in a word or two: "proved" only if every proof ran and held
    side_actions : slides and lifters
    rungs : which rung of each ladder was used, ``topic: rung; ...``
    reason : why it was refused or failed, else the gravest finding
    """

    name: str
    source: str
    result: str
    exit_code: int
    components: int | None = None
    proofs_passed: int | None = None
    proofs_total: int | None = None
    side_actions: int | None = None
    rungs: str = ""
    reason: str = ""


def row_of_result(name: str, source: Path, kind: JobKind, result: JobResult) -> Row:
    """Return the row of a part whose job ended with a result; components are counted in its manifest."""
    components, sides = _counted(result.output) if kind is JobKind.BUILD else (None, None)
    passed, total = sum(p.passed for p in result.proofs), len(result.proofs)
    gravest = sorted_findings(result.findings)[:1]
    return Row(
        name=name,
        source=source.as_posix(),
        result=_word(kind, result),
        exit_code=int(result.exit_code),
        components=components,
        proofs_passed=passed if total else None,
        proofs_total=total or None,
        side_actions=sides,
        rungs="; ".join(f"{d.topic}: {d.rung}" for d in result.decisions if d.rung),
        reason=_one_line("".join(f"{f.severity.value}: {f.message} [{f.code}]" for f in gravest)),
    )


def row_of_error(name: str, source: Path, error: MoldgenError) -> Row:
    """Return the row of a part whose job ended with an error."""
    first: MoldgenError = error.errors[0] if isinstance(error, SpecErrors) and error.errors else error
    reason = f"{first.where}: {first.what}" if first.where else first.what
    return Row(name, source.as_posix(), _FAILURES[error.exit_code], int(error.exit_code), reason=_one_line(reason))


def worst(codes: Sequence[int]) -> ExitCode:
    """Return the exit code of a whole batch: 5 is worse than 4, 3, 2, 1, 0."""
    return ExitCode(max(codes, default=0))


def summary_csv(rows: Sequence[Row]) -> str:
    """Return the rows as CSV ([published: RFC 4180] comma, CRLF), without times: same input, same bytes."""
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow(field.name for field in fields(Row))
    writer.writerows(asdict(row).values() for row in rows)
    return text.getvalue()


def row_json(row: Row, output: Path, seconds: float | None) -> dict[str, Any]:
    """Return what ``--json`` prints for a finished part; seconds are None if it was done by an earlier run."""
    made = output.as_posix() if row.exit_code in (ExitCode.OK, ExitCode.CHECK_FAILED) else None
    return {**asdict(row), "output": made, "seconds": None if seconds is None else round(seconds, 3)}


def cells(row: Row, seconds: float | None) -> tuple[Cell, ...]:
    """Return what the terminal shows of a row, see `COLUMNS`, all but its reason and rungs."""
    proofs = "" if row.proofs_total is None else f"{row.proofs_passed}/{row.proofs_total}"
    time = "earlier" if seconds is None else f"{seconds:.1f}"
    return (row.name, row.result, row.exit_code, row.components, proofs, row.side_actions, time)


COLUMNS = ("part", "result", "exit", "comp.", "proofs", "sides", "s")
"""comp.: components; sides: slides and lifters; s: seconds, or "earlier" if an earlier run did the part."""


def summary_table(rows: Sequence[tuple[Row, float | None]]) -> Table:
    """Return the rows with their seconds as a table of plain lines."""
    lines = tuple((*cells(row, s), textwrap.shorten(row.reason, SHORT_REASON, placeholder=" ...")) for row, s in rows)
    return Table("summary", (*COLUMNS, "gravest finding, or why not"), lines)


def summary_headline(rows: Sequence[tuple[Row, float | None]]) -> str:
    """Return how many parts came to what, in the order of the exit codes."""
    order = {row.result: row.exit_code for row, _ in rows}
    counts = Counter(row.result for row, _ in rows)
    said = ", ".join(f"{counts[word]} {word}" for word in sorted(counts, key=lambda w: (order[w], w)))
    earlier = sum(seconds is None for _, seconds in rows)
    return f"{len(rows)} parts: {said}" + (f" ({earlier} done by an earlier run)" if earlier else "")


def _word(kind: JobKind, result: JobResult) -> str:
    if kind is JobKind.CHECK:
        return "releases" if result.exit_code is ExitCode.OK else "check failed"
    if not result.proofs or not all(p.passed for p in result.proofs):
        return "not proved"
    return "proved" if result.exit_code is ExitCode.OK else "proved, check failed"


def _counted(output: Path | None) -> tuple[int | None, int | None]:
    """Return how many components and how many side actions the manifest of an output lists."""
    try:
        listed = json.loads((output / MANIFEST).read_text(encoding="utf-8"))["components"] if output else None
        groups = {c["moves_with"] for c in listed or () if _SIDE_ACTION.fullmatch(c["moves_with"])}
        return (None, None) if listed is None else (sum(len(c["positions"]) for c in listed), len(groups))
    except (OSError, ValueError, KeyError, TypeError):
        return None, None


def _one_line(text: str) -> str:
    return " ".join(text.split())
