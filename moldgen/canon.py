"""Canonical JSON and content hashes: the same input gives the same bytes."""

from __future__ import annotations

import dataclasses
import hashlib
import json
import math
from collections.abc import Mapping
from enum import Enum
from pathlib import Path, PurePath
from typing import Any

DIGITS = 12
"""Significant digits of numbers in outputs."""

EXACT = 17
"""Significant digits that tell any two numbers apart."""


def plain(value: Any, digits: int = DIGITS) -> Any:
    """Return `value` as JSON types: dataclasses to mappings, enums to their value, floats rounded to `digits`."""
    if isinstance(value, Enum):
        return plain(value.value, digits)
    if isinstance(value, (bool, str, int)) or value is None:
        return value
    if isinstance(value, PurePath):
        return value.as_posix()
    if isinstance(value, (list, tuple)):
        return [plain(v, digits) for v in value]
    members = _members(value)
    return _number(value, digits) if members is None else {str(k): plain(v, digits) for k, v in members.items()}


def _members(value: Any) -> Mapping[Any, Any] | None:
    """Return what a mapping or a dataclass holds, by name; None for anything else."""
    if isinstance(value, Mapping):
        return value
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: getattr(value, f.name) for f in dataclasses.fields(value)}
    return None


def _number(value: Any, digits: int) -> float:
    if not hasattr(value, "__float__"):
        raise TypeError(f"no JSON form for {type(value).__name__}")
    number = float(value)
    if not math.isfinite(number):
        raise ValueError(f"not a finite number: {number}")
    return float(f"{number:.{digits}g}") + 0.0  # + 0.0 turns -0.0 into 0.0


def to_json(value: Any, *, indent: int | None = 2) -> str:
    """Return canonical JSON text: keys in the order given, one trailing newline."""
    return json.dumps(plain(value), indent=indent, ensure_ascii=False) + "\n"


def sha256_bytes(data: bytes) -> str:
    """Return the SHA-256 of `data` in hexadecimal."""
    return hashlib.sha256(data).hexdigest()


def sha256_file(path: Path) -> str:
    """Return the SHA-256 of a regular file in hexadecimal, "" if there is none or it cannot be read."""
    try:
        if not path.is_file():
            return ""
        with path.open("rb") as stream:
            return hashlib.file_digest(stream, "sha256").hexdigest()
    except (OSError, ValueError):
        return ""


def sha256_json(value: Any, digits: int = DIGITS) -> str:
    """Return the SHA-256 of the canonical JSON of `value`, independent of the order of mapping keys."""
    text = json.dumps(plain(value, digits), sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return sha256_bytes(text.encode())
