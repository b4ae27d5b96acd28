"""Stages with their elapsed time on stderr: live lines on a terminal, plain lines elsewhere, nothing when quiet."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

import click

from moldgen.flow.tell import Message, StageFinished, StageStarted

if TYPE_CHECKING:
    from rich.progress import Progress

Hear = Callable[[Message], None]


@contextmanager
def progress(*, quiet: bool) -> Iterator[Hear]:
    """Give the function that shows each message of a job."""
    if quiet:
        yield lambda _: None
    elif sys.stderr.isatty():
        with _live_line() as shown:
            yield _Live(shown).hear
    else:
        yield _Plain().hear


class _Plain:
    """One line when a stage starts and one when it ends, each with the time since the start of the run."""

    def __init__(self) -> None:
        self._start = time.monotonic()

    def hear(self, message: Message) -> None:
        since = f"{time.monotonic() - self._start:7.1f} s"
        match message:
            case StageStarted(name):
                click.echo(f"{since}  {name} ...", err=True)
            case StageFinished():
                click.echo(f"{since}  {_finished(message)}", err=True)


class _Live:
    """Finished stages as lines that stay, the stage under way with its time below them."""

    def __init__(self, shown: Progress) -> None:
        self._shown = shown
        self._task = shown.add_task("start the worker process", total=None)
        self._open: list[str] = []

    def hear(self, message: Message) -> None:
        match message:
            case StageStarted(name):
                self._open.append(name)
            case StageFinished(name):
                del self._open[self._open.index(name) :]
                self._shown.console.print(_finished(message), markup=False, highlight=False)
            case _:
                return
        self._shown.reset(self._task, description=" > ".join(self._open) or "...", total=None)


def _live_line() -> Progress:
    from rich.console import Console  # noqa: PLC0415  only a terminal needs rich, and it takes its time to import
    from rich.progress import Progress, SpinnerColumn, TextColumn, TimeElapsedColumn  # noqa: PLC0415

    columns = (SpinnerColumn(), TextColumn("{task.description}", markup=False), TimeElapsedColumn())
    return Progress(*columns, console=Console(stderr=True), transient=True)


def _finished(stage: StageFinished) -> str:
    return f"{stage.name}: {stage.detail or 'done'} ({stage.seconds:.1f} s)"
