"""Trying an operation in a forked child first: the kernel can hang for ever, or crash, on operands that look harmless.

The child is a copy of this process, so what ends there ends here too, with the same result: the kernel repeats itself.
A rung of a ladder that would hang is refused instead of ending the whole run.
"""

from __future__ import annotations

import os
import signal
import time
from collections.abc import Callable

LIMIT_S = 8.0
"""A rung that takes longer is refused. The slowest that was ever of use on real parts took 2 s (measured)."""

LOOK_S = 0.002


def survives(work: Callable[[], object], seconds: float = LIMIT_S) -> bool:
    """Return whether `work` ends within the time without crashing the process; an exception counts as ending.

    Only one thread lives on in the child, so `work` must not need others (booleans and splits do not).
    """
    child = os.fork()
    if child == 0:
        _work_and_leave(work)
    deadline = time.monotonic() + seconds
    pause = LOOK_S
    while True:
        done, status = os.waitpid(child, os.WNOHANG)
        if done:
            return os.WIFEXITED(status)
        if time.monotonic() > deadline:
            os.kill(child, signal.SIGKILL)
            os.waitpid(child, 0)
            return False
        time.sleep(pause)
        pause = min(2 * pause, 0.1)


def _work_and_leave(work: Callable[[], object]) -> None:
    """Run in the child: whatever happens, leave without running anything of the parent's clean-up."""
    try:
        signal.signal(signal.SIGINT, signal.SIG_IGN)
        work()
    finally:
        os._exit(0)
