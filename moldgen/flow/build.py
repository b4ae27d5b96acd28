"""`moldgen build`: the whole way from a spec to a proved tool, for one pull after the other until one is proved."""

from __future__ import annotations

import shutil
from pathlib import Path

from moldgen.errors import KernelError, PartError
from moldgen.flow.job import JobResult, Options
from moldgen.flow.make_tool import build_along
from moldgen.flow.review import open_part, review_along
from moldgen.flow.stages import Stages
from moldgen.flow.words import direction_text
from moldgen.flow.write_tool import write_tool
from moldgen.spec.load import LoadedSpec

MOST_PULLS = 4
"""How many pulls of an automatic choice are tried before the part is refused (our choice: each takes seconds)."""

ASIDE = ".first"
"""Folder inside the output for the files of a tool that was built but not proved, while another pull is tried."""


def build_tool(loaded: LoadedSpec, folder: Path, options: Options, stages: Stages) -> JobResult:
    """Build, export and prove the tool of a spec into `folder`.

    Where the pull is auto, the next pull is tried when one gives no tool or none that is proved. If none is proved, the
    first tool stands; if none gives a tool, the best pull's refusal.

    Raises
    ------
    PartError : the part cannot be molded as asked; SpecError, KernelError : see the stages
    """
    source = open_part(loaded, stages)
    errors: list[PartError | KernelError] = []
    refused: list[str] = []
    first: JobResult | None = None
    for number, pull in enumerate(source.pulls[:MOST_PULLS]):
        try:
            built = build_along(review_along(loaded, source, number, stages, tuple(refused)), stages)
            result = write_tool(built, folder, options, stages)
        except (PartError, KernelError) as error:
            errors.append(error)
            short = error.what.split("\n")[0].rstrip(":")
            refused.append(f"{direction_text(pull.direction)}: {short}")
            _empty(folder)
            continue
        if all(p.passed for p in result.proofs) or len(source.pulls) == 1:
            shutil.rmtree(folder / ASIDE, ignore_errors=True)
            return result
        failed = ", ".join(p.name for p in result.proofs if not p.passed)
        refused.append(f"{direction_text(pull.direction)}: a tool, but not proved: {failed}")
        if first is None:
            first = result
            _set_aside(folder)
        _empty(folder)
    if first is not None:
        _bring_back(folder)
        return first
    if len(refused) > 1:
        errors[0].what += "\n  other pulls that were tried:\n    " + "\n    ".join(refused[1:])
    raise errors[0]


def _empty(folder: Path) -> None:
    """Delete what is in a folder, except what was set aside."""
    for path in folder.iterdir():
        if path.name == ASIDE:
            continue
        if path.is_dir():
            shutil.rmtree(path)
        else:
            path.unlink()


def _set_aside(folder: Path) -> None:
    found = sorted(folder.iterdir())
    (folder / ASIDE).mkdir()
    for path in found:
        path.rename(folder / ASIDE / path.name)


def _bring_back(folder: Path) -> None:
    _empty(folder)
    for path in sorted((folder / ASIDE).iterdir()):
        path.rename(folder / path.name)
    (folder / ASIDE).rmdir()
