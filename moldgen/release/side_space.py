"""The part as side actions see it: along one release direction, with everything that direction cannot let out."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.mesh_prism import Region, prism, rectangle, triangles_region, turned
from moldgen.kernel.meshsolid import MeshSolid, eroded
from moldgen.kernel.tracer import Tracer
from moldgen.model.part import Vector
from moldgen.model.side_action import across
from moldgen.tolerances import NOISE_THICKNESS

LEVEL = 1e-5
"""Sine up to which a flat face counts as square to a direction, and its height [mm] as level."""

LOOKS_BACK = 1e-4
"""Sine against the direction from which a triangle counts as looking back: 100 mm of less hold 0.01 mm."""

CLEAR_OF_PART = 10.0
"""How far [mm] fronts reach beyond the part: our choice, the steel that carries them starts there at the latest."""


@dataclass(frozen=True)
class SideSpace:
    """What every search on one part shares.

    part : the part as a mesh solid; shrunk : with every face moved inward by the erosion of proofs
    corners : of its triangles, (t, 3, 3) [mm]; tracer : rays against it
    """

    part: MeshSolid
    shrunk: MeshSolid
    corners: np.ndarray
    tracer: Tracer

    @classmethod
    def of(cls, body: Body, part: MeshSolid) -> SideSpace:
        """Return the space around a body."""
        return cls(part, eroded(body.mesh) or part, body.mesh.corners, Tracer(body.mesh))


class View:
    """The part seen along one direction, in the frame of `across`: w, the third coordinate, runs along it."""

    def __init__(self, space: SideSpace, direction: Vector) -> None:
        self.direction = direction
        self.rows = across(direction)
        self._space = space
        self._known: dict[tuple[float, ...], Region] = {}

    @property
    def tracer(self) -> Tracer:
        """Rays against the part, in the mold frame."""
        return self._space.tracer

    @cached_property
    def part(self) -> MeshSolid:
        """The part in this frame."""
        return turned(self._space.part, self.rows)

    @cached_property
    def _corners(self) -> np.ndarray:
        return np.asarray(self._space.corners @ self.rows.T)

    @cached_property
    def _normals(self) -> np.ndarray:
        corners = self._corners
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        return np.asarray(normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None])

    @cached_property
    def low(self) -> float:
        """Where the part starts along the direction [mm]."""
        return float(self._corners[:, :, 2].min())

    @cached_property
    def high(self) -> float:
        """Where the part ends along the direction [mm]."""
        return float(self._corners[:, :, 2].max())

    @property
    def far(self) -> float:
        """Where fronts end along the direction, clear of the part [mm]."""
        return self.high + CLEAR_OF_PART

    @cached_property
    def levels(self) -> np.ndarray:
        """The heights of the part's flat faces square to the direction, ascending [mm]."""
        square = np.abs(self._normals[:, 2]) > 1.0 - LEVEL
        heights = self._corners[square][:, :, 2]
        flat = np.ptp(heights, axis=1) < LEVEL * 10.0 if len(heights) else np.zeros(0, dtype=bool)
        if not flat.any():
            return np.zeros(0)
        exact = heights[flat][:, 0]  # a rounded level would leave a sheet of steel as thin as the rounding
        return np.asarray(exact[np.unique(np.round(exact, 5), return_index=True)[1]])

    @cached_property
    def _hooks(self) -> np.ndarray:
        """The triangles that look back, against the direction: steel behind them cannot leave, (k, 3, 3) [mm]."""
        return np.asarray(self._corners[self._normals[:, 2] < -LOOKS_BACK])

    def seen(self, solid: MeshSolid) -> MeshSolid:
        """Return a solid of the mold frame in this frame."""
        return turned(solid, self.rows)

    def back(self, solid: MeshSolid) -> MeshSolid:
        """Return a solid of this frame in the mold frame."""
        return turned(solid, self.rows.T)

    def hooks_above(self, low: np.ndarray, high: np.ndarray, near: float) -> np.ndarray:
        """Return the triangles over a rectangle that hold back steel which starts at a level, (k, 3, 3) [mm]."""
        hooks = self._hooks
        least, most = hooks.min(axis=1), hooks.max(axis=1)
        over = (least[:, :2] < high).all(axis=1) & (most[:, :2] > low).all(axis=1)
        return np.asarray(hooks[over & (most[:, 2] > near + NOISE_THICKNESS)])

    def forbidden(self, low: np.ndarray, high: np.ndarray, near: float) -> Region:
        """Return where, within a rectangle across the direction, steel that starts at a level could not leave.

        Right under a face that looks back there is no plastic but steel, and the face stands in its way: the shadows
        of those faces above the level are all there is to know. Gaps thinner than noise are forgiven.
        """
        key = tuple(round(float(v), 4) for v in (*low, *high, near))
        if key not in self._known:
            hooks = self.hooks_above(low, high, near)
            self._known[key] = triangles_region(clipped_above(hooks, near + NOISE_THICKNESS)) ^ rectangle(low, high)
        return self._known[key]

    def plastic_within(self, shape: Region, near: float) -> MeshSolid:
        """Return the plastic in the prism of a region from a level on."""
        return self.part ^ prism(shape, near, self.far)

    def walls_beside(self, start: np.ndarray, end: np.ndarray, near: float, gap: float) -> bool:
        """Return whether a face of the part nearly coincides with the wall of a prism over the side start-end (2,)."""
        along = end - start
        length = float(np.linalg.norm(along))
        if length < 1e-9:
            return False
        along = along / length
        out = np.array([along[1], -along[0]])
        parallel = np.flatnonzero(np.abs(self._normals[:, :2] @ out) > 0.995)
        corners = self._corners[parallel]
        off, run = corners[:, :, :2] @ out - start @ out, corners[:, :, :2] @ along - start @ along
        beside = (np.abs(off).max(axis=1) < gap) & (run.max(axis=1) > 0.0) & (run.min(axis=1) < length)
        return bool((beside & (corners[:, :, 2].max(axis=1) > near)).any())


def clipped_above(triangles: np.ndarray, level: float) -> list[np.ndarray]:
    """Return what of each triangle (k, 3, 3) lies above a level, seen along z, as polygons (n, 2)."""
    whole = triangles[:, :, 2].min(axis=1) >= level
    found = [t[:, :2] for t in triangles[whole]]
    for corners in triangles[~whole]:
        kept = []
        for start, end in zip(corners, np.roll(corners, -1, axis=0), strict=True):
            if start[2] >= level:
                kept.append(start[:2])
            if (start[2] >= level) != (end[2] >= level):
                share = (level - start[2]) / (end[2] - start[2])
                kept.append(start[:2] + share * (end[:2] - start[:2]))
        if len(kept) > 2:
            found.append(np.array(kept))
    return found
