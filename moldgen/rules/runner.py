"""Runners: the diameter of a trunk and of its branches."""

from __future__ import annotations

from moldgen.quantity import Provenance
from moldgen.rules.rule import Count, Length, Mass, Valid, rule


@rule(
    title="runner diameter",
    formula="mass ** 0.5 * length ** 0.25 / 3.7",
    source="Pye, Injection Mould Design, eq. 4.1a",
    provenance=Provenance.PUBLISHED,
    valid=(
        Valid("mass", high=200.0, unit="g", why="stated by the source"),
        Valid(
            "diameter",
            2.0,
            10.0,
            "mm",
            "stated by the source",
            measure=lambda mass, length: mass**0.5 * length**0.25 / 3.7,
        ),
    ),
)
def runner_diameter_pye(mass: Mass, length: Length) -> Length:
    """Diameter of a round runner that feeds one molding with walls under 3 mm.

    Parameters
    ----------
    mass : mass of the molding [g]
    length : length of the runner [mm]

    Returns
    -------
    diameter, to be rounded up to a cutter [mm]

    Raises
    ------
    ValueError : an argument is not positive

    Notes
    -----
    A quarter more for PVC-U and PMMA.

    >>> round(runner_diameter_pye(120.0, 50.0), 2)
    7.87
    """
    return float(mass**0.5 * length**0.25 / 3.7)


@rule(
    title="branch diameter",
    formula="trunk / branches ** (1 / 3)",
    source="least volume at equal pressure drop, J. Reinf. Plast. Compos. 17 (1998), abstract",
    provenance=Provenance.PUBLISHED,
)
def runner_branch_diameter(trunk: Length, branches: Count) -> Length:
    """Diameter of each of several equal branches of a runner.

    Parameters
    ----------
    trunk : diameter before the split [mm]
    branches : number of equal branches [1]

    Returns
    -------
    diameter of a branch [mm]

    Raises
    ------
    ValueError : trunk is not positive, or there is no branch

    >>> round(runner_branch_diameter(8.0, 2), 2)
    6.35
    """
    return float(trunk / branches ** (1.0 / 3.0))
