"""The colours of the pictures: safe for colour-blind readers, and each with one meaning.

Areas come from the "light" qualitative scheme, marks from "vibrant", "bright" and "muted", all of Paul Tol, Colour
Schemes, technical note SRON/EPS/TN/09-002 [published: issue 3.2, 18 August 2021]. "Light" is made for areas that carry
labels and keeps its members apart under normal and colour-blind vision; the marks are much darker than every area, so a
line reads by lightness alone. Of the nine areas those were given to the roles that stay furthest apart under simulated
protanopia and deuteranopia (checked by a test). The scheme has too few areas for the roles of side actions too: theirs
are our choice, searched on a grid of colours for the largest least distance to all others and each other, the slide
among those farthest from the cavity half that it stands in.
"""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType

Rgb = tuple[int, int, int]
"""Red, green, blue, 0 to 255."""


@dataclass(frozen=True)
class Ink:
    """One colour and the one thing it means: `label` for a single item, `plural` for several."""

    colour: Rgb
    label: str
    plural: str

    def describe(self, count: int) -> str:
        """Return the legend text for `count` items."""
        return self.label if count == 1 else f"{self.plural} ({count})"


def rgb(text: str) -> Rgb:
    """Return the colour of six hexadecimal digits, such as ``77AADD``."""
    return (int(text[0:2], 16), int(text[2:4], 16), int(text[4:6], 16))


ROLES = MappingProxyType(
    {
        "part": Ink(rgb("EE8866"), "plastic part", "plastic parts"),  # light orange
        "cavity": Ink(rgb("77AADD"), "cavity half", "cavity blocks"),  # light blue
        "core": Ink(rgb("44BB99"), "core half", "core blocks"),  # mint
        "core_pin": Ink(rgb("99DDFF"), "core pin", "core pins"),  # light cyan
        "ejector_pin": Ink(rgb("EEDD88"), "ejector pin", "ejector pins"),  # light yellow
        "sprue": Ink(rgb("AAAA00"), "sprue and gate, plastic", "sprues and gates, plastic"),  # olive
        "slide": Ink(rgb("FFDD11"), "slide", "slides"),  # gold
        "lifter": Ink(rgb("CC55FF"), "lifter", "lifters"),  # orchid
        "side_core_pin": Ink(rgb("DDEEBB"), "side core pin", "side core pins"),  # pale green
        "angled_pin": Ink(rgb("996655"), "angled pin", "angled pins"),  # brown
        "locking_block": Ink(rgb("2277BB"), "locking block", "locking blocks"),  # blue
        "guide": Ink(rgb("442255"), "guide", "guides"),  # plum
    }
)
"""Component roles, in the order of the legend."""

OTHER = Ink(rgb("DDDDDD"), "other component", "other components")  # pale grey

CAVITY_SIDE = Ink(ROLES["cavity"].colour, "formed by the cavity half", "formed by the cavity half")
CORE_SIDE = Ink(ROLES["core"].colour, "formed by the core half", "formed by the core half")
SLIDE_SIDE = Ink(ROLES["slide"].colour, "formed by a slide", "formed by slides")
LIFTER_SIDE = Ink(ROLES["lifter"].colour, "formed by a lifter", "formed by lifters")
NO_SIDE = Ink(OTHER.colour, "formed by no half yet", "formed by no half yet")

PARTING_LINE = Ink(rgb("CC3311"), "parting line", "parting lines")  # vibrant red
GATE = Ink(rgb("AA3377"), "gate", "gates")  # bright purple
PULL = Ink(rgb("332288"), "pull (cavity half opens)", "pull")  # muted indigo

STEEL = Ink(rgb("B8BEC5"), "steel of the new tool", "steel of the new tool")  # grey
CUT = Ink(rgb("D55E00"), "cut: steel that must go", "cut: steel that must go")  # vermilion
WELD = Ink(rgb("2244CC"), "weld or insert: steel that is missing", "weld or insert: steel that is missing")  # blue
"""The comparison of two tools. Our choice: orange against blue keeps apart for colour-blind readers, and both stand off
from grey (checked by a test). They never meet the colours of the roles in one picture."""

PAPER: Rgb = rgb("FCFCFD")
TEXT: Rgb = rgb("22262B")
QUIET_TEXT: Rgb = rgb("5E666F")
EDGE: Rgb = rgb("2B2F36")
RULE: Rgb = rgb("C9CED4")


def role_ink(role: str) -> Ink:
    """Return the colour of a component role; a role without its own colour is drawn in pale grey."""
    return ROLES.get(role, OTHER)


def tint(colour: Rgb, share: float) -> Rgb:
    """Return `colour` mixed with white: `share` 0 leaves it, 1 gives white. Hue, and so the meaning, stays."""
    red, green, blue = (round(c + (255 - c) * share) for c in colour)
    return (red, green, blue)


def darken(colour: Rgb, share: float) -> Rgb:
    """Return `colour` mixed with black: `share` 0 leaves it, 1 gives black."""
    red, green, blue = (round(c * (1.0 - share)) for c in colour)
    return (red, green, blue)
