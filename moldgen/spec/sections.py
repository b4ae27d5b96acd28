"""The optional sections of the spec, each with its keys, limits and defaults.

In the loaded spec None stands for `auto`. Points are in part coordinates [mm]: as in the part's own STEP file.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, Field, model_validator

from moldgen.catalog import steel
from moldgen.spec.fields import (
    OR_AUTO,
    AutoCoordinate,
    AutoLength,
    AutoPoint,
    Flag,
    Gap,
    Length,
    Number,
    Point,
    Section,
    Text,
    catalog_name,
    none_if_auto,
    refuse,
)
from moldgen.units import Measure

AutoDraft = Annotated[float | None, Number(Measure.ANGLE, least=0.0, most=45.0, auto=True)]
TextureDepth = Annotated[float, Number(Measure.LENGTH, least=0.0, most=1.0)]
TextureSlope = Annotated[float, Number(Measure.ANGLE, least=0.0, most=45.0)]


def _known_steel(number: str) -> str:
    return catalog_name(steel, number)


Material = Annotated[Text, AfterValidator(_known_steel)]


class Draft(Section):
    """Taper that lets the part slide out of the steel."""

    minimum: AutoDraft = Field(default=None, description="least draft of a wall [deg]; auto takes it from the resin")
    texture_depth: TextureDepth = Field(default=0.0, description="depth of the surface texture [mm]")
    texture_slope: TextureSlope = Field(
        # published values contradict each other: 1.0, 1.5 and about 1.9 deg; the mildest is the default
        default=1.0,
        description="extra draft for each 0.025 mm of texture depth [deg]",
    )


class Parting(Section):
    """Where the mold parts."""

    height: AutoCoordinate = Field(
        default=None, description="height of the flat parting surface: part coordinate along the pull [mm]"
    )
    undercuts: Literal["release", "release_or_fill", "fill", "refuse"] = Field(
        default="release",
        description="what to do where no straight pull releases the part: release plans slides and lifters and stops "
        "where none helps; fill molds the part with these places filled, and says what it gains; release_or_fill fills "
        "what no side action releases; refuse names the places and stops",
    )


class Blocks(Section):
    """Size and steel of the cavity and core blocks."""

    length: AutoLength = Field(default=None, description="size of both blocks along x of the mold [mm]")
    width: AutoLength = Field(default=None, description="size of both blocks along y of the mold [mm]")
    cavity_height: AutoLength = Field(default=None, description="height of the cavity block along the pull [mm]")
    core_height: AutoLength = Field(default=None, description="height of the core block along the pull [mm]")
    wall: AutoLength = Field(default=None, description="least steel between the part and the side of a block [mm]")
    material: Material = Field(default="1.2311", description="steel of both blocks")
    cavity_material: Material | None = Field(
        default=None, description="steel of the cavity block if it differs", examples=["1.2343"]
    )
    core_material: Material | None = Field(
        default=None, description="steel of the core block if it differs", examples=["1.2343"]
    )


class CorePins(Section):
    """Round cores made as pins of their own."""

    pick: Literal["auto", "none"] = Field(
        default="auto", description="auto makes a pin of each round core that suits; none only of those in `at`"
    )
    largest: Length = Field(default=20.0, description="largest diameter that auto makes a pin of [mm]")
    at: tuple[Point, ...] = Field(
        default=(), description="points in round cores that shall be pins in any case [mm]", examples=[[]]
    )


class Gate(Section):
    """Where the melt enters the cavity: one gate."""

    kind: Literal["auto", "edge", "pin", "sprue"] = Field(
        default="auto", description="auto, edge (from the side, at the parting line), pin or sprue (from above)"
    )
    at: AutoPoint = Field(default=None, description="the point of the part nearest to the gate [mm]")
    width: AutoLength = Field(default=None, description="width of an edge gate [mm]")
    depth: AutoLength = Field(default=None, description="depth of an edge gate [mm]")
    diameter: AutoLength = Field(default=None, description="diameter of a pin or sprue gate at the part [mm]")
    land: AutoLength = Field(default=None, description="length of the narrow part of the gate [mm]")

    @model_validator(mode="after")
    def _sizes_suit_the_kind(self) -> Gate:
        owners = {"width": ("edge",), "depth": ("edge",), "diameter": ("pin", "sprue")}
        for key, kinds in owners.items():
            if getattr(self, key) is not None and self.kind not in kinds:
                named = " or ".join(kinds)
                refuse(f"{key} belongs to a gate of kind {named}, and kind is {self.kind}", f"write kind: {kinds[0]}")
        return self


class EjectorPin(Section):
    """One ejector pin placed by the user."""

    at: Point = Field(description="point of the part that the pin pushes on [mm]")
    diameter: AutoLength = Field(default=None, description="diameter of the pin [mm]")


class Ejection(Section):
    """How the part is pushed off the core."""

    pins: Annotated[tuple[EjectorPin, ...] | None, BeforeValidator(none_if_auto), OR_AUTO] = Field(
        default=None, description="auto, or a list of pins, each {at: [x, y, z], diameter: mm}"
    )
    add: Flag = Field(
        default=True,
        description="whether moldgen may add pins; by default true when pins is auto, false when pins are given",
    )
    diameter: AutoLength = Field(default=None, description="diameter of the pins that moldgen places [mm]")
    edge_clearance: Gap = Field(
        default=1.0,  # common practice
        description="least steel between a pin and an edge of the part's outline or another bore [mm]",
    )
    stroke: AutoLength = Field(default=None, description="travel of the ejectors [mm]")

    @model_validator(mode="before")
    @classmethod
    def _given_pins_are_all(cls, value: Any) -> Any:
        given = isinstance(value, dict) and isinstance(value.get("pins"), (list, tuple))
        return {"add": False, **value} if given else value

    @model_validator(mode="after")
    def _someone_places_pins(self) -> Ejection:
        if self.pins is None and not self.add:
            refuse("pins is auto, but add: false forbids to place any", "delete add, or give the pins, or pins: []")
        return self


class Mark(Section):
    """What must stay off one face of the part."""

    face: Point = Field(description="a point on or near the face that is meant [mm]")
    no_gate: Flag = Field(default=False, description="true keeps the gate off this face")
    no_pins: Flag = Field(default=False, description="true keeps ejector pins off this face")
    no_parting_line: Flag = Field(default=False, description="true keeps the parting line off this face")

    @model_validator(mode="after")
    def _forbids_something(self) -> Mark:
        if not (self.no_gate or self.no_pins or self.no_parting_line):
            refuse("this mark forbids nothing", "set no_gate, no_pins or no_parting_line to true")
        return self


class Output(Section):
    """What is written, and where."""

    step: Literal["ap242", "ap214"] = Field(default="ap242", description="application protocol of the STEP files")
    pictures: Flag = Field(default=True, description="false leaves out the pictures")
    folder: Text | None = Field(
        default=None, description="folder that receives the result; by default out/ and the name", examples=["out"]
    )
