"""What the worker process does for each command. The kernel is loaded only once spec and output place are good."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

from moldgen.errors import MoldgenError, SpecError
from moldgen.flow.accept import accept_layout, with_layout_accepted
from moldgen.flow.folder import MANIFEST, fresh_folder, write_new_file
from moldgen.flow.job import Job, JobKind, JobResult, Options, Table
from moldgen.flow.store import Store, open_store
from moldgen.flow.tell import Tell
from moldgen.flow.unchanged import UNCHANGED, build_key, remember, stage_table, unchanged
from moldgen.spec.accepted import load_accepted
from moldgen.spec.declared import is_key, located
from moldgen.spec.load import LoadedSpec, load_spec

LOADING = "load the kernel"
"""The stage that takes seconds before anything about the part happens."""

OUT = Path("out")
"""Where outputs go, in the folder where moldgen is run, unless the spec or the command line says otherwise."""


def build(job: Job, tell: Tell) -> JobResult:
    """From a spec to a proved tool in the output folder; nothing is done where nothing has changed."""
    loaded, final = _loaded(job, "")
    store, options = open_store(), job.options
    loaded = replace(loaded, accepted=None if options.fresh else load_accepted(loaded.path))
    tell.output(final)
    key = build_key(loaded, options)
    same = unchanged(key, final, store)
    if same is not None:
        explained = stage_table({"all": f"kept: {UNCHANGED}"})
        same = with_layout_accepted(replace(same, output=final), loaded, options, tell)
        return _with_tables(same, options, explained, store)
    with fresh_folder(final, inputs=_inputs(loaded), tell=tell) as aside:
        with tell.stage(LOADING):
            from moldgen.flow.build import build_tool  # noqa: PLC0415
            from moldgen.flow.stages import Stages, reasons, runs_as_text, runs_from_text  # noqa: PLC0415

        stages, last = Stages(store, tell), f"stages of {final.absolute()}"
        before = runs_from_text(store.noted(last))
        with _located(loaded):
            result = build_tool(loaded, aside, options, stages)
    remember(key, final, result, store)
    store.note(last, runs_as_text(stages.runs))
    explained = stage_table(reasons(stages.runs, before))
    result = with_layout_accepted(replace(result, output=final), loaded, options, tell)
    return _with_tables(result, options, explained, store)


def _with_tables(result: JobResult, options: Options, explained: Table, store: Store) -> JobResult:
    """Return a result with what is for the reader of this run alone: why stages ran, and troubles of the store."""
    tables = (*result.tables, explained) if options.explain else result.tables
    return replace(result, tables=tables, findings=(*result.findings, *store.findings()))


def accept(job: Job, tell: Tell) -> JobResult:
    """Write the layout of the last output of a spec beside it, for the next builds to keep."""
    loaded, final = _loaded(job, "")
    return accept_layout(loaded, final, tell)


def check(job: Job, tell: Tell) -> JobResult:
    """Review the part of a spec against its pull, without building steel."""
    loaded, final = _loaded(job, "-check")
    tell.output(final)
    with fresh_folder(final, inputs=_inputs(loaded), tell=tell) as aside:
        with tell.stage(LOADING):
            from moldgen.flow.check import check_part  # noqa: PLC0415
            from moldgen.flow.stages import Stages  # noqa: PLC0415

        with _located(loaded):
            result = check_part(loaded, aside, Stages(open_store(), tell))
    return replace(result, output=final)


def prove(job: Job, tell: Tell) -> JobResult:
    """Read an output folder back and prove the tool again, without its spec."""
    with tell.stage(LOADING):
        from moldgen.flow.prove import prove_folder  # noqa: PLC0415

    return prove_folder(job.source, tell)


def new(job: Job, tell: Tell) -> JobResult:
    """Write a commented starter spec for a STEP file."""
    with tell.stage(LOADING):
        from moldgen.flow.new import starter_spec  # noqa: PLC0415

    output = job.output or Path(f"{job.source.stem}.yaml")
    text, result = starter_spec(job.source, output, job.options.resin, tell)
    write_new_file(output, text)
    return replace(result, output=output)


def compare(job: Job, tell: Tell) -> JobResult:
    """Say what of the tool in one output folder must change to become that in another."""
    old, new = job.source, job.other or job.source
    final = job.output or OUT / f"{new.resolve().name}-compare"
    with fresh_folder(final, inputs=[old / MANIFEST, new / MANIFEST], tell=tell) as aside:
        with tell.stage(LOADING):
            from moldgen.flow.compare import compare_folders  # noqa: PLC0415

        result = compare_folders(old, new, aside, tell, pictures=job.options.pictures)
    return replace(result, output=final)


_JOBS: dict[JobKind, Callable[[Job, Tell], JobResult]] = {
    JobKind.BUILD: build,
    JobKind.CHECK: check,
    JobKind.PROVE: prove,
    JobKind.NEW: new,
    JobKind.ACCEPT: accept,
    JobKind.COMPARE: compare,
}


def run_job(job: Job, tell: Tell) -> JobResult:
    """Do `job` and return its result; every error propagates to the worker's own handler.

    Raises
    ------
    MoldgenError : as the stages say
    """
    return _JOBS[job.kind](job, tell)


def _loaded(job: Job, suffix: str) -> tuple[LoadedSpec, Path]:
    loaded = load_spec(job.source, allow_code=job.options.allow_code)
    if job.output is not None:
        return loaded, job.output
    given = loaded.spec.output.folder
    place = OUT if given is None else loaded.folder / given
    return loaded, place / f"{loaded.spec.name}{suffix}"


@contextmanager
def _located(loaded: LoadedSpec) -> Iterator[None]:
    """Let a mistake that a stage finds in a key of the spec, such as ``blocks.length``, be told with its place."""
    try:
        yield
    except MoldgenError as error:
        error.what, error.where = located(error.what, loaded), located(error.where, loaded)
        if isinstance(error, SpecError) and is_key(error.where):
            error.what = f"{error.where}: {error.what}"
            error.where = loaded.locate(error.where)
        raise


def _inputs(loaded: LoadedSpec) -> list[Path]:
    return [loaded.path, *([loaded.part_file] if loaded.part_file is not None else [])]
