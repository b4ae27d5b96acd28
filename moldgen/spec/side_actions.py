"""The section `side_actions`: what the designer decides about slides and lifters."""

from __future__ import annotations

from typing import Annotated, Final, Literal

from pydantic import Field, PlainValidator

from moldgen.spec.fields import AutoLength, Flag, Point, Section, Written, refuse
from moldgen.spec.pull import Vector, read_direction, written_direction

_WRITTEN_DIRECTION: Final = Written(written_direction(auto=False))


def _direction(value: object) -> Vector:
    found = read_direction(value)
    if isinstance(found, tuple):
        return found
    refuse("a side action given by hand needs a direction", 'write "+x" or [1, 0, 0]')


class SideAction(Section):
    """One slide or lifter, as far as the designer decides it; moldgen checks that it releases the part."""

    at: Point = Field(description="a point in or on the undercut that it forms [mm]")
    direction: Annotated[Vector, PlainValidator(_direction), _WRITTEN_DIRECTION] = Field(
        description='the way the steel leaves the part: an axis such as "+x", or [x, y, z]'
    )
    kind: Literal["slide", "lifter"] = Field(
        default="slide", description="slide (leaves to the side) or lifter (moves aside with the ejectors)"
    )
    width: AutoLength = Field(default=None, description="width of its face across the pull, about the undercut [mm]")
    height: AutoLength = Field(default=None, description="height of its face along the pull, about the undercut [mm]")


class SideActions(Section):
    """Slides and lifters for what no straight pull releases."""

    given: tuple[SideAction, ...] = Field(
        default=(),
        description="side actions that the designer decides, each {at: [x, y, z], direction, kind, width, height}",
        examples=[[]],
    )
    add: Flag = Field(default=True, description="whether moldgen may plan more of them")
    lifters: Flag = Field(default=True, description="false allows slides only")
