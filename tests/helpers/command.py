"""Run the command line as a user does, in a process of its own."""

from __future__ import annotations

import os
import pty
import subprocess
import sys
from pathlib import Path

TESTS = Path(__file__).resolve().parents[1]


def moldgen_command(*arguments: object, job: str = "") -> list[str]:
    """The words that start moldgen; with `job`, its worker does that job of `bad_jobs` instead."""
    start = [str(TESTS / "helpers" / "moldgen_with.py"), job] if job else ["-m", "moldgen"]
    return [sys.executable, *start, *map(str, arguments)]


def environment() -> dict[str, str]:
    """Our environment, with the checkout and its tests importable."""
    paths = [str(TESTS), str(TESTS.parent), os.environ.get("PYTHONPATH", "")]
    return os.environ | {"PYTHONPATH": os.pathsep.join(p for p in paths if p), "COLUMNS": "100"}


def on_terminal(command: list[str], folder: Path, *, stdout: bool = True, **variables: str) -> tuple[int, bytes]:
    """Run a command with a terminal at its stderr (and stdout); return its exit code and what the terminal got."""
    ours, its = pty.openpty()
    settings = environment() | {"TERM": "xterm"} | variables
    out = its if stdout else subprocess.DEVNULL
    with subprocess.Popen(command, cwd=folder, env=settings, stdout=out, stderr=its) as process:
        os.close(its)
        seen = b""
        try:
            while block := os.read(ours, 4096):
                seen += block
        except OSError:  # how Linux says that the other end is closed
            pass
        os.close(ours)
    return process.returncode, seen


def moldgen(
    *arguments: object, folder: Path, job: str = "", timeout: float = 60, **variables: str
) -> subprocess.CompletedProcess[str]:
    """Run moldgen in `folder`, with environment `variables` of its own, and return what came of it."""
    return subprocess.run(
        moldgen_command(*arguments, job=job),
        cwd=folder,
        env=environment() | variables,
        capture_output=True,
        text=True,
        timeout=timeout,
        check=False,
    )
