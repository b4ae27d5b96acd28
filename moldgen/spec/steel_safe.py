"""The section `steel_safe`: dimensions of the part that will be tuned after the first shots."""

from __future__ import annotations

from typing import Annotated, Final, Literal

from pydantic import Field

from moldgen.spec.fields import Flag, Number, Point, Section
from moldgen.units import Measure

MOST: Final = 2.0
"""mm: more steel left on one face is no tuning any more, but another part (our choice)."""

AutoAllowance = Annotated[float | None, Number(Measure.LENGTH, above=0.0, most=MOST, auto=True)]


class TunedPlace(Section):
    """One face or feature of the part that will be tuned, named by a point."""

    at: Point = Field(description="a point on the face, or in the hole, slot, pin, wall or lip that is meant [mm]")
    face: Flag = Field(
        default=False, description="true means the one face nearest to the point; false the whole hole, slot, pin ..."
    )
    fit: Literal["press", "snap", "other"] = Field(default="other", description="what it will be: press, snap or other")
    allowance: AutoAllowance = Field(default=None, description="steel to leave on each face of it [mm]")


class SteelSafe(Section):
    """Where steel should be left on until the first shots are measured. Advice: the steel itself is cut to size."""

    find: Literal["auto", "none"] = Field(
        default="auto",
        description="auto also lists the snap fits and press fits that moldgen finds; none only those in `places`",
    )
    allowance: AutoAllowance = Field(
        default=None,
        description="steel to leave on each face; auto goes by the kind of fit and the doubt in shrink [mm]",
    )
    places: tuple[TunedPlace, ...] = Field(
        default=(),
        description="faces and features that will be tuned, each {at: [x, y, z], face, fit, allowance}",
        examples=[[]],
    )
