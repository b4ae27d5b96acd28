"""Features that make or remove material: blocks, profiles, holes, bosses, ribs, windows, snap hooks."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field

from moldgen.spec.recipe_fields import (
    XY,
    Angle,
    Count,
    Direction,
    Extent,
    FaceChoice,
    Length,
    Name,
    On,
    Place,
    Point3,
    RecipeModel,
    Size,
    Slope,
    Turn,
)
from moldgen.spec.recipe_profiles import Profile

ZERO2: Any = (0.0, 0.0)
ZERO3: Any = (0.0, 0.0, 0.0)
ZERO: Any = 0


class FeatureBase(RecipeModel):
    """What every feature has."""

    name: Annotated[Name, Field(description="name of the feature, used in messages and in 'top of NAME'")]


class _Body(FeatureBase):
    body: Annotated[Name, Field(description="body that the feature works on")] = "part"


class _Solid(_Body):
    mode: Annotated[
        Literal["add", "cut", "intersect", "new"],
        Field(description="add to the body, cut from it, keep what is common, or start a new body with this name"),
    ] = "add"


class Block(_Solid):
    """A rectangular block, standing on its plane."""

    feature: Literal["block"]
    size: Annotated[tuple[Size, Size, Size], Field(description="[along u, along v, height]")]
    at: Place = ZERO2
    on: On = XY
    radius: Annotated[Extent, Field(description="radius of the upright edges")] = ZERO
    draft: Annotated[Angle, Field(description="slope of the walls, positive = smaller away from the plane")] = ZERO
    angle: Annotated[Angle, Field(description="turn about the centre")] = ZERO


class Cylinder(_Solid):
    """A cylinder or cone, standing on its plane."""

    feature: Literal["cylinder"]
    diameter: Annotated[Size, Field(description="diameter on the plane")]
    height: Annotated[Size, Field(description="height")]
    at: Place = ZERO2
    on: On = XY
    draft: Annotated[Angle, Field(description="slope of the wall, positive = smaller away from the plane")] = ZERO


class Sphere(_Solid):
    """A ball."""

    feature: Literal["sphere"]
    diameter: Annotated[Size, Field(description="diameter")]
    at: Annotated[Point3, Field(description="centre [x, y, z]")] = ZERO3


class Torus(_Solid):
    """A ring of round section."""

    feature: Literal["torus"]
    diameter: Annotated[Size, Field(description="diameter of the centre line")]
    section: Annotated[Size, Field(description="diameter of the section")]
    at: Annotated[Point3, Field(description="centre [x, y, z]")] = ZERO3
    axis: Direction = "+z"


class Extrude(_Solid):
    """An outline moved away from its plane, with slope if wanted."""

    feature: Literal["extrude"]
    profile: Profile
    height: Annotated[Size, Field(description="how far")]
    on: On = XY
    at: Place = ZERO2
    draft: Annotated[Angle, Field(description="slope of the walls, positive = smaller away from the plane")] = ZERO
    both: Annotated[bool, Field(description="half of the height to each side of the plane (no draft)")] = False


class Revolve(_Solid):
    """An outline turned about an axis: u is the distance from the axis, v the place along it."""

    feature: Literal["revolve"]
    profile: Profile
    axis: Direction = "+z"
    at: Annotated[Point3, Field(description="point of the axis that is u = v = 0")] = ZERO3
    angle: Annotated[Turn, Field(description="how far, 360 at most")] = 360  # type: ignore[assignment]
    start: Annotated[Angle, Field(description="where the turn starts, from +x (or +y for an x axis)")] = ZERO


class Section(RecipeModel):
    """One outline of a loft."""

    profile: Profile
    height: Annotated[Length, Field(description="height above the plane of the loft")]


class Loft(_Solid):
    """A solid through outlines at different heights."""

    feature: Literal["loft"]
    sections: Annotated[tuple[Section, ...], Field(min_length=2, description="outlines in order")]
    on: On = XY
    ruled: Annotated[bool, Field(description="straight between the outlines instead of smooth")] = True


class Shell(_Body):
    """Hollow the body out to a wall of constant thickness."""

    feature: Literal["shell"]
    thickness: Annotated[Size, Field(description="wall thickness, kept inside the outer faces")]
    open: FaceChoice


class Counterbore(RecipeModel):
    """A flat-bottomed widening at the entry of a hole."""

    diameter: Annotated[Size, Field(description="diameter")]
    depth: Annotated[Size, Field(description="depth")]
    draft: Annotated[Slope, Field(description="slope of its wall, wider at the entry")] = ZERO


class Countersink(RecipeModel):
    """A conical widening at the entry of a hole."""

    diameter: Annotated[Size, Field(description="diameter at the entry")]
    angle: Annotated[Turn, Field(description="included angle")] = 90  # type: ignore[assignment]


def _through(value: object) -> object:
    return None if value == "through" else value


Depth = Annotated[
    Size | None,
    BeforeValidator(_through),
    Field(description="depth from the plane, or 'through' (the whole body)"),
]


class Hole(_Body):
    """A round hole that enters at its plane and runs against the plane's growth direction (into a face)."""

    feature: Literal["hole"]
    diameter: Annotated[Size, Field(description="diameter at the entry")]
    at: Annotated[Place, Field(description="centre of the entry")]
    on: On = XY
    depth: Depth = None
    draft: Annotated[Angle, Field(description="slope of the wall, positive = narrower inward")] = ZERO
    bottom: Annotated[Literal["flat", "cone", "round"], Field(description="end of a blind hole (cone: 118 deg)")] = (
        "flat"
    )
    counterbore: Annotated[Counterbore | None, Field(description="flat widening at the entry")] = None
    countersink: Annotated[Countersink | None, Field(description="conical widening at the entry")] = None


class BossHole(RecipeModel):
    """The hole of a boss, entering at the free end."""

    diameter: Annotated[Size, Field(description="diameter at the free end")]
    depth: Depth = None
    draft: Annotated[Slope, Field(description="slope of the wall, narrower inward")] = ZERO
    bottom: Annotated[Literal["flat", "cone", "round"], Field(description="end of a blind hole")] = "flat"


class Gussets(RecipeModel):
    """Triangular ribs round a boss."""

    count: Annotated[Count, Field(description="how many, evenly spaced")]
    length: Annotated[Size, Field(description="how far they reach from the boss wall on the plane")]
    height: Annotated[Size, Field(description="height at the boss")]
    thickness: Annotated[Size, Field(description="thickness on the plane")]
    draft: Annotated[Slope, Field(description="slope of the sides")] = ZERO
    start: Annotated[Angle, Field(description="direction of the first, from +u")] = ZERO


class Boss(_Body):
    """A round post, with a hole and gussets if wanted."""

    feature: Literal["boss"]
    diameter: Annotated[Size, Field(description="outer diameter at the free end")]
    height: Annotated[Size, Field(description="height above the plane")]
    at: Annotated[Place, Field(description="centre of the foot")]
    on: On = XY
    draft: Annotated[Slope, Field(description="slope of the outer wall, wider at the foot")] = ZERO
    hole: Annotated[BossHole | None, Field(description="hole from the free end")] = None
    gussets: Annotated[Gussets | None, Field(description="ribs round the boss")] = None


class Rib(_Solid):
    """A straight rib between two points of its plane."""

    feature: Literal["rib"]
    start: Annotated[Place, Field(description="one end of the centre line")]
    end: Annotated[Place, Field(description="other end of the centre line")]
    thickness: Annotated[Size, Field(description="thickness at the foot")]
    height: Annotated[Size, Field(description="height above the plane")]
    on: On = XY
    draft: Annotated[Slope, Field(description="slope of both sides")] = ZERO
    end_draft: Annotated[Slope, Field(description="slope of both ends")] = ZERO


class Window(_Body):
    """A rectangular opening through one wall."""

    feature: Literal["window"]
    size: Annotated[tuple[Size, Size], Field(description="[along u, along v] on the plane")]
    at: Annotated[Place, Field(description="centre on the plane; the wall is found by looking inward from there")]
    on: Annotated[On, Field(description="plane or face through which the window looks")]
    radius: Annotated[Extent, Field(description="corner radius")] = ZERO
    draft: Annotated[Angle, Field(description="slope of its sides, positive = narrower inward")] = ZERO
    angle: Annotated[Angle, Field(description="turn about the centre")] = ZERO
    depth: Annotated[Size | None, Field(description="how deep instead of through the wall")] = None


class SnapHook(_Body):
    """A bending snap hook: a beam that ends in a lip."""

    feature: Literal["snap_hook"]
    at: Annotated[Place, Field(description="middle of the foot, in the plane of the face that carries the lip")]
    on: On = XY
    toward: Annotated[Angle, Field(description="direction in which the lip points, from +u")] = ZERO
    length: Annotated[Size, Field(description="from the plane to the underside of the lip")]
    width: Annotated[Size, Field(description="width at the foot")]
    thickness: Annotated[Size, Field(description="thickness at the foot")]
    lip: Annotated[Size, Field(description="how far the lip stands out")]
    lip_height: Annotated[Size, Field(description="height of the lip")]
    lead_angle: Annotated[Turn, Field(description="slope of the lead-in, from the direction of assembly")] = 30  # type: ignore[assignment]
    return_angle: Annotated[Turn, Field(description="slope of the underside of the lip: 90 holds for good")] = 90  # type: ignore[assignment]
    back_draft: Annotated[Slope, Field(description="slope of the back")] = ZERO
    side_draft: Annotated[Slope, Field(description="slope of both sides")] = ZERO
    front_draft: Annotated[
        Angle, Field(description="slope of the front below the lip, positive = away from the lip")
    ] = ZERO
