"""Core pins: bending under a pressure that is not the same on both sides, tilt in the seat, and slenderness."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Flag, Length, LengthOrZero, Pressure, Ratio, Valid, rule

_BEAM: Final = "beam with a uniform load, textbook; Kazmer, Injection Mold Design Engineering, sec. 12.3, uses the same"
_SLENDER: Final = Valid(
    "length / diameter",
    low=2.0,
    why="a stout pin also shears, which is neglected",
    measure=lambda diameter, length, **_: length / diameter,
)


def _inertia(diameter: float, bore: float) -> float:
    """Return the second moment of area of a round section [mm^4].

    Raises
    ------
    ValueError : the bore is not smaller than the diameter
    """
    if bore >= diameter:
        raise ValueError(f"the bore must be smaller than the diameter, got {bore:g} and {diameter:g} mm")
    return math.pi / 64.0 * (diameter**4 - bore**4)


@rule(
    title="bending of a core pin, tip free",
    formula="pressure * diameter * (3 * length**4 - 4 * start**3 * length + start**4)"
    " / (24 * modulus * pi / 64 * (diameter**4 - bore**4))",
    source=_BEAM,
    provenance=Provenance.PUBLISHED,
    valid=(_SLENDER,),
)
def core_pin_deflection_cantilever(
    pressure: Pressure,
    diameter: Length,
    length: Length,
    modulus: Pressure = 210e3,
    bore: LengthOrZero = 0.0,
    start: LengthOrZero = 0.0,
) -> Length:
    """Movement of the tip of a core pin that is held at its foot only.

    Parameters
    ----------
    pressure : difference of pressure between the two sides [MPa]
    diameter : diameter of the pin [mm]
    length : free length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    bore : diameter of a bore in the pin, for cooling [mm]
    start : distance from the foot at which the load begins; it reaches to the tip [mm]

    Returns
    -------
    movement of the tip [mm]

    Raises
    ------
    ValueError : an argument is not positive, bore is not below diameter, or start is beyond the tip

    >>> round(core_pin_deflection_cantilever(40.0, 60.0, 58.0, 205e3, 40.0), 4)
    0.0324
    """
    if start > length:
        raise ValueError(f"the load must begin on the pin, got {start:g} of {length:g} mm")
    moment = 3.0 * length**4 - 4.0 * start**3 * length + start**4
    return pressure * diameter * moment / (24.0 * modulus * _inertia(diameter, bore))


@rule(
    title="bending of a core pin, foot and tip free to turn",
    formula="5 * pressure * diameter * length**4 / (384 * modulus * pi / 64 * (diameter**4 - bore**4))",
    source=_BEAM,
    provenance=Provenance.DERIVED,
    valid=(_SLENDER,),
)
def core_pin_deflection_simple(
    pressure: Pressure, diameter: Length, length: Length, modulus: Pressure = 210e3, bore: LengthOrZero = 0.0
) -> Length:
    """Movement of the middle of a core pin whose tip sits in a close bore and whose foot can turn.

    Parameters
    ----------
    pressure : difference of pressure between the two sides [MPa]
    diameter : diameter of the pin [mm]
    length : free length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    bore : diameter of a bore in the pin, for cooling [mm]

    Returns
    -------
    largest movement [mm]

    Raises
    ------
    ValueError : an argument is not positive, or bore is not below diameter

    >>> round(core_pin_deflection_simple(2.0, 4.0, 40.0), 3)
    0.101
    """
    return 5.0 * pressure * diameter * length**4 / (384.0 * modulus * _inertia(diameter, bore))


@rule(
    title="bending of a core pin, tip propped",
    formula="pressure * diameter * length**4 / (184.6 * modulus * pi / 64 * (diameter**4 - bore**4))",
    source=_BEAM,
    provenance=Provenance.DERIVED,
    valid=(_SLENDER,),
)
def core_pin_deflection_propped(
    pressure: Pressure, diameter: Length, length: Length, modulus: Pressure = 210e3, bore: LengthOrZero = 0.0
) -> Length:
    """Largest movement of a core pin that is held at its foot and whose tip sits in a bore where it can turn.

    Parameters
    ----------
    pressure : difference of pressure between the two sides [MPa]
    diameter : diameter of the pin [mm]
    length : free length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    bore : diameter of a bore in the pin, for cooling [mm]

    Returns
    -------
    largest movement [mm]

    Raises
    ------
    ValueError : an argument is not positive, or bore is not below diameter

    >>> round(core_pin_deflection_propped(2.0, 4.0, 40.0), 3)
    0.042
    """
    return pressure * diameter * length**4 / (184.6 * modulus * _inertia(diameter, bore))


@rule(
    title="bending of a core pin, both ends held",
    formula="pressure * diameter * length**4 / (384 * modulus * pi / 64 * (diameter**4 - bore**4))",
    source=_BEAM,
    provenance=Provenance.DERIVED,
    valid=(_SLENDER,),
)
def core_pin_deflection_fixed(
    pressure: Pressure, diameter: Length, length: Length, modulus: Pressure = 210e3, bore: LengthOrZero = 0.0
) -> Length:
    """Movement of the middle of a core pin whose foot and tip are both held without turning.

    Parameters
    ----------
    pressure : difference of pressure between the two sides [MPa]
    diameter : diameter of the pin [mm]
    length : free length [mm]
    modulus : modulus of elasticity of the pin [MPa]
    bore : diameter of a bore in the pin, for cooling [mm]

    Returns
    -------
    largest movement [mm]

    Raises
    ------
    ValueError : an argument is not positive, or bore is not below diameter

    >>> round(core_pin_deflection_fixed(2.0, 4.0, 40.0), 3)
    0.02
    """
    return pressure * diameter * length**4 / (384.0 * modulus * _inertia(diameter, bore))


@rule(
    title="bending stress of a core pin, tip free",
    formula="pressure * diameter * length**2 / 2 * diameter / 2 / (pi / 64 * (diameter**4 - bore**4))",
    source="beam with a uniform load, textbook",
    provenance=Provenance.DERIVED,
    valid=(_SLENDER,),
)
def core_pin_stress_cantilever(
    pressure: Pressure, diameter: Length, length: Length, bore: LengthOrZero = 0.0
) -> Pressure:
    """Largest bending stress at the foot of a core pin that is held there only.

    Parameters
    ----------
    pressure : difference of pressure between the two sides [MPa]
    diameter : diameter of the pin [mm]
    length : free length [mm]
    bore : diameter of a bore in the pin, for cooling [mm]

    Returns
    -------
    stress [MPa]

    Raises
    ------
    ValueError : an argument is not positive, or bore is not below diameter

    >>> round(core_pin_stress_cantilever(2.0, 4.0, 40.0))
    1019
    """
    moment = pressure * diameter * length**2 / 2.0
    return moment * diameter / 2.0 / _inertia(diameter, bore)


@rule(
    title="pressure difference on a core pin",
    formula="pressure * share",
    source="Kazmer, Injection Mold Design Engineering, pp. 414-415: side gate at a short core up to 0.5, long slender "
    "cores about 0.1 of the filling pressure",
    provenance=Provenance.PUBLISHED,
    valid=(Valid("share", 0.05, 0.5, "", "gates opposite each other or a ring gate leave less"),),
)
def core_pin_imbalance_kazmer(pressure: Pressure, share: Ratio = 0.1) -> Pressure:
    """Difference of melt pressure between the two sides of a core pin.

    Parameters
    ----------
    pressure : melt pressure in the cavity while it fills [MPa]
    share : part of it that is not balanced [1]

    Returns
    -------
    difference of pressure [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    >>> core_pin_imbalance_kazmer(40.0)
    4.0
    """
    return pressure * share


@rule(
    title="movement allowed to a core pin",
    formula="min(0.1 * wall, tolerance / 2)",
    source="a tenth of the wall, at most half the tolerance; beyond 5 % of the wall the shift feeds itself",
    provenance=Provenance.COMMON_PRACTICE,
)
def core_pin_deflection_limit(wall: Length, tolerance: Length) -> Length:
    """Largest movement that a core pin may make.

    Parameters
    ----------
    wall : wall thickness round the pin [mm]
    tolerance : width of the tolerance of the hole's position [mm]

    Returns
    -------
    movement [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> core_pin_deflection_limit(2.0, 0.2)
    0.1
    """
    return min(0.1 * wall, tolerance / 2.0)


@rule(
    title="tilt of a core pin in its seat",
    formula="clearance / 2 + clearance * length / engagement",
    source="geometry of a loose seat; Menges, How to Make Injection Molds, ch. 11, adds it to the bending",
    provenance=Provenance.DERIVED,
)
def core_pin_tilt(clearance: LengthOrZero, engagement: Length, length: Length) -> LengthOrZero:
    """Movement of the tip of a core pin that is loose in its seat.

    Parameters
    ----------
    clearance : diametral clearance of the fit [mm]
    engagement : length of the fit [mm]
    length : free length [mm]

    Returns
    -------
    movement of the tip [mm]

    Raises
    ------
    ValueError : clearance is negative, or another argument is not positive

    >>> round(core_pin_tilt(0.02, 10.0, 30.0), 3)
    0.07
    """
    return clearance / 2.0 + clearance * length / engagement


@rule(
    title="slenderness allowed to a core pin",
    formula="10 if tip_supported else (3 if diameter < 3 else 5)",
    source="2.5 to 3 below 3 mm with a free tip, 4 to 5 otherwise, 8 to 10 with the tip in a bore",
    provenance=Provenance.COMMON_PRACTICE,
)
def core_pin_slenderness_limit(diameter: Length, tip_supported: Flag) -> Ratio:
    """Free length over diameter up to which a core pin needs no second look.

    Parameters
    ----------
    diameter : diameter of the pin [mm]
    tip_supported : the tip sits in a bore of the other half [1]

    Returns
    -------
    largest length over diameter [1]

    Raises
    ------
    ValueError : diameter is not positive

    >>> core_pin_slenderness_limit(2.0, False), core_pin_slenderness_limit(2.0, True)
    (3.0, 10.0)
    """
    if tip_supported:
        return 10.0
    return 3.0 if diameter < 3.0 else 5.0
