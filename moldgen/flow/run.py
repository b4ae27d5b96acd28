"""One job from the command line to its result: start the worker, show its stages, hand back what it found."""

from __future__ import annotations

from moldgen.flow.job import Job, JobResult, Limits
from moldgen.flow.order import ENTRY
from moldgen.flow.progress import progress
from moldgen.flow.worker import Standby, run_in_worker


def run(
    job: Job, limits: Limits, *, quiet: bool = False, entry: str = ENTRY, ready: Standby | None = None
) -> JobResult:
    """Do `job` in a worker process while its stages are shown on stderr (not if `quiet`), and return its result.

    ready : a worker that was started ahead

    Raises
    ------
    MoldgenError : see `run_in_worker`
    KeyboardInterrupt : the user, or the system, stopped the run
    """
    with progress(quiet=quiet) as hear:
        return run_in_worker(job, limits, hear, entry=entry, ready=ready)
