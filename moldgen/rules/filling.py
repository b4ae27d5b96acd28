"""Filling: isothermal pressure drop of a power-law melt, shear rates, flow length, fill time."""

from __future__ import annotations

import math

from moldgen.quantity import Provenance
from moldgen.rules.rule import Consistency, FlowRate, Length, Pressure, Ratio, Seconds, ShearRate, Valid, rule

_INDEX = Valid("index", 0.15, 1.0, "", "melts thin with the shear rate")


@rule(
    title="pressure drop in a slot",
    formula="2e-6 * consistency * length / depth * (2 * (2 * index + 1) / index * flow / (width * depth**2)) ** index",
    source="steady flow of a power-law fluid between plates",
    provenance=Provenance.DERIVED,
    valid=(
        _INDEX,
        Valid("width / depth", low=10.0, why="edges are neglected", measure=lambda width, depth, **_: width / depth),
    ),
)
def slot_pressure_drop_power_law(
    flow: FlowRate, width: Length, depth: Length, length: Length, consistency: Consistency, index: Ratio
) -> Pressure:
    """Pressure drop of a melt through a wide slot.

    Parameters
    ----------
    flow : volume rate [mm^3/s]
    width : width of the slot [mm]
    depth : depth of the slot, less the frozen layers if they are to count [mm]
    length : length along the flow [mm]
    consistency : K of tau = K rate**n [Pa s^n]
    index : n of the power law [1]

    Returns
    -------
    pressure drop [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(slot_pressure_drop_power_law(20e3, 50.0, 2.0, 100.0, 3.93e4, 0.25), 2)
    23.13
    """
    rate = 2.0 * (2.0 * index + 1.0) / index * flow / (width * depth**2)
    return float(2e-6 * consistency * length / depth * rate**index)


@rule(
    title="pressure drop in a round channel",
    formula="2e-6 * consistency * length / (diameter / 2)"
    " * ((3 * index + 1) / index * flow / (pi * (diameter / 2)**3)) ** index",
    source="steady flow of a power-law fluid in a tube; inverse of Kazmer, Injection Mold Design Engineering, eq. 6.8",
    provenance=Provenance.PUBLISHED,
    valid=(_INDEX,),
)
def tube_pressure_drop_power_law(
    flow: FlowRate, diameter: Length, length: Length, consistency: Consistency, index: Ratio
) -> Pressure:
    """Pressure drop of a melt through a round channel.

    Parameters
    ----------
    flow : volume rate [mm^3/s]
    diameter : diameter of the channel [mm]
    length : length along the flow [mm]
    consistency : K of tau = K rate**n [Pa s^n]
    index : n of the power law [1]

    Returns
    -------
    pressure drop [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(tube_pressure_drop_power_law(20e3, 6.0, 60.0, 3.93e4, 0.25), 2)
    10.02
    """
    radius = diameter / 2.0
    rate = (3.0 * index + 1.0) / index * flow / (math.pi * radius**3)
    return float(2e-6 * consistency * length / radius * rate**index)


@rule(
    title="diameter of a round channel for a pressure drop",
    formula="2 * (((3 + 1 / index) * flow / pi) ** index"
    " * 2e-6 * consistency * length / drop) ** (1 / (3 * index + 1))",
    source="Kazmer, Injection Mold Design Engineering, eq. 6.8",
    provenance=Provenance.PUBLISHED,
    valid=(_INDEX,),
)
def tube_diameter_kazmer(
    flow: FlowRate, drop: Pressure, length: Length, consistency: Consistency, index: Ratio
) -> Length:
    """Diameter of a round channel that costs a given pressure.

    Parameters
    ----------
    flow : volume rate [mm^3/s]
    drop : pressure drop [MPa]
    length : length along the flow [mm]
    consistency : K of tau = K rate**n [Pa s^n]
    index : n of the power law [1]

    Returns
    -------
    diameter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(tube_diameter_kazmer(20e3, 10.0, 60.0, 3.93e4, 0.25) / 2, 3)
    3.003
    """
    inner = ((3.0 + 1.0 / index) * flow / math.pi) ** index * 2e-6 * consistency * length / drop
    return float(2.0 * inner ** (1.0 / (3.0 * index + 1.0)))


@rule(
    title="apparent shear rate in a slot",
    formula="6 * flow / (width * depth**2)",
    source="Newtonian wall shear rate; limits for gates are on this apparent rate by custom",
    provenance=Provenance.DERIVED,
)
def slot_shear_rate(flow: FlowRate, width: Length, depth: Length) -> ShearRate:
    """Apparent shear rate at the wall of a slot, such as an edge gate.

    Parameters
    ----------
    flow : volume rate through the gate [mm^3/s]
    width : width of the slot [mm]
    depth : depth of the slot [mm]

    Returns
    -------
    apparent shear rate [1/s]

    Raises
    ------
    ValueError : an argument is not positive

    >>> slot_shear_rate(10e3, 3.0, 1.0)
    20000.0
    """
    return 6.0 * flow / (width * depth**2)


@rule(
    title="apparent shear rate in a round channel",
    formula="4 * flow / (pi * (diameter / 2)**3)",
    source="Newtonian wall shear rate; limits for gates are on this apparent rate by custom",
    provenance=Provenance.DERIVED,
)
def round_shear_rate(flow: FlowRate, diameter: Length) -> ShearRate:
    """Apparent shear rate at the wall of a round channel, such as a pin gate.

    Parameters
    ----------
    flow : volume rate through the gate [mm^3/s]
    diameter : diameter [mm]

    Returns
    -------
    apparent shear rate [1/s]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(round_shear_rate(5e3, 1.0))
    50930
    """
    return 4.0 * flow / (math.pi * (diameter / 2.0) ** 3)


@rule(
    title="true over apparent shear rate in a slot",
    formula="(2 * index + 1) / (3 * index)",
    source="Rabinowitsch correction for a power-law fluid",
    provenance=Provenance.UNVERIFIED,
    valid=(_INDEX,),
)
def slot_rabinowitsch_factor(index: Ratio) -> Ratio:
    """Factor from the apparent to the true shear rate at the wall of a slot.

    Parameters
    ----------
    index : n of the power law [1]

    Returns
    -------
    true over apparent shear rate [1]

    Raises
    ------
    ValueError : index is not positive

    >>> slot_rabinowitsch_factor(0.25)
    2.0
    """
    return (2.0 * index + 1.0) / (3.0 * index)


@rule(
    title="true over apparent shear rate in a round channel",
    formula="(3 * index + 1) / (4 * index)",
    source="Rabinowitsch correction for a power-law fluid",
    provenance=Provenance.UNVERIFIED,
    valid=(_INDEX,),
)
def round_rabinowitsch_factor(index: Ratio) -> Ratio:
    """Factor from the apparent to the true shear rate at the wall of a round channel.

    Parameters
    ----------
    index : n of the power law [1]

    Returns
    -------
    true over apparent shear rate [1]

    Raises
    ------
    ValueError : index is not positive

    >>> round_rabinowitsch_factor(0.25)
    1.75
    """
    return (3.0 * index + 1.0) / (4.0 * index)


@rule(
    title="flow length limit",
    formula="flow_ratio * wall * min(1, wall / 1.5)",
    source="flow length to wall of the resin at 2 mm; below 1.5 mm the ratio falls about as the wall",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("wall", 0.5, 4.0, "mm", "flow-length figures are for such walls"),),
)
def flow_length_limit(flow_ratio: Ratio, wall: Length) -> Length:
    """Length that the melt can flow from one gate.

    Parameters
    ----------
    flow_ratio : flow length over wall at 2 mm wall [1]
    wall : usual wall thickness of the part [mm]

    Returns
    -------
    largest flow length [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> flow_length_limit(150.0, 2.0), flow_length_limit(150.0, 0.75)
    (300.0, 56.25)
    """
    return flow_ratio * wall * min(1.0, wall / 1.5)


@rule(
    title="fill time",
    formula="max(0.5 * wall, wall - 1)",
    source="common practice: 0.5 s at 1 mm, 1 s at 2 mm, 2 to 3 s at 3 to 4 mm",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("wall", 0.5, 4.0, "mm", "first guess for such walls"),),
)
def fill_time(wall: Length) -> Seconds:
    """First guess of the time to fill the cavity.

    Parameters
    ----------
    wall : usual wall thickness of the part [mm]

    Returns
    -------
    fill time [s]

    Raises
    ------
    ValueError : wall is not positive

    >>> fill_time(1.0), fill_time(2.0), fill_time(3.5)
    (0.5, 1.0, 2.5)
    """
    return max(0.5 * wall, wall - 1.0)
