"""Buckling of a shouldered pin: two pieces of different stiffness, the nose guided, the head held."""

from __future__ import annotations

import math
from typing import Final

STEP: Final = 0.2
"""rad: step of the search along the softer piece; two roots never lie this close."""


def stepped_buckling_force(
    tip_diameter: float, tip: float, diameter: float, shank: float, modulus: float = 200e3
) -> float:
    """Return the axial force at which a shouldered pin buckles [N], without a factor of safety.

    Parameters
    ----------
    tip_diameter, tip : diameter and unguided length of the tip, from the fit to the shoulder [mm]
    diameter, shank : diameter and length of the shank, from the shoulder to the head [mm]
    modulus : of elasticity of the pin [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    Source: Euler's equation of both pieces, the line of thrust through the guided nose, deflection and slope alike at
    the shoulder and none at the head; the least force that allows a bent shape. Derived here; with equal diameters it
    is Euler's case with a buckling length of 0.699 of the length.

    >>> round(stepped_buckling_force(3.0, 60.0, 3.0, 60.0))
    1115
    """
    if min(tip_diameter, tip, diameter, shank, modulus) <= 0.0:
        raise ValueError("diameters, lengths and modulus of a pin must be above zero")
    soft = min(tip_diameter, diameter)
    stiffness = [modulus * math.pi * d**4 / 64.0 for d in (tip_diameter, diameter, soft)]

    def open_end(wave: float) -> float:
        """Return what is missing at the head when the softer piece bends with this wave number [1/mm]."""
        force = wave**2 * stiffness[2]
        k1, k2 = math.sqrt(force / stiffness[0]), math.sqrt(force / stiffness[1])
        at, slope = math.sin(k1 * tip) / k1, math.cos(k1 * tip)
        sine, cosine = math.sin(k2 * shank), math.cos(k2 * shank)
        return at * cosine + slope * sine / k2 - (tip + shank) * (slope * cosine - at * k2 * sine)

    step = STEP / (tip + shank)
    low = step
    while open_end(low + step) > 0.0:
        low += step
    high = low + step
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if open_end(middle) > 0.0 else (low, middle)
    return low**2 * stiffness[2]
