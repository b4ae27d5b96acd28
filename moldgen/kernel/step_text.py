"""What the text of a STEP file tells before the kernel reads it: is it one, is it whole, which schema."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from moldgen.canon import sha256_bytes
from moldgen.errors import PartError

START: Final = b"ISO-10303-21;"
"""First token of an exchange structure [published: ISO 10303-21, clause on the exchange structure]."""

END: Final = b"END-ISO-10303-21;"

_COMMENT = re.compile(rb"/\*.*?\*/", re.DOTALL)
_SCHEMA = re.compile(rb"FILE_SCHEMA\s*\(\s*\(\s*'([^']*)'", re.IGNORECASE)

_OTHER_FORMATS: Final = (
    (b"\xef\xbb\xbf", "a text file that was saved again with a byte order mark: save it without"),
    (b"PK", "a zip archive (3MF, or a packed STEP file: unpack it first)"),
    (b"solid", "an STL mesh"),
    (b"ACIS", "an ACIS file"),
    (b"DBRep", "a BREP file"),
    (b"CASCADE", "a BREP file"),
    (b"<", "an XML file"),
    (b"**ABCDEF", "a Parasolid file"),
    (b"version https://git-lfs", "a Git LFS pointer, not the file itself (run: git lfs pull)"),
)

_SCHEMAS: Final = (
    ("AP203", ("CONFIG_CONTROL_DESIGN", "AP203")),
    ("AP242", ("AP242",)),
    ("AP214", ("AUTOMOTIVE_DESIGN",)),
)


@dataclass(frozen=True)
class StepText:
    """The checks and facts of a STEP file that need no kernel."""

    sha256: str
    schema: str


def check_step_text(path: Path) -> StepText:
    """Read the file once and refuse whatever is not a whole STEP file.

    Parameters
    ----------
    path : the file to read

    Raises
    ------
    PartError : missing, a folder, unreadable, empty, another format, or cut short
    """
    data = _read(path)
    where = str(path)
    if not data.strip():
        raise PartError("the file is empty", where=where, remedy="export the part again")
    start = _COMMENT.sub(b"", data[:20000]).lstrip()
    if not start.upper().startswith(START):
        raise PartError(
            f"not a STEP file{_guess(start)}", where=where, remedy="export the part as STEP (AP203, AP214 or AP242)"
        )
    tail = _COMMENT.sub(b"", data[-20000:]).replace(b"\n", b"").replace(b"\r", b"").rstrip()
    if not tail.upper().endswith(END):
        raise PartError(
            f"the STEP file is cut short: {len(data)} bytes, and the closing {END.decode()} is missing",
            where=where,
            remedy="copy or export the file again",
        )
    return StepText(sha256_bytes(data), _schema(data))


def _read(path: Path) -> bytes:
    if path.is_dir():
        raise PartError("a folder, not a STEP file", where=str(path), remedy="name the file in it")
    try:
        return path.read_bytes()
    except FileNotFoundError:
        raise PartError("no such file", where=str(path), remedy="check the path, it is relative to the spec") from None
    except OSError as error:
        raise PartError(f"cannot be read: {error.strerror}", where=str(path), remedy="check its permissions") from error


def _guess(start: bytes) -> str:
    for sign, meaning in _OTHER_FORMATS:
        if start.startswith(sign):
            return f": it looks like {meaning}"
    return ""


def _schema(data: bytes) -> str:
    found = _SCHEMA.search(data[:200000])
    text = found.group(1).decode("ascii", "replace").upper() if found else ""
    for name, signs in _SCHEMAS:
        if any(sign in text for sign in signs):
            return name
    return text or "unknown"
