"""What the parent hands the worker process, and the names of the files that both know."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from moldgen.flow.job import Job

LOG = "log.txt"
TRACEBACK = "traceback.txt"
ENTRY = "moldgen.flow.jobs:run_job"


AHEAD = ("moldgen.flow.jobs", "moldgen.flow.build")
"""What a worker that is started ahead loads while it waits: the kernel comes with it."""


@dataclass(frozen=True)
class Load:
    """Sent before the order to a worker that is started ahead: the modules to load meanwhile."""

    modules: tuple[str, ...]


@dataclass(frozen=True)
class Order:
    """One job, the function that does it (``module:name``), where evidence is kept, and the memory limit [bytes]."""

    job: Job
    entry: str
    evidence: Path
    memory_bytes: int
