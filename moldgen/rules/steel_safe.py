"""How much steel is left on where a dimension will be tuned: steel can be cut away, but not easily added."""

from __future__ import annotations

from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.practice import Practice
from moldgen.rules.rule import Length, LengthOrZero, Percent, rule

_MEMORY = "common practice, from memory, unverified"

PRESS_ALLOWANCE: Final = Practice(
    "steel left on each face of a press fit", 0.1, 0.05, 0.2, "mm", _MEMORY, Provenance.UNVERIFIED
)
SNAP_ALLOWANCE: Final = Practice(
    "steel left on each face of a snap fit", 0.2, 0.1, 0.4, "mm", _MEMORY, Provenance.UNVERIFIED
)
OTHER_ALLOWANCE: Final = Practice(
    "steel left on each face of another dimension to be tuned", 0.1, 0.05, 0.3, "mm", _MEMORY, Provenance.UNVERIFIED
)
DIRECTION: Final = "common practice: cores start large and cavities small; what is wrong is corrected by cutting steel"
"""Which side is steel-safe."""

BOSS_LEAST: Final = Practice("outside of a boss over its hole, least", 1.4, 1.3, 2.0, "1", "our choice")
BOSS_MOST: Final = Practice("outside of a boss over its hole, most", 3.5, 2.5, 4.0, "1", "our choice")
BOSS_HOLE: Final = Practice(
    "largest hole that is looked at as a press fit or screw hole", 12.0, 8.0, 16.0, "mm", "our choice"
)
PEG: Final = Practice("thickest free-standing pin that is looked at as a press fit", 8.0, 6.0, 12.0, "mm", "our choice")
DEEP: Final = Practice("depth over diameter from which a hole or pin can hold a fit", 0.8, 0.5, 1.0, "1", "our choice")
LIP_LEAST: Final = Practice("least reach of a snap lip", 0.3, 0.2, 0.5, "mm", "our choice")
LIP_MOST: Final = Practice("largest reach of a snap lip", 4.0, 3.0, 5.0, "mm", "our choice")
LIP_THICK: Final = Practice("thickest lip of a snap fit, along the pull", 8.0, 5.0, 10.0, "mm", "our choice")


@rule(
    title="doubt of a dimension for the range of shrink",
    formula="size * shrink_range / 200",
    source="half the range of shrink that the catalog gives for the resin, times the size",
    provenance=Provenance.DERIVED,
)
def shrink_doubt(size: Length, shrink_range: Percent) -> LengthOrZero:
    """By how much a dimension of the first shots may be off because the shrink is known as a range only.

    Parameters
    ----------
    size : dimension of the part [mm]
    shrink_range : highest less lowest shrink of the resin [%]

    Returns
    -------
    doubt to either side [mm]

    Raises
    ------
    ValueError : size is not positive

    >>> round(shrink_doubt(50.0, 0.3), 3)
    0.075
    """
    return max(size * shrink_range / 200.0, 0.0)
