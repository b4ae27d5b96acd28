"""A process that must not outlive the one that started it."""

from __future__ import annotations

import ctypes
import os
import signal
import sys

_PR_SET_PDEATHSIG = 1  # <linux/prctl.h>


def die_with_parent(parent: int) -> None:
    """Have the system kill this process when `parent`, the process that started it, is gone. Linux only, else nothing.

    For the first lines of a child process. The signal cannot be caught, so it also ends a hung kernel call.
    """
    if not sys.platform.startswith("linux"):
        return
    ctypes.CDLL(None).prctl(_PR_SET_PDEATHSIG, signal.SIGKILL, 0, 0, 0)
    if os.getppid() != parent:  # it went before we asked
        os._exit(1)
