"""Doing risky work in a forked child: the kernel can hang for ever, or crash, on operands that look harmless.

The child is a copy of this process, so what it makes is what would be made here: the kernel repeats itself. A rung of a
ladder that would hang is refused instead of ending the whole run.
"""

from __future__ import annotations

import os
import resource
import select
import signal
import time
from collections.abc import Callable, Sequence

from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import KernelError
from moldgen.kernel.beside import packed, unpacked

LIMIT_S = 8
"""A rung that takes more processor time is refused. The slowest of use on real parts took 2 s (measured)."""

PATIENCE = 5
"""Clock time over processor time after which a child is ended all the same: other programs may hold the cores."""

_SHAPES, _ERROR = b"S", b"E"

_given_up: list[int] = []
"""Processes that were ended because of their time, in this process."""


def times_given_up() -> int:
    """Return how often work was ended because of its time: what follows from it may come out otherwise another time."""
    return len(_given_up)


def made_apart(work: Callable[[], Sequence[TopoDS_Shape]], seconds: int = LIMIT_S) -> list[TopoDS_Shape]:
    """Return the shapes that `work` makes in a child process; they share nothing with shapes of this process.

    Only one thread lives on in the child, so `work` must not need others (booleans and splits do not).

    Raises
    ------
    KernelError : `work` raised, crashed, or did not end within the time [s]
    """
    reading, writing = os.pipe()
    child = os.fork()
    if child == 0:
        os.close(reading)
        _work_and_leave(work, writing, seconds)
    os.close(writing)
    try:
        answer = _listen(reading, time.monotonic() + PATIENCE * seconds)
    finally:
        os.close(reading)
        os.kill(child, signal.SIGKILL)
        _, status = os.waitpid(child, 0)
    if answer is None or (os.WIFSIGNALED(status) and os.WTERMSIG(status) == signal.SIGXCPU):
        _given_up.append(child)
        raise KernelError(f"the kernel did not end within {seconds:g} s")
    if answer[:1] == _ERROR:
        raise KernelError(answer[1:].decode("utf-8", "replace"))
    if answer[:1] != _SHAPES:
        raise KernelError("the kernel crashed")
    return unpacked(answer[1:])


def survives(work: Callable[[], object], seconds: int = LIMIT_S) -> bool:
    """Return whether `work` ends within the time without crashing; an exception counts as ending."""

    def tried() -> list[TopoDS_Shape]:
        try:
            work()
        except KernelError:
            return []
        return []

    try:
        made_apart(tried, seconds)
    except KernelError:
        return False
    return True


def _listen(pipe: int, deadline: float) -> bytes | None:
    """Return everything the child writes until it closes the pipe, None if that takes too long."""
    chunks: list[bytes] = []
    while True:
        left = deadline - time.monotonic()
        if left <= 0 or not select.select([pipe], [], [], left)[0]:
            return None
        chunk = os.read(pipe, 1 << 20)
        if not chunk:
            return b"".join(chunks)
        chunks.append(chunk)


def _work_and_leave(work: Callable[[], Sequence[TopoDS_Shape]], pipe: int, seconds: int) -> None:
    """Run in the child: whatever happens, leave without running anything of the parent's clean-up."""
    try:
        signal.signal(signal.SIGINT, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds + 1))
        try:
            answer = _SHAPES + packed(work())
        except KernelError as error:
            answer = _ERROR + error.what.encode()
        with os.fdopen(pipe, "wb") as out:
            out.write(answer)
    finally:
        os._exit(0)
