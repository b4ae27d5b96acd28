"""Ejection: the force that a part needs to leave its core."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import (
    AngleOrZero,
    Area,
    Expansion,
    Force,
    ForceOrZero,
    Length,
    Poisson,
    Pressure,
    Ratio,
    RatioOrZero,
    TemperatureChange,
    Valid,
    rule,
)

_SHRINK_FIT: Final = (
    "shrink fit of a thin wall on its core; Menges, How to Make Injection Molds, ch. 12, from memory; agrees with the "
    "abstract of Shen, Chen & Jiang, Plast. Rubber Compos. 28 (1999)"
)
_STRAIN: Final = Valid("strain", 0.0, 0.03, "", "shrinkage of the catalog resins")
_FRICTION: Final = Valid("friction", 0.1, 1.0, "", "plastic on steel")
_CUP: Final = (
    "closed thin-walled cup; Rosato, Injection Molding Handbook, and Glanvill & Denton have the same form "
    "(quoted by a trade page)"
)


@rule(
    title="draft factor of the ejection force",
    formula="max(0, cos(radians(draft)) * (1 - tan(radians(draft)) / friction)"
    " / (1 + friction * sin(radians(draft)) * cos(radians(draft))))",
    source="Menges, How to Make Injection Molds, ch. 12, from memory; a printed form with the opposite sign is wrong",
    provenance=Provenance.UNVERIFIED,
    valid=(_FRICTION,),
)
def draft_factor_menges(friction: Ratio, draft: AngleOrZero) -> RatioOrZero:
    """How much of the friction force is left on a drafted core.

    Parameters
    ----------
    friction : static coefficient of friction [1]
    draft : draft of the core [deg]

    Returns
    -------
    factor; zero from the angle on at which the part lets go by itself, tan(draft) = friction [1]

    Raises
    ------
    ValueError : friction is not positive, or draft is negative

    >>> [round(draft_factor_menges(0.4, angle), 3) for angle in (0.0, 0.5, 1.0, 2.0, 22.0)]
    [1.0, 0.975, 0.95, 0.9, 0.0]
    """
    angle = math.radians(draft)
    rest = 1.0 - math.tan(angle) / friction
    return max(0.0, math.cos(angle) * rest / (1.0 + friction * math.sin(angle) * math.cos(angle)))


@rule(
    title="strain at ejection",
    formula="expansion * drop",
    source="linear contraction from the no-flow to the ejection temperature; never more than the free shrinkage",
    provenance=Provenance.DERIVED,
)
def ejection_strain_thermal(expansion: Expansion, drop: TemperatureChange) -> RatioOrZero:
    """Strain that a part held by its core has gathered when it is ejected.

    Parameters
    ----------
    expansion : coefficient of linear thermal expansion of the resin [1/K]
    drop : no-flow temperature minus ejection temperature [K]

    Returns
    -------
    strain [1]

    Raises
    ------
    ValueError : an argument is not finite

    >>> round(ejection_strain_thermal(80e-6, 75.0), 4)
    0.006
    """
    return expansion * drop


@rule(
    title="contact pressure of a shrunk wall",
    formula="modulus * strain * wall / radius",
    source=_SHRINK_FIT,
    provenance=Provenance.DERIVED,
    valid=(
        _STRAIN,
        Valid(
            "wall / radius",
            high=0.2,
            why="a thin wall is assumed; a thick one presses less",
            measure=lambda wall, radius, **_: wall / radius,
        ),
    ),
)
def contact_pressure_shrink_fit(modulus: Pressure, strain: RatioOrZero, wall: Length, radius: Length) -> Pressure:
    """Pressure between a thin round wall and its core.

    Parameters
    ----------
    modulus : modulus of elasticity of the resin at ejection [MPa]
    strain : strain at ejection [1]
    wall : wall thickness [mm]
    radius : radius of the core [mm]

    Returns
    -------
    pressure [MPa]

    Raises
    ------
    ValueError : an argument is not positive, or strain is negative

    >>> round(contact_pressure_shrink_fit(1000.0, 0.006, 2.0, 20.0), 2)
    0.6
    """
    return modulus * strain * wall / radius


@rule(
    title="ejection force of an open sleeve",
    formula="2 * pi * friction * modulus * strain * wall * length * draft_factor_menges(friction, draft)",
    source=_SHRINK_FIT,
    provenance=Provenance.DERIVED,
    valid=(_STRAIN, _FRICTION),
)
def ejection_force_sleeve_menges(
    friction: Ratio, modulus: Pressure, strain: RatioOrZero, wall: Length, length: Length, draft: AngleOrZero = 0.0
) -> ForceOrZero:
    """Force to strip a closed wall, open at both ends, off a round or rounded core. The radius cancels.

    Parameters
    ----------
    friction : static coefficient of friction [1]
    modulus : modulus of elasticity of the resin at ejection [MPa]
    strain : strain at ejection [1]
    wall : wall thickness [mm]
    length : length of the wall on the core, along the pull [mm]
    draft : draft of the core [deg]

    Returns
    -------
    force, without vacuum [N]

    Raises
    ------
    ValueError : an argument is not positive, or strain or draft is negative

    >>> round(ejection_force_sleeve_menges(0.4, 1000.0, 0.006, 2.0, 40.0))
    1206
    """
    straight = 2.0 * math.pi * friction * modulus * strain * wall * length
    return straight * draft_factor_menges(friction, draft)


@rule(
    title="ejection force of a closed cup",
    formula="ejection_force_sleeve_menges(friction, modulus, strain, wall, length, draft) / (1 - poisson / 2)",
    source=_CUP,
    provenance=Provenance.DERIVED,
    valid=(_STRAIN, _FRICTION),
)
def ejection_force_cup_menges(
    friction: Ratio,
    modulus: Pressure,
    strain: RatioOrZero,
    wall: Length,
    length: Length,
    poisson: Poisson,
    draft: AngleOrZero = 0.0,
) -> ForceOrZero:
    """Force to strip a cup, closed at one end, off a round core.

    Parameters
    ----------
    friction : static coefficient of friction [1]
    modulus : modulus of elasticity of the resin at ejection [MPa]
    strain : strain at ejection [1]
    wall : wall thickness [mm]
    length : length of the wall on the core, along the pull [mm]
    poisson : Poisson's ratio of the resin [1]
    draft : draft of the core [deg]

    Returns
    -------
    force, without vacuum [N]

    Raises
    ------
    ValueError : an argument is not positive, or strain, poisson or draft is negative

    >>> round(ejection_force_cup_menges(0.4, 1000.0, 0.006, 2.0, 40.0, 0.39))
    1499
    """
    return ejection_force_sleeve_menges(friction, modulus, strain, wall, length, draft) / (1.0 - poisson / 2.0)


@rule(
    title="ejection force of a rectangular box",
    formula="8 * friction * modulus * strain * wall * length * draft_factor_menges(friction, draft)",
    source=_SHRINK_FIT + "; the four corners carry the force",
    provenance=Provenance.DERIVED,
    valid=(_STRAIN, _FRICTION),
)
def ejection_force_box_menges(
    friction: Ratio, modulus: Pressure, strain: RatioOrZero, wall: Length, length: Length, draft: AngleOrZero = 0.0
) -> ForceOrZero:
    """Force to strip a rectangular frame off its core. Length and width of the frame cancel.

    Parameters
    ----------
    friction : static coefficient of friction [1]
    modulus : modulus of elasticity of the resin at ejection [MPa]
    strain : strain at ejection [1]
    wall : wall thickness [mm]
    length : length of the wall on the core, along the pull [mm]
    draft : draft of the core [deg]

    Returns
    -------
    force, without vacuum [N]

    Raises
    ------
    ValueError : an argument is not positive, or strain or draft is negative

    >>> round(ejection_force_box_menges(0.4, 1000.0, 0.006, 2.0, 40.0))
    1536
    """
    return 8.0 * friction * modulus * strain * wall * length * draft_factor_menges(friction, draft)


@rule(
    title="ejection force from contact pressure",
    formula="friction * pressure * area * draft_factor_menges(friction, draft)",
    source="friction on the area that touches the core; Menges, How to Make Injection Molds, ch. 12, from memory",
    provenance=Provenance.UNVERIFIED,
    valid=(_FRICTION,),
)
def ejection_force_friction(friction: Ratio, pressure: Pressure, area: Area, draft: AngleOrZero = 0.0) -> ForceOrZero:
    """Force to pull a face off the steel that it presses on.

    Parameters
    ----------
    friction : static coefficient of friction [1]
    pressure : contact pressure [MPa]
    area : area of contact [mm^2]
    draft : draft of the face [deg]

    Returns
    -------
    force, without vacuum [N]

    Raises
    ------
    ValueError : an argument is not positive, or draft is negative

    >>> round(ejection_force_friction(0.4, 0.6, 2 * 3.14159265 * 20 * 40))
    1206
    """
    return friction * pressure * area * draft_factor_menges(friction, draft)


@rule(
    title="vacuum force",
    formula="vacuum * area",
    source="air pressure on a core without an air inlet",
    provenance=Provenance.DERIVED,
    valid=(Valid("vacuum", 0.0, 0.10133, "MPa", "one atmosphere at most"),),
)
def vacuum_force(area: Area, vacuum: Pressure = 0.10133) -> Force:
    """Force by which the air holds a closed part on its core.

    Parameters
    ----------
    area : area of the blind core seen along the pull [mm^2]
    vacuum : pressure difference [MPa]

    Returns
    -------
    force [N]

    Raises
    ------
    ValueError : an argument is not positive

    Notes
    -----
    From about 1000 mm^2 on, an air valve in the core is common practice.

    >>> round(vacuum_force(3.14159265 / 4 * 40.0**2))
    127
    """
    return vacuum * area
