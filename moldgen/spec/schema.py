"""The whole spec, as the user may write it and as the stages read it."""

from __future__ import annotations

from typing import Annotated, Any, Final

from pydantic import AfterValidator, Field, model_validator

from moldgen.catalog import resin
from moldgen.spec.fields import Section, Text, catalog_name, refuse, shown
from moldgen.spec.pull import SHORT_PULL, SHORT_SHRINK, Pull, Shrink
from moldgen.spec.sections import Blocks, CorePins, Draft, Ejection, Gate, Mark, Output, Parting
from moldgen.spec.side_actions import SideActions
from moldgen.spec.source import PartSource
from moldgen.spec.steel_safe import SteelSafe

PLANNED: Final = {
    "inserts": "components loaded before the shot",
    "cavities": "more than one cavity",
    "runner": "runners",
    "cooling": "cooling channels",
    "vents": "vents",
    "base": "the mold base",
    "press": "the injection machine",
}
"""Sections that a later version will read. Writing one is an error: it would have no effect."""


def _known_resin(name: str) -> str:
    return catalog_name(resin, name)


_NOT_IN_FOLDERS: Final = frozenset('<>:"/\\|?*')
"""Characters that some file system or other refuses."""

LONGEST_NAME: Final = 60


def folder_name(text: str) -> str:
    """Return `text` with what a folder's name cannot hold replaced or cut off."""
    kept = "".join("_" if c in _NOT_IN_FOLDERS or not c.isprintable() else c for c in text)
    return kept.strip(". ")[:LONGEST_NAME].strip(". ") or "spec"


def _file_name(name: str) -> str:
    if name != folder_name(name):
        refuse(f'"{shown(name)}" cannot name a folder', "use at most 60 letters, digits, spaces, - and _")
    return name


class Spec(Section):
    """One part, how it leaves the mold, and whatever the designer wants to decide."""

    name: Annotated[Text, AfterValidator(_file_name)] = Field(
        default="", description="name of the tool and of its output folder; by default the spec's file name"
    )
    part: PartSource = Field(description="where the part comes from: a STEP file, a recipe or a Python function")
    resin: Annotated[Text, AfterValidator(_known_resin)] = Field(description="the plastic, a name of the catalog")
    pull: Annotated[Pull, SHORT_PULL] = Field(
        default=Pull(), description="direction along which the cavity half leaves the part"
    )
    shrink: Annotated[Shrink, SHORT_SHRINK] = Field(
        default=Shrink(), description="how much the part shrinks: auto, a percentage, or its own section [%]"
    )
    draft: Draft = Field(default=Draft(), description="taper that lets the part slide out of the steel")
    parting: Parting = Field(default=Parting(), description="where the mold parts")
    side_actions: SideActions = Field(
        default=SideActions(), description="slides and lifters for what no straight pull releases"
    )
    blocks: Blocks = Field(default=Blocks(), description="size and steel of the cavity and core blocks")
    core_pins: CorePins = Field(default=CorePins(), description="round cores made as pins of their own")
    gate: Gate = Field(default=Gate(), description="where the melt enters the cavity")
    ejection: Ejection = Field(default=Ejection(), description="how the part is pushed off the core")
    marks: tuple[Mark, ...] = Field(
        default=(),
        description="what must stay off the face nearest to a point: no_gate, no_pins, no_parting_line",
        examples=[[{"face": [0, 0, 10], "no_gate": True}]],
    )
    steel_safe: SteelSafe = Field(
        default=SteelSafe(), description="dimensions that will be tuned, and how much steel to leave on for that"
    )
    output: Output = Field(default=Output(), description="what is written, and where")

    @model_validator(mode="before")
    @classmethod
    def _empty_sections_are_absent(cls, value: Any) -> Any:
        """Let a section whose lines are all commented out mean its defaults."""
        if not isinstance(value, dict):
            return value
        needed = [key for key, info in cls.model_fields.items() if info.is_required()]
        return {k: v for k, v in value.items() if v is not None or k in needed or k not in cls.model_fields}
