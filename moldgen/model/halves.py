"""The two halves of the mold around one part, before anything is bored into them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.model.part import Solid
from moldgen.model.side_action import Front


@dataclass(frozen=True)
class SideSteel:
    """The forming steel of one side action, in the mold frame: its front without the part.

    name : "slide 1", "lifter 2", ...
    solid : of a slide it reaches from the front's near end to the side of the block, of a lifter to its bottom; a
        compound where the outline has several polygons that only the body outside joins
    in_cavity : cavity steel lies under it, so that it cannot stay behind when the cavity half lifts: it moves with that
        half, or leaves it sideways first
    """

    name: str
    front: Front
    solid: Solid
    in_cavity: bool = False


@dataclass(frozen=True)
class SteelContact:
    """Where the halves close on each other around the part, or in one of its holes.

    name : "parting surface", "shut-off 1", ...
    made_as : the kind of surface
    at : the place where it is steepest, in part coordinates [mm]
    least_deg : angle between surface and pull there, 0 for an upright face, 90 for a level one
    upright_mm2 : area less than 1 deg from the pull
    land_mm : width of the level land around the part, 0 where it has no constant width
    """

    name: str
    made_as: str
    at: tuple[float, float, float]
    least_deg: float
    upright_mm2: float
    land_mm: float


@dataclass(frozen=True)
class Halves:
    """Cavity and core around the part, in the mold frame: pull along +z [mm].

    body : `moldgen.kernel.body.Body` of the part in the mold, shrink included, with every split of the parting line;
        where side actions form undercuts, these are filled in it
    cavity_side : (f,) bool, True where the cavity half forms the face, False where the core half does
    level : height of the parting plane
    low, high : (3,) corners of the closed block
    parting_line : closed polylines (k, 3), the outer one first
    sides : steel that side actions carry; it is no longer in cavity and core
    part : the real part where it differs from `body`
    contacts : how steeply the halves close on each other, the surface around the part first
    """

    cavity: Solid
    core: Solid
    body: Any
    cavity_side: np.ndarray
    level: float
    low: np.ndarray
    high: np.ndarray
    parting_line: tuple[np.ndarray, ...]
    sides: tuple[SideSteel, ...] = ()
    part: Solid | None = None
    contacts: tuple[SteelContact, ...] = ()

    @property
    def real_part(self) -> Solid:
        """The part as it is molded."""
        return self.body.solid if self.part is None else self.part
