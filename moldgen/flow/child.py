"""The worker process, seen from inside: takes one order, does it, tells what it does, sends what came of it.

Nothing of this module is imported by the parent. It starts with nothing loaded, so that what hangs, crashes or eats
memory here takes nothing else with it.
"""

from __future__ import annotations

import faulthandler
import importlib
import os
import pickle
import resource
import signal
import sys
import traceback
from contextlib import suppress
from dataclasses import replace
from multiprocessing.connection import Connection
from pathlib import Path

from moldgen.errors import KernelError, MoldgenError, StageError
from moldgen.flow.job import JobResult
from moldgen.flow.order import TRACEBACK, Load, Order
from moldgen.flow.syslibs import explain_import
from moldgen.flow.tell import Tell
from moldgen.flow.versions import program_sha256
from moldgen.kernel.guard import use_evidence_folder
from moldgen.tether import die_with_parent

ADDRESS_SPACE_FACTOR = 2
ADDRESS_SPACE_SPARE_BYTES = 4 * 2**30
"""Address space beyond the memory limit: thread stacks, arenas and graphics drivers reserve far more than they use.

The parent watches resident memory; this only stops a single huge request between two of its looks.
"""


def main(handle: int, parent: int) -> None:
    """Serve one order from the pipe `handle` (a file descriptor) of the process `parent`, and end."""
    die_with_parent(parent)
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # Ctrl-C reaches the parent, which ends us
    faulthandler.enable()
    connection: Connection = Connection(handle)
    order = _order(connection)
    outcome = _outcome(order, Tell(connection.send))
    connection.send_bytes(_packed(outcome, order))
    sys.stdout.flush()
    sys.stderr.flush()
    os._exit(0)  # the kernel's own tear-down has been seen to hang and to crash, and nothing waits for it


def _order(connection: Connection) -> Order:
    """Return the order; before it may come a request to load modules.

    What went into memory is what `versions` names, so whoever changes the program meanwhile gets a new child: the order
    still waits in the pipe.
    """
    message: Order | Load = connection.recv()
    if isinstance(message, Order):
        return message
    loaded = program_sha256()
    with suppress(Exception):  # it will fail again, and be explained, when there is an order
        for module in message.modules:
            importlib.import_module(module)
    connection.poll(None)
    program_sha256.cache_clear()
    if program_sha256() != loaded:
        os.execv(sys.executable, sys.orig_argv)  # noqa: S606  our own command, word for word
    return _order(connection)


def _outcome(order: Order, tell: Tell) -> JobResult | MoldgenError:
    """Do the job. This is the outermost handler: whatever escapes a stage becomes an error that the parent can show."""
    try:
        _limit_memory(order.memory_bytes)
        use_evidence_folder(order.evidence)
        with tell.stage("load the stages"):
            module, _, name = order.entry.partition(":")
            run_job = getattr(importlib.import_module(module), name)
        result: JobResult = run_job(order.job, tell)
        return replace(result, timings_s=result.timings_s or tell.timings_s)
    except MoldgenError as error:
        traceback.print_exc()
        return error
    except MemoryError:
        traceback.print_exc()
        limit = order.memory_bytes / 2**30
        return KernelError(f"out of memory, at a limit of {limit:g} GiB", remedy="raise --memory-limit")
    except ImportError as error:
        return explain_import(error) or _bug(error, order)
    except BaseException as error:  # noqa: BLE001  the worker's outermost handler: nothing may leave it unexplained
        return _bug(error, order)


def _bug(error: BaseException, order: Order) -> StageError:
    traceback.print_exc()
    kept = order.evidence / TRACEBACK
    try:
        kept.write_text("".join(traceback.format_exception(error)), encoding="utf-8")
    except OSError:
        kept = Path()
    what = f"unexpected {type(error).__name__}: {error}".rstrip(": ")
    remedy = "this is a bug in moldgen: please report it with the files kept"
    return StageError(what, where=_place(error), remedy=remedy, evidence=str(kept) if kept.name else "")


def _place(error: BaseException) -> str:
    """Return module:line of the innermost frame in our own code, without a path of this machine."""
    frames = traceback.extract_tb(error.__traceback__)
    ours = [f for f in frames if f"{os.sep}moldgen{os.sep}" in f.filename and not f.filename.endswith("child.py")]
    if not ours:
        return ""
    inside = ours[-1].filename.rpartition(f"{os.sep}moldgen{os.sep}")[2]
    return f"moldgen/{Path(inside).as_posix()}:{ours[-1].lineno}"


def _packed(outcome: JobResult | MoldgenError, order: Order) -> bytes:
    try:
        return pickle.dumps(outcome)
    except Exception as error:  # noqa: BLE001  anything may hang on a result by mistake, and pickling it may raise anything
        return pickle.dumps(_bug(error, order))


def _limit_memory(limit: int) -> None:
    wanted = ADDRESS_SPACE_FACTOR * limit + ADDRESS_SPACE_SPARE_BYTES
    _, hard = resource.getrlimit(resource.RLIMIT_AS)
    if hard == resource.RLIM_INFINITY or wanted < hard:
        resource.setrlimit(resource.RLIMIT_AS, (wanted, hard))
    resource.setrlimit(resource.RLIMIT_CORE, (0, resource.getrlimit(resource.RLIMIT_CORE)[1]))
