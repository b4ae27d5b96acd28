"""How the part leaves the cavity, and how much larger the mold is than the part."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from typing import Annotated, Any, Final, Literal

from pydantic import Field, PlainValidator, model_validator

from moldgen.spec.fields import AUTO, Number, OrWritten, Section, Written, refuse, shown, to_point
from moldgen.units import Measure

Vector = tuple[float, float, float]


@dataclass(frozen=True)
class FaceNormal:
    """The outward normal of the flat face nearest to `point` (part coordinates [mm])."""

    point: Vector


_AXES: Final[dict[str, Vector]] = {
    sign + axis: tuple(factor if name == axis else 0.0 for name in "xyz")  # type: ignore[misc]
    for axis in "xyz"
    for sign, factor in (("", 1.0), ("+", 1.0), ("-", -1.0))
}
_WRITE_A_PULL: Final = 'write auto, "+z", [0, 0, 1] or "face at 10, 4, 3"'
_FACE: Final = re.compile(r"face\s+at\s+(.+)", re.IGNORECASE)


def read_direction(value: object) -> Vector | FaceNormal | None:
    """Return what the user wrote as a unit vector, as the normal of a face, or as None for auto."""
    if value == AUTO:
        return None
    if isinstance(value, str):
        return _named_direction(value.strip())
    if isinstance(value, (list, tuple)) and len(value) == 3:
        return _unit_vector(to_point(value))
    refuse(f"{shown(value)} is not a direction", _WRITE_A_PULL)


def _named_direction(text: str) -> Vector | FaceNormal:
    if text.lower() in _AXES:
        return _AXES[text.lower()]
    face = _FACE.fullmatch(text)
    numbers = face[1].strip("[] ").split(",") if face else []
    if len(numbers) != 3:
        refuse(f'"{shown(text)}" is not a direction', _WRITE_A_PULL)
    return FaceNormal(to_point(numbers))


def _unit_vector(v: Vector) -> Vector:
    largest = max(map(abs, v))
    if largest == 0.0:
        refuse("the pull has length zero, so it has no direction", "give at least one component that is not 0")
    scaled = [c / largest for c in v]  # so that neither tiny nor huge components leave the range of floats
    length = math.hypot(*scaled)
    return (scaled[0] / length + 0.0, scaled[1] / length + 0.0, scaled[2] / length + 0.0)


_THREE: Final = {"type": "array", "items": {"type": ["number", "string"]}, "minItems": 3, "maxItems": 3}
_WRITTEN_FACE: Final = {"type": "string", "pattern": "^[Ff]ace +at +.+,.+,"}


def written_direction(*, auto: bool = True) -> dict[str, Any]:
    """Return the JSON Schema of a direction; `auto`: also as auto, or as the normal of a face."""
    if auto:
        return {"anyOf": [{"enum": [AUTO, *_AXES]}, _THREE, _WRITTEN_FACE]}
    return {"anyOf": [{"enum": [*_AXES]}, _THREE]}


_WRITTEN_DIRECTION: Final = written_direction()
_Direction = Vector | FaceNormal | None


class Pull(Section):
    """Direction along which the cavity half leaves the part."""

    direction: Annotated[_Direction, PlainValidator(read_direction), Written(_WRITTEN_DIRECTION)] = Field(
        default=None,
        description='auto, an axis such as "+z", [x, y, z], or "face at x, y, z": the normal of the flat face nearest '
        "to that point of the part [mm]",
        examples=[AUTO],
    )
    search: Literal["axes", "full"] = Field(
        default="full",
        description="what auto tries: axes (x, y, z, both ways) or full (also directions that the part "
        "itself suggests, and a search over all others)",
    )

    @model_validator(mode="before")
    @classmethod
    def _short_form(cls, value: Any) -> Any:
        return value if isinstance(value, dict) else {"direction": value}


_WRITTEN_FIXED_POINT: Final = {"anyOf": [{"enum": ["origin", "centre", "center"]}, _THREE]}

SHORT_PULL: Final = OrWritten(_WRITTEN_DIRECTION)

_SHRINK_REMEDY: Final = (
    "write the shrink as a percentage, such as 0.5 %; mold = part / (1 - S) has no value at 100 %, "
    "and no molding resin comes near 50 %"
)
_LIMITS: Final = {"least": 0.0, "below": 50.0, "remedy": _SHRINK_REMEDY}
AutoShrink = Annotated[float | None, Number(Measure.PERCENT, auto=True, **_LIMITS)]  # type: ignore[arg-type]
AxisShrink = Annotated[float | None, Number(Measure.PERCENT, **_LIMITS)]  # type: ignore[arg-type]


def _fixed_point(value: object) -> Vector | str:
    if value in ("origin", "centre", "center"):
        return str(value).replace("center", "centre")
    if isinstance(value, (list, tuple)):
        return to_point(value)
    refuse(f"{shown(value)} is not a fixed point", "write origin, centre or [x, y, z]")


class Shrink(Section):
    """How much the part shrinks: S of ISO 294-4, in percent of the mold's dimension."""

    all: AutoShrink = Field(
        default=None,
        description="shrink in all directions [%]; auto takes it from the resin; or give x, y and z each",
    )
    x: AxisShrink = Field(default=None, description="shrink along x of the part [%]")
    y: AxisShrink = Field(default=None, description="shrink along y of the part [%]")
    z: AxisShrink = Field(default=None, description="shrink along z of the part [%]")
    fixed_point: Annotated[Vector | str, PlainValidator(_fixed_point), Written(_WRITTEN_FIXED_POINT)] = Field(
        default="origin",
        description="the point that scaling leaves in place: origin, centre (of the bounding box) or [x, y, z] [mm]",
    )
    convention: Literal["mold", "part"] = Field(
        default="mold",
        description="what the percentage is of: mold, so mold = part / (1 - S) as in ISO 294-4; "
        "or part, so mold = part * (1 + S)",
    )

    @model_validator(mode="before")
    @classmethod
    def _short_form(cls, value: Any) -> Any:
        return value if isinstance(value, dict) else {"all": value}

    @model_validator(mode="after")
    def _all_or_each(self) -> Shrink:
        given = [axis for axis in (self.x, self.y, self.z) if axis is not None]
        if given and self.all is not None:
            refuse("all is given together with x, y or z", "keep all, or x, y and z")
        if len(given) in (1, 2):
            refuse(f"{len(given)} of x, y and z are given", "give all three, or only `all`")
        return self

    @property
    def percent(self) -> Vector | None:
        """Shrink along x, y and z of the part [%]; None if the resin decides."""
        if self.all is not None:
            return (self.all, self.all, self.all)
        if self.x is None or self.y is None or self.z is None:
            return None
        return (self.x, self.y, self.z)


_WRITTEN_SHRINK: Final = [{"type": "number", "minimum": 0, "exclusiveMaximum": 50}, {"type": "string"}]
SHORT_SHRINK: Final = OrWritten({"anyOf": _WRITTEN_SHRINK})
