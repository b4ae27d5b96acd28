"""Work in a child beside this process: the answer is the same whether the child lives or not."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

import pytest
from helpers import solids

from moldgen.errors import KernelError
from moldgen.kernel.beside import Beside, packed, unpacked
from moldgen.kernel.measure import volume


def test_the_answer_comes_from_another_process() -> None:
    beside = Beside(os.getpid)
    assert beside.result() != os.getpid()
    assert beside.result() == beside.result()


def test_an_answer_larger_than_a_pipe_comes_whole() -> None:
    assert Beside(lambda: bytes(3_000_000)).result() == bytes(3_000_000)


def test_the_work_of_a_child_that_dies_is_done_here() -> None:
    here = os.getpid()

    def work() -> int:
        if os.getpid() != here:
            os.kill(os.getpid(), signal.SIGKILL)
        return os.getpid()

    assert Beside(work).result() == here


def test_what_the_work_raises_is_raised_here() -> None:
    def work() -> None:
        raise KernelError("no such thing")

    with pytest.raises(KernelError, match="no such thing"):
        Beside(work).result()


def test_a_child_that_is_stopped_ends(tmp_path: Path) -> None:
    def work() -> None:
        time.sleep(1.0)
        (tmp_path / "late").touch()

    beside = Beside(work)
    child = beside._child
    assert child > 0
    beside.stop()
    with pytest.raises(ChildProcessError):
        os.waitpid(child, os.WNOHANG)
    assert not (tmp_path / "late").exists()


def test_packed_shapes_come_back_in_order_with_their_volumes() -> None:
    made = [solids.box((0, 0, 0), (1, 2, 3)), solids.sphere(2)]
    back = unpacked(packed(made))
    assert [volume(s) for s in back] == [volume(s) for s in made]
    assert not any(s.IsSame(t) for s, t in zip(back, made, strict=True))
