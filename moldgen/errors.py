"""The errors that end a run, and the exit code of each.

    MoldgenError
      SpecError     2  the spec or the command line is wrong
      PartError     3  the part cannot be read, or cannot be molded as asked
      KernelError   4  the geometry kernel failed, crashed or ran out of time
      StageError    5  our bug

A run that is stopped (Ctrl-C, SIGTERM) ends with 130: that is no error of ours, and Python's own KeyboardInterrupt.

A failed *check* is not an error: it is a `Finding`, and the run ends with exit code 1.
"""

from __future__ import annotations

from enum import IntEnum


class ExitCode(IntEnum):
    """What the process tells its caller."""

    OK = 0
    CHECK_FAILED = 1
    SPEC = 2
    PART = 3
    KERNEL = 4
    BUG = 5
    STOPPED = 130

    @property
    def meaning(self) -> str:
        """The one sentence that `moldgen --help` and the README print for this code."""
        return _MEANING[self]


_MEANING = {
    ExitCode.OK: "all well",
    ExitCode.CHECK_FAILED: "done, but a check or a proof failed",
    ExitCode.SPEC: "the spec or the command line is wrong",
    ExitCode.PART: "the part cannot be read, or cannot be molded as asked",
    ExitCode.KERNEL: "the geometry kernel failed, crashed, or ran out of time or memory",
    ExitCode.BUG: "a bug in moldgen",
    ExitCode.STOPPED: "stopped by Ctrl-C or by a signal; the earlier output is untouched",
}


class MoldgenError(Exception):
    """What failed, where, and what to try.

    Parameters
    ----------
    what : the failure in one sentence, with value and limit where there is one
    where : the place: ``spec.yaml:12:5``, ``face at 10.0, 4.2, 3.0``, a file
    remedy : what the user can do about it
    evidence : a file that holds the operands or the log, if one was kept
    """

    exit_code: ExitCode = ExitCode.BUG

    def __init__(self, what: str, *, where: str = "", remedy: str = "", evidence: str = "") -> None:
        super().__init__(what)
        self.what = what
        self.where = where
        self.remedy = remedy
        self.evidence = evidence

    @property
    def told(self) -> str:
        """Place and failure, without the remedy."""
        return f"{self.where}: {self.what}" if self.where else self.what

    def __str__(self) -> str:
        lines = [self.told]
        if self.remedy:
            lines.append(f"  try: {self.remedy}")
        if self.evidence:
            lines.append(f"  kept: {self.evidence}")
        return "\n".join(lines)

    def __reduce__(self) -> tuple[object, ...]:
        """Survive the trip from the worker process: keyword arguments do not pickle by default."""
        state = {"where": self.where, "remedy": self.remedy, "evidence": self.evidence}
        return (_rebuild, (type(self), self.what, state, dict(self.__dict__)))


def _rebuild(cls: type[MoldgenError], what: str, keywords: dict[str, str], state: dict[str, object]) -> MoldgenError:
    error = cls(what, **keywords)
    error.__dict__.update(state)
    return error


class SpecError(MoldgenError):
    """The spec or the command line is wrong."""

    exit_code = ExitCode.SPEC


class SpecErrors(SpecError):  # noqa: N818  the plural of SpecError
    """Several mistakes of one spec, reported together."""

    def __init__(self, errors: list[SpecError] | str, **_: str) -> None:
        self.errors: list[SpecError] = errors if isinstance(errors, list) else []
        super().__init__(errors if isinstance(errors, str) else "\n".join(str(e) for e in errors))


class PartError(MoldgenError):
    """The part cannot be read, or cannot be molded as asked."""

    exit_code = ExitCode.PART


class KernelError(MoldgenError):
    """The geometry kernel failed on a named operation."""

    exit_code = ExitCode.KERNEL


class StageError(MoldgenError):
    """A stage broke its own contract: our bug, not the user's."""

    exit_code = ExitCode.BUG
