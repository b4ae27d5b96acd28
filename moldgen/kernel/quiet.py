"""Keep the kernel from printing: it writes to the process's own stdout, where our tables and JSON go."""

from __future__ import annotations

import contextlib
import ctypes
import os
import sys
from collections.abc import Iterator

from OCP.Message import Message


@contextlib.contextmanager
def quiet() -> Iterator[None]:
    """Send whatever the process prints inside the block, also from compiled code, to nowhere.

    The kernel's message printers are taken away for good; the rest is caught at the file descriptors, so nothing of
    ours should print from another thread meanwhile.
    """
    messenger = Message.DefaultMessenger_s()
    for printer in list(messenger.Printers()):
        messenger.RemovePrinter(printer)
    _flush()
    with contextlib.ExitStack() as stack:
        nowhere = os.open(os.devnull, os.O_WRONLY | os.O_CLOEXEC)
        stack.callback(os.close, nowhere)
        for number in (1, 2):
            try:
                saved = os.dup(number)
            except OSError:  # a process without stdout or stderr: nothing to keep quiet
                continue
            stack.callback(os.close, saved)
            stack.callback(os.dup2, saved, number)
            os.dup2(nowhere, number)
        stack.callback(_flush)
        yield


def _flush() -> None:
    """Empty the buffers of Python and of the C library, so that text lands on the side where it was written."""
    for stream in (sys.stdout, sys.stderr):
        if stream is not None:
            with contextlib.suppress(OSError, ValueError):
                stream.flush()
    ctypes.CDLL(None).fflush(None)
