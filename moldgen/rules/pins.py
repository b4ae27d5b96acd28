"""Slender pins: buckling of ejector pins, their guidance and their bores."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Force, Length, LengthOrZero, Pressure, Ratio, Valid, rule

_EULER: Final = "Euler; 0.5 both ends fixed, 0.7 head held and nose guided, 1 both ends free to turn"
_ENDS: Final = Valid("end_factor", 0.5, 2.0, "", "textbook cases")


@rule(
    title="buckling force of a pin",
    formula="pi**3 * modulus * diameter**4 / (64 * (end_factor * length)**2)",
    source=_EULER,
    provenance=Provenance.DERIVED,
    valid=(
        _ENDS,
        Valid(
            "length / diameter",
            low=15.0,
            why="a stouter pin yields before it buckles",
            measure=lambda diameter, length, **_: length / diameter,
        ),
    ),
)
def euler_buckling_force(diameter: Length, length: Length, modulus: Pressure = 200e3, end_factor: Ratio = 0.7) -> Force:
    """Axial force at which a round pin buckles.

    Parameters
    ----------
    diameter : diameter of the pin [mm]
    length : unguided length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    end_factor : buckling length over unguided length [1]

    Returns
    -------
    critical force, without a factor of safety [N]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(euler_buckling_force(3.0, 120.0))
    1112
    """
    return math.pi**3 * modulus * diameter**4 / (64.0 * (end_factor * length) ** 2)


@rule(
    title="diameter of a pin against buckling",
    formula="(64 * safety * force * (end_factor * length)**2 / (pi**3 * modulus)) ** 0.25",
    source=_EULER + "; safety 3 is common practice",
    provenance=Provenance.DERIVED,
    valid=(_ENDS, Valid("safety", low=2.0, why="common practice is 3")),
)
def euler_pin_diameter(
    force: Force, length: Length, modulus: Pressure = 200e3, end_factor: Ratio = 0.7, safety: Ratio = 3.0
) -> Length:
    """Diameter of a round pin that carries a force without buckling.

    Parameters
    ----------
    force : axial force on the pin [N]
    length : unguided length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    end_factor : buckling length over unguided length [1]
    safety : factor of safety on the force [1]

    Returns
    -------
    least diameter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(euler_pin_diameter(1112.0 / 3.0, 120.0), 2)
    3.0
    """
    inertia_times = 64.0 * safety * force * (end_factor * length) ** 2 / (math.pi**3 * modulus)
    return float(inertia_times**0.25)


@rule(
    title="slenderness of a pin",
    formula="length / diameter",
    source="trade journal, Sept 2018: slenderness up to 100, that is 25 diameters for a round pin",
    provenance=Provenance.PUBLISHED,
    valid=(
        Valid(
            "length / diameter",
            high=25.0,
            why="stated by the source",
            measure=lambda length, diameter: length / diameter,
        ),
    ),
)
def pin_slenderness(length: Length, diameter: Length) -> Ratio:
    """Unguided length of an ejector pin over its diameter.

    Parameters
    ----------
    length : unguided length [mm]
    diameter : diameter [mm]

    Returns
    -------
    length over diameter [1]

    Raises
    ------
    ValueError : an argument is not positive

    >>> pin_slenderness(100.0, 4.0)
    25.0
    """
    return length / diameter


@rule(
    title="length of the fit",
    formula="max(least, ratio * diameter)",
    source="2 to 3 diameters, at least 10 to 12 mm",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("ratio", 2.0, 3.0, "", "common practice"), Valid("least", 10.0, 12.0, "mm", "common practice")),
)
def guided_fit_length(diameter: Length, ratio: Ratio = 2.5, least: Length = 10.0) -> Length:
    """Length over which a pin is fitted in the steel before the bore widens.

    Parameters
    ----------
    diameter : diameter of the pin [mm]
    ratio : length of the fit over diameter [1]
    least : shortest fit [mm]

    Returns
    -------
    length of the fit [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> guided_fit_length(3.0), guided_fit_length(8.0)
    (10.0, 20.0)
    """
    return max(least, ratio * diameter)


@rule(
    title="clearance bore",
    formula="diameter + allowance",
    source="diameter plus 0.5 to 1 mm behind the fit",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("allowance", 0.4, 1.0, "mm", "common practice"),),
)
def clearance_bore_diameter(diameter: Length, allowance: Length = 0.5) -> Length:
    """Diameter of the bore that a pin passes without touching.

    Parameters
    ----------
    diameter : diameter of the pin, or of its head [mm]
    allowance : diametral clearance [mm]

    Returns
    -------
    diameter of the bore [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> clearance_bore_diameter(4.0)
    4.5
    """
    return diameter + allowance


@rule(
    title="gap in which the melt makes flash",
    formula="vent_depth - clearance / 2",
    source="a gap wider than the vent depth of the resin lets melt in",
    provenance=Provenance.COMMON_PRACTICE,
)
def fit_flash_margin(vent_depth: Length, clearance: LengthOrZero) -> Length:
    """How far the gap of a fit stays below the depth that the melt enters; negative means flash.

    Parameters
    ----------
    vent_depth : vent depth of the resin [mm]
    clearance : largest diametral clearance of the fit [mm]

    Returns
    -------
    vent depth minus radial gap [mm]

    Raises
    ------
    ValueError : vent_depth is not positive, or clearance is negative

    >>> round(fit_flash_margin(0.013, 0.024), 3)
    0.001
    """
    return vent_depth - clearance / 2.0
