"""Figures of common practice that the layout falls back on where no formula decides."""

from __future__ import annotations

from typing import Final

from moldgen.rules.practice import Practice

STEEL_OVER_PART: Final = Practice("steel over the part in the cavity block", 20.0, 16.0, 40.0, "mm")
STEEL_UNDER_PART: Final = Practice("steel under the part in the core block", 25.0, 20.0, 50.0, "mm")
STEEL_BEHIND_FIT: Final = Practice("relieved length between the fit and the head of a core pin", 5.0, 3.0, 20.0, "mm")
WALL_CAP: Final = Practice(
    "wall that a block needs at most, by the rule of thumb",
    2.0,
    1.5,
    2.0,
    "1",
    "common practice: beyond it the plate around the block carries the load",
)
CORE_PIN_LARGEST: Final = Practice("diameter up to which a round core is made as a pin", 16.0, 10.0, 20.0, "mm")
CORE_PIN_SLENDER: Final = Practice(
    "length over diameter from which a thicker core is made as a pin", 1.5, 1.0, 2.0, "1"
)
CORE_PIN_SHALLOW: Final = Practice("length over diameter below which a core is left in the block", 0.25, 0.2, 0.5, "1")
HEAD_SHOULDER: Final = Practice("least shoulder of a ground pin head, on the radius", 0.5, 0.5, 1.0, "mm")
PIN_SLOPE: Final = Practice("steepest surface that an ejector pin pushes on", 30.0, 15.0, 45.0, "deg")
PIN_GENTLE_SLOPE: Final = Practice("slope up to which an ejector pin does not slip", 15.0, 10.0, 20.0, "deg")
SMALL_PIN_EDGE: Final = Practice(
    "steel between the rim of a small ejector pin and the edge of what it pushes on", 0.5, 0.3, 1.0, "mm"
)
SHOULDER_GAP: Final = Practice("room over the shoulder of an ejector pin at the end of its stroke", 1.0, 0.5, 2.0, "mm")
EJECTOR_FEWEST: Final = Practice(
    "fewest ejector pins of one part", 3.0, 2.0, 4.0, "1", "common practice: three points hold a plane"
)
RETAINER_PLATE: Final = Practice("ejector retainer plate", 16.0, 12.5, 25.0, "mm")
EDGE_GATE_RUNNER: Final = Practice("runner between sprue and edge gate", 12.0, 8.0, 25.0, "mm")
POSITION_TOLERANCE: Final = Practice("tolerance of a hole's position when none is given", 0.2, 0.1, 0.4, "mm")
GATE_SLOPE: Final = Practice("steepest surface that a gate from above enters", 15.0, 10.0, 30.0, "deg")
SPRUE_ORIFICE: Final = Practice(
    "smallest diameter of a sprue, at the nozzle",
    3.5,
    2.5,
    6.0,
    "mm",
    "sprue bushes on the market, from memory, unverified",
)
GATE_OVER_RUNNER: Final = Practice("width of an edge gate over the runner that feeds it", 2.0, 1.0, 3.0, "1")
PIN_GATE_LEAST: Final = Practice("smallest pin gate", 0.6, 0.5, 1.0, "mm")
STEEL_BETWEEN_BORES: Final = Practice("least steel between the bores of two pins", 1.5, 1.0, 3.0, "mm")
STEEL_TO_FEATURE: Final = Practice("least steel between a pin's bore and a wall of the core", 1.0, 1.0, 3.0, "mm")
STEEL_TO_EDGE: Final = Practice("least steel between a bore and the side of the block", 5.0, 4.0, 10.0, "mm")
