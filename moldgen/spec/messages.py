"""What pydantic found, in plain words: what is wrong, where in the file, and what to write instead."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import Any, Final, get_args

from pydantic import BaseModel, ValidationError

from moldgen.errors import SpecError
from moldgen.spec.fields import shown
from moldgen.spec.schema import PLANNED, Spec
from moldgen.spec.tree import Path, Tree

_LOOK_IT_UP: Final = "correct it; `moldgen schema` describes every key"

MAX_WORDED: Final = 500
"""A text with more mistakes is no spec; looking for the nearest key of each would take seconds."""

_Words = tuple[str, str]
"""What is wrong with the value, and the remedy."""


def plain_errors(error: ValidationError, tree: Tree, top: type[BaseModel] = Spec) -> list[SpecError]:
    """Return the mistakes of `error`, at most `MAX_WORDED`, with their places in `tree`, in the order of the file.

    top : what the whole file was read as
    """
    lines = error.errors(include_url=False)[:MAX_WORDED]
    found = [_plain_error(line, tree, top) for line in lines if not _only_follows(line, lines)]
    unique = {(at, str(e)): e for at, e in found}
    return [unique[key] for key in sorted(unique)]


def _only_follows(line: Mapping[str, Any], lines: Sequence[Mapping[str, Any]]) -> bool:
    """Whether a list is called too short only because its wrong items, reported too, were not counted."""
    loc = line["loc"]
    return "after validation" in line["msg"] and any(
        len(other["loc"]) > len(loc) and other["loc"][: len(loc)] == loc for other in lines
    )


def _plain_error(line: Mapping[str, Any], tree: Tree, top: type[BaseModel]) -> tuple[tuple[int, int], SpecError]:
    loc = tuple(line["loc"])
    path, value = _follow(tree.data, loc)
    kind = line["type"]
    if kind == "recipe":  # names its feature and the nearest key itself
        what, _, remedy = line["msg"].partition("; ")
        remedy = remedy or _LOOK_IT_UP
        is_value = False
    elif kind == "extra_forbidden":
        what, remedy = _unknown_key(path, top)
        is_value = False
    elif kind == "missing":
        what, remedy = _missing_key(path, loc, top)
        is_value = not path
    else:
        words, remedy = _wrong_value(line, value)
        what = f"{dotted(path)}: {words}" if path else words
        is_value = True
    where = tree.where(path, value=is_value)
    row, column = where.rsplit(":", 2)[1:]
    return (int(row), int(column)), SpecError(what, where=where, remedy=remedy)


def dotted(path: Path) -> str:
    """Return a path as people write it: ``gate.at``, ``marks[2].face``."""
    text = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in path)
    return text.removeprefix(".")


def _follow(data: Any, loc: Path) -> tuple[Path, Any]:
    """Return the part of `loc` that the user wrote, and its value; steps that pydantic adds for unions are skipped."""
    path: Path = ()
    for step in loc:
        if isinstance(data, list):
            written = isinstance(step, int) and step < len(data)
        else:
            written = isinstance(data, dict) and step in data
        if written:
            data = data[step]
            path = (*path, step)
    return path, data


# --- keys ------------------------------------------------------------------------------------------------------------
def _unknown_key(path: Path, top: type[BaseModel]) -> _Words:
    key = str(path[-1])
    if top is Spec and len(path) == 1 and key in PLANNED:
        return f"this version does not build {PLANNED[key]} yet: `{key}` would have no effect", f"delete `{key}`"
    known = sorted({name for model in _models_at(top, path[:-1]) for name in model.model_fields})
    section = f" in {dotted(path[:-1])}" if len(path) > 1 else ""
    near = difflib.get_close_matches(key.lower(), known, n=1)
    if near:
        remedy = f"did you mean `{near[0]}`?"
    else:
        owners = [name for name, model in _sections(top) if key in model.model_fields]
        remedy = f"`{key}` is a key of {' and '.join(owners)}; " if owners and len(path) < 3 else ""
        remedy += f"known keys{section or ' here'}: {', '.join(known)}"
    return f"unknown key `{shown(key)}`{section}", remedy


def _missing_key(path: Path, loc: Path, top: type[BaseModel]) -> _Words:
    key = loc[-1]
    section = f" in {dotted(path)}" if path else ""
    descriptions = [m.model_fields[key].description for m in _models_at(top, path) if key in m.model_fields]
    meaning = f" ({descriptions[0]})" if descriptions and descriptions[0] else ""
    return f"the key `{key}` is missing{section}", f"add `{key}:`{meaning}"


def _sections(top: type[BaseModel]) -> Iterator[tuple[str, type[BaseModel]]]:
    for name, info in top.model_fields.items():
        for model in _models_in(info.annotation):
            yield name, model


def _models_at(top: type[BaseModel], path: Path) -> list[type[BaseModel]]:
    """Return the models that a mapping at `path` may be read as."""
    models = [top]
    for step in path:
        if isinstance(step, str):
            models = [
                m
                for model in models
                if step in model.model_fields
                for m in _models_in(model.model_fields[step].annotation)
            ]
    return models


def _models_in(annotation: Any) -> list[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    return [model for part in get_args(annotation) for model in _models_in(part)]


# --- values ----------------------------------------------------------------------------------------------------------
def _wrong_value(line: Mapping[str, Any], value: Any) -> _Words:
    context = line.get("ctx", {})
    if line["type"] == "moldgen":
        return context["what"], context["remedy"]
    if line["type"] == "literal_error":
        return _not_a_choice(value, context["expected"])
    for prefix, say in _BY_TYPE:
        if line["type"].startswith(prefix):
            return say(value, context)
    return line["msg"].removeprefix("Value error, "), _LOOK_IT_UP


def _not_a_choice(value: Any, expected: str) -> _Words:
    choices = [c.strip("'") for c in expected.replace(" or ", ", ").split(", ")]
    near = difflib.get_close_matches(str(value).lower(), choices, n=1)
    remedy = f"did you mean {near[0]}?" if near else f"write {' or '.join(choices)}"
    return f"{_quoted(value)} is not one of {', '.join(choices)}", remedy


def _quoted(value: Any) -> str:
    if isinstance(value, dict):
        return "a mapping"
    if isinstance(value, list):
        return "a list"
    return f'"{shown(value)}"' if isinstance(value, str) else shown(value)


def _not(noun: str, remedy: str) -> Callable[[Any, Mapping[str, Any]], _Words]:
    return lambda value, _: (f"{_quoted(value)} is not {noun}", remedy)


_BY_TYPE: Final[Sequence[tuple[str, Callable[[Any, Mapping[str, Any]], _Words]]]] = (
    ("model_", _not("a section", "write its keys below it, indented, each as `key: value`")),
    ("dict_", _not("a section", "write its keys below it, indented, each as `key: value`")),
    ("tuple_", _not("a list", "write a list: [a, b], or one item a line, each after a dash")),
    ("list_", _not("a list", "write a list: [a, b], or one item a line, each after a dash")),
    ("bool_", _not("true or false", "write true or false")),
    ("string_type", _not("text", "write text, in quotes if need be")),
)
