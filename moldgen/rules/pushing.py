"""Pushing the part off: what the ejector pins do to it, how many it takes, and how far they go."""

from __future__ import annotations

import math

from moldgen.quantity import Provenance
from moldgen.rules.rule import Area, Count, ForceOrZero, Length, LengthOrZero, Pressure, Ratio, Valid, rule


@rule(
    title="pressure of the pins on the part",
    formula="force / (pins * pi / 4 * diameter**2)",
    source="force over the faces of the pins",
    provenance=Provenance.DERIVED,
)
def pin_push_pressure(force: ForceOrZero, pins: Count, diameter: Length) -> Pressure:
    """Pressure of the ejector pins on the part, shared equally.

    Parameters
    ----------
    force : ejection force [N]
    pins : number of equal pins [1]
    diameter : diameter of a pin [mm]

    Returns
    -------
    pressure, to be held against the resin's push pressure [MPa]

    Raises
    ------
    ValueError : force is negative, there is no pin, or diameter is not positive

    >>> round(pin_push_pressure(1206.0, 4, 4.0), 1)
    24.0
    """
    return force / (pins * math.pi / 4.0 * diameter**2)


@rule(
    title="punch-through shear stress",
    formula="force / (pins * pi * diameter * wall)",
    source="shear over the cylinder that a pin would punch out; half the push pressure is the limit in common practice",
    provenance=Provenance.COMMON_PRACTICE,
)
def punch_shear_stress(force: ForceOrZero, pins: Count, diameter: Length, wall: Length) -> Pressure:
    """Shear stress in the wall round the ejector pins.

    Parameters
    ----------
    force : ejection force [N]
    pins : number of equal pins [1]
    diameter : diameter of a pin [mm]
    wall : wall thickness over the pin [mm]

    Returns
    -------
    shear stress [MPa]

    Raises
    ------
    ValueError : force is negative, there is no pin, or a length is not positive

    >>> round(punch_shear_stress(1206.0, 4, 4.0, 2.0), 1)
    12.0
    """
    return force / (pins * math.pi * diameter * wall)


@rule(
    title="pin face area by side-wall area",
    formula="wall_area / ratio",
    source="resin producer's design slides: 1 in^2 of pin face for 80 to 100 in^2 of side wall",
    provenance=Provenance.PUBLISHED,
    valid=(Valid("ratio", 80.0, 100.0, "", "stated by the source"),),
)
def pin_area_by_side_wall(wall_area: Area, ratio: Ratio = 80.0) -> Area:
    """Area of pin faces that a part with these side walls wants.

    Parameters
    ----------
    wall_area : area of the side walls of the part [mm^2]
    ratio : side-wall area for each unit of pin face [1]

    Returns
    -------
    area of all pin faces together [mm^2]

    Raises
    ------
    ValueError : an argument is not positive

    >>> pin_area_by_side_wall(80.0 * 645.16)
    645.16
    """
    return wall_area / ratio


@rule(
    title="number of pins for a face area",
    formula="area / (pi / 4 * diameter**2)",
    source="area of a circle",
    provenance=Provenance.DERIVED,
)
def pins_for_area(area: Area, diameter: Length) -> Ratio:
    """Number of pins whose faces make up an area; round up.

    Parameters
    ----------
    area : area of all pin faces together [mm^2]
    diameter : diameter of a pin [mm]

    Returns
    -------
    number of pins, not rounded [1]

    Raises
    ------
    ValueError : an argument is not positive

    >>> round(pins_for_area(645.16, 3.175), 1)
    81.5
    """
    return area / (math.pi / 4.0 * diameter**2)


@rule(
    title="ejection stroke",
    formula="depth + margin",
    source="Pye, Injection Mould Design: height of the molding plus 5 mm; 5 to 10 mm is common practice",
    provenance=Provenance.PUBLISHED,
    valid=(Valid("margin", 5.0, 10.0, "mm", "less may leave the part hanging"),),
)
def ejection_stroke_pye(depth: LengthOrZero, margin: Length = 5.0) -> Length:
    """Travel of the ejector pins that frees the part.

    Parameters
    ----------
    depth : depth of the part on the core, along the pull [mm]
    margin : travel beyond that [mm]

    Returns
    -------
    stroke [mm]

    Raises
    ------
    ValueError : depth is negative, or margin is not positive

    >>> ejection_stroke_pye(25.0)
    30.0
    """
    return depth + margin
