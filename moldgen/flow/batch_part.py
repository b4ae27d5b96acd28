"""One part of a batch, done in its worker process: a bare STEP file gets a starter spec, then all is as ever."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

from moldgen.canon import sha256_file
from moldgen.errors import MoldgenError, SpecError
from moldgen.flow.batch_inputs import STARTERS, USUAL_RESIN, is_step
from moldgen.flow.folder import replace_file
from moldgen.flow.job import Job, JobResult
from moldgen.flow.jobs import run_job
from moldgen.flow.tell import Tell
from moldgen.spec.accepted import accepted_file
from moldgen.spec.load import LoadedSpec, load_spec
from moldgen.spec.starter import starter

_WARNING = "# Written by `moldgen batch`, and written over by it: copy it before you change it.\n"


def run_part(job: Job, tell: Tell) -> JobResult:
    """Do a job whose source may be a bare STEP file, and tell which files it depends on.

    Raises
    ------
    MoldgenError : as the stages say
    """
    if not is_step(job.source):
        return _run_spec(job, tell)
    spec = _starter_spec(job)
    try:
        return _run_spec(replace(job, source=spec), tell)
    except MoldgenError as error:
        if str(spec) in error.where:  # a spec that the user did not write tells him nothing
            error.where = str(job.source)
        raise


def _run_spec(job: Job, tell: Tell) -> JobResult:
    loaded = load_spec(job.source, allow_code=job.options.allow_code)
    if loaded.spec.part.function is None:  # nobody knows what a function reads: such a part is built every time
        tell.inputs({str(path): sha256_file(path) for path in _files(loaded)})
    return run_job(job, tell)


def _files(loaded: LoadedSpec) -> list[Path]:
    own = [loaded.path, accepted_file(loaded.path)]  # where there is none, that is what the build depends on
    return own if loaded.part_file is None else [*own, loaded.part_file]


def _starter_spec(job: Job) -> Path:
    if job.output is None:
        raise SpecError("a bare STEP file in a batch needs an output folder", remedy="name one with --output")
    path = job.output.parent / STARTERS / f"{job.output.name}.yaml"
    beside = Path(os.path.relpath(job.source, path.parent)).as_posix()
    path.parent.mkdir(parents=True, exist_ok=True)
    replace_file(path, _WARNING + starter(beside, job.output.name, job.options.resin or USUAL_RESIN))
    return path
