"""Shrinkage: from the part's size to the mold's."""

from __future__ import annotations

from moldgen.quantity import Provenance
from moldgen.rules.rule import Expansion, Length, Percent, Ratio, TemperatureChange, Valid, rule

_USUAL = Valid("shrink", 0.0, 5.0, "%", "no catalog resin shrinks more")


@rule(
    title="mold dimension",
    formula="part / (1 - shrink / 100)",
    source="ISO 294-4: shrinkage is referred to the mold dimension; equation from memory",
    provenance=Provenance.UNVERIFIED,
    valid=(_USUAL,),
)
def mold_dimension_iso294_4(part: Length, shrink: Percent) -> Length:
    """Mold dimension that leaves `part` after shrinking.

    Parameters
    ----------
    part : dimension of the part at room temperature [mm]
    shrink : linear shrinkage S = (mold - part) / mold [%]

    Returns
    -------
    mold dimension at 20 degC [mm]

    Raises
    ------
    ValueError : part is not positive, or shrink is 100 % or more

    Notes
    -----
    S of ISO 294-4 is the free shrinkage without the uptake of moisture: an upper bound for a part held by its core.
    It is measured from the mold at 20 degC, so the thermal growth of the mold is inside S and is not applied twice.

    >>> round(mold_dimension_iso294_4(100.0, 1.8), 3)
    101.833
    """
    return part / (1.0 - shrink / 100.0)


@rule(
    title="mold dimension, first order",
    formula="part * (1 + shrink / 100)",
    source="shop convention",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(_USUAL,),
)
def mold_dimension_first_order(part: Length, shrink: Percent) -> Length:
    """Mold dimension by the shop convention that refers shrinkage to the part.

    Parameters
    ----------
    part : dimension of the part [mm]
    shrink : linear shrinkage referred to the part [%]

    Returns
    -------
    mold dimension [mm]

    Raises
    ------
    ValueError : part is not positive, or shrink is 100 % or more

    Notes
    -----
    Only when asked for by name: at 1.8 % it is 0.033 mm short on 100 mm.

    >>> round(mold_dimension_first_order(100.0, 1.8), 3)
    101.8
    """
    return part * (1.0 + shrink / 100.0)


@rule(
    title="shrink factor",
    formula="1 / (1 - shrink / 100)",
    source="ISO 294-4: shrinkage is referred to the mold dimension; equation from memory",
    provenance=Provenance.UNVERIFIED,
    valid=(_USUAL,),
)
def shrink_factor_iso294_4(shrink: Percent) -> Ratio:
    """Factor from part to mold along one axis.

    Parameters
    ----------
    shrink : linear shrinkage referred to the mold [%]

    Returns
    -------
    mold dimension over part dimension [1]

    Raises
    ------
    ValueError : shrink is 100 % or more

    >>> round(shrink_factor_iso294_4(0.5), 6)
    1.005025
    """
    return 1.0 / (1.0 - shrink / 100.0)


@rule(
    title="shrink factor, first order",
    formula="1 + shrink / 100",
    source="shop convention",
    provenance=Provenance.COMMON_PRACTICE,
    valid=(_USUAL,),
)
def shrink_factor_first_order(shrink: Percent) -> Ratio:
    """Factor from part to mold by the shop convention that refers shrinkage to the part.

    Parameters
    ----------
    shrink : linear shrinkage referred to the part [%]

    Returns
    -------
    mold dimension over part dimension [1]

    Raises
    ------
    ValueError : shrink is 100 % or more

    >>> shrink_factor_first_order(0.5)
    1.005
    """
    return 1.0 + shrink / 100.0


@rule(
    title="shrinkage measured",
    formula="100 * (mold - part) / mold",
    source="ISO 294-4: shrinkage is referred to the mold dimension; equation from memory",
    provenance=Provenance.UNVERIFIED,
)
def shrinkage_iso294_4(mold: Length, part: Length) -> Percent:
    """Shrinkage from a mold and the part that came out of it.

    Parameters
    ----------
    mold : dimension of the mold at 20 degC [mm]
    part : the same dimension of the part [mm]

    Returns
    -------
    linear shrinkage referred to the mold [%]

    Raises
    ------
    ValueError : a dimension is not positive

    >>> round(shrinkage_iso294_4(60.0, 59.64), 3)
    0.6
    """
    return 100.0 * (mold - part) / mold


@rule(
    title="thermal growth",
    formula="length * expansion * rise",
    source="linear thermal expansion",
    provenance=Provenance.DERIVED,
)
def thermal_growth(length: Length, expansion: Expansion, rise: TemperatureChange) -> Length:
    """Growth of a length on heating.

    Parameters
    ----------
    length : length at the start [mm]
    expansion : coefficient of linear thermal expansion [1/K]
    rise : change of temperature [K]

    Returns
    -------
    change of length [mm]

    Raises
    ------
    ValueError : length is not positive

    >>> round(thermal_growth(300.0, 11.7e-6, 60.0), 3)
    0.211
    """
    return length * expansion * rise
