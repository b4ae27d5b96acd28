"""Draft: the least angle of a wall, and what an angle does to a size."""

from __future__ import annotations

import math

from moldgen.quantity import Provenance
from moldgen.rules.rule import Angle, AngleOrZero, Length, LengthOrZero, Ratio, Roughness, Slope, Valid, rule


@rule(
    title="draft required",
    formula="minimum + slope * texture_depth / 0.025",
    source="trade pages: texture draft is added to the base draft; they disagree on the slope, from 1 to 1.9 deg "
    "per 0.025 mm",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(
        Valid("texture_depth", 0.0, 0.1, "mm", "depth of usual textures"),
        Valid("slope", 1.0, 2.0, "deg per 0.025 mm", "what the pages give"),
    ),
)
def draft_required(minimum: AngleOrZero, texture_depth: LengthOrZero = 0.0, slope: Slope = 1.0) -> AngleOrZero:
    """Draft that a wall needs, per side.

    Parameters
    ----------
    minimum : draft of the same wall when polished [deg]
    texture_depth : depth of the texture [mm]
    slope : draft added by 0.025 mm of texture depth [deg per 0.025 mm]

    Returns
    -------
    least angle between wall and pull [deg]

    Raises
    ------
    ValueError : an argument is negative

    Notes
    -----
    Below a slope of 1.5 a deep grain may still scuff.

    >>> round(draft_required(1.0, 0.03), 2)
    2.2
    """
    return minimum + slope * texture_depth / 0.025


@rule(
    title="offset of a drafted wall",
    formula="height * tan(radians(angle))",
    source="trigonometry",
    provenance=Provenance.DERIVED,
)
def draft_offset(height: LengthOrZero, angle: AngleOrZero) -> LengthOrZero:
    """How far a drafted wall leans over its height, per side.

    Parameters
    ----------
    height : height along the pull [mm]
    angle : draft [deg]

    Returns
    -------
    offset square to the pull [mm]

    Raises
    ------
    ValueError : height is negative, or the angle is not below 90 deg

    >>> round(draft_offset(40.0, 1.0), 3)
    0.698
    """
    return height * math.tan(math.radians(angle))


@rule(
    title="shut-off height",
    formula="gap / tan(radians(angle))",
    source="trigonometry; trade pages ask for a gap of 0.25 mm or more and 3 deg, better 5 to 7 deg",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(Valid("angle", 3.0, 15.0, "deg", "a flatter wipe wears"),),
)
def shut_off_height(gap: Length, angle: Angle) -> Length:
    """Height over which an angled shut-off frees a gap when the mold opens.

    Parameters
    ----------
    gap : sideways clearance wanted at the end of that height [mm]
    angle : angle between the shut-off face and the pull [deg]

    Returns
    -------
    height along the pull [mm]

    Raises
    ------
    ValueError : gap or angle is not positive

    >>> round(shut_off_height(0.25, 5.0), 2)
    2.86
    """
    return gap / math.tan(math.radians(angle))


@rule(
    title="roughness of a spark-eroded face",
    formula="10 ** (number / 20) / 10",
    source="VDI 3400, from memory",
    provenance=Provenance.UNVERIFIED,
    valid=(Valid("number", 0.0, 45.0, "", "the scale ends there"),),
)
def roughness_vdi3400(number: Ratio) -> Roughness:
    """Mean roughness Ra that a number of VDI 3400 means.

    Parameters
    ----------
    number : reference number of the texture [1]

    Returns
    -------
    Ra [um]

    Raises
    ------
    ValueError : number is not positive

    >>> round(roughness_vdi3400(30.0), 2)
    3.16
    """
    return float(10.0 ** (number / 20.0) / 10.0)
