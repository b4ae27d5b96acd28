"""What a slide meets of the part: how far the part reaches in a window, and whether steel is clear when it leaves."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.mesh_prism import joined_regions, outline_mesh, region
from moldgen.kernel.meshsolid import MeshSolid, eroded, mesh_solid, overlap_depth, thick_pieces
from moldgen.tolerances import OPEN_OVERLAP

STEPS = (0.05, 0.2, 0.5, 1.0, 2.0)
"""mm: first places on its way at which steel is held against the part; then eighths of the way. The motion proof, which
sweeps, decides."""

CORNER = 1e-6
"""mm: corners of an outline closer than this are one."""

TOUCH = 1e-4
"""mm: steel this close to the end of a prism reaches it."""


@dataclass(frozen=True)
class Window:
    """A rectangle across an axis: u and z from low to high, in the frame `across(axis)` [mm]."""

    left: float
    right: float
    low: float
    high: float

    @property
    def outline(self) -> tuple[np.ndarray, ...]:
        """The rectangle as an outline."""
        corners = [(self.left, self.low), (self.right, self.low), (self.right, self.high), (self.left, self.high)]
        return (np.array(corners),)


def extent_in(mesh: SurfaceMesh, frame: np.ndarray, window: Window, high: float = np.inf) -> np.ndarray | None:
    """Return all corners of the part inside a window, in the frame (k, 3) [mm]; None when there is no part.

    high : coordinate along the frame's z up to which the part is looked at
    """
    own = mesh.vertices @ frame.T
    far = min(float(own[:, 2].max()) + 1.0, high)
    near = float(own[:, 2].min()) - 1.0
    if far <= near:
        return None
    inside = mesh_solid(mesh) ^ outline_mesh(window.outline, frame, near, far)
    if inside.num_tri() == 0:
        return None
    return np.asarray(np.asarray(inside.to_mesh64().vert_properties)[:, :3] @ frame.T)


def lowered(outline: Sequence[np.ndarray], level: float) -> tuple[np.ndarray, ...]:
    """Return an outline together with everything between it and a height under it; y of the outline points up."""
    section = region(outline)
    shadows = [section]
    for polygon in section.to_polygons():
        for start, end in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
            if max(start[1], end[1]) <= level + CORNER or abs(start[0] - end[0]) < CORNER:
                continue
            foot = min(level, start[1], end[1])
            quad = np.array([[start[0], foot], [end[0], foot], end, start])
            shadows.append(region([quad if end[0] > start[0] else quad[::-1]]))
    joined = joined_regions(shadows).simplify(CORNER)
    return tuple(np.asarray(p, float) for p in joined.to_polygons())


def outline_gain(outline: Sequence[np.ndarray], larger: Sequence[np.ndarray]) -> float:
    """Return by how much area one outline is larger than another [mm^2]."""
    return float(region(larger).area() - region(outline).area())


def joined_area(outlines: Sequence[Sequence[np.ndarray]]) -> float:
    """Return the area that outlines cover together [mm^2]."""
    return float(joined_regions([region(o) for o in outlines]).area())


@dataclass(frozen=True)
class Taken:
    """The steel that a prism takes outside the part, where it reaches the prism's far end.

    start : where it begins, along the axis [mm]; volume : [mm^3]
    depth : how deep it would cut into the part on its way out [mm]
    left : length of the steel before the prism that it leaves there, open toward it [mm]
    """

    start: float
    volume: float
    depth: float
    left: float


class Outside:
    """Steel outside the part, in straight prisms of one outline.

    own : an outline inside that one; what lies in it before a prism is taken anyhow
    """

    def __init__(
        self, mesh: SurfaceMesh, outline: Sequence[np.ndarray], frame: np.ndarray, own: Sequence[np.ndarray]
    ) -> None:
        self._outline, self._frame, self._own = outline, frame, own
        self._part, self._thin = mesh_solid(mesh), eroded(mesh)
        self._far_end = float((mesh.vertices @ frame[2]).max())

    def taken(self, first: float, near: float, far: float) -> Taken | None:
        """Return what a prism from `near` to `far` takes, and what of the steel from `first` on it leaves.

        Steel that does not reach `far` counts for nothing: it stays where it is, or goes with another body. None: there
        is no other.
        """
        pieces = self._reaching(near, far)
        if not pieces:
            return None
        start = min(self._along(p)[0] for p in pieces)
        depth = max(self._depth(p, self._far_end - start) for p in pieces)
        before = self._reaching(first, near, own=False) if near > first + CORNER else []
        left = max((near - self._along(p)[0] for p in before), default=0.0)
        return Taken(start, sum(float(p.volume()) for p in pieces), depth, left)

    def _reaching(self, near: float, far: float, *, own: bool = True) -> list[MeshSolid]:
        steel = outline_mesh(self._outline, self._frame, near, far) - self._part
        if not own:
            steel = steel - outline_mesh(self._own, self._frame, near, far)
        return [p for p in thick_pieces(steel) if self._along(p)[1] > far - TOUCH]

    def _along(self, piece: MeshSolid) -> tuple[float, float]:
        along = np.asarray(piece.to_mesh64().vert_properties)[:, :3] @ self._frame[2]
        return float(along.min()), float(along.max())

    def _depth(self, piece: MeshSolid, way: float) -> float:
        """Return how deep a piece cuts into the part on its way out, up to where the part ends."""
        if way <= 0.0 or self._thin is None:
            return 0.0
        depth = 0.0
        for step in sorted({s for s in STEPS if s < way} | {way * k / 8 for k in range(1, 9)}):
            moved = piece.translate([float(v) for v in self._frame[2] * step])
            depth = max(depth, overlap_depth(moved, self._thin))
            if depth > OPEN_OVERLAP:
                break
        return depth
