"""The worker process, seen from outside: one child does the job under a time limit and a memory limit.

The parent stays light (no kernel, no numpy), so that it answers Ctrl-C at once whatever the kernel is doing, and
survives whatever the kernel does.
"""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, nullcontext, suppress
from dataclasses import dataclass
from multiprocessing import Pipe
from multiprocessing.connection import Connection
from pathlib import Path
from types import FrameType

import psutil

from moldgen.errors import ExitCode, KernelError, MoldgenError, SpecError, StageError
from moldgen.flow.evidence import forget_failure, keep_failure
from moldgen.flow.folder import clear_leftovers
from moldgen.flow.job import Job, JobKind, JobResult, Limits
from moldgen.flow.order import AHEAD, ENTRY, LOG, Load, Order
from moldgen.flow.tell import Message, OutputPlanned, StageFinished, StageStarted
from moldgen.kernel.guard import interrupted

LOOK_S = 0.1
"""How often the parent looks at time and memory [s]."""

GONE_S = 1.0
"""How long a killed process may take to be gone [s]."""

_BOOT = (
    "import json, sys; sys.path[:] = json.loads(sys.argv[3]); "
    "from moldgen.flow.child import main; main(int(sys.argv[1]), int(sys.argv[2]))"
)

_GONE = (psutil.NoSuchProcess, psutil.AccessDenied)


def run_in_worker(
    job: Job,
    limits: Limits,
    hear: Callable[[Message], None],
    *,
    entry: str = ENTRY,
    stop: threading.Event | None = None,
    ready: Standby | None = None,
) -> JobResult:
    """Do `job` in a child process and return what came of it.

    Parameters
    ----------
    job : what to do
    limits : of time and memory
    hear : is told each message of the job as it comes
    entry : ``module:function`` that does the job in the child; tests name their own
    stop : may be set by another thread to stop the run; signals reach only the main thread
    ready : a worker that was started ahead; if it is no longer there, one is started now

    Raises
    ------
    MoldgenError : as the job raised it, with the place where its evidence is kept
    KernelError : the child crashed, or passed a limit; the message names the operation under way
    StageError : the child ended without a result
    KeyboardInterrupt : SIGINT, SIGTERM or SIGHUP came, or `stop`; the child is gone and the earlier output is whole
    """
    watch = _Watch(job, hear)
    waiting = None if ready is None else ready.taken(job, entry, limits)
    with signals_stop(), _workspace() if waiting is None else nullcontext(waiting.space) as space:
        try:
            with _started(space) if waiting is None else _ending(waiting) as child:
                if waiting is None:
                    child.connection.send(Order(job, entry, space, limits.memory_bytes))
                result = _listen(child, limits, watch, stop or threading.Event())
        except MoldgenError as error:
            error.evidence = keep_failure(error, watch.output, space)
            raise
        finally:  # the child is gone: what it left half-written goes too
            with suppress(OSError):
                clear_leftovers(watch.output)
        forget_failure(watch.output)
        return result


@contextmanager
def standby(modules: Sequence[str] = AHEAD) -> Iterator[Standby]:
    """Start a worker that loads what jobs need and waits for one job, see `run_in_worker`; at the end it is killed.

    The thread that starts it must live as long: the system ends a child with the thread that made it.

    Raises
    ------
    SpecError : the temporary folder cannot be written
    """
    with _workspace() as space, _started(space) as child:
        with suppress(OSError):  # it is gone already: that is found out when it is asked for
            child.connection.send(Load(tuple(modules)))
        yield Standby(child)


class Standby:
    """A worker that waits for one job; it costs nothing but its memory."""

    def __init__(self, child: _Child) -> None:
        self._child, self._waits = child, True

    def taken(self, job: Job, entry: str, limits: Limits) -> _Child | None:
        """Hand it the job and return it; None if it had one already, or is gone."""
        waits, self._waits = self._waits and self._child.process.poll() is None, False
        if not waits:
            return None
        try:
            self._child.connection.send(Order(job, entry, self._child.space, limits.memory_bytes))
        except OSError:  # it went this moment
            return None
        return self._child


@dataclass(frozen=True)
class _Child:
    """The child process, our end of the pipe to it, and the folder where it keeps evidence."""

    process: subprocess.Popen[bytes]
    connection: Connection
    space: Path

    def failure(self, what: str, where: str, remedy: str) -> KernelError:
        """Return the error for a child that cannot speak for itself; `what` follows the name of its operation."""
        doing = interrupted(self.space)
        name, evidence = (f"'{doing.operation}'", doing.evidence) if doing else ("the worker process", "")
        return KernelError(f"{name} {what}", where=where, remedy=remedy, evidence=evidence)

    def resident_bytes(self) -> int:
        """Resident memory of the child and its children."""
        used = 0
        with suppress(*_GONE):
            root = psutil.Process(self.process.pid)
            for process in (root, *root.children(recursive=True)):
                with suppress(*_GONE):
                    used += process.memory_info().rss
        return used

    def kill(self) -> None:
        """End the child and all its children."""
        family: list[psutil.Process] = []
        with suppress(*_GONE):
            family = psutil.Process(self.process.pid).children(recursive=True)
        with suppress(ProcessLookupError, PermissionError):
            os.killpg(self.process.pid, signal.SIGKILL)
        for process in family:  # those that left the group
            with suppress(*_GONE):
                process.kill()
        with suppress(subprocess.TimeoutExpired):
            self.process.wait(GONE_S)
        psutil.wait_procs(family, GONE_S)


class _Watch:
    """What the parent knows of the job: the stages under way, where the output goes, who else listens."""

    def __init__(self, job: Job, hear: Callable[[Message], None]) -> None:
        self._hear = hear
        self._stages: list[str] = []
        named = job.output if job.kind is not JobKind.NEW else None
        self.output = job.source if job.kind is JobKind.PROVE else named or Path("out") / job.source.stem

    def hear(self, message: Message) -> None:
        """Note `message`, and pass it on."""
        match message:
            case StageStarted(name):
                self._stages.append(name)
            case StageFinished(name):
                del self._stages[self._stages.index(name) :]
            case OutputPlanned(final):
                self.output = final
        self._hear(message)

    @property
    def stage(self) -> str:
        """The innermost stage under way, as a place for an error."""
        return f"stage '{self._stages[-1]}'" if self._stages else ""


def _listen(child: _Child, limits: Limits, watch: _Watch, stop: threading.Event) -> JobResult:
    start = looked = time.monotonic()
    while True:
        if stop.is_set():
            raise KeyboardInterrupt
        if child.connection.poll(LOOK_S):
            try:
                message = child.connection.recv()
            except (EOFError, ConnectionError):
                raise _ended(child, watch) from None
            if isinstance(message, JobResult):
                return message
            if isinstance(message, MoldgenError):
                if message.exit_code in (ExitCode.KERNEL, ExitCode.BUG):
                    message.where = message.where or watch.stage
                raise message
            watch.hear(message)
        now = time.monotonic()
        if now - start > limits.time_s:
            what = f"did not end within the time limit of {limits.time_s:g} s"
            raise child.failure(what, watch.stage, "raise --time-limit, or simplify the part where it is finest")
        if now - looked > LOOK_S:
            looked, used = now, child.resident_bytes()
            if used > limits.memory_bytes:
                what = f"took {used / 2**30:.2f} GiB of memory, the limit is {limits.memory_bytes / 2**30:g} GiB"
                raise child.failure(what, watch.stage, "raise --memory-limit, or simplify the part")


def _ended(child: _Child, watch: _Watch) -> MoldgenError:
    """Return the error for a child that closed the pipe without a result."""
    try:
        code = child.process.wait(GONE_S)
    except subprocess.TimeoutExpired:
        return StageError("the worker process closed its pipe without a result", where=watch.stage)
    if code >= 0:
        return StageError(f"the worker process ended without a result (exit status {code})", where=watch.stage)
    if -code == signal.SIGKILL:
        what = "was killed from outside (SIGKILL): most likely the system ran out of memory"
        return child.failure(what, watch.stage, "free memory, or lower --memory-limit to fail earlier")
    what = f"crashed the geometry kernel ({signal.Signals(-code).name})"
    remedy = "heal or simplify the part there, and report the crash with the files kept"
    return child.failure(what, watch.stage, remedy)


@contextmanager
def _started(space: Path) -> Iterator[_Child]:
    """Start the child, in a session of its own so that Ctrl-C reaches us alone; kill it and its children at the end."""
    ours, its = Pipe()
    command = [sys.executable, "-P", "-c", _BOOT, str(its.fileno()), str(os.getpid()), json.dumps(sys.path)]
    with ours, (space / LOG).open("wb") as log:
        with its:
            process = subprocess.Popen(  # noqa: S603  our own interpreter, our own code
                command,
                stdin=subprocess.DEVNULL,
                stdout=log,
                stderr=log,
                pass_fds=(its.fileno(),),
                start_new_session=True,
                # belt and braces: nothing may depend on the hash seed; and what the child and its own children leave
                # in the temporary folder goes with the workspace, also when they are killed
                env={"PYTHONHASHSEED": "0", **os.environ, "TMPDIR": str(space)},
            )
        with _ending(_Child(process, ours, space)) as child:
            yield child


@contextmanager
def _ending(child: _Child) -> Iterator[_Child]:
    try:
        yield child
    finally:
        child.kill()


@contextmanager
def _workspace() -> Iterator[Path]:
    try:
        space = Path(tempfile.mkdtemp(prefix="moldgen-"))
    except OSError as error:
        what = f"the temporary folder cannot be written: {error.strerror or error}"
        raise SpecError(what, remedy="free some space there, or set TMPDIR to another folder") from error
    try:
        yield space
    finally:
        shutil.rmtree(space, ignore_errors=True)


@contextmanager
def signals_stop() -> Iterator[None]:
    """Let SIGINT, SIGTERM and SIGHUP raise KeyboardInterrupt once; from then on they are ignored until we are done.

    In the main thread only: no other is told of signals.
    """
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    ours = [s for s in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP) if signal.getsignal(s) is not signal.SIG_IGN]

    def stop(_number: int, _frame: FrameType | None) -> None:
        for number in ours:
            signal.signal(number, signal.SIG_IGN)
        raise KeyboardInterrupt

    before = {number: signal.signal(number, stop) for number in ours}
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
