"""The files that a watcher looks at: what is in them, and whether they have come to rest."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import Final

from moldgen.canon import sha256_file

SMALL: Final = 2**22
"""Bytes up to which a file is read at every look; a larger one when its times or size changed (our choice)."""

READ_AGAIN: Final = 40
"""Looks after which a large file is read in any case: times can lie (our choice: some ten seconds)."""

RESTS: Final = 2
"""So many equal looks, one after the other, make a file one that nobody is writing (our choice)."""

RESTS_ABSENT: Final = 8
"""The same for a file that is not there: an editor that saves by renaming may be in the middle of it (our choice)."""

Content = dict[Path, str]
"""SHA-256 of each file, "" for one that is not there or cannot be read."""

_Hint = tuple[int, int, int]


class Watched:
    """Files by content. Names stay watched while their files come and go."""

    def __init__(self, paths: Iterable[Path]) -> None:
        self._paths: tuple[Path, ...] = ()
        self._read: dict[Path, tuple[_Hint, str, int]] = {}
        self._last: Content = {}
        self._rested: Content = {}
        self._equal = 0
        self.watch(paths)

    def watch(self, paths: Iterable[Path]) -> None:
        """Watch these files from now on, and no others."""
        self._paths = tuple(dict.fromkeys(paths))
        self._read = {path: read for path, read in self._read.items() if path in self._paths}

    def look(self) -> Content | None:
        """Return what is in the files, None while one of them is still changing."""
        content = {path: self._digest(path) for path in self._paths}
        self._equal = self._equal + 1 if content == self._last else 1
        self._last = content
        gone = any(self._rested.get(path) and not digest for path, digest in content.items())
        if self._equal < (RESTS_ABSENT if gone else RESTS):
            return None
        self._rested = content
        return content

    def also(self, paths: Iterable[Path], content: Content) -> Content:
        """Watch these files from now on, and return what is in them: of those in `content`, what is said there."""
        self.watch(paths)
        found = {path: content[path] if path in content else self._digest(path) for path in self._paths}
        self._rested = found
        return found

    def _digest(self, path: Path) -> str:
        try:
            stat = path.stat()
        except (OSError, ValueError):
            self._read.pop(path, None)
            return ""
        hint = (stat.st_mtime_ns, stat.st_size, stat.st_ino)
        known = self._read.get(path)
        if known is not None and known[0] == hint and stat.st_size > SMALL and known[2] < READ_AGAIN:
            self._read[path] = (hint, known[1], known[2] + 1)
            return known[1]
        digest = sha256_file(path)
        self._read[path] = (hint, digest, 0)
        return digest
