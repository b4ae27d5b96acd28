"""What every decision of the layout asks of the part in its halves; each answer is worked out once."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from moldgen.finding import Point
from moldgen.kernel.body import Body
from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.polygon import signed_area
from moldgen.kernel.probe import Probe
from moldgen.layout.keep_out import KeepOut
from moldgen.model.halves import Halves
from moldgen.model.part import MoldFrame
from moldgen.model.slide import SideLayout

OFF = 1e-3
"""mm: how far inside its face a ray starts, so that it does not meet that face again."""

LEVEL = 0.02
"""mm: what lies this close to the parting plane is on it."""

TO_CENTRE = 0.1
"""Way from a triangle's corner to its centre at which its corner is looked at."""

THICKEST = 1e3
"""mm: stands for a wall that a ray does not leave (a hole in the mesh)."""


class PartView:
    """The part between its halves, read-only, in the mold frame [mm].

    frame : the way back to the part's own coordinates for findings; None leaves mold coordinates
    sides : bodies, angled pins and lifters of side actions, if they are laid out already
    """

    def __init__(self, halves: Halves, frame: MoldFrame | None = None, sides: SideLayout | None = None) -> None:
        self.halves = halves
        self.body: Body = halves.body
        self.mesh: SurfaceMesh = self.body.mesh
        self.level = halves.level
        self.low, self.high = np.asarray(halves.low, float), np.asarray(halves.high, float)
        self._frame = frame
        self._sides = sides

    def place(self, point: np.ndarray | Point) -> Point:
        """Return a mold point as a place to report, in part coordinates [mm]."""
        x, y, z = (float(v) for v in point)
        spot = (x, y, z) if self._frame is None else self._frame.to_part((x, y, z))
        return (round(spot[0], 3), round(spot[1], 3), round(spot[2], 3))

    @property
    def sides(self) -> SideLayout | None:
        """Bodies, angled pins and lifters of side actions, None if they are not laid out."""
        return self._sides

    @cached_property
    def probe(self) -> Probe:
        """Rays against the part."""
        return Probe(self.mesh)

    @cached_property
    def core_side(self) -> np.ndarray:
        """Which triangles the core half forms, (t,) bool."""
        return np.asarray(~np.asarray(self.halves.cavity_side, bool)[self.mesh.face])

    @cached_property
    def keep_out(self) -> KeepOut:
        """Where side actions leave."""
        return KeepOut(self.halves, self._sides)

    @cached_property
    def formed_aside(self) -> np.ndarray:
        """Which triangles a side action forms or takes the place of, wholly as far as four points tell, (t,) bool."""
        found = self.keep_out.forms(self.centres, self.normals)
        for corner in range(3):
            rows = np.flatnonzero(found)
            points = self.mesh.corners[rows, corner]
            points = points + TO_CENTRE * (self.centres[rows] - points)
            found[rows] = self.keep_out.forms(points, self.normals[rows])
        return found

    def aside(self, points: np.ndarray, triangles: np.ndarray) -> np.ndarray:
        """Return whether a side action forms surface points (k, 3) on triangles (k,), -1 for none, (k,) bool."""
        found = np.zeros(len(points), dtype=bool)
        if self.halves.sides:
            on = np.flatnonzero((triangles >= 0) & np.isfinite(points).all(axis=1))
            found[on] = self.keep_out.forms(points[on], self.normals[triangles[on]])
        return found

    @property
    def centres(self) -> np.ndarray:
        """Centre of each triangle, (t, 3) [mm]."""
        return self.mesh.centres

    @property
    def normals(self) -> np.ndarray:
        """Outward unit normal of each triangle as it lies, (t, 3)."""
        return self.mesh.facet_normals

    def thickness(self, points: np.ndarray, normals: np.ndarray) -> np.ndarray:
        """Return the wall under surface points (k, 3), straight against their outward normals (k, 3), (k,) [mm]."""
        distance, _ = self.probe.first(points - OFF * normals, -normals)
        return np.asarray(np.where(np.isfinite(distance), distance + OFF, THICKEST))

    @cached_property
    def triangle_walls(self) -> np.ndarray:
        """Wall under the centre of each triangle, (t,) [mm]."""
        return self.thickness(self.centres, self.normals)

    @cached_property
    def wall(self) -> float:
        """The usual wall of the part: half of its surface lies over a thinner one [mm]."""
        order = np.argsort(self.triangle_walls, kind="stable")
        share = np.cumsum(self.body.triangle_areas[order])
        return float(self.triangle_walls[order][np.searchsorted(share, 0.5 * share[-1])])

    @cached_property
    def middle(self) -> np.ndarray:
        """Middle of the part's box in plan, (2,) [mm]."""
        low, high = self.body.box
        return np.asarray(0.5 * (low + high)[:2])

    @cached_property
    def triangle_edges(self) -> np.ndarray:
        """Number of the mesh edge opposite to each corner, (t, 3): neighbours share the number."""
        t = self.mesh.triangles.astype(np.int64)
        ends = np.sort(np.stack([t[:, [1, 2]], t[:, [2, 0]], t[:, [0, 1]]], axis=1), axis=2).reshape(-1, 2)
        _, number = np.unique(ends[:, 0] * len(self.mesh.vertices) + ends[:, 1], return_inverse=True)
        return np.asarray(number.reshape(-1, 3))

    @cached_property
    def outline(self) -> np.ndarray:
        """The outer parting line as the mesh has it, counter-clockwise in plan, (n, 3) [mm]."""
        t = self.mesh.triangles
        edges = self.triangle_edges
        count = int(edges.max()) + 1
        seen = np.bincount(edges[self.core_side].ravel(), minlength=count)
        row, corner = np.nonzero(~self.core_side[:, None] & (seen[edges] > 0))
        start, end = t[row, (corner + 1) % 3], t[row, (corner + 2) % 3]
        loops = [self.mesh.vertices[loop] for loop in _chained(start.tolist(), end.tolist())]
        if not loops:
            return np.asarray(self.halves.parting_line[0], float)
        best = max(loops, key=lambda p: abs(signed_area(p)))
        return best if signed_area(best) > 0.0 else best[::-1]

    @cached_property
    def _core(self) -> Probe | None:
        """Rays against the core half; None where its surface beside the part is the parting plane."""
        if self.halves.core is None or np.abs(self.outline[:, 2] - self.level).max() < LEVEL:
            return None
        return Probe(Body(self.halves.core).mesh)

    def on_plane(self, places: np.ndarray) -> np.ndarray:
        """Return whether the halves meet in the parting plane at plan places (k, 2) beside the part, (k,) bool."""
        if self._core is None or len(places) == 0:
            return np.ones(len(places), dtype=bool)
        start = float(self.high[2]) + 1.0
        origins = np.column_stack([places, np.full(len(places), start)])
        distance, _ = self._core.first(origins, np.array([0.0, 0.0, -1.0]))
        return np.asarray(np.abs(start - distance - self.level) < LEVEL)

    def underside(self, places: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Look up from under the part: height [mm] of the first surface over plan places (k, 2) and its triangle.

        Height is inf and the triangle -1 where there is no part.
        """
        start = self.body.box[0][2] - 1.0
        origins = np.column_stack([places, np.full(len(places), start)])
        distance, triangle = self.probe.first(origins, np.array([0.0, 0.0, 1.0]))
        return start + distance, triangle

    def topside(self, places: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Look down from above the part: as `underside`; height is -inf where there is no part."""
        start = self.body.box[1][2] + 1.0
        origins = np.column_stack([places, np.full(len(places), start)])
        distance, triangle = self.probe.first(origins, np.array([0.0, 0.0, -1.0]))
        return start - distance, triangle


def _chained(start: list[int], end: list[int]) -> list[list[int]]:
    """Return closed chains of vertices from directed edges; a chain that does not close is left out."""
    leaving: dict[int, list[int]] = {}
    for number, vertex in enumerate(start):
        leaving.setdefault(vertex, []).append(number)
    chains = []
    used = [False] * len(start)
    for first in range(len(start)):
        chain: list[int] = []
        at: int | None = first
        while at is not None and not used[at]:
            used[at] = True
            chain.append(start[at])
            at = next((n for n in leaving.get(end[at], []) if not used[n]), None)
        if len(chain) > 2:
            chains.append(chain)
    return chains
