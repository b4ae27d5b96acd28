"""`moldgen watch`: builds a spec again whenever it, its part or its accepted layout is saved, until it is stopped.

A change during a build stops that build: what it would give is out of date already, stages that it has finished are
kept, and the earlier output stays whole until a build is finished. The worker is watched from a thread, so that the
main thread is free for signals and for the files.
"""

from __future__ import annotations

import json
import threading
import time
from collections.abc import Callable, Sequence
from concurrent.futures import Future, ThreadPoolExecutor, wait
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any, Final

from moldgen.canon import plain
from moldgen.errors import ExitCode, MoldgenError, SpecErrors
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import Job, JobResult, Limits
from moldgen.flow.manifest_changes import ManifestChanges, manifest_changes
from moldgen.flow.order import AHEAD, ENTRY
from moldgen.flow.report import error_json
from moldgen.flow.tell import Message, OutputPlanned
from moldgen.flow.watched import Content, Watched
from moldgen.flow.worker import run_in_worker, signals_stop, standby
from moldgen.spec.accepted import accepted_file
from moldgen.spec.load import LoadedSpec, load_spec

LOOK_S: Final = 0.25
"""How often the files are looked at [s] (our choice)."""

_VERDICTS: Final = {
    ExitCode.OK: "proved",
    ExitCode.CHECK_FAILED: "failed",
    ExitCode.SPEC: "broken",
    ExitCode.PART: "refused",
    ExitCode.KERNEL: "no tool",
    ExitCode.BUG: "our bug",
}

Hear = Callable[[Message], None]


@dataclass(frozen=True)
class Round:
    """One rebuild: its time [s], what came of it, and what that changed against the one before (None for the first)."""

    seconds: float
    result: JobResult | None = None
    error: MoldgenError | None = None
    changes: ManifestChanges | None = None

    @property
    def exit_code(self) -> ExitCode:
        """The code that `moldgen build` would have ended with."""
        if self.error is not None:
            return self.error.exit_code
        return ExitCode.BUG if self.result is None else self.result.exit_code

    def line(self) -> str:
        """Return the round as one line for the terminal."""
        return f"{self.seconds:6.1f} s  {_VERDICTS[self.exit_code]:7}  {self._said()}"

    def _said(self) -> str:
        if self.error is not None:
            return _one_line(self.error)
        if self.result is None:
            return ""
        said = [self.result.headline] if self.changes is None else [self.changes.line()]
        failed = [p.name for p in self.result.proofs if not p.passed]
        if self.exit_code is not ExitCode.OK:
            said.append(f"not proved: {', '.join(failed)}" if failed else "see the findings of 'moldgen build'")
        return "; ".join(said)

    def as_json(self) -> dict[str, Any]:
        """Return the round as an object for ``--json``."""
        if self.error is not None:
            return {"seconds": round(self.seconds, 3), **error_json(self.error)}
        said = self.result
        return {
            "seconds": round(self.seconds, 3),
            "exit_code": int(self.exit_code),
            "headline": "" if said is None else said.headline,
            "output": None if said is None else plain(said.output),
            "changes": None if self.changes is None else {"line": self.changes.line(), **plain(self.changes)},
            "not_proved": [] if said is None else [p.name for p in said.proofs if not p.passed],
        }


def watch_spec(
    job: Job,
    limits: Limits,
    show: Callable[[Round], None],
    progress: Callable[[], AbstractContextManager[Hear]],
    *,
    entry: str = ENTRY,
    ahead: Sequence[str] = AHEAD,
) -> None:
    """Build the spec of `job` now and after each change, until a signal comes.

    Parameters
    ----------
    job : a build; limits : of each build
    show : is told each round when it is finished
    progress : gives for each build what hears its messages, which come from another thread
    entry : what the worker does, and `ahead` : the modules that it loads before it is asked; tests name their own

    Raises
    ------
    KeyboardInterrupt : SIGINT, SIGTERM or SIGHUP came; no worker is left, and the earlier output is whole
    """
    files = Watched([job.source, accepted_file(job.source)])
    done: Content = {}
    output = _Output()
    first = True
    with signals_stop():
        while True:
            # the next worker loads the kernel while the files are at rest; the first build may not need the kernel
            with nullcontext() if first else standby(ahead) as ready:
                first = False
                done, loaded = _good(job, files, done, show)
                done = files.also(_files(job, loaded), done)
                with progress() as hear:
                    work = partial(run_in_worker, job, limits, entry=entry, ready=ready)
                    made = _built(work, hear, output, partial(_current, files, done))
            if made is not None:
                show(made)


def _good(job: Job, files: Watched, done: Content, show: Callable[[Round], None]) -> tuple[Content, LoadedSpec]:
    """Wait until the files hold something else than `done` and the spec is sound; what is wrong before is shown.

    While the spec is wrong, the part file of the last sound one is watched on.
    """
    while True:
        done = _next(files, done)
        start = time.monotonic()
        try:
            return done, load_spec(job.source, allow_code=job.options.allow_code)
        except MoldgenError as error:
            show(Round(time.monotonic() - start, error=error))


def _files(job: Job, loaded: LoadedSpec) -> list[Path]:
    part = [] if loaded.part_file is None else [loaded.part_file]
    return [job.source, accepted_file(job.source), *part]


def _next(files: Watched, done: Content) -> Content:
    """Wait until the files hold something else than `done`, and are at rest."""
    while True:
        content = files.look()
        if content is not None and content != done:
            return content
        time.sleep(LOOK_S)


def _current(files: Watched, done: Content) -> bool:
    """Return whether the files hold what is being built, as far as they are at rest."""
    return files.look() in (None, done)


def _built(work: Callable[..., JobResult], hear: Hear, output: _Output, current: Callable[[], bool]) -> Round | None:
    """Build once by `work(hear, stop=...)`; return None if that was stopped because it was no longer `current`."""
    stop, start = threading.Event(), time.monotonic()

    def both(message: Message) -> None:
        output.hear(message)
        hear(message)

    with ThreadPoolExecutor(max_workers=1) as threads:
        future: Future[JobResult] = threads.submit(work, both, stop=stop)
        try:
            while wait([future], LOOK_S).not_done:
                if not current():
                    stop.set()
                    break
        finally:
            if not future.done():
                stop.set()
        try:
            result = future.result()
        except MoldgenError as error:
            return Round(time.monotonic() - start, error=error)
        except KeyboardInterrupt:  # from the thread: `stop` was set, for the files have changed
            return None
    return Round(time.monotonic() - start, result, changes=output.changes())


class _Output:
    """The output folder as the last build left it, by its manifest; a build of another folder begins anew."""

    def __init__(self) -> None:
        self._folder, self._planned = Path(), Path()
        self._manifest: dict[str, Any] = {}

    def hear(self, message: Message) -> None:
        """Take a message of the worker: it may say where the output goes."""
        if isinstance(message, OutputPlanned):
            self._planned = message.final

    def changes(self) -> ManifestChanges | None:
        """Return what the build that has just ended changed against the one before it; None for the first."""
        before = self._manifest if self._planned == self._folder else {}
        self._folder, self._manifest = self._planned, _manifest(self._planned)
        return manifest_changes(before, self._manifest) if before else None


def _manifest(folder: Path) -> dict[str, Any]:
    try:
        manifest = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return manifest if isinstance(manifest, dict) else {}


def _one_line(error: MoldgenError) -> str:
    """Return an error in one line: of several mistakes the first, with how many more there are."""
    first: MoldgenError = error
    more = 0
    if isinstance(error, SpecErrors) and error.errors:
        first, more = error.errors[0], len(error.errors) - 1
    said = " ".join(first.told.split())
    if more:
        said += f" (and {more} more)"
    return f"{said}; try: {' '.join(first.remedy.split())}" if first.remedy else said
