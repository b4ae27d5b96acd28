"""YAML text to plain data that remembers where each key and value stands.

Only the parser of the YAML library is used. Its events are folded here, without recursion, into dicts, lists and
scalars: no tag is ever honoured, so no object can be constructed, and limits stop a hostile text early.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any, Final

from ruamel.yaml import YAML
from ruamel.yaml.error import YAMLError
from ruamel.yaml.events import (
    AliasEvent,
    CollectionEndEvent,
    CollectionStartEvent,
    DocumentStartEvent,
    Event,
    MappingStartEvent,
    NodeEvent,
    ScalarEvent,
)

from moldgen.errors import SpecError
from moldgen.spec.syntax import syntax_error

Path = tuple[str | int, ...]
"""Keys and list indices from the top of the spec down to a value."""

MAX_DEPTH: Final = 40
MAX_ALIASES: Final = 100
MAX_VALUES: Final = 20_000
"""Values in the text with every alias written out: the longest demo spec has a few hundred."""


@dataclass(frozen=True, order=True)
class Place:
    """Line and column, both counted from 1."""

    line: int
    column: int


class WrittenInt(int):
    """A whole number that keeps its text, so that a name such as 0042 can still be read as text."""

    text: str


class WrittenFloat(float):
    """A number that keeps its text: the steel 1.2710 is a name, not 1.271."""

    text: str


@dataclass
class Tree:
    """The data of a spec, where each path stands, and the mistakes that did not stop the reading."""

    file: str
    data: Any = None
    keys: dict[Path, Place] = field(default_factory=dict)
    """Where the key (in a list: the item) of each path begins."""
    values: dict[Path, Place] = field(default_factory=dict)
    mistakes: list[SpecError] = field(default_factory=list)

    def where(self, path: Path, *, value: bool = False) -> str:
        """Return ``file:line:column`` of the key at `path`, or of its `value`; of the nearest parent if unwritten."""
        places = self.values if value else self.keys
        while path and path not in places:
            path = path[:-1]
        place = places.get(path, self.values.get((), Place(1, 1)))
        return at(self.file, place)


def at(file: str, place: Place) -> str:
    """Return ``file:line:column``."""
    return f"{file}:{place.line}:{place.column}"


def read_tree(text: str, file: str) -> Tree:
    """Return the data of one YAML document; `file` is the name to report places with.

    Raises
    ------
    SpecError : not YAML, more than one document, a tag, or a limit of this module is passed
    """
    builder = _Builder(Tree(file))
    for event in _events(text, file):
        builder.feed(event)
    return builder.tree


def _events(text: str, file: str) -> Iterator[Event]:
    try:
        yield from YAML(typ="safe", pure=True).parse(text)
    except YAMLError as error:
        raise syntax_error(error, text, file) from error
    except (ArithmeticError, AttributeError, AssertionError, LookupError, TypeError, ValueError) as error:
        # slips of the library on malformed text, such as an escape beyond the last character
        raise SpecError("this is not YAML", where=file, remedy="look for a stray escape or directive") from error


@dataclass
class _Frame:
    """A mapping or list whose end has not come yet."""

    container: dict[str, Any] | list[Any]
    path: Path
    anchor: str | None
    awaits_key: bool
    key: str = ""
    key_place: Place = Place(1, 1)
    size: int = 1
    """Values in it so far, itself included, aliases written out."""


class _Builder:
    """Folds events into a tree."""

    def __init__(self, tree: Tree) -> None:
        self.tree = tree
        self._open: list[_Frame] = []
        self._anchors: dict[str, tuple[Any, int]] = {}
        self._aliases = self._values = self._documents = 0

    def feed(self, event: Event) -> None:
        place = Place(event.start_mark.line + 1, event.start_mark.column + 1)
        if isinstance(event, DocumentStartEvent):
            self._documents += 1
            if self._documents > 1:
                self._stop(place, "a second document begins here", "one file holds one spec: delete the line ---")
        elif isinstance(event, CollectionEndEvent):
            frame = self._open.pop()
            self._remember(frame.anchor, frame.container, frame.size)
            if self._open:
                self._open[-1].size += frame.size
        elif isinstance(event, AliasEvent):
            self._alias(event, place)
        elif isinstance(event, NodeEvent):
            self._node(event, place)

    def _node(self, event: Any, place: Place) -> None:
        if event.tag is not None:
            self._stop(place, f"the tag {event.tag} is not allowed", "delete it: a spec holds plain data only")
        if isinstance(event, CollectionStartEvent):
            self._collection(event, place)
            return
        if not isinstance(event, ScalarEvent):
            return
        if _HALF_CHARACTER.search(event.value):
            self._stop(place, "an escape here is half a character", "write the character itself, or \\U and 8 digits")
        if self._wants_key():
            self._key(event.value, place)
            return
        value = _plain_scalar(event.value) if event.implicit[0] else event.value
        if value is None and not event.value and self._open and isinstance(self._open[-1].container, dict):
            place = self._open[-1].key_place  # the parser places a missing value at the next line
        self._count(1, place)
        self._add(value, place, size=1)
        self._remember(event.anchor, value, 1)

    def _collection(self, event: Any, place: Place) -> None:
        if self._wants_key():
            self._stop(place, "a key must be plain text", "put the text before the colon in quotes")
        if len(self._open) >= MAX_DEPTH:
            self._stop(place, f"nested more than {MAX_DEPTH} deep", "a spec needs about six levels")
        container: dict[str, Any] | list[Any] = {} if isinstance(event, MappingStartEvent) else []
        self._count(1, place)
        path = self._add(container, place, size=0)  # its size is known at its end
        self._open.append(_Frame(container, path, event.anchor, awaits_key=isinstance(container, dict)))

    def _alias(self, event: Any, place: Place) -> None:
        self._aliases += 1
        if self._wants_key():
            self._stop(place, "a key must be plain text", "put the text before the colon in quotes")
        if self._aliases > MAX_ALIASES:
            self._stop(place, f"more than {MAX_ALIASES} aliases", "write the values out")
        if event.anchor not in self._anchors:
            self._stop(
                place, f"no finished value is named &{event.anchor}", "name it before it is used, and not inside itself"
            )
        value, size = self._anchors[event.anchor]
        self._count(size, place)
        self._add(value, place, size=size)

    def _wants_key(self) -> bool:
        return bool(self._open) and self._open[-1].awaits_key

    def _key(self, text: str, place: Place) -> None:
        frame = self._open[-1]
        frame.key, frame.key_place, frame.awaits_key = text, place, False
        if text in frame.container:
            first = self.tree.where((*frame.path, text))
            what = f"the key `{text}` is written twice; the first is at {first}"
            self.tree.mistakes.append(SpecError(what, where=at(self.tree.file, place), remedy="delete one of them"))

    def _add(self, value: Any, place: Place, *, size: int) -> Path:
        """Put `value` where the open container expects it; the first of two equal keys wins."""
        path: Path = ()
        key_place = place
        if not self._open:
            self.tree.data = value
        else:
            frame = self._open[-1]
            frame.size += size
            if isinstance(frame.container, list):
                path = (*frame.path, len(frame.container))
                frame.container.append(value)
            else:
                path, key_place = (*frame.path, frame.key), frame.key_place
                frame.container.setdefault(frame.key, value)
                frame.awaits_key = True
        self.tree.keys.setdefault(path, key_place)
        self.tree.values.setdefault(path, place)
        return path

    def _remember(self, anchor: str | None, value: Any, size: int) -> None:
        if anchor is not None:
            self._anchors[anchor] = (value, size)

    def _count(self, size: int, place: Place) -> None:
        self._values += size
        if self._values > MAX_VALUES:
            self._stop(place, f"more than {MAX_VALUES} values, aliases written out", "write a shorter spec")

    def _stop(self, place: Place, what: str, remedy: str) -> None:
        raise SpecError(what, where=at(self.tree.file, place), remedy=remedy)


_HALF_CHARACTER: Final = re.compile("[\ud800-\udfff]")
"""Surrogates: only an escape can smuggle them in, and no UTF-8 file or message could hold them."""

_NULL: Final = frozenset({"", "~", "null", "Null", "NULL"})
_TRUE: Final = frozenset({"true", "True", "TRUE"})
_FALSE: Final = frozenset({"false", "False", "FALSE"})
_INT: Final = re.compile(r"[-+]?[0-9]+")
_FLOAT: Final = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_SPECIAL: Final = re.compile(r"[-+]?\.(inf|Inf|INF)|\.(nan|NaN|NAN)")


def _plain_scalar(text: str) -> Any:
    """Return the value of unquoted text by the core schema [YAML 1.2.2, section 10.3.2], decimal numbers only."""
    if text in _NULL:
        return None
    if text in _TRUE or text in _FALSE:
        return text in _TRUE
    if _INT.fullmatch(text) and len(text) < 19:
        whole = WrittenInt(text)
        whole.text = text
        return whole
    if _FLOAT.fullmatch(text):
        number = WrittenFloat(text)
        number.text = text
        return number
    if _SPECIAL.fullmatch(text):
        return float(text.replace(".", ""))
    return text
