"""Floor of a cavity that bridges a hollow behind it: how far it bends, and how thick it must be."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Length, Poisson, Pressure, Ratio, Valid, rule

_TERMS: Final = (1, 3, 5, 7, 9)
_THIN: Final = Valid(
    "thickness / width",
    high=0.5,
    why="a thick plate also shears, which is neglected",
    measure=lambda thickness, width, **_: thickness / width,
)


@rule(
    title="thickness of a round cavity floor",
    formula="(pressure * radius**4 / (6 * modulus * limit)) ** (1 / 3)",
    source="Pye, Injection Mould Design, eq. 12.1 (after Reuleaux)",
    provenance=Provenance.PUBLISHED,
)
def cavity_floor_thickness_reuleaux(
    pressure: Pressure, radius: Length, limit: Length, modulus: Pressure = 210e3
) -> Length:
    """Thickness of a round floor that is clamped at its rim and hollow behind.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    radius : radius of the hollow behind the floor [mm]
    limit : largest movement of the middle [mm]
    modulus : modulus of elasticity of the steel [MPa]

    Returns
    -------
    least thickness [mm]

    Raises
    ------
    ValueError : an argument is not positive

    Notes
    -----
    Plate theory has 0.1706 (Poisson's ratio 0.3) where the source has 1/6.

    >>> round(cavity_floor_thickness_reuleaux(60.0, 25.0, 0.02, 207e3), 2)
    9.81
    """
    return float((pressure * radius**4 / (6.0 * modulus * limit)) ** (1.0 / 3.0))


@rule(
    title="coefficient of a rectangular plate",
    formula="48 * (1 - poisson**2) / pi**5 * sum((-1) ** ((m - 1) // 2) / m**5"
    " * (1 - (min(m * pi * ratio / 2, 50) * tanh(min(m * pi * ratio / 2, 50)) + 2)"
    " / (2 * cosh(min(m * pi * ratio / 2, 50)))) for m in (1, 3, 5, 7, 9))",
    source="Levy's series for a plate that is simply supported at all edges; the printed tables agree",
    provenance=Provenance.DERIVED,
)
def plate_coefficient_levy(ratio: Ratio, poisson: Poisson = 0.3) -> Ratio:
    """Coefficient C of the bending of a rectangular plate, C pressure width^4 / (modulus thickness^3).

    Parameters
    ----------
    ratio : length over width of the plate, 1 or more [1]
    poisson : Poisson's ratio [1]

    Returns
    -------
    coefficient [1]

    Raises
    ------
    ValueError : ratio is below 1, or poisson is impossible

    >>> round(plate_coefficient_levy(1.0), 4), round(plate_coefficient_levy(2.0), 3)
    (0.0444, 0.111)
    """
    if ratio < 1.0:
        raise ValueError(f"length over width must be 1 or more, got {ratio:g}")
    return 48.0 * (1.0 - poisson**2) / math.pi**5 * sum(_levy_term(m, ratio) for m in _TERMS)


@rule(
    title="movement of a rectangular cavity floor",
    formula="plate_coefficient_levy(max(width, length) / min(width, length), poisson)"
    " * pressure * min(width, length)**4 / (modulus * thickness**3)",
    source="plate theory, simply supported at all edges",
    provenance=Provenance.DERIVED,
    valid=(_THIN,),
)
def cavity_floor_rectangular(
    pressure: Pressure,
    width: Length,
    length: Length,
    thickness: Length,
    modulus: Pressure = 210e3,
    poisson: Poisson = 0.3,
) -> Length:
    """Movement of the middle of a rectangular floor that is hollow behind.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    width : width of the hollow behind the floor [mm]
    length : length of the hollow behind the floor [mm]
    thickness : thickness of the floor [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    movement of the middle [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_floor_rectangular(50.0, 40.0, 80.0, 40.0), 4)
    0.0011
    """
    narrow, wide = sorted((width, length))
    return plate_coefficient_levy(wide / narrow, poisson) * pressure * narrow**4 / (modulus * thickness**3)


@rule(
    title="thickness of a rectangular cavity floor",
    formula="(plate_coefficient_levy(max(width, length) / min(width, length), poisson)"
    " * pressure * min(width, length)**4 / (modulus * limit)) ** (1 / 3)",
    source="plate theory, simply supported at all edges",
    provenance=Provenance.DERIVED,
)
def cavity_floor_thickness_rectangular(
    pressure: Pressure,
    width: Length,
    length: Length,
    limit: Length,
    modulus: Pressure = 210e3,
    poisson: Poisson = 0.3,
) -> Length:
    """Thickness of a rectangular floor that is hollow behind.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    width : width of the hollow behind the floor [mm]
    length : length of the hollow behind the floor [mm]
    limit : largest movement of the middle [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    least thickness [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_floor_thickness_rectangular(50.0, 40.0, 80.0, 0.02), 1)
    15.0
    """
    narrow, wide = sorted((width, length))
    coefficient = plate_coefficient_levy(wide / narrow, poisson)
    return float((coefficient * pressure * narrow**4 / (modulus * limit)) ** (1.0 / 3.0))


def _levy_term(m: int, ratio: float) -> float:
    # Past 50 the bracket is 1 to machine precision, and cosh would overflow for very long plates.
    alpha = min(m * math.pi * ratio / 2.0, 50.0)
    bracket = 1.0 - (alpha * math.tanh(alpha) + 2.0) / (2.0 * math.cosh(alpha))
    return float((-1) ** ((m - 1) // 2) / m**5 * bracket)
