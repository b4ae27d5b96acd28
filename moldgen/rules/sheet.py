"""Lines of the calculation sheet that no rule makes: what was given, and what was measured on the part.

A rule makes its own line (`Rule.line`), a catalog row makes its own (`Row.line`), and so does a figure of practice.
"""

from __future__ import annotations

from moldgen.quantity import Provenance, Quantity


def given(name: str, value: float, unit: str, drives: str, *, where: str = "the spec") -> Quantity:
    """Return the line of a number that the user gave.

    Parameters
    ----------
    name : what the number is
    value, unit : the number in the unit of the project
    drives : what in the layout depends on it
    where : file and line, or the key of the spec

    >>> given("shrinkage", 0.5, "%", "mold dimensions", where="spec.yaml:4:9").source
    'spec.yaml:4:9'
    """
    return Quantity(name=name, value=value, unit=unit, source=where, provenance=Provenance.GIVEN, drives=drives)


def measured(name: str, value: float, unit: str, drives: str, *, how: str = "the part as read") -> Quantity:
    """Return the line of a number that was measured on the part.

    Parameters
    ----------
    name : what the number is
    value, unit : the number in the unit of the project
    drives : what in the layout depends on it
    how : what was measured, and by what means

    >>> measured("projected area", 1250.0, "mm^2", "clamp force").provenance.value
    'measured on the part'
    """
    return Quantity(name=name, value=value, unit=unit, source=how, provenance=Provenance.MEASURED, drives=drives)
