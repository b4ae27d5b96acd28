"""`moldgen batch`: many parts, several at once, each in a worker of its own, so that none can stop the others."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from queue import SimpleQueue

from moldgen.canon import sha256_file
from moldgen.errors import ExitCode, MoldgenError, StageError
from moldgen.flow.batch_inputs import USUAL_RESIN, BatchInput, is_step
from moldgen.flow.batch_record import SUMMARY, Did, Record, job_key
from moldgen.flow.batch_row import Row, row_of_error, row_of_result, summary_csv, worst
from moldgen.flow.folder import MANIFEST, replace_file
from moldgen.flow.job import Job, JobKind, JobResult, Limits, Options
from moldgen.flow.tell import InputsRead, Message
from moldgen.flow.worker import run_in_worker, signals_stop

ENTRY = "moldgen.flow.batch_part:run_part"


@dataclass(frozen=True)
class Batch:
    """What to do.

    Parameters
    ----------
    inputs : the parts
    folder : where the output folder of each part goes, the summary and the record
    kind : build or check
    options : for each part; `resin` is for bare STEP files
    again : do all parts, also those that are done
    """

    inputs: tuple[BatchInput, ...]
    folder: Path
    kind: JobKind = JobKind.BUILD
    options: Options = field(default_factory=Options)
    again: bool = False


@dataclass(frozen=True)
class PartStarted:
    """A worker begins with a part."""

    name: str


@dataclass(frozen=True)
class PartTold:
    """A part under way says something."""

    name: str
    message: Message


@dataclass(frozen=True)
class PartFinished:
    """A part is finished; `seconds` is None if an earlier run did it."""

    row: Row
    output: Path
    seconds: float | None


@dataclass(frozen=True)
class BatchStopped:
    """The user, or the system, stopped the batch."""

    finished: int


Event = PartStarted | PartTold | PartFinished | BatchStopped


@dataclass(frozen=True)
class BatchResult:
    """The exit code, each finished part with its seconds in the order of the inputs, and the file of the summary."""

    exit_code: ExitCode
    rows: tuple[tuple[Row, float | None], ...]
    summary: Path


@dataclass(frozen=True)
class _Done:
    """What a worker brought: its outcome, the files it read (None: it did not say), and how long it took [s]."""

    outcome: JobResult | MoldgenError
    files: dict[str, str] | None
    seconds: float


def run_batch(
    batch: Batch, limits: Limits, jobs: int, hear: Callable[[Event], None], *, entry: str = ENTRY
) -> BatchResult:
    """Do all parts of a batch, `jobs` at once, and write its summary.

    What is finished is noted at once, so that a run which is stopped or killed loses only what was under way.

    Raises
    ------
    SpecError : the folder of the batch cannot be written
    """
    run = _Run(batch, limits, hear, entry)
    try:
        with signals_stop():
            run.all(jobs)
    except KeyboardInterrupt:
        hear(BatchStopped(len(run.finished)))
        return BatchResult(ExitCode.STOPPED, run.rows(), batch.folder / SUMMARY)
    rows = run.rows()
    replace_file(batch.folder / SUMMARY, summary_csv([row for row, _ in rows]))
    return BatchResult(worst([row.exit_code for row, _ in rows]), rows, batch.folder / SUMMARY)


class _Run:
    """A batch under way. Workers are watched by threads; all that is noted and shown happens in the thread of `all`."""

    def __init__(self, batch: Batch, limits: Limits, hear: Callable[[Event], None], entry: str) -> None:
        self.finished: dict[str, tuple[Row, float | None]] = {}
        self._batch, self._limits, self._hear, self._entry = batch, limits, hear, entry
        self._record = Record(batch.folder)
        self._keys: dict[str, str] = {}
        self._events: SimpleQueue[Event | tuple[BatchInput, Future[_Done]]] = SimpleQueue()
        self._stop = threading.Event()

    def rows(self) -> tuple[tuple[Row, float | None], ...]:
        """Return the finished parts in the order of the inputs."""
        return tuple(self.finished[i.name] for i in self._batch.inputs if i.name in self.finished)

    def all(self, jobs: int) -> None:
        """Do every part that is not done yet; when this ends, however it ends, no worker is left."""
        pool = ThreadPoolExecutor(max(1, jobs))
        try:
            left = [one for one in self._batch.inputs if not self._taken_over(one)]
            for one in left:
                pool.submit(self._work, one).add_done_callback(partial(self._ended, one))
            while len(self.finished) < len(self._batch.inputs):
                event = self._events.get()
                if isinstance(event, tuple):
                    self._finish(*event)
                else:
                    self._hear(event)
        finally:
            self._stop.set()
            pool.shutdown(cancel_futures=True)

    def _ended(self, one: BatchInput, future: Future[_Done]) -> None:
        self._events.put((one, future))

    def _taken_over(self, one: BatchInput) -> bool:
        """Take over what an earlier run did of a part, if that still holds."""
        self._keys[one.name] = job_key(self._job(one))
        row = (
            None if self._batch.again else self._record.done(self._place(one).name, self._keys[one.name], self._limits)
        )
        if row is not None:
            self._show(one, row, None)
        return row is not None

    def _job(self, one: BatchInput) -> Job:
        options = self._batch.options
        if not is_step(one.source):  # a spec names its own resin: that of the command line changes nothing there
            options = Options(options.allow_code, options.pictures)
        return Job(self._batch.kind, one.source, self._place(one), options)

    def _place(self, one: BatchInput) -> Path:
        """Return the output folder of a part; a review does not replace a tool."""
        return self._batch.folder / (one.name + ("-check" if self._batch.kind is JobKind.CHECK else ""))

    def _work(self, one: BatchInput) -> _Done:
        """Do one part in a worker; this runs in a thread of the pool."""
        files: dict[str, str] | None = None

        def hear(message: Message) -> None:
            nonlocal files
            if isinstance(message, InputsRead):
                files = message.files
            self._events.put(PartTold(one.name, message))

        outcome: JobResult | MoldgenError
        self._events.put(PartStarted(one.name))
        start = time.monotonic()
        try:
            outcome = run_in_worker(self._job(one), self._limits, hear, entry=self._entry, stop=self._stop)
        except MoldgenError as error:
            outcome = error
        return _Done(outcome, files, time.monotonic() - start)

    def _finish(self, one: BatchInput, future: Future[_Done]) -> None:
        """Note what came of a part, and show it. Whatever its thread did not expect is our bug, and ends only it."""
        unforeseen = future.exception()
        if unforeseen is not None:
            what = f"unexpected {type(unforeseen).__name__}: {unforeseen}"
            remedy = "this is a bug in moldgen, or the machine has no room for one more process: try --jobs 1"
            done = _Done(StageError(what, remedy=remedy), None, 0.0)
        else:
            done = future.result()
        if isinstance(done.outcome, MoldgenError):
            row, made = row_of_error(one.name, one.source, done.outcome), ""
        else:
            row = row_of_result(one.name, one.source, self._batch.kind, done.outcome)
            made = sha256_file(self._place(one) / MANIFEST)
        if done.files is None:
            self._record.forget(self._place(one).name)
        else:
            limits = (self._limits.time_s, self._limits.memory_bytes)
            self._record.keep(self._place(one).name, Did(self._keys[one.name], done.files, made, limits, row))
        self._show(one, row, done.seconds)

    def _show(self, one: BatchInput, row: Row, seconds: float | None) -> None:
        self.finished[one.name] = (row, seconds)
        self._hear(PartFinished(row, self._place(one), seconds))


def steps_without_resin(batch: Batch) -> str:
    """Return what to tell about the resin of bare STEP files, "" if nothing.

    Raises
    ------
    SpecError : the resin is not in the catalog: better said once than by every part
    """
    from moldgen.catalog import resin  # noqa: PLC0415  the catalog takes its time to read

    if batch.options.resin:
        resin(batch.options.resin)
        return ""
    count = sum(is_step(one.source) for one in batch.inputs)
    if count == 0:
        return ""
    return (
        f"note: STEP files without a spec ({count}) are taken as {USUAL_RESIN}, pull auto; --resin names another resin"
    )
