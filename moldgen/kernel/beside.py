"""Work in a forked child while this process goes on: on two cores it costs no time.

The child is a copy of this process, so its answer is what would be found here. Only the one thread that forks lives on
in it: its work must not mesh, nor do mesh booleans, which share theirs among several. A child that dies or raises says
nothing; the work is then done here, when its answer is asked for, and fails as it would have without a child.
"""

from __future__ import annotations

import contextlib
import io
import os
import pickle
import signal
from collections.abc import Callable, Sequence
from typing import Generic, TypeVar

from OCP.BinTools import BinTools
from OCP.TopoDS import TopoDS_Shape

from moldgen.kernel.guard import use_evidence_folder
from moldgen.kernel.topology import compound_of, parts_of
from moldgen.tether import die_with_parent

T = TypeVar("T")


class Beside(Generic[T]):
    """The answer of some work, found in a child process that starts at once and ends with this one.

    work : returns something that can be pickled, or writes files; it may be done twice
    """

    def __init__(self, work: Callable[[], T]) -> None:
        self._work = work
        self._answer: list[T] = []
        self._reading, writing = os.pipe()
        parent = os.getpid()
        self._child = os.fork()
        if self._child == 0:
            _work_and_leave(work, writing, parent)
        os.close(writing)

    def result(self) -> T:
        """Return the answer, waiting for it if need be. Raises whatever the work raises."""
        if not self._answer:
            told = b""
            if self._child:
                with os.fdopen(os.dup(self._reading), "rb") as pipe:
                    told = pipe.read()
                self.stop()
            self._answer.append(pickle.loads(told) if told else self._work())  # noqa: S301  our own child wrote it
        return self._answer[0]

    def stop(self) -> None:
        """End the child if it still works. An answer that was not fetched is lost."""
        if self._child:
            os.close(self._reading)
            os.kill(self._child, signal.SIGKILL)
            os.waitpid(self._child, 0)
            self._child = 0


def packed(shapes: Sequence[TopoDS_Shape]) -> bytes:
    """Return shapes as bytes that can be pickled, exact to the last digit."""
    stream = io.BytesIO()
    BinTools.Write_s(compound_of(shapes), stream)
    return stream.getvalue()


def unpacked(data: bytes) -> list[TopoDS_Shape]:
    """Return the shapes that were packed, in order; they share nothing with shapes of this process."""
    shape = TopoDS_Shape()
    BinTools.Read_s(shape, io.BytesIO(data))
    return parts_of(shape)


def _work_and_leave(work: Callable[[], object], pipe: int, parent: int) -> None:
    """Run in the child: whatever happens, leave without running anything of the parent's clean-up."""
    try:
        die_with_parent(parent)
        signal.signal(signal.SIGINT, signal.SIG_IGN)
        use_evidence_folder(None)  # the marker there tells what the parent is doing
        with contextlib.suppress(Exception):
            told = pickle.dumps(work())
            with os.fdopen(pipe, "wb") as out:
                out.write(told)
    finally:
        os._exit(0)
