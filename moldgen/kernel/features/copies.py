"""Patterns and mirrors: the same steps again elsewhere."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Final

from OCP.gp import gp_Ax2, gp_Trsf

from moldgen.errors import PartError
from moldgen.kernel.features.frame import Array, X, Y, Z, axis, direction, pnt, unit, vec
from moldgen.kernel.features.shapes import moved
from moldgen.kernel.features.tools import Step, Values

MOST_COPIES: Final = 2000
"""A pattern with more copies is a slip of the pen, and would run for hours."""

_NORMALS: Final = {"xy": Z, "xz": Y, "yz": X}


def pattern(values: Values, originals: Sequence[Step]) -> list[Step]:
    """Return the steps of every copy but the original.

    Raises
    ------
    PartError : only one copy, or far too many
    """
    transformations = _transformations(values)
    if not transformations:
        raise PartError("the pattern has one copy, the original", remedy="use a count of 2 or more")
    return [replace(step, solid=moved(step.solid, t)) for t in transformations for step in originals]


def _transformations(values: Values) -> list[gp_Trsf]:
    if values["polar"]:
        return _polar(values["polar"])
    if values["offsets"]:
        return [_shift(vec(offset)) for offset in values["offsets"]]
    rows = values["linear"]
    _limit(math.prod(row["count"] for row in rows))
    result = []
    for index in itertools.product(*(range(row["count"]) for row in rows)):
        if any(index):
            shift: Array = sum(
                (i * row["spacing"] * unit(row["direction"]) for i, row in zip(index, rows, strict=True)), 0 * X
            )
            result.append(_shift(vec(shift)))
    return result


def _polar(polar: Values) -> list[gp_Trsf]:
    count, angle = polar["count"], polar["angle"]
    _limit(count)
    if angle > 360 + 1e-9:
        raise PartError(f"an angle of {angle:g} deg is more than a full turn", remedy="use 360 or less")
    # on a full circle the last copy would fall on the first
    pitch = angle / count if angle > 360 - 1e-9 else angle / max(count - 1, 1)
    result = []
    for index in range(1, count):
        turn = gp_Trsf()
        turn.SetRotation(axis(polar["at"], polar["axis"]), math.radians(index * pitch))
        result.append(turn)
    return result


def mirror_transformation(values: Values) -> gp_Trsf:
    """Return the reflection in the plane of a mirror feature."""
    normal = _NORMALS[values["plane"]]
    reflection = gp_Trsf()
    reflection.SetMirror(gp_Ax2(pnt(values["offset"] * normal), direction(normal)))
    return reflection


def mirror(values: Values, originals: Sequence[Step]) -> list[Step]:
    """Return the mirrored steps."""
    reflection = mirror_transformation(values)
    return [replace(step, solid=moved(step.solid, reflection)) for step in originals]


def _shift(by: object) -> gp_Trsf:
    shift = gp_Trsf()
    shift.SetTranslation(by)
    return shift


def _limit(count: int) -> None:
    if count > MOST_COPIES:
        raise PartError(f"a pattern of {count} copies; the most is {MOST_COPIES}", remedy="check the counts")
