"""A spec narrowed to the keys that a stage has declared, so that it cannot read any other; and these keys as values."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import replace
from typing import Any, cast

from pydantic import BaseModel

from moldgen.errors import StageError
from moldgen.finding import Finding, Notes
from moldgen.spec.load import LoadedSpec
from moldgen.spec.schema import Spec
from moldgen.spec.tree import Path, Tree

_MARK = "\ufdd0"
"""Stands around a key whose place in the file is told later: a character that no text may hold."""

_KEY = re.compile(r"([a-z_]+)((?:\.[a-z_]+|\[\d+\])*)")
"""A key of a spec: its section, and where it stands inside."""


def narrowed(loaded: LoadedSpec, keys: Iterable[str]) -> LoadedSpec:
    """Return the spec with nothing but `keys` (``"blocks"``, ``"ejection.stroke"``); reading another is a StageError.

    Its `locate` returns a mark that `located` turns into file, line and column: where a key stands must not get into
    what a stage makes, or a comment at the top of the file would change it all.
    """
    narrow = cast("Spec", _Narrow(loaded.spec, tuple(keys), ""))
    return replace(loaded, spec=narrow, findings=(), _tree=cast("Tree", _Marks()))


def located(text: str, loaded: LoadedSpec) -> str:
    """Return a text of a stage with its marks turned into places in the file of the spec."""
    return re.sub(f"{_MARK}([^{_MARK}]*){_MARK}", lambda found: loaded.locate(found[1]), text)


def is_key(text: str) -> bool:
    """True for the name of a key of the spec: ``blocks``, ``ejection.pins[0].at``."""
    found = _KEY.fullmatch(text)
    return found is not None and found[1] in Spec.model_fields


def key_values(spec: Spec, keys: Iterable[str]) -> dict[str, Any]:
    """Return the value of each key by its full name, sections taken apart: ``{"blocks.length": None, ...}``."""
    found: dict[str, Any] = {}
    for key in keys:
        value: Any = spec
        for name in key.split("."):
            value = getattr(value, name)
        found.update(_leaves(key, value))
    return found


def _leaves(key: str, value: Any) -> Iterable[tuple[str, Any]]:
    if not isinstance(value, BaseModel):
        yield key, _plain(value)
        return
    for name in type(value).model_fields:
        yield from _leaves(f"{key}.{name}", getattr(value, name))


def _plain(value: Any) -> Any:
    if isinstance(value, BaseModel):
        return {name: _plain(getattr(value, name)) for name in type(value).model_fields}
    if isinstance(value, tuple | list):
        return [_plain(v) for v in value]
    if isinstance(value, Mapping):
        return {str(k): _plain(v) for k, v in value.items()}
    return value


def located_notes(notes: Notes, loaded: LoadedSpec) -> Notes:
    """Return the notes of stages with marks, and places that are keys the user wrote, told as places in his file."""

    def place(finding: Finding) -> Finding:
        key = finding.where
        inside = is_key(key) and key not in Spec.model_fields  # a section's name may mean something else: the part
        return replace(finding, where=f"{loaded.locate(key)} ({key})") if inside and loaded.has(key) else finding

    notes = replace(notes, findings=tuple(map(place, notes.findings)))
    return _retold(notes, lambda text: located(text, loaded))


def without_folder(notes: Notes, loaded: LoadedSpec) -> Notes:
    """Return located notes with the spec named by its file alone: an output does not tell where it was made."""
    return _retold(notes, lambda text: text.replace(f"{loaded.path}:", f"{loaded.path.name}:"))


def _retold(notes: Notes, told: Callable[[str], str]) -> Notes:
    """Return notes with `told` of every text that may name a place in the spec."""
    findings = (replace(f, where=told(f.where), message=told(f.message)) for f in notes.findings)
    decisions = (replace(d, why=told(d.why), refused=tuple(map(told, d.refused))) for d in notes.decisions)
    return replace(notes, findings=tuple(findings), decisions=tuple(decisions))


class _Marks:
    """Answers for the tree of a spec where the places are not known yet."""

    def where(self, path: Path, *, value: bool = False) -> str:  # noqa: ARG002
        """Return a mark for a key."""
        return f"{_MARK}{'.'.join(map(str, path))}{_MARK}"


class _Narrow:
    """Some keys of a section; the others are not there."""

    def __init__(self, section: BaseModel, keys: tuple[str, ...], path: str) -> None:
        self._section, self._keys, self._path = section, keys, path

    def __getattr__(self, name: str) -> Any:
        full = f"{self._path}{name}"
        if full in self._keys:
            return getattr(self._section, name)
        if any(key.startswith(f"{full}.") for key in self._keys):
            return _Narrow(getattr(self._section, name), self._keys, f"{full}.")
        raise StageError(f"a stage reads the key {full} of the spec, which it has not declared")
