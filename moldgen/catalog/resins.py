"""Resins: shrinkage, temperatures, pressures, limits. Typical values of natural grades, not of one product."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from moldgen.catalog.names import find_row
from moldgen.catalog.table import Range, Row, read_rows


@dataclass(frozen=True, kw_only=True)
class Resin(Row):
    """One resin. Units and sources: `fact(column)`. Ranges keep their ends; the default is `.mean`."""

    structure: str
    """amorphous, semicrystalline or elastomer"""
    filled: bool
    """glass-filled"""
    shrink_along: Range
    """linear shrinkage along the flow as ISO 294-4 refers it, to the mold dimension [%]"""
    shrink_across: Range
    """the same across the flow [%]"""
    melt_temperature: Range
    mold_temperature: Range
    ejection_temperature: Range
    no_flow_temperature: float
    melt_density: float
    """[g/cm^3]"""
    heat_capacity: float
    """of the melt [J/(kg K)]"""
    conductivity: float
    """[W/(m K)]"""
    diffusivity: float
    """effective, for cooling, latent heat included [mm^2/s]"""
    cavity_pressure: Range
    """mean over the projected area [MPa]"""
    flow_ratio: float
    """largest flow length to wall at 2 mm wall [1]"""
    wall_min: float
    """[mm]"""
    wall_recommended: Range
    """[mm]"""
    shear_limit: float
    """apparent, in the gate [1/s]"""
    vent_depth: Range
    """[mm]"""
    ejection_modulus: Range
    """modulus of elasticity at the ejection temperature [MPa]"""
    friction: Range
    """static, on polished steel [1]"""
    poisson: float
    expansion_along: float
    """[1e-6/K]"""
    expansion_across: float
    draft_minimum: Range
    """smallest for polished walls, and usual; per side [deg]"""
    push_pressure: float
    """largest pressure of an ejector pin's face on the part at ejection [MPa]"""
    gate_factor: float
    """n of the edge- and pin-gate rules [1]"""
    flow_temperature: float
    """at which consistency and flow_index hold [degC]"""
    consistency: float
    """K of the power law tau = K rate**n [Pa s^n]"""
    flow_index: float
    """n of the power law [1]"""

    @property
    def shrink(self) -> float:
        """One shrinkage for all axes when none is given: the mean of both directions [%]."""
        return 0.5 * (self.shrink_along.mean + self.shrink_across.mean)


@cache
def all_resins() -> tuple[Resin, ...]:
    """Return every resin, in the order of the data file."""
    return read_rows("resins.yaml", Resin)


def resin_names() -> tuple[str, ...]:
    """Return the names that a spec may use, without aliases.

    >>> resin_names()[:3]
    ('ABS', 'PC', 'PC/ABS')
    """
    return tuple(row.name for row in all_resins())


@cache
def resin(name: str) -> Resin:
    """Return the resin called `name`; case, spaces, dashes and common aliases do not matter.

    Raises
    ------
    SpecError : no such resin; the remedy names the nearest ones

    >>> resin("pa 66 gf30").name
    'PA66-GF30'
    >>> resin("Acetal").shrink_along
    Range(low=1.8, high=2.5)
    """
    return find_row(all_resins(), name, "resin")
