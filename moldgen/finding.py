"""What a run has to tell: findings, decisions and numbers, each with its place and its reason."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum

from moldgen.quantity import Quantity

Point = tuple[float, float, float]


class Severity(StrEnum):
    """How much a finding matters to the reader."""

    NOTE = "note"
    CAUTION = "caution"
    WARNING = "warning"
    FAILURE = "failure"


@dataclass(frozen=True)
class Finding:
    """One thing the reader should know.

    `code` is stable (``draft.too_small``) and is never reused for another meaning. `where` names the place in words;
    `at` is the same place as a point in the part's own coordinates [mm]. `value` and `limit` share `unit`.
    """

    code: str
    severity: Severity
    message: str
    where: str = ""
    at: Point | None = None
    value: float | None = None
    limit: float | None = None
    unit: str = ""
    remedy: str = ""


@dataclass(frozen=True)
class Decision:
    """What moldgen chose by itself, and why. `rung` names the step of a ladder that was used, where there is one."""

    topic: str
    choice: str
    why: str
    rung: str = ""
    refused: tuple[str, ...] = ()


@dataclass(frozen=True)
class Notes:
    """Everything one stage has to tell besides its result."""

    findings: tuple[Finding, ...] = ()
    decisions: tuple[Decision, ...] = ()
    quantities: tuple[Quantity, ...] = field(default=())

    def __add__(self, other: Notes) -> Notes:
        return Notes(
            self.findings + other.findings,
            self.decisions + other.decisions,
            self.quantities + other.quantities,
        )
