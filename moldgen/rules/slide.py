"""Slides: travel, angles, guides, and what the melt, the pin and the locking face do to each other."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import (
    Angle,
    Area,
    Force,
    ForceOrZero,
    Length,
    Mass,
    Pressure,
    PressureOrZero,
    RatioOrZero,
    Valid,
    rule,
)

GRAVITY: Final = 9.81
"""m/s^2."""

_FORCES: Final = "balance of forces on a wedge without friction; Kazmer, Injection Mold Design Engineering, eq. 11.23"


@rule(
    title="travel of a slide",
    formula="undercut + margin",
    source="common practice: 2 to 3 mm more than the undercut, at least 1.5",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("margin", 1.5, 5.0, "mm", "common practice 2 to 3"),),
)
def slide_travel_practice(undercut: Length, margin: Length = 2.5) -> Length:
    """Travel that takes a slide clear of the part.

    Parameters
    ----------
    undercut : depth of the undercut along the travel [mm]
    margin : how far beyond it the slide stops [mm]

    Returns
    -------
    travel [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> slide_travel_practice(5.0)
    7.5
    """
    return undercut + margin


@rule(
    title="angle of the locking face of a slide",
    formula="pin_angle + extra",
    source="common practice: 2 to 3 deg more than the angled pin, so that the face is free before the slide moves",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("extra", 2.0, 4.0, "deg", "common practice 2 to 3, up to 4"),),
)
def locking_face_angle(pin_angle: Angle, extra: Angle = 2.0) -> Angle:
    """Angle between the locking face and the pull.

    Parameters
    ----------
    pin_angle : angle between the angled pin and the pull [deg]
    extra : how much more the locking face leans [deg]

    Returns
    -------
    angle [deg]

    Raises
    ------
    ValueError : an argument is not between 0 and 90 deg

    >>> locking_face_angle(20.0)
    22.0
    """
    return pin_angle + extra


@rule(
    title="guided length of a slide",
    formula="max(1.5 * height, 3 * travel)",
    source="common practice: 1.5 times the height, and two thirds stay in the guide when the slide is out",
    provenance=Provenance.COMMON_PRACTICE,
)
def slide_guided_length(height: Length, travel: Length) -> Length:
    """Length of the slide in its guide, closed.

    Parameters
    ----------
    height : height of the slide [mm]
    travel : travel [mm]

    Returns
    -------
    guided length [mm]

    Raises
    ------
    ValueError : an argument is not positive

    >>> slide_guided_length(30.0, 12.0), slide_guided_length(20.0, 12.0)
    (45.0, 36.0)
    """
    return max(1.5 * height, 3.0 * travel)


@rule(
    title="force of the melt on a slide",
    formula="pressure * area",
    source=_FORCES,
    provenance=Provenance.PUBLISHED,
)
def slide_melt_force_kazmer(pressure: Pressure, area: Area) -> Force:
    """Force of the melt that drives a slide outward.

    Parameters
    ----------
    pressure : mean melt pressure in the cavity [MPa]
    area : area of the forming face seen along the travel [mm^2]

    Returns
    -------
    force along the travel [N]

    Raises
    ------
    ValueError : an argument is not positive

    >>> slide_melt_force_kazmer(40.0, 2000.0)
    80000.0
    """
    return pressure * area


@rule(
    title="part of the melt's force on a slide that opens the mold",
    formula="force * tan(radians(locking_angle))",
    source=_FORCES,
    provenance=Provenance.DERIVED,
)
def locking_axial_force(force: ForceOrZero, locking_angle: Angle) -> ForceOrZero:
    """Force along the pull that a locking face adds to the clamp force.

    Parameters
    ----------
    force : force of the melt along the travel [N]
    locking_angle : angle between the locking face and the pull [deg]

    Returns
    -------
    force along the pull [N]

    Raises
    ------
    ValueError : force is negative, or the angle is not between 0 and 90 deg

    >>> round(locking_axial_force(80000.0, 20.0))
    29118
    """
    return force * math.tan(math.radians(locking_angle))


@rule(
    title="force square to the locking face",
    formula="force / cos(radians(locking_angle))",
    source=_FORCES,
    provenance=Provenance.DERIVED,
)
def locking_normal_force(force: ForceOrZero, locking_angle: Angle) -> ForceOrZero:
    """Force that the locking face takes, square to itself.

    Parameters
    ----------
    force : force of the melt along the travel [N]
    locking_angle : angle between the locking face and the pull [deg]

    Returns
    -------
    force square to the face [N]

    Raises
    ------
    ValueError : force is negative, or the angle is not between 0 and 90 deg

    >>> round(locking_normal_force(80000.0, 22.0))
    86283
    """
    return force / math.cos(math.radians(locking_angle))


@rule(
    title="angle up to which a locking face holds by friction",
    formula="degrees(atan(friction))",
    source="tan(angle) = friction, textbook",
    provenance=Provenance.DERIVED,
)
def self_locking_angle(friction: RatioOrZero = 0.15) -> Angle:
    """Angle of a face that does not slip by itself; a steeper one pushes the mold open.

    Parameters
    ----------
    friction : steel on greased steel [1]

    Returns
    -------
    angle [deg]

    Raises
    ------
    ValueError : friction is negative

    >>> round(self_locking_angle(0.15), 1)
    8.5
    """
    return math.degrees(math.atan(friction))


@rule(
    title="pressure on the locking face",
    formula="force / area",
    source="force over area",
    provenance=Provenance.DERIVED,
)
def locking_face_pressure(force: Force, area: Area) -> Pressure:
    """Mean pressure between the locking face and the slide.

    Parameters
    ----------
    force : force square to the face [N]
    area : area of the face [mm^2]

    Returns
    -------
    pressure [MPa]

    Raises
    ------
    ValueError : an argument is not positive

    >>> locking_face_pressure(80000.0, 1600.0)
    50.0
    """
    return force / area


@rule(
    title="drag of a slide",
    formula="sticking + friction * 9.81e-3 * mass",
    source="friction of the shrunk resin on the front, and of the slide's weight in its guide; no melt load: the "
    "locking face takes that",
    provenance=Provenance.DERIVED,
)
def slide_drag(sticking: ForceOrZero, mass: Mass, friction: RatioOrZero = 0.15) -> ForceOrZero:
    """Force that pulls a slide out.

    Parameters
    ----------
    sticking : force that holds the front in the part [N]
    mass : mass of the slide [g]
    friction : of the slide in its guide, steel on greased steel [1]

    Returns
    -------
    force along the travel [N]

    Raises
    ------
    ValueError : mass is not positive, or another argument is negative

    >>> round(slide_drag(100.0, 2000.0), 2)
    102.94
    """
    return sticking + friction * GRAVITY * 1e-3 * mass


@rule(
    title="force across an angled pin",
    formula="drag / (cos(radians(angle)) - friction * sin(radians(angle)))",
    source="balance of forces on an inclined pin with friction, textbook",
    provenance=Provenance.DERIVED,
)
def angled_pin_side_force(drag: ForceOrZero, angle: Angle, friction: RatioOrZero = 0.15) -> ForceOrZero:
    """Force square to an angled pin that pulls a slide.

    Parameters
    ----------
    drag : force that pulls the slide out [N]
    angle : angle between pin and pull [deg]
    friction : pin in the slide's bore, steel on greased steel [1]

    Returns
    -------
    force square to the pin [N]

    Raises
    ------
    ValueError : an argument is impossible

    >>> round(angled_pin_side_force(500.0, 20.0, 0.0), 1)
    532.1
    """
    slope = math.radians(angle)
    return drag / (math.cos(slope) - friction * math.sin(slope))


@rule(
    title="bending stress of an angled pin",
    formula="32 * force * arm / (pi * diameter**3)",
    source="cantilever with a round section, textbook",
    provenance=Provenance.DERIVED,
)
def angled_pin_bending_stress(force: ForceOrZero, arm: Length, diameter: Length) -> PressureOrZero:
    """Largest bending stress of an angled pin, where it leaves the cavity half.

    Parameters
    ----------
    force : force square to the pin [N]
    arm : distance of the force from there, along the pin [mm]
    diameter : diameter of the pin [mm]

    Returns
    -------
    stress [MPa]

    Raises
    ------
    ValueError : force is negative, or another argument is not positive

    >>> round(angled_pin_bending_stress(500.0, 30.0, 16.0))
    37
    """
    return 32.0 * force * arm / (math.pi * diameter**3)
