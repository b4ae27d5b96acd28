"""Dimensions that are likely to be tuned after the first shots, and where steel is left on for that. Advice only."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from moldgen.model.part import Vector


class Fit(StrEnum):
    """What a dimension is for; what is surest to be tuned first."""

    MARKED = "other fit"
    SNAP = "snap fit"
    PRESS = "press fit"


@dataclass(frozen=True)
class SteelSafe:
    """One dimension of the part that is likely to be tuned, or several equal ones.

    feature, dimension : "hole in a boss", "diameter"
    places : of each of the equal ones, in part coordinates [mm]; formed_by : the components that form them
    nominal_mm : of the part as drawn
    allowance_mm : steel to leave on each face; faces : of the dimension on which it is left, 1 or 2
    steel_first_mm, steel_last_mm : the dimension in the steel, shrink included, as it starts and as it would end; the
        files of the tool have the last one
    steel_safe : which way is safe, in words
    source : of the allowance; why : the reason for listing it
    given : number of its entry in `steel_safe.places`, -1 if moldgen found it
    """

    fit: Fit
    feature: str
    dimension: str
    places: tuple[Vector, ...]
    formed_by: tuple[str, ...]
    nominal_mm: float
    allowance_mm: float
    faces: int
    steel_first_mm: float
    steel_last_mm: float
    steel_safe: str
    source: str
    why: str
    given: int = -1
