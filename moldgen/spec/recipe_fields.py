"""The kinds of value a recipe is made of: sizes, points, directions, and choices of faces and edges."""

from __future__ import annotations

import re
from functools import partial
from typing import Annotated, Any, Final, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, PlainSerializer, PlainValidator, WithJsonSchema

from moldgen.spec.expression import Dimension, Expression, Sign, parse
from moldgen.spec.fields import OrWritten

Mapping = dict[str, Any]
NAME_PATTERN: Final = r"[A-Za-z][A-Za-z0-9_-]*"


class RecipeModel(BaseModel):
    """Base of everything in a recipe: unknown keys are errors, values never change."""

    model_config = ConfigDict(extra="forbid", frozen=True, validate_default=True)


def _sized(what: str, dimension: Dimension, sign: Sign = Sign.ANY, *, whole: bool = False) -> Any:
    return (
        PlainValidator(partial(parse, dimension=dimension, sign=sign, whole=whole)),
        PlainSerializer(lambda e: e.source if isinstance(e, Expression) else e),
        WithJsonSchema({"type": ["number", "string"], "description": f"{what}: number, text with unit or expression"}),
    )


Number = Annotated[Expression, *_sized("plain number", Dimension.NUMBER)]
Length = Annotated[Expression, *_sized("length [mm]", Dimension.LENGTH)]
Size = Annotated[Expression, *_sized("length [mm] above zero", Dimension.LENGTH, Sign.POSITIVE)]
Extent = Annotated[Expression, *_sized("length [mm], zero or more", Dimension.LENGTH, Sign.NOT_NEGATIVE)]
Angle = Annotated[Expression, *_sized("angle [deg]", Dimension.ANGLE)]
Slope = Annotated[Expression, *_sized("angle [deg], zero or more", Dimension.ANGLE, Sign.NOT_NEGATIVE)]
Turn = Annotated[Expression, *_sized("angle [deg] above zero", Dimension.ANGLE, Sign.POSITIVE)]
Count = Annotated[Expression, *_sized("whole number above zero", Dimension.NUMBER, Sign.POSITIVE, whole=True)]

Point2 = tuple[Length, Length]
Point3 = tuple[Length, Length, Length]
Place = Annotated[
    tuple[Length, Length] | tuple[Length, Length, Length],
    Field(description="point on the plane of the feature: [u, v], or [u, v, height above the plane]"),
]


def _name(value: object) -> object:
    if isinstance(value, str) and not re.fullmatch(NAME_PATTERN, value):
        raise ValueError(f"name '{value}' must start with a letter and hold letters, digits, _ and - only")
    return value


Name = Annotated[str, BeforeValidator(_name), Field(max_length=60)]

# --- directions and planes -------------------------------------------------------------------------------------------
AXES: Final = ("+x", "-x", "+y", "-y", "+z", "-z")


def _direction(value: object) -> object:
    if isinstance(value, str):
        text = value.replace(" ", "").lower()
        text = text if text[:1] in "+-" else f"+{text}"
        if text not in AXES:
            raise ValueError(f"direction '{value}' must be one of {', '.join(AXES)} or three numbers [x, y, z]")
        return text
    return value


Direction = Annotated[
    Literal["+x", "-x", "+y", "-y", "+z", "-z"] | tuple[Number, Number, Number],
    BeforeValidator(_direction),
    Field(description="+x, -x, +y, -y, +z, -z, or a vector [x, y, z]"),
]

# --- selectors -------------------------------------------------------------------------------------------------------
SIDES: Final = ("top", "bottom", "left", "right", "front", "back")
"""Extreme faces: +z, -z, -x, +x, -y, +y."""

FACE_WORDS: Final = (*SIDES, "walls", "planar", "all")
EDGE_WORDS: Final = (
    *SIDES,
    *("vertical", "horizontal", "straight", "round", "convex", "concave", "outer", "inner", "all"),
)


class Choice(RecipeModel):
    """Faces or edges by geometry, when the short text form does not reach: conditions that must all hold."""

    select: Annotated[str, Field(description="text form, e.g. 'top of lid', 'concave', 'between boss and floor'")] = (
        "all"
    )
    within: Annotated[
        tuple[Point3, Point3] | None,
        Field(description="two opposite corners of a box that must hold the whole edge, or the middle of the face"),
    ] = None
    at: Annotated[Point3 | None, Field(description="the face or edge nearest to this point")] = None


class Words(RecipeModel):
    """The text form of a choice, taken apart."""

    words: tuple[str, ...]
    of: str | None = None
    between: tuple[str, str] | None = None


def split_words(text: str, known: tuple[str, ...]) -> Words:
    """Take ``"concave top of boss"`` or ``"between boss and floor"`` apart.

    Parameters
    ----------
    text : the choice as written
    known : the words allowed before ``of`` and ``between``

    Raises
    ------
    ValueError : an unknown word, or a sentence that cannot be understood
    """
    match = re.fullmatch(
        rf"\s*(?P<words>[a-z\s]*?)\s*(?:\bof\s+(?P<of>{NAME_PATTERN})"
        rf"|\bbetween\s+(?P<a>{NAME_PATTERN})\s+and\s+(?P<b>{NAME_PATTERN}))?\s*",
        text,
    )
    if match is None:
        raise ValueError(f"cannot understand '{text}'; write e.g. 'top of NAME', 'vertical', 'between NAME and NAME'")
    words = tuple(match["words"].split())
    for word in words:
        if word not in known:
            raise ValueError(
                f"unknown word '{word}' in '{text}'; known: {', '.join(known)}, of NAME, between NAME and NAME"
            )
    between = (match["a"], match["b"]) if match["a"] else None
    if not words and not match["of"] and between is None:
        raise ValueError("the choice is empty; write e.g. 'top of NAME'")
    return Words(words=words, of=match["of"], between=between)


def _as_choices(value: object, known: tuple[str, ...]) -> object:
    items = value if isinstance(value, (list, tuple)) else [value]
    choices = [{"select": i} if isinstance(i, str) else i for i in items]
    for choice in choices:
        text = choice.get("select") if isinstance(choice, dict) else getattr(choice, "select", None)
        if isinstance(text, str):
            split_words(text, known)
    return choices


def _choices(what: str, known: tuple[str, ...]) -> Any:
    return (
        BeforeValidator(partial(_as_choices, known=known)),
        Field(min_length=1, description=f"{what}: text, mapping (select, within, at) or a list of them"),
        OrWritten({"type": ["string", "object"]}),
        OrWritten({"type": "array", "items": {"type": ["string", "object"]}, "minItems": 1}),
    )


FaceChoice = Annotated[tuple[Choice, ...], *_choices(f"faces ({', '.join(FACE_WORDS)}, of NAME)", FACE_WORDS)]
EdgeChoice = Annotated[
    tuple[Choice, ...],
    *_choices(f"edges ({', '.join(EDGE_WORDS)}, of NAME, between NAME and NAME)", EDGE_WORDS),
]


class PlaneOn(RecipeModel):
    """Where a sketch or a feature stands.

    On a coordinate plane u, v are x, y (xy), x, z (xz) or y, z (yz) and the feature grows toward +z, +y or +x; `flip`
    turns only the growth round. On a face u, v are the same part coordinates and the feature grows out of the face.
    """

    plane: Annotated[Literal["xy", "xz", "yz"] | None, Field(description="coordinate plane")] = None
    face: Annotated[str | None, Field(description="planar face, e.g. 'top of base'")] = None
    offset: Annotated[
        Length | None, Field(description="distance of the plane along the growth direction before flip")
    ] = None
    flip: Annotated[bool, Field(description="grow the other way")] = False
    origin: Annotated[
        Literal["part", "centre"],
        Field(description="where u = v = 0 lies: at the part's origin, or at the centre of the face"),
    ] = "part"

    def model_post_init(self, _: object) -> None:
        """Check that exactly one of plane and face is given."""
        if (self.plane is None) == (self.face is None):
            raise ValueError("give either 'plane' or 'face'")
        if self.face is not None:
            split_words(self.face, FACE_WORDS)
        if self.plane is not None and self.origin == "centre":
            raise ValueError("origin: centre needs a face")


def _plane(value: object) -> object:
    if isinstance(value, str):
        return {"plane": value} if value in ("xy", "xz", "yz") else {"face": value}
    return value


On = Annotated[
    PlaneOn,
    BeforeValidator(_plane),
    Field(description="xy, xz, yz, a face such as 'top of base', or a mapping (plane|face, offset, flip, origin)"),
    OrWritten({"type": "string"}),
]
XY: Final = PlaneOn(plane="xy")
