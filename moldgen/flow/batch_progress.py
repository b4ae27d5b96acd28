"""A batch on the terminal: the parts under way, each finished one, and at the end the summary."""

from __future__ import annotations

import sys
import textwrap
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING

import click

from moldgen.canon import to_json
from moldgen.errors import ExitCode
from moldgen.flow.batch import BatchResult, BatchStopped, Event, PartFinished, PartStarted, PartTold
from moldgen.flow.batch_row import COLUMNS, Row, cells, row_json, summary_headline, summary_table
from moldgen.flow.report import CAUTIONS, stopped_json, table_lines
from moldgen.flow.tell import StageFinished, StageStarted

if TYPE_CHECKING:
    from rich.progress import Progress, TaskID

Hear = Callable[[Event], None]

MORE_COLUMNS = {"gravest finding, or why not": 100, "rungs": 160}
"""Columns of the summary that need room, and the width of the terminal that gives it (our choice)."""

GAP = 2
"""Columns that the drawn table takes besides each of its texts, at most."""

LONG = 240
"""Characters of a reason on the terminal; the CSV has all of them (our choice)."""


@contextmanager
def batch_progress(parts: int, *, quiet: bool, as_json: bool) -> Iterator[Hear]:
    """Give the function that shows each event of a batch of so many parts: on stderr, with `as_json` also on stdout."""
    live = sys.stderr.isatty() and not (as_json and sys.stdout.isatty())  # else the objects would run into the display
    if quiet:
        yield _told(as_json, lambda _: None)
    elif live:
        with _display() as display:
            yield _told(as_json, _Live(display, parts).hear)
    else:
        yield _told(as_json, _Plain(parts).hear)


def show_summary(result: BatchResult) -> None:
    """Print the summary on stdout: a drawn table on a terminal, plain lines elsewhere."""
    if sys.stdout.isatty():
        _draw(result.rows)
    else:
        click.echo("\n".join(table_lines(summary_table(result.rows))))
    click.echo(f"\n{summary_headline(result.rows)}\nwritten: {result.summary}")
    if any(row.proofs_total for row, _ in result.rows):
        for text in CAUTIONS:
            click.echo("\n" + textwrap.fill(text, 78))


def _told(as_json: bool, hear: Hear) -> Hear:
    """Return `hear`, with one JSON object a line on stdout for each finished part if asked for."""

    def both(event: Event) -> None:
        hear(event)
        if as_json and isinstance(event, PartFinished):
            click.echo(to_json(row_json(event.row, event.output, event.seconds), indent=None), nl=False)
        elif isinstance(event, BatchStopped):
            if as_json:
                click.echo(to_json(stopped_json(), indent=None), nl=False)
            kept = f"{event.finished} finished parts are kept, and the same command goes on from there"
            click.echo(f"moldgen: stopped by Ctrl-C or by a signal; {kept}", err=True)

    return both


class _Plain:
    """One line when a part is begun and one when it is finished, each with the time since the start of the run."""

    def __init__(self, parts: int) -> None:
        self._start, self._parts, self._finished = time.monotonic(), parts, 0

    def hear(self, event: Event) -> None:
        since = f"{time.monotonic() - self._start:7.1f} s"
        match event:
            case PartStarted(name):
                click.echo(f"{since}  {name} ...", err=True)
            case PartFinished():
                self._finished += 1
                click.echo(f"{since}  {self._finished} of {self._parts}  {_finished(event)}", err=True)


class _Live:
    """Finished parts as lines that stay; below them each part under way with its stage and time, and the whole."""

    def __init__(self, display: Progress, parts: int) -> None:
        self._display, self._parts, self._finished = display, parts, 0
        self._whole = display.add_task(self._said(), total=None)
        self._tasks: dict[str, TaskID] = {}
        self._open: dict[str, list[str]] = {}

    def hear(self, event: Event) -> None:
        match event:
            case PartStarted(name):
                self._open[name] = []
                self._tasks[name] = self._display.add_task(f"{name}: start the worker process", total=None)
            case PartTold(name, StageStarted(stage)):
                self._open[name].append(stage)
            case PartTold(name, StageFinished(stage)):
                del self._open[name][self._open[name].index(stage) :]
            case PartFinished(row):
                self._finished += 1
                if row.name in self._tasks:
                    self._display.remove_task(self._tasks.pop(row.name))
                self._display.console.print(_finished(event), markup=False, highlight=False)
                self._display.update(self._whole, description=self._said())
                return
            case _:
                return
        if isinstance(event, PartTold):
            stages = " > ".join(self._open[event.name]) or "..."
            self._display.update(self._tasks[event.name], description=f"{event.name}: {stages}")

    def _said(self) -> str:
        return f"{self._finished} of {self._parts} parts"


def _display() -> Progress:
    from rich.console import Console  # noqa: PLC0415  only a terminal needs rich, and it takes its time to import
    from rich.progress import Progress, SpinnerColumn, TextColumn, TimeElapsedColumn  # noqa: PLC0415

    columns = (SpinnerColumn(), TextColumn("{task.description}", markup=False), TimeElapsedColumn())
    return Progress(*columns, console=Console(stderr=True), transient=True, redirect_stdout=False)


def _finished(event: PartFinished) -> str:
    time_taken = "done by an earlier run" if event.seconds is None else f"{event.seconds:.1f} s"
    return f"{event.row.name}: {event.row.result} ({time_taken})"


def _draw(rows: Sequence[tuple[Row, float | None]]) -> None:
    """Draw one line a part, as much of its reason as fits; below, the whole reason of each that is not all well."""
    from rich import box  # noqa: PLC0415
    from rich.console import Console  # noqa: PLC0415
    from rich.table import Table  # noqa: PLC0415
    from rich.text import Text  # noqa: PLC0415

    console = Console()
    more = [title for title, least in MORE_COLUMNS.items() if console.width >= least]
    table = Table(box=box.SIMPLE_HEAD, padding=(0, 1, 0, 0), pad_edge=False)
    lines = [["" if cell is None else str(cell) for cell in cells(row, seconds)] for row, seconds in rows]
    taken = sum(max(map(len, column)) + GAP for column in zip(COLUMNS, *lines, strict=True))
    for title in COLUMNS:
        table.add_column(title, justify="left" if title in ("part", "result") else "right", overflow="fold")
    for title in more:
        room = (console.width - taken) // len(more) - GAP
        table.add_column(title, width=max(room, len(title)), no_wrap=True, overflow="ellipsis")
    for (row, _), line in zip(rows, lines, strict=True):
        texts = [*line, *[row.reason, row.rungs][: len(more)]]
        style = "" if row.exit_code == ExitCode.OK else "bold" if row.exit_code >= ExitCode.KERNEL else "yellow"
        table.add_row(*(Text(text, style if i == 1 else "") for i, text in enumerate(texts)))
    console.print(table)
    for row, _ in rows:
        if row.exit_code != ExitCode.OK:
            said = textwrap.shorten(f"{row.name}: {row.result}: {row.reason}", LONG, placeholder=" ...")
            click.echo(textwrap.fill(said, console.width - 1, initial_indent="  ", subsequent_indent=" " * 6))
