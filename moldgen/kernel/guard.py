"""The seam around the geometry kernel: foreign exceptions become `KernelError`, and a crash leaves its operands behind.

    with operation("cut", operands=(block, part), risky=True, faces=212):
        ...

The kernel runs in a worker process. Its parent cannot ask a process that crashed or hangs what it was doing, so every
operation writes its name into a marker file of the evidence folder on entry, and a risky one its operands too; the
parent reads both back with `interrupted`. This module loads no kernel by itself, so that the parent may import it.
"""

from __future__ import annotations

import contextlib
import os
import re
import shutil
from collections.abc import Iterator, Sequence
from contextvars import ContextVar
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

from moldgen.errors import KernelError, MoldgenError

MARKER: Final = "operation"
"""File of the evidence folder that holds the name of the operation under way."""

MARKER_BYTES: Final = 400
"""Fixed length of the marker: one write replaces it as a whole, also while the parent reads."""

MOST_KEPT: Final = 12
"""Evidence of this many failures is kept, the oldest goes first: a ladder may fail often on its way to a good rung."""

_OURS: Final = (
    MoldgenError,  # already says what, where and what to try
    OSError,  # the file system is not the kernel
    AttributeError,  # these are mistakes in our own code, and must not make a ladder try its next rung
    NameError,
    TypeError,
    LookupError,
    AssertionError,
    ImportError,
    NotImplementedError,
)


@dataclass(frozen=True)
class Interrupted:
    """What the worker was doing when it went: the operation's name, and the folder with its operands ("" if none)."""

    operation: str
    evidence: str


@dataclass
class _Evidence:
    """The open evidence folder of this process, and the names of the operations under way, outermost first."""

    folder: Path
    marker: int
    names: list[str]


_evidence: ContextVar[_Evidence | None] = ContextVar("evidence", default=None)


def use_evidence_folder(folder: Path | None) -> None:
    """Keep evidence in `folder` from now on (made if missing); `None` keeps none, which is the default.

    Raises
    ------
    OSError : the folder or the marker in it cannot be written
    """
    old = _evidence.get()
    if old is not None:
        os.close(old.marker)
    if folder is None:
        _evidence.set(None)
        return
    folder.mkdir(parents=True, exist_ok=True)
    marker = os.open(folder / MARKER, os.O_WRONLY | os.O_CREAT | os.O_TRUNC | os.O_CLOEXEC, 0o600)
    _evidence.set(_Evidence(folder, marker, []))


@contextlib.contextmanager
def operation(
    name: str, *, operands: Sequence[Any] = (), risky: bool = False, remedy: str = "", where: str = "", **facts: object
) -> Iterator[None]:
    """Name the kernel work inside the block, and turn what the kernel throws into a `KernelError`.

    Parameters
    ----------
    name : what is being done, in words a user can repeat ("cut the part from the cavity block")
    operands : shapes to keep as evidence if it fails
    risky : the operation is known to hang or crash on some inputs: write the operands before it starts
    remedy, where : as in `KernelError`
    facts : whatever helps a bug report, added to the message as ``key=value``

    Raises
    ------
    KernelError : the kernel threw; the foreign exception is chained as its cause
    """
    kept = _enter(name, operands if risky else ())
    try:
        yield
    except Exception as foreign:  # the one broad except of the project: kernel exceptions share no base class
        if _is_ours(foreign):
            _forget(kept)
            raise
        if not kept:
            kept = keep_operands(name, operands)
        what = f"{name} failed: {_describe(foreign)}{_listed(facts)}"
        raise KernelError(what, where=where, remedy=remedy, evidence=kept) from foreign
    except BaseException:
        _forget(kept)
        raise
    else:
        _forget(kept)
    finally:
        _leave()


def present(shape: Any, name: str) -> Any:
    """Return `shape`, the result of the operation called `name`, if there is one.

    Raises
    ------
    KernelError : the kernel returned nothing (None or a null shape), which it does without an exception
    """
    if shape is None or shape.IsNull():
        raise KernelError(f"{name} gave no shape")
    return shape


def keep_operands(name: str, shapes: Sequence[Any]) -> str:
    """Write `shapes` as BREP files into a new folder of the evidence folder; return that folder, "" if none is in use.

    Evidence must never make matters worse: a disk that is full or a shape that cannot be written gives "".
    """
    evidence = _evidence.get()
    if evidence is None or not shapes:
        return ""
    from OCP.BRepTools import BRepTools  # noqa: PLC0415  the parent process imports this module without a kernel

    try:
        folder = _new_folder(evidence.folder, name, {line.partition("\n")[2] for line in evidence.names})
        for number, shape in enumerate(shapes, start=1):
            if shape is not None and not shape.IsNull():
                BRepTools.Write_s(shape, str(folder / f"operand{number}.brep"))
        (folder / "operation.txt").write_text(name + "\n", encoding="utf-8")
    except Exception:  # noqa: BLE001  kernel exceptions share no base class
        return ""
    return str(folder)


def interrupted(folder: Path) -> Interrupted | None:
    """Return what a worker with this evidence folder was doing when it ended, `None` if no operation was under way.

    For the parent process, after the worker crashed, hung or was stopped.
    """
    try:
        line = (folder / MARKER).read_bytes().decode("utf-8", "replace").rstrip("\0")
    except OSError:
        return None
    name, _, kept = line.partition("\n")
    return Interrupted(name, str(folder / kept) if kept else "") if name else None


def _enter(name: str, operands: Sequence[Any]) -> str:
    kept = keep_operands(name, operands)
    evidence = _evidence.get()
    if evidence is not None:
        evidence.names.append(f"{name[:200]}\n{Path(kept).name if kept else ''}")
        _mark(evidence)
    return kept


def _leave() -> None:
    evidence = _evidence.get()
    if evidence is not None and evidence.names:
        evidence.names.pop()
        _mark(evidence)


def _mark(evidence: _Evidence) -> None:
    text = evidence.names[-1] if evidence.names else ""
    with contextlib.suppress(OSError):  # a full disk must not stop the build
        os.pwrite(evidence.marker, text.encode("utf-8")[:MARKER_BYTES].ljust(MARKER_BYTES, b"\0"), 0)


def _forget(kept: str) -> None:
    if kept:
        shutil.rmtree(kept, ignore_errors=True)


def _new_folder(parent: Path, name: str, in_use: set[str]) -> Path:
    earlier = sorted(p for p in parent.iterdir() if p.is_dir() and p.name[:4].isdigit())
    number = int(earlier[-1].name[:4]) + 1 if earlier else 1
    for oldest in earlier[: max(0, len(earlier) - MOST_KEPT + 1)]:
        if oldest.name not in in_use:
            shutil.rmtree(oldest, ignore_errors=True)
    folder = parent / f"{number:04d}-{re.sub(r'[^a-z0-9]+', '-', name.lower()).strip('-')[:40]}"
    folder.mkdir()
    return folder


def _is_ours(error: Exception) -> bool:
    """True for our own errors and mistakes; a missing result (None) handed on to a call is the kernel's doing."""
    called_with = str(error).partition("Invoked with:")[2]
    if isinstance(error, TypeError) and "None" in called_with:
        return False
    return isinstance(error, _OURS)


def _describe(foreign: Exception) -> str:
    if isinstance(foreign, MemoryError) or type(foreign).__name__ == "Standard_OutOfMemory":
        return "out of memory"
    text = " ".join(str(foreign).split())
    return f"{type(foreign).__name__}: {text}" if text else type(foreign).__name__


def _listed(facts: dict[str, object]) -> str:
    return " (" + ", ".join(f"{key}={value}" for key, value in facts.items()) + ")" if facts else ""
