"""Figures of common practice for slides, angled pins and lifters that no formula gives."""

from __future__ import annotations

from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.practice import Practice

SLIDE_LAND: Final = Practice("land between the cavity and the body of a slide", 5.0, 3.0, 10.0, "mm")
SLIDE_SHOULDER: Final = Practice("body of a slide beyond its front, each way", 4.0, 3.0, 6.0, "mm")
LEDGE_WIDTH: Final = Practice("width of a slide's guide ledge", 6.0, 4.0, 10.0, "mm")
LEDGE_HEIGHT: Final = Practice("height of a slide's guide ledge", 8.0, 5.0, 12.0, "mm")
LEDGE_COVER: Final = Practice("steel over a slide's guide ledge", 8.0, 6.0, 15.0, "mm")
STEEL_BESIDE_SLIDE: Final = Practice(
    "steel between a slide and another slide or the side of the block", 10.0, 8.0, 20.0, "mm"
)
STEEL_UNDER_SLIDE: Final = Practice("steel under a slide", 15.0, 10.0, 25.0, "mm")
STEEL_OVER_SLIDE: Final = Practice("steel over a slide, which holds its angled pin", 25.0, 20.0, 50.0, "mm")
LOCKING_HEIGHT: Final = Practice(
    "least height of a slide over the parting plane, for its locking face", 18.0, 15.0, 30.0, "mm"
)
LOCKING_FOOT: Final = Practice("least steel behind a locking face, at its foot", 12.0, 10.0, 30.0, "mm")
PIN_CLEARANCE: Final = Practice("clearance of an angled pin in the slide, per side", 0.5, 0.5, 1.0, "mm")
PIN_TIP: Final = Practice("lead at the tip of an angled pin", 2.0, 1.5, 5.0, "mm")
UNDER_TIP: Final = Practice("clearance under the tip of an angled pin", 3.0, 2.0, 10.0, "mm", "our choice")
PIN_WALL: Final = Practice("steel round the bore of an angled pin", 5.0, 4.0, 10.0, "mm")
PIN_HELD: Final = Practice("length of an angled pin in the cavity half by its diameter", 1.5, 1.5, 2.5, "1")
PIN_STRESS: Final = Practice(
    "bending stress allowed to an angled pin", 150.0, 100.0, 250.0, "MPa",
    "from memory, a hardened pin under changing load", Provenance.UNVERIFIED,
)  # fmt: skip
SLIDE_FRICTION: Final = Practice("friction of steel on greased steel", 0.15, 0.1, 0.2, "1")
PIN_OPENING: Final = Practice(
    "opening up to which a flatter angled pin is taken", 50.0, 30.0, 80.0, "mm", "our choice: more costs time each shot"
)
LIFTER_CLEARANCE: Final = Practice("sideways travel of a lifter beyond the undercut", 1.0, 0.5, 2.0, "mm")
LIFTER_GUIDED: Final = Practice("guided length of a lifter by its thickness", 1.5, 1.5, 3.0, "1")
SIDE_BORE_SLENDER: Final = Practice(
    "length over diameter from which a side bore is formed by a pin of its own", 2.5, 2.0, 3.0, "1"
)
