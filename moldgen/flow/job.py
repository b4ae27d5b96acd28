"""What the command line asks of the worker process, and what it gets back: plain data, no geometry."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, field
from enum import StrEnum
from pathlib import Path

from moldgen.errors import ExitCode
from moldgen.finding import Decision, Finding, Severity
from moldgen.model.proof import Proof

Cell = str | float | int | bool | None
"""One cell of a table; `None` is empty."""


class JobKind(StrEnum):
    """The commands that need the geometry kernel."""

    BUILD = "build"
    CHECK = "check"
    PROVE = "prove"
    NEW = "new"
    ACCEPT = "accept"
    COMPARE = "compare"


@dataclass(frozen=True)
class Options:
    """What the command line adds to a job.

    resin : for `new` only; "" leaves the choice to the starter spec
    explain : whether the result says why each stage ran
    fresh : whether the accepted layout is ignored
    accept : whether the layout is accepted once the tool is proved
    """

    allow_code: bool = False
    pictures: bool = True
    resin: str = ""
    explain: bool = False
    fresh: bool = False
    accept: bool = False


@dataclass(frozen=True)
class Job:
    """One piece of work for the worker process.

    Parameters
    ----------
    kind : which command
    source : the spec (build, check, accept), the STEP file (new) or the output folder of an earlier build (prove)
    output : the folder (build, check) or spec file (new) to write, or the folder whose layout is accepted; `None`: as
        the spec says, else the default
    options : see `Options`
    other : the second output folder (compare), whose tool is the new one; `source` is the old one's
    """

    kind: JobKind
    source: Path
    output: Path | None = None
    options: Options = field(default_factory=Options)
    other: Path | None = None


@dataclass(frozen=True)
class Limits:
    """How long [s] and how large [bytes, resident, with its children] the worker may get."""

    time_s: float = 120.0
    memory_bytes: int = 8 * 2**30

    def __post_init__(self) -> None:
        if not (math.isfinite(self.time_s) and self.time_s > 0 and self.memory_bytes > 0):
            raise ValueError(f"limits must be finite and above zero: {self}")


@dataclass(frozen=True)
class Table:
    """A table for the terminal and for ``--json``. Column names carry their unit: ``depth [mm]``."""

    title: str
    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]

    def __post_init__(self) -> None:
        wrong = [row for row in self.rows if len(row) != len(self.columns)]
        if wrong:
            raise ValueError(f"table {self.title!r}: {len(self.columns)} columns, but a row is {wrong[0]!r}")


@dataclass(frozen=True)
class JobResult:
    """What a job has to say. Everything in it is plain data, so that the parent process needs no kernel to read it.

    Parameters
    ----------
    exit_code : `ExitCode.OK` or `ExitCode.CHECK_FAILED`; everything worse is an error, not a result
    headline : the outcome in one sentence
    output : what was written, a folder or a file; `None` if nothing was
    tables, proofs, findings, decisions : shown in this order, findings by severity
    timings_s : (stage, seconds) in the order they ran
    first_pass : True when steel was laid out or proved, so that the standing cautions are shown
    """

    exit_code: ExitCode
    headline: str
    output: Path | None = None
    tables: tuple[Table, ...] = ()
    proofs: tuple[Proof, ...] = ()
    findings: tuple[Finding, ...] = ()
    decisions: tuple[Decision, ...] = ()
    timings_s: tuple[tuple[str, float], ...] = ()
    first_pass: bool = False


def verdict_code(findings: Iterable[Finding], proofs: Iterable[Proof] = ()) -> ExitCode:
    """Return OK, or CHECK_FAILED if a finding is a failure or a proof did not pass (one that did not run did not)."""
    failed = any(f.severity is Severity.FAILURE for f in findings) or not all(p.passed for p in proofs)
    return ExitCode.CHECK_FAILED if failed else ExitCode.OK
