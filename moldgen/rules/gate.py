"""Gates: depth, width and diameter of edge, pin, sprue and tunnel gates, and the sizes that the shear rate asks for."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Angle, Area, FlowRate, Length, Ratio, ShearRate, Valid, rule

_FACTOR: Final = Valid("factor", 0.6, 0.9, "", "PE and PS 0.6 to PVC 0.9")


@rule(
    title="edge gate depth",
    formula="factor * wall",
    source="Pye, Injection Mould Design, ch. 4 (formula seen in a trade tutorial with its POM example; "
    "attribution from memory)",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(_FACTOR, Valid("wall", 0.75, 4.0, "mm", "walls of the usual tables")),
)
def edge_gate_depth_pye(factor: Ratio, wall: Length) -> Length:
    """Depth of an edge gate.

    Parameters
    ----------
    factor : n of the resin [1]
    wall : wall thickness at the gate [mm]

    Returns
    -------
    depth of the gate [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(edge_gate_depth_pye(0.7, 1.5), 2)
    1.05
    """
    return factor * wall


@rule(
    title="edge gate width",
    formula="factor * sqrt(surface_area) / 30",
    source="Pye, Injection Mould Design, ch. 4 (formula seen in a trade tutorial with its POM example; "
    "attribution from memory)",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(_FACTOR,),
)
def edge_gate_width_pye(factor: Ratio, surface_area: Area) -> Length:
    """Width of an edge gate.

    Parameters
    ----------
    factor : n of the resin [1]
    surface_area : area of the cavity's surface, that is the outside of the part [mm^2]

    Returns
    -------
    width of the gate [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(edge_gate_width_pye(0.7, 4900.0), 2)
    1.63
    """
    return factor * math.sqrt(surface_area) / 30.0


@rule(
    title="pin gate diameter",
    formula="factor * 0.206 * sqrt(wall) * surface_area ** 0.25",
    source="Pye, Injection Mould Design, ch. 4, from memory",
    provenance=Provenance.UNVERIFIED,
    valid=(
        _FACTOR,
        Valid("wall", 0.75, 2.5, "mm", "range of the printed table, from memory"),
        Valid(
            "diameter",
            0.8,
            2.0,
            "mm",
            "usual pin gates",
            measure=lambda factor, wall, surface_area: factor * 0.206 * math.sqrt(wall) * surface_area**0.25,
        ),
    ),
)
def pin_gate_diameter_pye(factor: Ratio, wall: Length, surface_area: Area) -> Length:
    """Diameter of a pin gate.

    Parameters
    ----------
    factor : n of the resin [1]
    wall : wall thickness at the gate [mm]
    surface_area : area of the cavity's surface, that is the outside of the part [mm^2]

    Returns
    -------
    diameter of the gate [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(pin_gate_diameter_pye(0.7, 1.5, 4900.0), 2)
    1.48
    """
    return float(factor * 0.206 * math.sqrt(wall) * surface_area**0.25)


@rule(
    title="sprue diameter at the part",
    formula="wall + allowance",
    source="Menges, How to Make Injection Molds, ch. 5 and 6, from memory: wall + 1 to 1.5 mm, at most twice the wall",
    provenance=Provenance.UNVERIFIED,
    valid=(
        Valid("allowance", 1.0, 1.5, "mm", "the source's figures"),
        Valid(
            "diameter over wall",
            high=2.0,
            why="a thicker sprue leaves a sink mark",
            measure=lambda wall, allowance: (wall + allowance) / wall,
        ),
    ),
)
def sprue_diameter_menges(wall: Length, allowance: Length = 1.25) -> Length:
    """Diameter of a direct sprue where it meets the part.

    Parameters
    ----------
    wall : wall thickness at the sprue [mm]
    allowance : added to the wall so that the sprue freezes last [mm]

    Returns
    -------
    diameter at the part [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> sprue_diameter_menges(2.5)
    3.75
    """
    return wall + allowance


@rule(
    title="diameter of a tapered sprue at its other end",
    formula="diameter - 2 * length * tan(radians(taper))",
    source="trigonometry; taper 1 to 2 deg per side is common practice",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("taper", 1.0, 2.0, "deg", "less sticks, more is slow to cool"),),
)
def sprue_small_diameter(diameter: Length, length: Length, taper: Angle = 1.0) -> Length:
    """Diameter of a tapered sprue at the nozzle, from its diameter at the part.

    Parameters
    ----------
    diameter : diameter at the part [mm]
    length : length of the sprue [mm]
    taper : half angle of the cone [deg]

    Returns
    -------
    diameter at the nozzle; zero or less means that the sprue is too long for its diameter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(sprue_small_diameter(5.0, 60.0, 1.0), 3)
    2.905
    """
    return diameter - 2.0 * length * math.tan(math.radians(taper))


@rule(
    title="tunnel gate of the same area as an edge gate",
    formula="2 * sqrt(depth * width / pi)",
    source="trade journal: equal area of the orifice",
    provenance=Provenance.PUBLISHED,
)
def tunnel_gate_diameter_equal_area(depth: Length, width: Length) -> Length:
    """Diameter of a round orifice that has the area of an edge gate.

    Parameters
    ----------
    depth : depth of the edge gate [mm]
    width : width of the edge gate [mm]

    Returns
    -------
    diameter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(tunnel_gate_diameter_equal_area(1.05, 1.63), 3)
    1.476
    """
    return 2.0 * math.sqrt(depth * width / math.pi)


@rule(
    title="smallest round gate for a shear rate",
    formula="2 * (4 * flow / (pi * shear_limit)) ** (1 / 3)",
    source="inverse of the Newtonian wall shear rate",
    provenance=Provenance.DERIVED,
)
def round_gate_diameter_min(flow: FlowRate, shear_limit: ShearRate) -> Length:
    """Diameter at which a round gate just keeps the shear limit.

    Parameters
    ----------
    flow : volume rate through the gate [mm^3/s]
    shear_limit : largest apparent shear rate of the resin [1/s]

    Returns
    -------
    smallest diameter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(round_gate_diameter_min(5e3, 50e3), 3)
    1.006
    """
    return float(2.0 * (4.0 * flow / (math.pi * shear_limit)) ** (1.0 / 3.0))


@rule(
    title="smallest width of an edge gate for a shear rate",
    formula="6 * flow / (shear_limit * depth**2)",
    source="inverse of the Newtonian wall shear rate",
    provenance=Provenance.DERIVED,
)
def edge_gate_width_min(flow: FlowRate, depth: Length, shear_limit: ShearRate) -> Length:
    """Width at which an edge gate of given depth just keeps the shear limit.

    Parameters
    ----------
    flow : volume rate through the gate [mm^3/s]
    depth : depth of the gate [mm]
    shear_limit : largest apparent shear rate of the resin [1/s]

    Returns
    -------
    smallest width [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> edge_gate_width_min(10e3, 1.0, 20e3)
    3.0
    """
    return 6.0 * flow / (shear_limit * depth**2)
