"""Closed outlines for extruded, revolved and lofted features."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag

from moldgen.spec.recipe_fields import Angle, Count, Extent, Point2, RecipeModel, Size

At = Annotated[Point2, Field(description="centre of the outline on its plane [u, v]")]
ORIGIN: Any = (0.0, 0.0)


class _Outline(RecipeModel):
    """What every outline may have."""

    minus: Annotated[tuple[Profile, ...], Field(description="outlines cut out of this one (holes)")] = ()


class Circle(_Outline):
    """A circle."""

    shape: Literal["circle"]
    diameter: Annotated[Size, Field(description="diameter")]
    at: At = ORIGIN


class Ellipse(_Outline):
    """An ellipse."""

    shape: Literal["ellipse"]
    size: Annotated[tuple[Size, Size], Field(description="both axes, end to end [along u, along v] before turning")]
    at: At = ORIGIN
    angle: Annotated[Angle, Field(description="turn about the centre")] = 0  # type: ignore[assignment]


class Rectangle(_Outline):
    """A rectangle, with rounded corners if wanted."""

    shape: Literal["rectangle"]
    size: Annotated[tuple[Size, Size], Field(description="[along u, along v] before turning")]
    radius: Annotated[Extent, Field(description="corner radius")] = 0  # type: ignore[assignment]
    at: At = ORIGIN
    angle: Annotated[Angle, Field(description="turn about the centre")] = 0  # type: ignore[assignment]


class Polygon(_Outline):
    """A regular polygon; a corner lies on +u before turning."""

    shape: Literal["polygon"]
    sides: Annotated[Count, Field(description="number of sides, 3 or more")]
    diameter: Annotated[Size, Field(description="across corners or across flats")]
    across: Annotated[Literal["corners", "flats"], Field(description="what `diameter` measures")] = "corners"
    radius: Annotated[Extent, Field(description="corner radius")] = 0  # type: ignore[assignment]
    at: At = ORIGIN
    angle: Annotated[Angle, Field(description="turn about the centre")] = 0  # type: ignore[assignment]


class Slot(_Outline):
    """A slot with round ends."""

    shape: Literal["slot"]
    length: Annotated[Size, Field(description="overall length along u before turning, ends included")]
    width: Annotated[Size, Field(description="width = diameter of the ends")]
    at: At = ORIGIN
    angle: Annotated[Angle, Field(description="turn about the centre")] = 0  # type: ignore[assignment]


class Blob(_Outline):
    """A smooth closed curve through points."""

    shape: Literal["spline"]
    points: Annotated[tuple[Point2, ...], Field(min_length=3, description="points in order, the first not repeated")]


class LineStep(RecipeModel):
    """A straight line to a point."""

    line: Annotated[Point2, Field(description="end point")]
    round: Annotated[Size | None, Field(description="radius that rounds the corner at the end point")] = None


class ArcStep(RecipeModel):
    """A circular arc to a point: through a point, with a radius, or tangent to the step before."""

    arc: Annotated[Point2, Field(description="end point")]
    through: Annotated[Point2 | None, Field(description="a point on the arc")] = None
    radius: Annotated[Size | None, Field(description="radius; the shorter arc is meant")] = None
    side: Annotated[
        Literal["left", "right"],
        Field(description="on which side of the straight line from start to end the arc bulges (with `radius`)"),
    ] = "left"
    tangent: Annotated[bool, Field(description="leave the step before without a corner")] = False
    round: Annotated[Size | None, Field(description="radius that rounds the corner at the end point")] = None

    def model_post_init(self, _: object) -> None:
        """Check that the arc is defined in exactly one way."""
        if sum((self.through is not None, self.radius is not None, self.tangent)) != 1:
            raise ValueError("an arc needs exactly one of 'through', 'radius' and 'tangent: true'")


class SplineStep(RecipeModel):
    """A smooth curve through points; the last one is the end point."""

    spline: Annotated[
        tuple[Point2, ...], Field(min_length=2, description="points after the start, the last is the end")
    ]
    start_tangent: Annotated[Point2 | None, Field(description="direction at the start")] = None
    end_tangent: Annotated[Point2 | None, Field(description="direction at the end")] = None
    round: Annotated[Size | None, Field(description="radius that rounds the corner at the end point")] = None


def _step_kind(value: Any) -> str | None:
    keys = value if isinstance(value, dict) else dict(value) if isinstance(value, RecipeModel) else {}
    return next((k for k in ("line", "arc", "spline") if k in keys), None)


Step = Annotated[
    Annotated[LineStep, Tag("line")] | Annotated[ArcStep, Tag("arc")] | Annotated[SplineStep, Tag("spline")],
    Discriminator(
        _step_kind,
        custom_error_type="step",
        custom_error_message="a step of a path starts with one of the keys 'line', 'arc' or 'spline'",
    ),
]


class Path(_Outline):
    """An outline of lines, arcs and splines; the last point is joined to the first by a line if they differ."""

    shape: Literal["path"]
    start: Annotated[Point2, Field(description="first point")]
    steps: Annotated[tuple[Step, ...], Field(min_length=1, description="lines, arcs and splines in order")]
    round: Annotated[Size | None, Field(description="radius that rounds the corner at the first point")] = None


Profile = Annotated[
    Circle | Ellipse | Rectangle | Polygon | Slot | Blob | Path,
    Field(discriminator="shape", description="closed outline"),
]

for _model in (Circle, Ellipse, Rectangle, Polygon, Slot, Blob, Path):
    _model.model_rebuild()
