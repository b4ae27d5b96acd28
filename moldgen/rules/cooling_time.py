"""Cooling time of plates and cylinders: first term of the series for one-dimensional conduction."""

from __future__ import annotations

import math
from typing import Final

from moldgen.quantity import Provenance
from moldgen.rules.rule import Diffusivity, Length, Seconds, Temperature, Valid, rule

_BESSEL_ZERO: Final = 2.404825557695773
"""First zero of the Bessel function J0."""

_BESSEL_J1: Final = 0.5191474972894669
"""J1 at that zero."""

_SOURCE: Final = "first term of the Fourier series, both walls at the mold temperature; checked by finite differences"


def _theta(melt: float, mold: float, eject: float) -> float:
    """Return (melt - mold) / (eject - mold).

    Raises
    ------
    ValueError : not melt > eject > mold
    """
    if not melt > eject > mold:
        raise ValueError(f"melt > eject > mold is needed, got {melt:g}, {eject:g} and {mold:g} degC")
    return (melt - mold) / (eject - mold)


_FIRST_TERM = Valid(
    "4/pi * (melt - mold) / (eject - mold)",
    low=2.0,
    why="the first term of the series rules only then",
    measure=lambda melt, mold, eject, **_: 4.0 / math.pi * _theta(melt, mold, eject),
)


@rule(
    title="cooling time of a plate, center",
    formula="wall**2 / (pi**2 * diffusivity) * log(4 / pi * (melt - mold) / (eject - mold))",
    source=_SOURCE,
    provenance=Provenance.DERIVED,
    valid=(_FIRST_TERM,),
)
def cooling_time_plate_center(
    wall: Length, diffusivity: Diffusivity, melt: Temperature, mold: Temperature, eject: Temperature
) -> Seconds:
    """Time until the middle of a wall is cold enough to eject.

    Parameters
    ----------
    wall : wall thickness; twice that when one side only is cooled [mm]
    diffusivity : effective heat diffusivity of the resin [mm^2/s]
    melt : temperature of the melt [degC]
    mold : temperature of the cavity wall [degC]
    eject : temperature at which the part is ejected [degC]

    Returns
    -------
    cooling time [s]

    Raises
    ------
    ValueError : wall or diffusivity is not positive, or not melt > eject > mold

    Notes
    -----
    Also the freezing time of a flat gate, with its depth for the wall and the no-flow temperature for eject.

    >>> round(cooling_time_plate_center(2.5, 0.085, 235.0, 60.0, 95.0), 2)
    13.79
    """
    return wall**2 / (math.pi**2 * diffusivity) * math.log(4.0 / math.pi * _theta(melt, mold, eject))


@rule(
    title="cooling time of a plate, mean",
    formula="wall**2 / (pi**2 * diffusivity) * log(8 / pi**2 * (melt - mold) / (eject - mold))",
    source=_SOURCE,
    provenance=Provenance.DERIVED,
    valid=(_FIRST_TERM,),
)
def cooling_time_plate_mean(
    wall: Length, diffusivity: Diffusivity, melt: Temperature, mold: Temperature, eject: Temperature
) -> Seconds:
    """Time until the mean temperature over a wall is low enough to eject.

    Parameters
    ----------
    wall : wall thickness; twice that when one side only is cooled [mm]
    diffusivity : effective heat diffusivity of the resin [mm^2/s]
    melt : temperature of the melt [degC]
    mold : temperature of the cavity wall [degC]
    eject : mean temperature at which the part is ejected [degC]

    Returns
    -------
    cooling time [s]

    Raises
    ------
    ValueError : wall or diffusivity is not positive, or not melt > eject > mold

    >>> round(cooling_time_plate_mean(2.5, 0.085, 235.0, 60.0, 95.0), 2)
    10.43
    """
    return wall**2 / (math.pi**2 * diffusivity) * math.log(8.0 / math.pi**2 * _theta(melt, mold, eject))


@rule(
    title="cooling time of a cylinder, center",
    formula="diameter**2 / (4 * 2.404826**2 * diffusivity) * log(1.601975 * (melt - mold) / (eject - mold))",
    source=_SOURCE,
    provenance=Provenance.DERIVED,
    valid=(_FIRST_TERM,),
)
def cooling_time_cylinder_center(
    diameter: Length, diffusivity: Diffusivity, melt: Temperature, mold: Temperature, eject: Temperature
) -> Seconds:
    """Time until the axis of a long cylinder (a runner, a boss) is cold enough to eject.

    Parameters
    ----------
    diameter : diameter [mm]
    diffusivity : effective heat diffusivity of the resin [mm^2/s]
    melt : temperature of the melt [degC]
    mold : temperature of the cavity wall [degC]
    eject : temperature at which the part is ejected [degC]

    Returns
    -------
    cooling time [s]

    Raises
    ------
    ValueError : diameter or diffusivity is not positive, or not melt > eject > mold

    >>> round(cooling_time_cylinder_center(6.0, 0.085, 235.0, 60.0, 95.0), 2)
    38.09
    """
    first = 2.0 / (_BESSEL_ZERO * _BESSEL_J1)
    return diameter**2 / (4.0 * _BESSEL_ZERO**2 * diffusivity) * math.log(first * _theta(melt, mold, eject))


@rule(
    title="cooling time of a cylinder, mean",
    formula="diameter**2 / (4 * 2.404826**2 * diffusivity) * log(0.691660 * (melt - mold) / (eject - mold))",
    source=_SOURCE,
    provenance=Provenance.DERIVED,
    valid=(_FIRST_TERM,),
)
def cooling_time_cylinder_mean(
    diameter: Length, diffusivity: Diffusivity, melt: Temperature, mold: Temperature, eject: Temperature
) -> Seconds:
    """Time until the mean temperature over a long cylinder is low enough to eject.

    Parameters
    ----------
    diameter : diameter [mm]
    diffusivity : effective heat diffusivity of the resin [mm^2/s]
    melt : temperature of the melt [degC]
    mold : temperature of the cavity wall [degC]
    eject : mean temperature at which the part is ejected [degC]

    Returns
    -------
    cooling time [s]

    Raises
    ------
    ValueError : diameter or diffusivity is not positive, or not melt > eject > mold

    >>> round(cooling_time_cylinder_mean(6.0, 0.085, 235.0, 60.0, 95.0), 2)
    22.72
    """
    first = 4.0 / _BESSEL_ZERO**2
    return diameter**2 / (4.0 * _BESSEL_ZERO**2 * diffusivity) * math.log(first * _theta(melt, mold, eject))
