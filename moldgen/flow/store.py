"""What runs remember for later ones, on disk: bytes by content hash, whole or absent, bounded, safe among many runs.

    FOLDER/entries/ab/abcd...   one file an entry, named by its key
    FOLDER/notes/abcd...        one file a note, named by the hash of its name
    FOLDER/aside/PID-...        what is being written; renamed into its place when it is whole

A file says in its head what it is, for which key, how long, and its hash: one that is cut off, damaged, exchanged or
not of this format is dropped, never returned. Entries are unpickled by their readers, so only files that are ours, and
that nobody else can write, are read. Times of files decide only what goes first when there is too much.
"""

from __future__ import annotations

import hashlib
import math
import os
import stat
import struct
import tempfile
from collections.abc import Iterator, Mapping
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path

from moldgen.canon import sha256_bytes
from moldgen.errors import SpecError
from moldgen.finding import Finding, Severity
from moldgen.flow.folder import alive

PLACE, SIZE = "MOLDGEN_CACHE", "MOLDGEN_CACHE_SIZE"
"""Environment variables: the folder of the cache, or ``off``; its limit [GiB]."""

LIMIT_GIB = 2.0
"""Default limit (our choice: some hundred builds)."""

LEAST_GIB, MOST_GIB = 0.001, 1e6
"""Limits that make sense."""

ROOM_MADE = 0.9
"""Share of the limit that is left after older entries went, so that they do not go one by one (our choice)."""

BETWEEN_LOOKS = 1 / 16
"""Share of the limit that a run adds before it looks again what others have added (our choice)."""

MOST_NOTES, MOST_NOTE_BYTES = 500, 2**20
"""How many notes are kept, and how long one may be (our choice: one for each output of a user)."""

BLOCK = 4096
"""Bytes: a file takes whole blocks."""

_MAGIC = b"moldgen store 1\n"
_HEAD = struct.Struct(f">{len(_MAGIC)}s32sQ32s")
_OTHERS_WRITE = stat.S_IWGRP | stat.S_IWOTH


@dataclass(frozen=True)
class Summary:
    """What a store holds: its folder ("" if none), entries, notes, bytes on disk and the limit [bytes].

    why_not : why it remembers nothing; "" if it does
    """

    folder: str
    entries: int
    notes: int
    size_bytes: int
    limit_bytes: int
    why_not: str = ""


def open_store(environ: Mapping[str, str] = os.environ) -> Store:
    """Return the store that the environment names; one that forgets, and says why, where that cannot be used.

    `MOLDGEN_CACHE` names its folder, or is ``off``; else it is ``moldgen`` in `XDG_CACHE_HOME` or in ``~/.cache``.
    `MOLDGEN_CACHE_SIZE` is its limit [GiB].

    Raises
    ------
    SpecError : the limit is no number, or makes no sense
    """
    limit = _limit(environ.get(SIZE, ""))
    place = environ.get(PLACE, "")
    if place.lower() == "off":
        return Store(None, limit, f"{PLACE}=off")
    try:
        folder = _folder(place, environ).absolute()
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        why_not = _unfit(folder)
    except (OSError, RuntimeError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else None
        return Store(None, limit, f"{place or 'its folder'} cannot be used: {reason or error}", trouble=True)
    return Store(None, limit, f"{folder} {why_not}", trouble=True) if why_not else Store(folder, limit)


def _folder(place: str, environ: Mapping[str, str]) -> Path:
    if place:
        return Path(place).expanduser()
    base = environ.get("XDG_CACHE_HOME", "")
    return (Path(base) if os.path.isabs(base) else Path.home() / ".cache") / "moldgen"  # noqa: PTH117  "" is no path


def _unfit(folder: Path) -> str:
    """Return why a folder cannot hold what is unpickled later, "" if it can."""
    found = folder.stat()
    if found.st_uid != os.geteuid():
        return "belongs to another user"
    if found.st_mode & _OTHERS_WRITE:
        return "can be written by others (chmod go-w)"
    return "" if os.access(folder, os.R_OK | os.W_OK | os.X_OK) else "cannot be written"


def _limit(text: str) -> int:
    if not text:
        return int(LIMIT_GIB * 2**30)
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not LEAST_GIB <= value <= MOST_GIB:
        raise SpecError(
            f"'{text}' is no size of a cache: it must be a number of GiB from {LEAST_GIB:g} to {MOST_GIB:g}",
            where=f"environment variable {SIZE}",
            remedy=f"{SIZE}={LIMIT_GIB:g}, or leave it out",
        )
    return int(value * 2**30)


class Store:
    """Entries and notes in a folder. Nothing here ever fails a run: what cannot be read or written is forgotten.

    Parameters
    ----------
    folder : an existing folder of our own, None for a store that forgets everything
    limit_bytes : the entries take no more, but for what several runs at once add between two looks
    why_not : why there is no folder
    trouble : that is not as the user wanted it
    """

    def __init__(self, folder: Path | None, limit_bytes: int, why_not: str = "", *, trouble: bool = False) -> None:
        self.folder, self.limit_bytes, self.why_not = folder, limit_bytes, why_not
        self._trouble = trouble
        self._failed = ""
        self._size: int | None = None  # of all entries as far as we know; None before the first look
        self._added = 0  # since the last look

    def recall(self, key: str) -> bytes | None:
        """Return what was kept under `key`, None if nothing was, or if it is lost."""
        path = self._entry(key)
        return None if path is None else _read(path, key)

    def keep(self, key: str, data: bytes) -> None:
        """Keep `data` under `key`, in place of what was there; older entries make room. After a failure, do nothing."""
        path, size = self._entry(key), _blocks(_HEAD.size + len(data))
        if path is None or size > self.limit_bytes or not self._written(path, key, data):
            return
        self._size = None if self._size is None else self._size + size
        self._added += size
        if self._size is None or self._size > self.limit_bytes or self._added > BETWEEN_LOOKS * self.limit_bytes:
            self._make_room()

    def note(self, name: str, text: str) -> None:
        """Note `text` under a name, in place of what was noted before; the oldest of very many notes go."""
        key, data = sha256_bytes(name.encode()), text.encode()
        if self.folder is None or len(data) > MOST_NOTE_BYTES:
            return
        if self._written(self.folder / "notes" / key, key, data):
            for found in _oldest_first(self._notes())[:-MOST_NOTES]:
                _drop(found.path)

    def noted(self, name: str) -> str | None:
        """Return what was noted under a name, None if nothing was, or if it is lost."""
        key = sha256_bytes(name.encode())
        data = None if self.folder is None else _read(self.folder / "notes" / key, key)
        return None if data is None else data.decode()

    def findings(self) -> tuple[Finding, ...]:
        """Return what the reader of this run should know of the store: that nothing, or not all, was remembered."""
        if self._trouble:
            return (_finding("cache.unusable", self.why_not, f"set {PLACE} to a folder of your own, or to off"),)
        if self._failed:
            what = f"not everything could be kept for later runs: {self._failed}"
            return (_finding("cache.not_kept", what, "free some space, or `moldgen cache --clear`"),)
        return ()

    def summary(self) -> Summary:
        """Return what the store holds now."""
        entries, notes = list(self._entries()), list(self._notes())
        size = sum(found.size for found in (*entries, *notes))
        return Summary(str(self.folder or ""), len(entries), len(notes), size, self.limit_bytes, self.why_not)

    def clear(self) -> None:
        """Forget everything. What another run is just writing stays."""
        for found in (*self._entries(), *self._notes()):
            _drop(found.path)
        self._drop_leftovers()
        self._size = None

    def _entry(self, key: str) -> Path | None:
        if len(key) != 64 or not set(key) <= set("0123456789abcdef"):
            raise ValueError(f"a key is a SHA-256 in hexadecimal, not '{key}'")
        return None if self.folder is None else self.folder / "entries" / key[:2] / key

    def _written(self, path: Path, key: str, data: bytes) -> bool:
        """Write a file, unless an earlier one could not be written; return whether that was done."""
        if self.folder is None or self._failed:
            return False
        try:
            _write(self.folder, path, key, data)
        except OSError as error:
            self._failed = error.strerror or str(error)
        return not self._failed

    def _make_room(self) -> None:
        """Look what there is, drop what dead runs left, and the longest unused entries where there is too much."""
        if self._size is None:
            self._drop_leftovers()
        found = _oldest_first(self._entries())
        size = sum(entry.size for entry in found)
        if size > self.limit_bytes:
            for entry in found:
                if size <= ROOM_MADE * self.limit_bytes:
                    break
                _drop(entry.path)
                size -= entry.size
        self._size, self._added = size, 0

    def _drop_leftovers(self) -> None:
        for found in self._asides():
            pid = found.path.name.partition("-")[0]
            if not pid.isdecimal() or not (int(pid) == os.getpid() or alive(int(pid))):
                _drop(found.path)

    def _entries(self) -> Iterator[_Found]:
        if self.folder is not None:
            for folder in _listed(self.folder / "entries"):
                yield from _files(folder)

    def _notes(self) -> Iterator[_Found]:
        return _files(self.folder / "notes") if self.folder is not None else iter(())

    def _asides(self) -> Iterator[_Found]:
        return _files(self.folder / "aside") if self.folder is not None else iter(())


@dataclass(frozen=True)
class _Found:
    """A file of a store, what it takes on disk [bytes], and when it was used last [ns]."""

    path: Path
    size: int
    used_ns: int


def _oldest_first(found: Iterator[_Found]) -> list[_Found]:
    return sorted(found, key=lambda f: (f.used_ns, f.path.name))


def _files(folder: Path) -> Iterator[_Found]:
    """Yield the files of a folder; those that go meanwhile are left out."""
    for path in _listed(folder):
        with suppress(OSError):
            here = path.lstat()
            if stat.S_ISREG(here.st_mode):
                yield _Found(path, _blocks(here.st_size), here.st_mtime_ns)


def _listed(folder: Path) -> list[Path]:
    try:
        return sorted(folder.iterdir())
    except OSError:
        return []


def _blocks(size: int) -> int:
    return -(-size // BLOCK) * BLOCK


def _write(folder: Path, path: Path, key: str, data: bytes) -> None:
    """Write a file of a store that is there whole or not at all. Raises OSError."""
    aside = folder / "aside"
    for place in (folder, aside, path.parents[1], path.parent):
        place.mkdir(mode=0o700, exist_ok=True)
    handle, name = tempfile.mkstemp(prefix=f"{os.getpid()}-", dir=aside)  # unique also among threads and hosts
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(_HEAD.pack(_MAGIC, bytes.fromhex(key), len(data), hashlib.sha256(data).digest()))
            stream.write(data)
        Path(name).replace(path)
    finally:
        _drop(Path(name))


def _read(path: Path, key: str) -> bytes | None:
    """Return what a file holds for `key`, and note that it was used; drop it if it is not what it should be."""
    try:
        with os.fdopen(os.open(path, os.O_RDONLY | os.O_NOFOLLOW | os.O_NONBLOCK), "rb") as stream:
            here = os.fstat(stream.fileno())
            safe = stat.S_ISREG(here.st_mode) and here.st_uid == os.geteuid() and not here.st_mode & _OTHERS_WRITE
            data = _payload(stream.read(), key) if safe else None
            if data is not None:
                with suppress(OSError):  # a file system that is read-only meanwhile
                    os.utime(stream.fileno())
    except OSError:  # it is not there, it is a link, too many files are open
        return None
    if data is None:
        _drop(path)
    return data


def _payload(whole: bytes, key: str) -> bytes | None:
    """Return what follows the head of a file, None unless the head is right about all of it."""
    if len(whole) < _HEAD.size:
        return None
    magic, its_key, size, digest = _HEAD.unpack_from(whole)
    data = whole[_HEAD.size :]
    right = magic == _MAGIC and its_key.hex() == key and size == len(data)
    return data if right and hashlib.sha256(data).digest() == digest else None


def _finding(code: str, what: str, remedy: str) -> Finding:
    return Finding(code, Severity.NOTE, f"the cache: {what}", remedy=remedy)


def _drop(path: Path) -> None:
    with suppress(OSError):
        path.unlink()
