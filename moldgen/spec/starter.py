"""The commented starter spec. Its keys, values and comments come from the schema, so that they cannot drift apart."""

from __future__ import annotations

import json
import re
import textwrap
from collections.abc import Iterator, Sequence
from typing import Any, Final

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from moldgen import catalog
from moldgen.errors import SpecError
from moldgen.spec.fields import AUTO, OR_AUTO, Number
from moldgen.spec.pull import Pull
from moldgen.spec.schema import Spec, folder_name

_WIDTH: Final = 118
_COMMENT_COLUMN: Final = 32
_HEADER: Final = """\
# Spec of an injection-mold layout, read by moldgen. Plain numbers are mm, deg and percent; a unit may be written:
# 0.5 in, 1.5 deg, 0.5 %. Points are in the coordinates of the part's own file, before shrink.
"""
_OPTIONAL: Final = """
# Everything below is optional and shows its default, or an example. To decide something yourself, delete the "# " in
# front of the name of the section and of the key.
"""


def starter(
    part_file: str, name: str, resin: str = "ABS", *, solid: int | str | None = None, facts: Sequence[str] = ()
) -> str:
    """Return the text of a spec that loads and builds, with every optional key shown commented out.

    `part_file` is written as given, so it must be relative to the folder of the spec or absolute. `name` becomes the
    name of the tool, with characters that a folder name cannot hold replaced. `solid` chooses one of several solids.
    `facts` are lines about the part for the reader, such as its size.

    Raises
    ------
    SpecError : an unknown resin, or a file name that a spec cannot hold
    """
    for text in (part_file, str(solid)):
        if not text.strip() or not text.isprintable() or len(text) > 200:
            raise SpecError(f"{text!r} cannot be written in a spec", remedy="rename it")
    resin = catalog.resin(resin).name
    fields = Spec.model_fields
    lines = [_HEADER + "".join(f"# {' '.join(fact.split())}\n" for fact in facts)]
    lines += _line(f"name: {_scalar(folder_name(name))}", fields["name"].description)
    lines += ["part:", *_line(f"  file: {_scalar(part_file)}", "STEP file, relative to the folder of this spec")]
    chosen = f"  solid: {_scalar(solid)}" if solid is not None else "  # solid: 1"
    lines += _line(chosen, "which solid, if the file has several: its number from 1, or its name")
    lines += _line(f"resin: {_scalar(resin)}", f"one of {', '.join(catalog.resin_names())}")
    lines += ["pull:", *_keys(Pull, margin="  ")]
    lines.append(_OPTIONAL)
    for key, info in fields.items():
        if key not in ("name", "part", "resin", "pull"):
            lines += [*_section(key, info), ""]
    return "\n".join(lines).rstrip("\n") + "\n"


def _section(key: str, info: FieldInfo) -> Iterator[str]:
    model = info.annotation
    if isinstance(model, type) and issubclass(model, BaseModel):
        yield f"## {info.description}"
        yield f"# {key}:"
        yield from _keys(model, margin="#   ")
    else:
        yield f"## {info.description}"
        yield f"# {key}: {_scalar(_example(info))}"


def _keys(model: type[BaseModel], margin: str) -> Iterator[str]:
    for name, field in model.model_fields.items():
        value = _example(field)
        if value is not None:
            yield from _line(f"{margin}{name}: {_scalar(value)}", field.description)


def _example(info: FieldInfo) -> Any:
    """Return what to show for a key: its example or its default; None for a key that needs no showing."""
    if info.examples:
        return info.examples[0]
    automatic = any(m is OR_AUTO or (isinstance(m, Number) and m.auto) for m in info.metadata)
    return AUTO if automatic else info.default


def _line(text: str, comment: str | None) -> list[str]:
    """Return `text` with a comment to its right, wrapped so that it stays a comment when the line is put to use."""
    column = max(_COMMENT_COLUMN, len(text) + 2)
    wrapped = textwrap.wrap(comment or "", _WIDTH - column - 2, break_on_hyphens=False)
    margin = "# " if text.startswith("#") else ""
    rows = [f"{text:{column}}# {wrapped[0]}"] if wrapped else [text]
    return rows + [f"{margin:{column}}# {more}" for more in wrapped[1:]]


_PLAIN: Final = re.compile(r"[A-Za-z_./][\w ./-]*[\w/-]|[A-Za-z_]", re.ASCII)
_NOT_TEXT: Final = frozenset({"true", "false", "null", "yes", "no", "on", "off", "y", "n"})


def _scalar(value: Any) -> str:
    """Return `value` as YAML on one line."""
    if isinstance(value, dict):
        return "{" + ", ".join(f"{k}: {_scalar(v)}" for k, v in value.items()) + "}"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(map(_scalar, value)) + "]"
    if isinstance(value, str) and _PLAIN.fullmatch(value) and value.lower() not in _NOT_TEXT:
        return value
    return f"{value:g}" if isinstance(value, float) else json.dumps(value, ensure_ascii=False)
