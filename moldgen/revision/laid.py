"""An old part laid onto the new one: both by their faces, and questions about places that either covers."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np

from moldgen.kernel.face_compare import SAME_PLACE, on_same_surface
from moldgen.kernel.face_signature import PartSigns
from moldgen.model.face_sign import FaceSign, SurfaceKind
from moldgen.model.part import Box, Vector, vector
from moldgen.model.revision import Alignment
from moldgen.revision.align import grown_motion, placed_signs
from moldgen.revision.congruent import STAY, Faces, Pairs

SAMPLES: Final = 12
"""Places of a face that are looked at (our choice)."""

ON_MESH: Final = 0.1
"""mm: a place on the mesh of a face counts as on the face: twice the sag of the working mesh."""

SAME_FREE: Final = 5e-3
"""mm: places of a free face that keep this close to free faces of the other part lie on the same surface (our choice:
half of what two writings of one shell may differ by)."""


@dataclass(frozen=True, eq=False)
class Laid:
    """Two versions of a part in the coordinates of the new one.

    old, new : the parts; placed : the signs of the old one where it lies now; tolerance : of one place [mm]
    """

    old: PartSigns
    new: PartSigns
    alignment: Alignment
    placed: tuple[FaceSign, ...]
    tolerance: float

    @classmethod
    def of(cls, old: PartSigns, new: PartSigns, alignment: Alignment) -> Laid:
        """Return the old part laid onto the new one; faces match as closely as they did then."""
        tolerance = max(SAME_PLACE, 2.0 * alignment.residual_mm)
        return cls(old, new, alignment, placed_signs(old, alignment), tolerance)

    @cached_property
    def _motion(self) -> tuple[np.ndarray, np.ndarray]:
        rotation, shift = grown_motion(self.old, self.alignment)
        return np.array(rotation), np.array(shift)

    def over(self, points: np.ndarray) -> np.ndarray:
        """Return points of the old part in the coordinates of the new one, (n, 3) [mm]."""
        rotation, shift = self._motion
        return np.asarray(self.alignment.scale * points @ rotation.T + shift)

    def back(self, points: np.ndarray) -> np.ndarray:
        """Return points of the new part in the coordinates of the old one, (n, 3) [mm]."""
        rotation, shift = self._motion
        return np.asarray((points - shift) @ rotation / self.alignment.scale)

    def in_place(self) -> tuple[np.ndarray, np.ndarray]:
        """Return the numbers of old and new faces that lie on each other all over, (n,) and (n,)."""
        pairs = Pairs.of(Faces.of(self.placed), Faces.of(self.new.signs), self.tolerance)
        hits = pairs.hits(STAY)
        return pairs.first[hits], pairs.second[hits]

    def overlap(self, old: int, new: int) -> bool:
        """True when an old and a new face, on one surface, have a place in common."""
        for point in self.over(self.old.samples(old, SAMPLES)):
            if self.new.distance(new, vector(point)) <= ON_MESH:
                return True
        for point in self.back(self.new.samples(new, SAMPLES)):
            if self.old.distance(old, vector(point)) <= ON_MESH:
                return True
        return False

    def trimmed(self, old: int, new: int) -> bool:
        """True when two faces lie on one surface and overlap: only their boundaries differ."""
        sign = self.new.signs[new]
        return on_same_surface(self.placed[old], sign, self.tolerance) and self.overlap(old, new)

    def old_lies_on_new(self, old: int) -> bool:
        """True when a free face of the old part lies on faces of the new one all over, whatever they are written as."""
        points = self.over(self.old.vertices(old, SAMPLES))
        return self.old.signs[old].kind is SurfaceKind.FREE and _all_on(points, self.new)

    def new_lies_on_old(self, new: int) -> bool:
        """True when a free face of the new part lies on faces of the old one all over."""
        points = self.back(self.new.vertices(new, SAMPLES))
        return self.new.signs[new].kind is SurfaceKind.FREE and _all_on(points, self.old)

    def box(self, old: tuple[int, ...], new: tuple[int, ...]) -> Box:
        """Return the box of the new faces, of the old ones where there are none."""
        if new:
            corners = np.vstack([self.new.box(n) for n in new])
        else:
            corners = self.over(np.vstack([self.old.vertices(n, 10**6) for n in old]))
        return vector(corners.min(axis=0)), vector(corners.max(axis=0))

    def place(self, old: tuple[int, ...], new: tuple[int, ...]) -> Vector:
        """Return the axis of the largest of some faces where it goes around one, else a point on it; new ones first."""
        signs, numbers = (self.new.signs, new) if new else (self.placed, old)
        largest = max(numbers, key=lambda n: (signs[n].area_mm2, -n))
        sign = signs[largest]
        if sign.kind in (SurfaceKind.CYLINDER, SurfaceKind.CONE) and _inside(sign.at, self.box(old, new)):
            return sign.at
        if new:
            return vector(self.new.samples(largest, 1)[0])
        return vector(self.over(self.old.samples(largest, 1))[0])


def _inside(point: Vector, box: Box) -> bool:
    """True for a point well inside a box: the axis of a rounding lies beside it, that of a hole in its middle."""
    low, high = (np.asarray(corner) for corner in box)
    return bool((np.minimum(point - low, high - point) >= 0.2 * (high - low)).all())


def _all_on(points: np.ndarray, part: PartSigns) -> bool:
    for point in points:
        number, gap = part.nearest(vector(point))
        if gap > ON_MESH or part.exact_distance(number, point) > SAME_FREE:
            return False
    return True
