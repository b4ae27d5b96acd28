"""Where the part comes from: a STEP file, a recipe in the spec, or a Python function."""

from __future__ import annotations

from typing import Annotated

from pydantic import Field, PlainValidator, model_validator

from moldgen.spec.fields import Section, Text, Written, as_text, refuse, shown
from moldgen.spec.recipe import Recipe


def _solid(value: object) -> int | str:
    if isinstance(value, int) and not isinstance(value, bool):
        if value < 1:
            refuse(f"there is no solid {value}", "count solids from 1, or give the solid's name")
        return int(value)
    if not isinstance(value, str):
        refuse(f"{shown(value)} is not a solid", 'write its number, such as 1, or its name, such as "lid"')
    return str(as_text(value))


SolidChoice = Annotated[int | str, PlainValidator(_solid), Written({"type": ["integer", "string"]})]


class PartSource(Section):
    """One of `file`, `recipe` or `function`."""

    file: Text | None = Field(default=None, description="STEP file of the part, relative to the folder of the spec")
    solid: SolidChoice | None = Field(
        default=None, description="which solid, if the file has several: its number from 1, or its name"
    )
    recipe: Recipe | None = Field(default=None, description="parametric recipe of the part")
    function: Text | None = Field(
        default=None, description='"file.py:name" of a function that returns the part; runs only with --allow-code'
    )

    @model_validator(mode="after")
    def _one_source(self) -> PartSource:
        given = [key for key in ("file", "recipe", "function") if getattr(self, key) is not None]
        if len(given) != 1:
            said = " and ".join(given) if given else "none"
            refuse(f"the part needs one of file, recipe and function; given: {said}", "keep exactly one of the three")
        if self.solid is not None and self.file is None:
            refuse("solid chooses among the solids of a file, but no file is given", "delete solid")
        if self.function is not None and not _names_a_function(self.function):
            refuse(f'"{shown(self.function)}" does not name a function', 'write "file.py:name"')
        return self


def _names_a_function(text: str) -> bool:
    file, _, name = text.rpartition(":")
    return file.endswith(".py") and name.isidentifier()
