"""How a job tells what it is doing: stages with their time, and where its output will be.

The worker process sends each message to its parent; a test or a script takes `silent()`.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True)
class StageStarted:
    """A stage begins."""

    name: str


@dataclass(frozen=True)
class StageFinished:
    """A stage ended well after `seconds`; `detail` is its result in a few words."""

    name: str
    seconds: float
    detail: str = ""


@dataclass(frozen=True)
class OutputPlanned:
    """The output goes to `final`; whoever ends this process clears up beside it."""

    final: Path


@dataclass(frozen=True)
class InputsRead:
    """What comes of the job depends on these files and nothing else; `files` is their SHA-256 by path, "" if absent."""

    files: dict[str, str]


Message = StageStarted | StageFinished | OutputPlanned | InputsRead


class Stage:
    """The stage under way; set `detail` to say what came of it ("6 loops, stepped")."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.detail = ""


class Tell:
    """Hands messages to `send`, and keeps the time of each stage."""

    def __init__(self, send: Callable[[Message], None]) -> None:
        self._send = send
        self._timings: list[tuple[str, float]] = []

    @contextmanager
    def stage(self, name: str) -> Iterator[Stage]:
        """Announce the stage `name`, time it, and announce its end unless it raised."""
        self._send(StageStarted(name))
        stage = Stage(name)
        start = time.perf_counter()
        yield stage
        seconds = time.perf_counter() - start
        self._timings.append((name, seconds))
        self._send(StageFinished(name, seconds, stage.detail))

    def output(self, final: Path) -> None:
        """Announce where the output will be. `fresh_folder(final, tell=tell)` calls this."""
        self._send(OutputPlanned(final))

    def inputs(self, files: dict[str, str]) -> None:
        """Announce all the files that the job depends on, with their SHA-256."""
        self._send(InputsRead(files))

    @property
    def timings_s(self) -> tuple[tuple[str, float], ...]:
        """(stage, seconds) of every finished stage, in order."""
        return tuple(self._timings)


def silent() -> Tell:
    """Return a `Tell` that keeps times and says nothing."""
    return Tell(lambda _: None)
