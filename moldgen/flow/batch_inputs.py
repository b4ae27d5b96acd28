"""What a batch works through: specs and bare STEP files, from files and folders, each with a name of its own."""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from moldgen.errors import SpecError
from moldgen.flow.batch_record import RECORD, SUMMARY, is_batch
from moldgen.flow.folder import is_output
from moldgen.spec.schema import folder_name

SPEC_SUFFIXES = (".yaml", ".yml")
STEP_SUFFIXES = (".step", ".stp")
STEP_BEGINS = b"ISO-10303-21"
"""[published: ISO 10303-21] the first characters of every STEP file in clear text."""

STARTERS = "starter"
"""Folder in that of a batch which holds the specs written for bare STEP files."""

USUAL_RESIN = "ABS"
"""For STEP files without a spec, as in the starter spec of `moldgen new`."""

PLAIN_STEM = "spec"
"""A file ``lid/spec.yaml`` says nothing by its own name: the part is called after its folder."""


@dataclass(frozen=True)
class BatchInput:
    """One part of a batch: the name of its output folder, and its spec or STEP file as the user named it."""

    name: str
    source: Path


def batch_inputs(words: Sequence[Path], own: Path) -> tuple[BatchInput, ...]:
    """Return the parts that the files and folders `words` stand for, in that order, those of a folder sorted.

    A folder stands for all specs and STEP files in it and below, without outputs of moldgen, hidden folders and STEP
    files that have a spec of the same name beside them. A file that is met twice counts once. Two parts of one name
    become ``lid`` and ``lid-2``.

    Parameters
    ----------
    words : files and folders
    own : the folder of the batch, in which nothing is looked for

    Raises
    ------
    SpecError : there is nothing to do
    """
    found: dict[str, Path] = {}
    for word in words:
        for path in _below(word, own) if word.is_dir() else [word]:
            found.setdefault(os.path.realpath(path), path)
    if not found:
        raise SpecError(
            "there are no specs (*.yaml) and no STEP files (*.step, *.stp) here",
            where=", ".join(map(str, words)),
            remedy="name specs, STEP files, or folders that hold some",
        )
    taken = {name.casefold() for name in (STARTERS, SUMMARY, RECORD)}  # no output folder may have these names
    return tuple(BatchInput(_free(_called(path), taken), path) for path in found.values())


def is_step(path: Path) -> bool:
    """True for a bare STEP file, by its name or, if that tells nothing, by how it begins."""
    suffix = path.suffix.lower()
    if suffix in SPEC_SUFFIXES or suffix in STEP_SUFFIXES:
        return suffix in STEP_SUFFIXES
    try:
        with path.open("rb") as stream:
            return stream.read(len(STEP_BEGINS)) == STEP_BEGINS
    except OSError:
        return False


def _below(folder: Path, own: Path) -> Iterator[Path]:
    """Yield the specs and STEP files of a folder, then those of its folders, each sorted by name."""
    skipped = os.path.realpath(own)
    for place, folders, files in os.walk(folder):
        here = Path(place)
        folders[:] = sorted(
            f for f in folders if not f.startswith(".") and os.path.realpath(here / f) != skipped and _open(here / f)
        )
        specs = {Path(f).stem for f in files if Path(f).suffix.lower() in SPEC_SUFFIXES}
        for name in sorted(f for f in files if not f.startswith(".")):
            suffix, stem = Path(name).suffix.lower(), Path(name).stem
            if suffix in SPEC_SUFFIXES or (suffix in STEP_SUFFIXES and stem not in specs):
                yield here / name


def _open(folder: Path) -> bool:
    """True unless moldgen made the folder: what is in it are components and starter specs, not parts."""
    return not (is_output(folder) or is_batch(folder) or folder.name.endswith(".failure"))


def _called(path: Path) -> str:
    stem = path.stem
    return folder_name(path.absolute().parent.name if stem.casefold() == PLAIN_STEM else stem)


def _free(name: str, taken: set[str]) -> str:
    """Return `name`, or the first of name-2, name-3, ... that is not taken, and take it."""
    number, free = 1, name
    while free.casefold() in taken:
        number += 1
        free = f"{name}-{number}"
    taken.add(free.casefold())
    return free
