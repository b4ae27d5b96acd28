"""`moldgen watch` in a process of its own, line by line."""

from __future__ import annotations

import queue
import signal
import subprocess
import threading
from pathlib import Path

import psutil

from helpers.command import environment, moldgen_command


class Watching:
    """A watcher at work in `folder`; `line()` waits for the next line of its stdout."""

    def __init__(self, folder: Path, *arguments: object, job: str = "", **variables: str) -> None:
        self.process = subprocess.Popen(
            moldgen_command("watch", *arguments, job=job),
            cwd=folder,
            env=environment() | variables,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
        self._lines: queue.SimpleQueue[str] = queue.SimpleQueue()
        self._errors: list[str] = []
        self._readers = [
            threading.Thread(target=self._read, daemon=True),
            threading.Thread(target=self._read_errors, daemon=True),
        ]
        for reader in self._readers:
            reader.start()

    def _read(self) -> None:
        for line in self.process.stdout:
            self._lines.put(line.rstrip("\n"))

    def _read_errors(self) -> None:
        self._errors.extend(self.process.stderr)

    def line(self, seconds: float = 60.0) -> str:
        """The next line of stdout."""
        try:
            return self._lines.get(timeout=seconds)
        except queue.Empty:
            raise AssertionError(f"no line within {seconds} s; stderr: {''.join(self._errors)}") from None

    def silent(self, seconds: float) -> bool:
        """Whether no line comes within this time."""
        try:
            self._lines.get(timeout=seconds)
        except queue.Empty:
            return True
        return False

    def workers(self) -> list[psutil.Process]:
        """What the watcher has started and what that has started."""
        return psutil.Process(self.process.pid).children(recursive=True)

    def end(self, number: signal.Signals = signal.SIGINT) -> str:
        """Stop it by a signal and return what it said on stderr."""
        self.process.send_signal(number)
        self.process.wait(30)
        for reader in self._readers:
            reader.join(10)
        return "".join(self._errors)

    def __enter__(self) -> Watching:
        return self

    def __exit__(self, *_: object) -> None:
        if self.process.poll() is None:
            self.process.kill()
            self.process.wait(10)
        self.process.stdout.close()
        self.process.stderr.close()


def gone(processes: list[psutil.Process]) -> bool:
    """Whether all of them have ended."""
    psutil.wait_procs(processes, timeout=10)
    return not any(p.is_running() and p.status() != psutil.STATUS_ZOMBIE for p in processes)
