"""What was proved about a tool, with the figure and its limit."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class Verdict(StrEnum):
    """The outcome of one proof. A proof that did not run never reads as passed."""

    PASSED = "passed"
    FAILED = "failed"
    NOT_RUN = "not run"


@dataclass(frozen=True)
class Proof:
    """One question asked of the exported tool."""

    name: str
    verdict: Verdict
    figure: float | None
    limit: float
    unit: str
    detail: str = ""

    @property
    def passed(self) -> bool:
        """True only when the proof ran and held."""
        return self.verdict is Verdict.PASSED
