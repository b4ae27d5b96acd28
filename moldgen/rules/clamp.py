"""Clamp force and the pressures that follow from it."""

from __future__ import annotations

from moldgen.quantity import Provenance
from moldgen.rules.rule import Area, Force, Length, Pressure, PressureOrZero, Ratio, Valid, rule


@rule(
    title="clamp force",
    formula="pressure * projected_area * margin",
    source="mean pressure on the projected area, with a margin of 1.1 to 1.2",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("margin", 1.0, 1.3, "", "common practice 1.1 to 1.2"),),
)
def clamp_force_simple(pressure: Pressure, projected_area: Area, margin: Ratio = 1.1) -> Force:
    """Force that keeps the mold closed.

    Parameters
    ----------
    pressure : mean melt pressure in the cavity [MPa]
    projected_area : area of parts and runners seen along the pull [mm^2]
    margin : factor of safety [1]

    Returns
    -------
    clamp force [N]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(clamp_force_simple(35.0, 20000.0))
    770000
    """
    return pressure * projected_area * margin


@rule(
    title="mean cavity pressure from flow",
    formula="base * viscosity_factor * allowance",
    source="Crawford, Plastics Engineering, ex. 4.6: base pressure by flow ratio, times a viscosity factor, "
    "plus 10 to 20 %",
    provenance=Provenance.PUBLISHED,
    valid=(
        Valid("viscosity_factor", 1.0, 2.0, "", "PE, PP, PS 1; PA66 1.2-1.4; ABS 1.3-1.4; PMMA 1.5-1.7; PVC, PC to 2"),
        Valid("allowance", 1.0, 1.2, "", "stated by the source"),
    ),
)
def mean_pressure_crawford(base: Pressure, viscosity_factor: Ratio, allowance: Ratio = 1.15) -> Pressure:
    """Mean cavity pressure of a thin part, from the base pressure for its flow ratio.

    Parameters
    ----------
    base : pressure for a melt of low viscosity at this flow ratio and wall [MPa]
    viscosity_factor : how much stiffer the melt is [1]
    allowance : factor of safety [1]

    Returns
    -------
    mean cavity pressure [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    Notes
    -----
    Tables of mean pressure are for usual walls: for a thin cup this rule gives three times as much, and both are right.

    >>> round(mean_pressure_crawford(75.0, 1.4), 2)
    120.75
    """
    return base * viscosity_factor * allowance


@rule(
    title="mean cavity pressure",
    formula="max(usual, drop / 2 + end)",
    source="the larger of the resin's usual pressure and half the pressure drop plus 10 MPa at the end of flow",
    provenance=Provenance.COMMON_PRACTICE,
)
def mean_pressure_from_drop(usual: Pressure, drop: PressureOrZero, end: PressureOrZero = 10.0) -> Pressure:
    """Mean cavity pressure, not less than what the flow through the part asks for.

    Parameters
    ----------
    usual : usual mean cavity pressure of the resin [MPa]
    drop : pressure drop from the gate to the end of flow [MPa]
    end : pressure needed at the end of flow [MPa]

    Returns
    -------
    mean cavity pressure [MPa]

    Raises
    ------
    ValueError : usual is not positive, or another argument is negative

    >>> mean_pressure_from_drop(32.5, 20.0), mean_pressure_from_drop(32.5, 90.0)
    (32.5, 55.0)
    """
    return max(usual, drop / 2.0 + end)


@rule(
    title="pressure on a platen",
    formula="force / (width * length)",
    source="force over area; up to about 60 MPa is common practice",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(
        Valid(
            "pressure",
            high=60.0,
            unit="MPa",
            why="a small mold dents the platen",
            measure=lambda force, width, length: force / (width * length),
        ),
    ),
)
def platen_pressure(force: Force, width: Length, length: Length) -> Pressure:
    """Pressure of the whole mold on the platen under full clamp.

    Parameters
    ----------
    force : clamp force [N]
    width : width of the mold [mm]
    length : length of the mold [mm]

    Returns
    -------
    pressure [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(platen_pressure(1e6, 250.0, 315.0), 1)
    12.7
    """
    return force / (width * length)


@rule(
    title="land area needed",
    formula="force / contact_pressure",
    source="force over area; 80 MPa on prehardened and 120 MPa on hardened steel are common practice",
    provenance=Provenance.COMMON_PRACTICE,
)
def land_area_min(force: Force, contact_pressure: Pressure) -> Area:
    """Least area of steel that must touch at the parting when the mold is clamped empty.

    Parameters
    ----------
    force : clamp force [N]
    contact_pressure : largest pressure on the land [MPa]

    Returns
    -------
    area [mm^2]

    Raises
    ------
    ValueError : an argument is not positive

    >>> land_area_min(1e6, 80.0)
    12500.0
    """
    return force / contact_pressure
