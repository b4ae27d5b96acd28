"""A parametric recipe with every expression worked out: what `moldgen.kernel.features` builds."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from moldgen.model.part import Box, Vector

MAIN_BODY = "part"
"""The body that a recipe ends with, and that features work on unless they say otherwise."""


@dataclass(frozen=True)
class Selector:
    """Faces or edges chosen by geometry, never by index.

    Parameters
    ----------
    text : the choice as the user wrote it, for messages
    words : directions and kinds, e.g. ``("concave", "top")``
    of : feature on whose boundary the face or edge must lie
    between : two features whose faces the edge must separate
    at : point [mm]; the nearest face or edge is meant
    within : box [mm] that must hold the whole edge, or the middle of the face
    """

    text: str
    words: tuple[str, ...] = ()
    of: str | None = None
    between: tuple[str, str] | None = None
    at: Vector | None = None
    within: Box | None = None


@dataclass(frozen=True)
class ResolvedFeature:
    """One feature: lengths in mm, angles in deg, choices as `Selector`, profiles as mappings of plain values."""

    name: str
    kind: str
    values: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class ResolvedRecipe:
    """A recipe ready to build: features in order, and the parameters they were worked out from (for the manifest)."""

    features: tuple[ResolvedFeature, ...]
    parameters: Mapping[str, float] = field(default_factory=dict)
