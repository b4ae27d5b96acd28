"""A small cap of a garden weather station, changed in scripted ways, with what that does to its steel worked out.

The cap covers a light sensor: a tapered box, open below, with a round vent through its roof and a post that hangs from
the roof. It is pulled along +z, so what forms what is certain before any steel is made: the cavity half forms the
outside and the vent, which is wider at the top; the core forms the hollow and the outside of the post; they meet in
the plane z = 0 and, in the vent, in the plane of the ceiling. More plastic means that steel goes, less that it is
missing. Everything grows by the shrink factor about the origin, K = 1 / (1 - S), volumes by K^3; pins, feed and the
outsides of the blocks do not grow.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from moldgen.model.revision import Fate, PartChangeKind
from tests.revision.closed_forms import tan

Feature = dict[str, Any]
Features = dict[str, Feature]

SHRINK = 1.0
"""%, in all directions."""

K3 = 1.0 / (1.0 - SHRINK / 100.0) ** 3
"""From a volume of the part to that of the steel around it: mold = part / (1 - S), ISO 294-4."""

LENGTH, WIDTH, HEIGHT, DRAFT = 28.0, 20.0, 9.0, 2.0
"""mm, deg: outside of the cap, at its rim z = 0."""

INNER_LENGTH, INNER_WIDTH, CEILING = 24.0, 16.0, 7.0
"""mm: hollow of the cap at z = 0, with the same draft, up to its ceiling."""

VENT, VENT_DRAFT, VENT_AT = 4.0, 2.0, (6.0, 0.0)
"""mm, deg: vent through the roof, its diameter at z = 9; narrower downward."""

POST, POST_DRAFT, POST_AT, POST_END = 4.0, 1.0, (-6.0, 0.0), 3.0
"""mm, deg: post under the roof, its diameter at its free end and where that is; wider at its foot."""

IN_ROOF = 0.5
"""mm: the post and ribs begin this far inside the roof, so that they join it."""

PIN, PIN_CLEARANCE, PINS = 2.0, 2.5, tuple((x, y) for x in (-9.5, 9.5) for y in (-5.0, 5.0))
"""mm: four ejector pins at the ceiling, the bore behind their fit (catalog/bores.yaml), and where they stand."""

GATE = 3.0
"""mm: foot of the direct sprue on the middle of the roof."""

CAVITY_HEIGHT = 30.0
"""mm: of the cavity block over the parting plane."""


def cap_features() -> Features:
    """Return the features of the cap by name."""
    return {
        "cap": {"feature": "block", "size": [LENGTH, WIDTH, HEIGHT], "draft": DRAFT},
        "hollow": {
            "feature": "block",
            "mode": "cut",
            "size": [INNER_LENGTH, INNER_WIDTH, CEILING],
            "draft": DRAFT,
        },
        "post": post(),
        "vent": vent(),
    }


def post(
    at: tuple[float, float] = POST_AT, diameter: float = POST, draft: float = POST_DRAFT, end: float = POST_END
) -> Feature:
    """Return the post: `diameter` at its free end, which is at z = `end`."""
    return {
        "feature": "boss",
        "on": {"plane": "xy", "offset": CEILING + IN_ROOF, "flip": True},
        "at": list(at),
        "diameter": diameter,
        "height": CEILING + IN_ROOF - end,
        "draft": draft,
    }


def vent(at: tuple[float, float] = VENT_AT, diameter: float = VENT) -> Feature:
    """Return the vent through the roof."""
    plane = {"plane": "xy", "offset": HEIGHT}
    return {"feature": "hole", "on": plane, "at": list(at), "diameter": diameter, "draft": VENT_DRAFT}


def in_vent(diameter: float, depth: float) -> float:
    """Return the radius of a vent of this diameter, `depth` under the roof's outside [mm]."""
    return diameter / 2 - depth * tan(VENT_DRAFT)


def on_post(diameter: float, height: float, draft: float = POST_DRAFT) -> float:
    """Return the radius of a post, `height` over its free end [mm]."""
    return diameter / 2 + height * tan(draft)


def changed(features: Features | None = None, /, **changes: Feature | None) -> Features:
    """Return features (the cap's) with other values of some of them; None takes one away, new names come last."""
    result = dict(cap_features() if features is None else features)
    for name, values in changes.items():
        if values is None:
            del result[name]
        else:
            result[name] = {**result.get(name, {}), **values}
    return result


@dataclass(frozen=True)
class Version:
    """One version of the part and its spec.

    pins : where ejector pins stand at the ceiling, part coordinates; ceiling, roof : heights of inside and outside [mm]
    rewritten : how another program would have written the solid; None: it is made by the recipe itself
    place : from the cap's own coordinates to those of the file, as rotation and translation; pull : in the latter
    spec : more keys of the spec
    """

    features: Features = field(default_factory=cap_features)
    pins: tuple[tuple[float, float], ...] = PINS
    ceiling: float = CEILING
    roof: float = HEIGHT
    rewritten: Callable[[Any], Any] | None = None
    place: Callable[[float, float, float], tuple[float, float, float]] | None = None
    pull: str = "+z"
    turned: bool = False
    spec: Mapping[str, Any] = field(default_factory=dict)

    def recipe(self) -> dict[str, Any]:
        """Return the recipe of the part."""
        return {"features": [{"name": name, **values} for name, values in self.features.items()]}

    def as_spec(self, part: Mapping[str, Any]) -> dict[str, Any]:
        """Return the whole spec, with `part` as where the part comes from."""
        place = self.place or (lambda x, y, z: (x, y, z))
        length, width = (50, 60) if self.turned else (60, 50)
        return {
            "name": "cap",
            "resin": "ABS",
            "pull": self.pull,
            "shrink": {"all": SHRINK, "fixed_point": "origin"},
            "blocks": {"length": length, "width": width, "cavity_height": CAVITY_HEIGHT, "core_height": 40},
            "gate": {"kind": "sprue", "at": list(place(0.0, 0.0, self.roof)), "diameter": GATE},
            "core_pins": {"pick": "none"},
            "ejection": {
                "stroke": 13,
                "pins": [{"at": list(place(x, y, self.ceiling)), "diameter": PIN} for x, y in self.pins],
            },
            **self.spec,
            "part": dict(part),
        }


@dataclass(frozen=True)
class Steel:
    """Steel that must go and that is missing of one component, of all its copies together [mm^3], in the mold."""

    cut: float = 0.0
    weld: float = 0.0

    @property
    def fate(self) -> Fate:
        """What becomes of such a component."""
        if self.weld:
            return Fate.WELD
        return Fate.CUT if self.cut else Fate.UNCHANGED


@dataclass(frozen=True)
class Told:
    """What the comparison must say of the part: one feature that changed.

    word : in the name of the feature; kinds : any of them; shift : how far it moved
    by : how much larger its size is, or its draft [mm, deg]; at : its box holds this point of the new part [mm]
    """

    word: str
    kinds: tuple[PartChangeKind, ...]
    shift: tuple[float, float, float] | None = None
    by: float | None = None
    at: tuple[float, float, float] | None = None


@dataclass(frozen=True)
class Change:
    """One scripted change with its answer.

    steel : by component; those that are not named stay as they are
    aside : what of that steel goes and is missing where the part does not change: steel that one component hands to
        another, what the feed takes, bores that begin elsewhere
    told : what the part's change is called; nothing else of the part changed
    """

    name: str
    old: Version
    new: Version
    steel: Mapping[str, Steel] = field(default_factory=dict)
    aside: Steel = Steel()
    told: tuple[Told, ...] = ()


def sprue(roof: float, top: float = CAVITY_HEIGHT) -> float:
    """Return the plastic [mm^3] of the direct sprue from a roof at this height in the mold up to the block's top.

    A cone with its wide end on the part, 1 deg a side (as the layout in the manifest says).
    """
    height = top - roof
    foot, end = GATE / 2, GATE / 2 - height * tan(1.0)
    return math.pi / 3 * height * (foot**2 + foot * end + end**2)
