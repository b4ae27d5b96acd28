"""Side walls of a cavity: how far the melt pressure bends or widens them, and how thick they must be."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Length, Poisson, Pressure, Ratio, Valid, rule

_WALL: Final = (
    "strip of wall 1 mm wide, bending and shear, textbook; Menges, How to Make Injection Molds, ch. 10, also adds both"
)


@rule(
    title="movement of a side wall held at its foot",
    formula="pressure * depth**4 / (8 * modulus * thickness**3 / 12)"
    " + 1.2 * pressure * depth**2 * (1 + poisson) / (modulus * thickness)",
    source=_WALL,
    provenance=Provenance.DERIVED,
)
def cavity_side_wall_cantilever(
    pressure: Pressure, depth: Length, thickness: Length, modulus: Pressure = 210e3, poisson: Poisson = 0.3
) -> Length:
    """Movement of the top of a straight side wall that only its foot holds (a long wall).

    Parameters
    ----------
    pressure : melt pressure [MPa]
    depth : depth of the cavity along the pull [mm]
    thickness : thickness of the wall, square to it [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    movement of the top [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_side_wall_cantilever(50.0, 30.0, 35.0), 4)
    0.0163
    """
    bending = pressure * depth**4 / (8.0 * modulus * thickness**3 / 12.0)
    return bending + 1.2 * pressure * depth**2 * (1.0 + poisson) / (modulus * thickness)


@rule(
    title="movement of a side wall held at its ends",
    formula="pressure * length**4 / (384 * modulus * thickness**3 / 12)"
    " + 1.2 * pressure * length**2 * (1 + poisson) / (4 * modulus * thickness)",
    source=_WALL,
    provenance=Provenance.DERIVED,
)
def cavity_side_wall_beam(
    pressure: Pressure, length: Length, thickness: Length, modulus: Pressure = 210e3, poisson: Poisson = 0.3
) -> Length:
    """Movement of the middle of a straight side wall that only its two corners hold (a deep wall).

    Parameters
    ----------
    pressure : melt pressure [MPa]
    length : length of the wall between the corners [mm]
    thickness : thickness of the wall, square to it [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    movement of the middle [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_side_wall_beam(50.0, 100.0, 35.0), 4)
    0.0439
    """
    bending = pressure * length**4 / (384.0 * modulus * thickness**3 / 12.0)
    return bending + 1.2 * pressure * length**2 * (1.0 + poisson) / (4.0 * modulus * thickness)


@rule(
    title="movement of a side wall",
    formula="min(cavity_side_wall_cantilever(pressure, depth, thickness, modulus, poisson),"
    " cavity_side_wall_beam(pressure, length, thickness, modulus, poisson))",
    source=_WALL + "; foot and corners both hold, so the smaller movement counts",
    provenance=Provenance.DERIVED,
)
def cavity_side_wall(
    pressure: Pressure,
    depth: Length,
    length: Length,
    thickness: Length,
    modulus: Pressure = 210e3,
    poisson: Poisson = 0.3,
) -> Length:
    """Movement of a straight side wall of a rectangular cavity.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    depth : depth of the cavity along the pull [mm]
    length : length of the wall between the corners [mm]
    thickness : thickness of the wall, square to it [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    largest movement [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_side_wall(50.0, 30.0, 100.0, 35.0), 3)
    0.016
    """
    foot = cavity_side_wall_cantilever(pressure, depth, thickness, modulus, poisson)
    return min(foot, cavity_side_wall_beam(pressure, length, thickness, modulus, poisson))


@rule(
    title="thickness of a side wall",
    formula="thickness where cavity_side_wall(pressure, depth, length, thickness, modulus, poisson) = limit",
    source=_WALL + "; solved for the thickness",
    provenance=Provenance.DERIVED,
)
def cavity_side_wall_thickness(
    pressure: Pressure,
    depth: Length,
    length: Length,
    limit: Length,
    modulus: Pressure = 210e3,
    poisson: Poisson = 0.3,
) -> Length:
    """Thickness at which a straight side wall moves as far as it may.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    depth : depth of the cavity along the pull [mm]
    length : length of the wall between the corners [mm]
    limit : largest movement; half the vent depth of the resin is common practice [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    least thickness [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(cavity_side_wall_thickness(50.0, 30.0, 100.0, 0.01628), 1)
    35.0
    """
    return _solve_falling(
        lambda thickness: cavity_side_wall(pressure, depth, length, thickness, modulus, poisson), limit
    )


@rule(
    title="thickness of a side wall, rule of thumb",
    formula="0.2 * length + 17",
    source="common practice for a wall with open corners",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("length", 20.0, 400.0, "mm", "usual cavities"),),
)
def cavity_side_wall_practice(length: Length) -> Length:
    """Thickness of a side wall by the length of the cavity.

    Parameters
    ----------
    length : length of the cavity along the wall [mm]

    Returns
    -------
    thickness [mm]

    Raises
    ------
    ValueError : length is not positive

    >>> cavity_side_wall_practice(100.0)
    37.0
    """
    return 0.2 * length + 17.0


@rule(
    title="widening of a round cavity",
    formula="pressure * radius / modulus * ((outer**2 + radius**2) / (outer**2 - radius**2) + poisson)",
    source="Lame, thick-walled cylinder under inner pressure",
    provenance=Provenance.DERIVED,
)
def round_cavity_growth_lame(
    pressure: Pressure, radius: Length, outer: Length, modulus: Pressure = 210e3, poisson: Poisson = 0.3
) -> Length:
    """Growth of the radius of a round cavity in a round insert.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    radius : radius of the cavity [mm]
    outer : radius of the insert [mm]
    modulus : modulus of elasticity of the steel [MPa]
    poisson : Poisson's ratio of the steel [1]

    Returns
    -------
    growth of the radius [mm]

    Raises
    ------
    ValueError : an argument is not positive, or outer is not above radius

    >>> round(round_cavity_growth_lame(60.0, 25.0, 50.0), 4)
    0.014
    """
    return pressure * radius / modulus * (_hoop(radius, outer) + poisson)


@rule(
    title="hoop stress of a round cavity",
    formula="pressure * (outer**2 + radius**2) / (outer**2 - radius**2)",
    source="Lame, thick-walled cylinder under inner pressure",
    provenance=Provenance.DERIVED,
)
def round_cavity_hoop_stress_lame(pressure: Pressure, radius: Length, outer: Length) -> Pressure:
    """Largest hoop stress of a round insert, at the cavity.

    Parameters
    ----------
    pressure : melt pressure [MPa]
    radius : radius of the cavity [mm]
    outer : radius of the insert [mm]

    Returns
    -------
    stress [MPa]

    Raises
    ------
    ValueError : an argument is not positive, or outer is not above radius

    >>> round(round_cavity_hoop_stress_lame(60.0, 25.0, 50.0))
    100
    """
    return pressure * _hoop(radius, outer)


@rule(
    title="movement allowed at the parting",
    formula="share * vent_depth",
    source="half the vent depth of the resin, so that no flash forms",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("share", 0.0, 1.0, "", "a gap of the vent depth lets melt in"),),
)
def parting_gap_limit(vent_depth: Length, share: Ratio = 0.5) -> Length:
    """Gap that may open at the parting or beside a wall without flash.

    Parameters
    ----------
    vent_depth : vent depth of the resin [mm]
    share : part of it that may be used [1]

    Returns
    -------
    gap [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> parting_gap_limit(0.03)
    0.015
    """
    return share * vent_depth


def _hoop(radius: float, outer: float) -> float:
    if outer <= radius:
        raise ValueError(f"the insert must be larger than its cavity, got radii {outer:g} and {radius:g} mm")
    return (outer**2 + radius**2) / (outer**2 - radius**2)


def _solve_falling(function: Callable[[float], float], target: float) -> float:
    """Return where a function that falls from infinity to zero reaches `target`, by bisection to the last digit."""
    low, high = 1e-9, 1.0
    while function(high) > target:
        low, high = high, 2.0 * high
    while True:
        middle = 0.5 * (low + high)
        if math.isclose(low, high, rel_tol=1e-14) or middle in (low, high):
            return high
        low, high = (middle, high) if function(middle) > target else (low, middle)
