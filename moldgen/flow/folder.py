"""Output that is whole or absent: written aside, then renamed into place; an interrupted run leaves the old one whole.

Beside ``out/lid`` a run may leave ``out/.lid.new-PID`` (not finished) and, for the instant of the swap,
``out/.lid.old-PID`` (the previous output). `clear_leftovers` knows both: it puts the previous output back if the swap
was cut in two, and never touches what a living process still works on.
"""

from __future__ import annotations

import errno
import json
import os
import re
import shutil
import tempfile
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path

from moldgen.errors import MoldgenError, SpecError
from moldgen.flow.tell import Tell

MANIFEST = "manifest.json"
MANIFEST_KEY = "moldgen"
"""A folder is an output of ours, and may be replaced, when its manifest is a JSON object with this key."""

LEAST_FREE_BYTES = 2**20
"""A file system with less free space than this after a failure is called full (own choice)."""

_REASONS = {
    errno.ENOSPC: ("the disk is full", "free some space, or write elsewhere with --output"),
    errno.EDQUOT: ("the disk quota is used up", "free some space, or write elsewhere with --output"),
    errno.EROFS: ("the file system is read-only", "write elsewhere with --output"),
    errno.EACCES: ("permission denied", "give yourself write access, or write elsewhere with --output"),
    errno.EPERM: ("not permitted", "give yourself write access, or write elsewhere with --output"),
    errno.ENOTDIR: ("a file stands where a folder is needed", "choose another place with --output"),
    errno.EEXIST: ("a file stands where a folder is needed", "choose another place with --output"),
    errno.EISDIR: ("a folder stands where a file is needed", "choose another place with --output"),
    errno.ENAMETOOLONG: ("the name is too long", "choose a shorter name with --output"),
    errno.ENOENT: ("the place does not exist", "choose another place with --output"),
    errno.EIO: ("the device reports an input/output error", "check the disk, or write elsewhere with --output"),
    errno.EBUSY: ("the folder is in use, or is a mount point", "write to a folder inside it with --output"),
    errno.EXDEV: ("the folder is on another file system", "write to a folder inside it with --output"),
    errno.ELOOP: ("symbolic links run in a circle", "choose another place with --output"),
}


@contextmanager
def fresh_folder(final: Path, *, inputs: Sequence[Path] = (), tell: Tell | None = None) -> Iterator[Path]:
    """Give an empty folder to fill; when the block ends well it becomes `final`, else it goes and `final` stays.

    Parameters
    ----------
    final : the output folder; its parents are made
    inputs : files of the user that must not stand inside `final`, since that is replaced as a whole
    tell : is told where the output goes, so that a parent process can clear up if this one is killed

    Raises
    ------
    SpecError : `final` cannot be written, the disk is full, or `final` holds something that moldgen did not make
    """
    final = final.resolve() if os.path.islink(final) else final  # noqa: PTH114  a name too long is told below
    if tell is not None:
        tell.output(final)
    with _explained(final):
        clear_leftovers(final)
        check_replaceable(final, inputs)
        final.parent.mkdir(parents=True, exist_ok=True)
        aside = _aside(final, "new")
        aside.mkdir()
    try:
        with _explained(final, written=aside):
            yield aside
        with _explained(final):
            _swap(aside, final)
    finally:
        shutil.rmtree(aside, ignore_errors=True)


def check_replaceable(final: Path, inputs: Sequence[Path] = ()) -> None:
    """Make sure that writing `final` destroys nothing but an earlier output of moldgen.

    Raises
    ------
    SpecError : `final` is a file, is where we stand, holds one of `inputs`, or something that moldgen did not make
    """
    where, elsewhere = str(final), "choose another folder with --output"
    if not os.path.lexists(final):
        return
    if not final.is_dir():
        raise SpecError("the output folder is a file", where=where, remedy=elsewhere)
    whole = final.resolve()
    if Path.cwd().is_relative_to(whole):
        raise SpecError(
            "the output folder holds the folder you are in, and would be replaced", where=where, remedy=elsewhere
        )
    for path in inputs:
        if path.resolve().is_relative_to(whole):
            what = f"the output folder holds {path.name}, which this run reads, and would be replaced"
            raise SpecError(what, where=where, remedy=elsewhere)
    if any(final.iterdir()) and not is_output(final):
        what = f"the folder is not empty and has no {MANIFEST} of moldgen: it is left alone"
        raise SpecError(what, where=where, remedy=f"{elsewhere}, or empty this one")


def clear_leftovers(final: Path) -> None:
    """Remove what a dead run left beside `final`, and put the previous output back if it died in the swap."""
    if not final.parent.is_dir():
        return
    pattern = re.compile(re.escape(f".{final.name}.") + r"(new|old)-(\d+)")
    for path in sorted(final.parent.iterdir()):
        match = pattern.fullmatch(path.name)
        if match is None or alive(int(match[2])):
            continue
        if match[1] == "old" and not os.path.lexists(final):
            path.rename(final)
        else:
            shutil.rmtree(path, ignore_errors=True)


def write_new_file(path: Path, text: str) -> None:
    """Write `text` to `path`, which must not exist yet; the file is there whole or not at all.

    Raises
    ------
    SpecError : the file exists, or cannot be written
    """
    with _explained(path):
        if os.path.lexists(path):
            raise SpecError(
                "the file exists already", where=str(path), remedy="name another one with --output, or remove it"
            )
        handle, aside = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
        try:
            with os.fdopen(handle, "w", encoding="utf-8") as stream:
                stream.write(text)
            Path(aside).chmod(0o666 & ~_umask())
            os.link(aside, path)  # unlike a rename, this fails if the file has come into being meanwhile
        except FileExistsError as error:
            raise SpecError(
                "the file exists already", where=str(path), remedy="name another one with --output"
            ) from error
        finally:
            Path(aside).unlink()


def replace_file(path: Path, text: str) -> None:
    """Write `text` to `path`, over an earlier file of ours; the file is the old one or the new one, never half of one.

    Raises
    ------
    SpecError : the file cannot be written
    """
    aside = _aside(path, "new")
    with _explained(path):
        try:
            aside.write_text(text, encoding="utf-8", newline="")
            aside.replace(path)
        finally:
            aside.unlink(missing_ok=True)


@contextmanager
def _explained(place: Path, *, written: Path | None = None) -> Iterator[None]:
    """Turn what the file system refuses inside the block into a `SpecError` about `place`, the output.

    With `written`, the block does more than write: only a full disk and what happens inside `written` are ours to tell.
    """
    try:
        yield
    except OSError as error:
        if error.errno not in _REASONS or (written is not None and not _concerns(error, written)):
            raise
        reason, remedy = _REASONS[error.errno]
        raise SpecError(f"the output cannot be written: {reason}", where=str(place), remedy=remedy) from error
    except MoldgenError as error:
        if error.exit_code == SpecError.exit_code or not _full(place):
            raise
        reason, remedy = _REASONS[errno.ENOSPC]
        what = f"the output cannot be written: {reason} ({error.what})"
        raise SpecError(what, where=str(place), remedy=remedy) from error


def _concerns(error: OSError, folder: Path) -> bool:
    """True for a full disk, wherever the kernel or a library met it, and for every refusal inside `folder`."""
    if error.errno in (errno.ENOSPC, errno.EDQUOT):
        return True
    return isinstance(error.filename, str | os.PathLike) and Path(error.filename).absolute().is_relative_to(
        folder.absolute()
    )


def _swap(aside: Path, final: Path) -> None:
    old = _aside(final, "old")
    replaces = os.path.lexists(final)
    if replaces:
        final.rename(old)
    try:
        aside.rename(final)
    except OSError:
        if replaces:
            old.rename(final)
        raise
    if replaces:
        shutil.rmtree(old, ignore_errors=True)


def _aside(final: Path, what: str) -> Path:
    return final.with_name(f".{final.name}.{what}-{os.getpid()}")


def is_output(folder: Path) -> bool:
    """True if moldgen wrote this folder, so that it may be replaced."""
    try:
        manifest = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
    except (FileNotFoundError, ValueError):
        return False
    return isinstance(manifest, dict) and MANIFEST_KEY in manifest


def alive(pid: int) -> bool:
    """True if a process of that number lives, and is not this one."""
    if pid == os.getpid():
        return False  # an earlier process of the same number: we clear up before we make anything
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    except (PermissionError, OverflowError):
        return True
    return True


def _full(place: Path) -> bool:
    with suppress(OSError):
        return shutil.disk_usage(_existing(place)).free < LEAST_FREE_BYTES
    return False


def _existing(place: Path) -> Path:
    return next(p for p in (place.absolute(), *place.absolute().parents) if p.exists())


def _umask() -> int:
    mask = os.umask(0o077)
    os.umask(mask)
    return mask
