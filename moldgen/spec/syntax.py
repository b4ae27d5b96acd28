"""The YAML library's complaints, in the words of a person who did not mean to learn YAML."""

from __future__ import annotations

from typing import Any, Final

from ruamel.yaml.error import YAMLError

from moldgen.errors import SpecError

_WORDS: Final = (
    ("found character '\\t'", "a tab indents this line", "indent with spaces: YAML forbids tabs"),
    ("cannot start any token", "a value must not begin with this character", "put the value in quotes"),
    ("mapping values are not allowed", "a colon is not expected here", "check the indent, or put the value in quotes"),
    ("could not find expected ':'", "a key without a colon", "write `key: value`"),
    ("unexpected end of stream", "a quote opens here and is never closed", "close the quote"),
    ("expected <block end>", "the indent does not fit the lines above", "give all keys of one section the same indent"),
    ("expected ',' or ']'", "a list opens with [ and is not closed", "close it with ]"),
    ("expected ',' or '}'", "a mapping opens with { and is not closed", "close it with }"),
    ("expected the node content", "a value is missing here", "write the value, or close the bracket"),
    ("duplicate anchor", "this & name is used twice", "use another name"),
)
"""Part of the library's problem text, what to say, remedy. The first match wins."""

_OPENS_EARLIER: Final = ("unexpected end of stream", "expected ',' or")
"""Problems whose place of interest is where the quote or bracket was opened."""


def syntax_error(error: YAMLError, text: str, file: str) -> SpecError:
    """Return the error of the YAML parser as a `SpecError` with its place in `text`."""
    problem = str(getattr(error, "problem", None) or "")
    mark: Any = getattr(error, "problem_mark", None)
    if any(part in problem for part in _OPENS_EARLIER):
        mark = getattr(error, "context_mark", None) or mark
    if mark is not None:
        where = f"{file}:{mark.line + 1}:{mark.column + 1}"
    else:
        where = _unreadable_character(text, getattr(error, "position", None), file)
        problem = problem or "a character that text cannot hold"
    for part, what, remedy in _WORDS:
        if part in problem:
            return SpecError(what, where=where, remedy=remedy)
    return SpecError(f"this is not YAML: {problem}", where=where, remedy="correct this line")


def _unreadable_character(text: str, position: int | None, file: str) -> str:
    before = text[: position or 0]
    return f"{file}:{before.count(chr(10)) + 1}:{len(before) - before.rfind(chr(10))}"
