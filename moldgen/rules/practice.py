"""Plain figures of common practice that no formula gives: usual range, default, source."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from moldgen.quantity import Provenance, Quantity


@dataclass(frozen=True)
class Practice:
    """One figure of the trade: what it is, its usual range and the default that moldgen takes."""

    title: str
    default: float
    low: float
    high: float
    unit: str
    source: str = "common practice"
    provenance: Provenance = Provenance.COMMON_PRACTICE

    def line(self, drives: str) -> Quantity:
        """Return the default as a line of the calculation sheet; `drives` says what depends on it."""
        return Quantity(
            name=self.title,
            value=self.default,
            unit=self.unit,
            source=self.source,
            provenance=self.provenance,
            valid_range=f"{self.low:g} to {self.high:g} {self.unit}".rstrip(),
            drives=drives,
        )


GATE_LAND: Final = Practice("gate land", 0.75, 0.5, 1.0, "mm", "common practice; a trade article has 0.76 mm")
SPRUE_TAPER: Final = Practice("sprue taper per side", 1.0, 1.0, 2.0, "deg")
SHUT_OFF_ANGLE: Final = Practice(
    "shut-off angle", 5.0, 3.0, 7.0, "deg", "trade pages: 3 deg least, 3 to 5 good, 5 to 7 for a stepped parting"
)
SEALING_LAND: Final = Practice("sealing land round the cavity", 10.0, 8.0, 15.0, "mm")
SMALL_SEALING_LAND: Final = Practice("sealing land of a small insert", 5.0, 5.0, 8.0, "mm")
BUCKLING_SAFETY: Final = Practice("safety against buckling", 3.0, 2.0, 4.0, "1")
PIN_END_FACTOR: Final = Practice(
    "buckling length over unguided length", 0.7, 0.5, 1.0, "1", "Euler: head held, nose guided"
)
PIN_EDGE_CLEARANCE: Final = Practice("steel between pin rim and wall of the core", 2.0, 1.0, 3.0, "mm")
PIN_PITCH: Final = Practice("pitch of ejector pins", 30.0, 20.0, 40.0, "mm")
PIN_FLUSH: Final = Practice("ejector pin above the core face", 0.0, 0.0, 0.05, "mm")
VACUUM_RELIEF_AREA: Final = Practice("blind core area that wants an air valve", 1000.0, 1000.0, 1000.0, "mm^2")
STEEL_AROUND_HOLE: Final = Practice("least steel between two holes", 3.0, 3.0, 5.0, "mm")
"""As the smallest distance of a pin from a cooling bore."""
