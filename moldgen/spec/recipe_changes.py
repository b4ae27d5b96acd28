"""Features that change or repeat what is there: fillet, chamfer, draft, pattern, mirror, union, cut, intersect."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Field

from moldgen.spec.recipe_features import FeatureBase, _Body
from moldgen.spec.recipe_fields import (
    Count,
    Direction,
    EdgeChoice,
    FaceChoice,
    Length,
    Name,
    Point3,
    RecipeModel,
    Size,
    Turn,
)

ZERO3: Any = (0.0, 0.0, 0.0)
ZERO: Any = 0


class Fillet(_Body):
    """Round edges."""

    feature: Literal["fillet"]
    edges: EdgeChoice
    radius: Annotated[Size, Field(description="radius")]


class Chamfer(_Body):
    """Bevel edges."""

    feature: Literal["chamfer"]
    edges: EdgeChoice
    distance: Annotated[Size, Field(description="distance from the edge on both faces")]


class Draft(_Body):
    """Slope walls: they keep their place on the neutral plane and lean inward along the pull."""

    feature: Literal["draft"]
    faces: FaceChoice
    angle: Annotated[Turn, Field(description="slope")]
    pull: Direction = "+z"
    neutral: Annotated[Length, Field(description="where the walls keep their place, along the pull")] = ZERO


class Linear(RecipeModel):
    """Copies in a row."""

    direction: Direction
    count: Annotated[Count, Field(description="how many, the original included")]
    spacing: Annotated[Size, Field(description="distance from one to the next")]


class Polar(RecipeModel):
    """Copies on a circle."""

    count: Annotated[Count, Field(description="how many, the original included")]
    axis: Direction = "+z"
    at: Annotated[Point3, Field(description="point of the axis")] = ZERO3
    angle: Annotated[Turn, Field(description="whole angle; 360 closes the circle")] = 360  # type: ignore[assignment]


class Pattern(FeatureBase):
    """Repeat features: in rows, on a circle, or by given offsets."""

    feature: Literal["pattern"]
    of: Annotated[tuple[Name, ...], Field(min_length=1, description="features to repeat")]
    linear: Annotated[tuple[Linear, ...], Field(max_length=3, description="one row, or two or three for a grid")] = ()
    polar: Annotated[Polar | None, Field(description="copies on a circle")] = None
    offsets: Annotated[tuple[Point3, ...], Field(description="where each copy goes, from the original")] = ()

    def model_post_init(self, _: object) -> None:
        """Check that the pattern is of exactly one kind."""
        if sum((bool(self.linear), self.polar is not None, bool(self.offsets))) != 1:
            raise ValueError(f"pattern '{self.name}' needs exactly one of 'linear', 'polar' and 'offsets'")


class Mirror(_Body):
    """Mirror features, or the whole body, and keep the original."""

    feature: Literal["mirror"]
    of: Annotated[tuple[Name, ...], Field(description="features to mirror; none means the whole body")] = ()
    plane: Annotated[Literal["xy", "xz", "yz"], Field(description="mirror plane")]
    offset: Annotated[Length, Field(description="place of the plane along its normal")] = ZERO


class _Combine(_Body):
    tools: Annotated[tuple[Name, ...], Field(min_length=1, description="bodies made with mode: new")]
    keep: Annotated[bool, Field(description="keep the tool bodies for later features")] = False


class Union(_Combine):
    """Join bodies."""

    feature: Literal["union"]


class Cut(_Combine):
    """Remove bodies from the body."""

    feature: Literal["cut"]


class Intersect(_Combine):
    """Keep what the bodies have in common."""

    feature: Literal["intersect"]
