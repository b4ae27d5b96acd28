"""What is kept of a failed run, for a bug report: ``out/lid.failure`` beside the output ``out/lid``."""

from __future__ import annotations

import platform
import shutil
from contextlib import suppress
from pathlib import Path

import moldgen
from moldgen.errors import ExitCode, MoldgenError
from moldgen.flow.order import LOG, TRACEBACK

SUFFIX = ".failure"
SUMMARY = "failure.txt"
"""Marks a folder as evidence of ours, which the next run of the same output may replace."""


def failure_folder(output: Path) -> Path:
    """Return the folder that keeps the evidence of a failed run of `output`."""
    return output.with_name(output.name + SUFFIX)


def keep_failure(error: MoldgenError, output: Path, space: Path) -> str:
    """Copy the evidence of `error` from the worker's folder `space` to beside `output`; return the copy's folder.

    A wrong spec or part says everything in its message: nothing is kept ("" is returned) unless it names evidence.
    What cannot be written beside the output goes to a folder in the system's temporary folder; failing that, nowhere.
    """
    if error.exit_code not in (ExitCode.KERNEL, ExitCode.BUG) and not error.evidence:
        return ""
    for folder in (failure_folder(output), space.with_name(space.name + SUFFIX)):
        with suppress(OSError):
            forget_failure(output)
            folder.mkdir(parents=True)  # fails if something stands there that is not ours
            _fill(folder, error, space)
            return str(folder)
    return ""


def forget_failure(output: Path) -> None:
    """Remove the evidence of an earlier run of `output`, but nothing in that place that is not ours."""
    folder = failure_folder(output)
    if (folder / SUMMARY).is_file():
        shutil.rmtree(folder, ignore_errors=True)


def _fill(folder: Path, error: MoldgenError, space: Path) -> None:
    lines = [
        f"moldgen {moldgen.__version__}, Python {platform.python_version()}, {platform.platform()}",
        "",
        str(error),
    ]
    (folder / SUMMARY).write_text("\n".join(lines) + "\n", encoding="utf-8")
    named = Path(error.evidence) if error.evidence else None
    for path in (space / LOG, space / TRACEBACK, named):
        if path is None or not path.is_relative_to(space) or not path.exists():
            continue
        if path.is_dir():
            shutil.copytree(path, folder / path.name, dirs_exist_ok=True)
        else:
            shutil.copyfile(path, folder / path.name)
