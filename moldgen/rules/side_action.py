"""Side actions: travel of a slide on an angled pin, and of a lifter."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Angle, Length, LengthOrZero, Valid, rule

_ANGLED_PIN: Final = "geometry; Pye, Injection Mould Design, from memory"
_PIN_ANGLE: Final = Valid("angle", 10.0, 25.0, "deg", "common practice")
_LIFTER_ANGLE: Final = Valid("angle", 3.0, 12.0, "deg", "common practice: 3 to 8 usual, up to 15 guided in two stages")


@rule(
    title="working length of an angled pin",
    formula="travel / sin(radians(angle)) + 2 * clearance / sin(radians(2 * angle))",
    source=_ANGLED_PIN,
    provenance=Provenance.DERIVED,
    valid=(_PIN_ANGLE,),
)
def angled_pin_length_pye(travel: Length, clearance: LengthOrZero, angle: Angle) -> Length:
    """Length of an angled pin that moves a slide.

    Parameters
    ----------
    travel : sideways travel of the slide [mm]
    clearance : clearance between pin and hole, per side [mm]
    angle : angle between pin and pull [deg]

    Returns
    -------
    working length, without head and tip [mm]

    Raises
    ------
    ValueError : travel or angle is not positive, or clearance is negative

    >>> round(angled_pin_length_pye(12.0, 0.5, 20.0), 2)
    36.64
    """
    slope = math.radians(angle)
    return travel / math.sin(slope) + 2.0 * clearance / math.sin(2.0 * slope)


@rule(
    title="opening that moves a slide",
    formula="travel / tan(radians(angle))",
    source=_ANGLED_PIN,
    provenance=Provenance.DERIVED,
    valid=(_PIN_ANGLE,),
)
def angled_pin_opening_pye(travel: Length, angle: Angle) -> Length:
    """Opening of the mold while an angled pin moves its slide, after the delay.

    Parameters
    ----------
    travel : sideways travel of the slide [mm]
    angle : angle between pin and pull [deg]

    Returns
    -------
    opening [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(angled_pin_opening_pye(12.0, 20.0), 2)
    32.97
    """
    return travel / math.tan(math.radians(angle))


@rule(
    title="opening before a slide moves",
    formula="clearance / sin(radians(angle))",
    source=_ANGLED_PIN,
    provenance=Provenance.DERIVED,
    valid=(_PIN_ANGLE,),
)
def angled_pin_delay_pye(clearance: LengthOrZero, angle: Angle) -> LengthOrZero:
    """Opening of the mold before an angled pin touches its slide.

    Parameters
    ----------
    clearance : clearance between pin and hole, per side [mm]
    angle : angle between pin and pull [deg]

    Returns
    -------
    opening [mm]

    Raises
    ------
    ValueError : clearance is negative, or angle is not positive

    >>> round(angled_pin_delay_pye(0.5, 20.0), 2)
    1.46
    """
    return clearance / math.sin(math.radians(angle))


@rule(
    title="sideways travel of a lifter",
    formula="stroke * tan(radians(angle))",
    source="Pye, Injection Mould Design, eq. 8.12",
    provenance=Provenance.PUBLISHED,
    valid=(_LIFTER_ANGLE,),
)
def lifter_travel_pye(stroke: Length, angle: Angle) -> Length:
    """Sideways travel of a lifter whose foot slides on a flat ejector plate.

    Parameters
    ----------
    stroke : ejection stroke [mm]
    angle : angle between lifter and pull [deg]

    Returns
    -------
    sideways travel [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(lifter_travel_pye(60.0, 10.0), 2)
    10.58
    """
    return stroke * math.tan(math.radians(angle))


@rule(
    title="sideways travel of a lifter on an angled face",
    formula="stroke * sin(radians(2 * angle)) / 2",
    source="Pye, Injection Mould Design, eq. 8.13",
    provenance=Provenance.PUBLISHED,
    valid=(_LIFTER_ANGLE,),
)
def lifter_travel_angled_face_pye(stroke: Length, angle: Angle) -> Length:
    """Sideways travel of a lifter whose foot slides on a face square to the lifter.

    Parameters
    ----------
    stroke : ejection stroke [mm]
    angle : angle between lifter and pull [deg]

    Returns
    -------
    sideways travel [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(lifter_travel_angled_face_pye(60.0, 10.0), 2)
    10.26
    """
    return stroke * math.sin(math.radians(2.0 * angle)) / 2.0
