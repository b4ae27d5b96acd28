"""What the worker process does for each command. Runs in the child: here the kernel may be imported."""

from __future__ import annotations

from collections.abc import Callable

from moldgen.errors import StageError
from moldgen.flow.job import Job, JobKind, JobResult
from moldgen.flow.tell import Tell


def build(job: Job, tell: Tell) -> JobResult:
    """From a spec to a proved tool in the output folder."""
    raise StageError(f"{job.kind} is not written yet ({tell.timings_s})")


def check(job: Job, tell: Tell) -> JobResult:
    """Review the part of a spec against its pull, without building steel."""
    raise StageError(f"{job.kind} is not written yet ({tell.timings_s})")


def prove(job: Job, tell: Tell) -> JobResult:
    """Read an output folder back and prove the tool again, without its spec."""
    raise StageError(f"{job.kind} is not written yet ({tell.timings_s})")


def new(job: Job, tell: Tell) -> JobResult:
    """Write a commented starter spec for a STEP file."""
    raise StageError(f"{job.kind} is not written yet ({tell.timings_s})")


_JOBS: dict[JobKind, Callable[[Job, Tell], JobResult]] = {
    JobKind.BUILD: build,
    JobKind.CHECK: check,
    JobKind.PROVE: prove,
    JobKind.NEW: new,
}


def run_job(job: Job, tell: Tell) -> JobResult:
    """Do `job` and return its result; every error propagates to the worker's own handler.

    Raises
    ------
    MoldgenError : as the stages say
    """
    return _JOBS[job.kind](job, tell)
