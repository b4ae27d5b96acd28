"""A level land around the part, an inclined wall beyond it, and a flat parting plane out to the sides of the block.

The land is ruled: from each place of the parting line level outward, square to the line. So the steel seals on a band
of constant width whatever the line does, and everything beyond it is plane again.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.gp import gp_Pln, gp_Pnt, gp_Vec
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.build import line_edge, plane_face, plane_through, vertex_at, wire_of
from moldgen.kernel.land_plan import Lie, Patch, PlanEdge, Spoke, plan_land
from moldgen.kernel.measure import is_valid
from moldgen.kernel.ruled import is_straight, ruled_face, spline_edge, spline_of, spline_through
from moldgen.kernel.topology import directed_points, is_reversed, vertex_point
from moldgen.kernel.walls import Rim, rectangle_rim
from moldgen.tolerances import ON_PLANE

SAMPLES = ((5.0, 9), (20.0, 17), (math.inf, 33))
"""Places along a curved edge at which its land is laid out, by the length [mm] of the edge."""

UPRIGHT = 1e-5
"""mm: an edge that covers no more than this, seen along the pull, is upright."""

STEEP = 0.2
"""A straight edge with less plan length than this share of its rise (11 deg to the pull) counts as a step."""

LOW_STEP = 0.05
"""mm: an upright step this low is within what spotting the halves against each other evens out (our choice)."""

FLAT_LEFT = 2.0
"""mm of flat parting plane that must remain beyond the wall (our choice)."""

Loop = Sequence[TopoDS_Edge]


@dataclass(frozen=True)
class Land:
    """Faces from the line to the sides of the block.

    width : of the land [mm]; run : plan width of the wall beyond it [mm]
    upright : edges of the line that stand upright: the land is upright beside them, and leans more and more outward
    """

    faces: tuple[TopoDS_Face, ...]
    rim: Rim
    width: float
    run: float
    upright: int


def level_land(loop: Loop, level: float, corners: tuple[np.ndarray, np.ndarray], width: float, lean_deg: float) -> Land:
    """Return the land of a loop that is counter-clockwise seen along -z.

    level : height of the flat parting plane [mm]; corners : of the block [mm]
    width : of the land [mm]; lean_deg : least angle between the wall and the pull

    Raises
    ------
    KernelError : the block leaves no room, the line turns more tightly inward than the land, the land meets itself, or
        the kernel cannot make a face
    """
    return _Lander(loop, level, width, lean_deg).lay(corners)


def level_lid(loop: Loop, level: float, width: float, lean_deg: float) -> tuple[TopoDS_Face, ...]:
    """Return the faces that close a hole: a level land inward from its loop, a wall, and a flat lid at z = level [mm].

    loop : clockwise seen along -z, so that the hole lies on its right; width, lean_deg : as of `level_land`

    Raises
    ------
    KernelError : the hole is too narrow, or the kernel cannot make a face
    """
    return _Lander(loop, level, width, lean_deg).cover()


def plan_edge(edge: TopoDS_Edge, level: float) -> PlanEdge:
    """Return how one edge of the line lies, and its places and directions in plan."""
    straight = is_straight(edge)
    points = directed_points(edge, 2 if straight else _samples(edge))
    across, rise = float(np.linalg.norm(np.ptp(points[:, :2], axis=0))), float(np.ptp(points[:, 2]))
    if np.abs(points[:, 2] - level).max() < ON_PLANE:
        lie = Lie.LEVEL
    elif across < UPRIGHT or (straight and across < STEEP * rise):
        lie = Lie.STEP
    else:
        lie = Lie.FREE
    if across < UPRIGHT:
        return PlanEdge(lie, points[[0, -1]], np.array([1.0, 0.0]), np.array([1.0, 0.0]))
    return PlanEdge(lie, points, *_end_tangents(edge, points))


def _samples(edge: TopoDS_Edge) -> int:
    length = float(np.linalg.norm(np.diff(directed_points(edge, 9), axis=0), axis=1).sum())
    return next(count for longest, count in SAMPLES if length <= longest)


def _is_upright(edge: PlanEdge) -> bool:
    """True for an edge along the pull that is high enough to matter."""
    across, rise = np.ptp(edge.points[:, :2], axis=0).max(), np.ptp(edge.points[:, 2])
    return bool(edge.lie is Lie.STEP and across < UPRIGHT and rise > LOW_STEP)


def _end_tangents(edge: TopoDS_Edge, points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the unit plan tangents at both ends; of an end that runs upright, that of the chord beside it."""
    curve = BRepAdaptor_Curve(edge)
    found = []
    for parameter in (curve.FirstParameter(), curve.LastParameter()):
        place, along = gp_Pnt(), gp_Vec()
        curve.D1(parameter, place, along)
        found.append((-1.0 if is_reversed(edge) else 1.0) * np.array([along.X(), along.Y()]))
    if is_reversed(edge):
        found.reverse()
    chords = points[1, :2] - points[0, :2], points[-1, :2] - points[-2, :2]
    tangents = [t if np.linalg.norm(t) > 1e-9 else c for t, c in zip(found, chords, strict=True)]
    one, two = (t / max(float(np.linalg.norm(t)), 1e-12) for t in tangents)
    return one, two


class _Lander:
    def __init__(self, loop: Loop, level: float, width: float, lean_deg: float) -> None:
        self.loop = list(loop)
        self.level, self.width = level, width
        self.edges = [plan_edge(e, level) for e in self.loop]
        height = max(float(np.abs(e.points[:, 2] - level).max()) for e in self.edges)
        self.run = height * math.tan(math.radians(lean_deg))
        self.faces: list[TopoDS_Face] = []
        self.ends: dict[int, tuple[TopoDS_Vertex, TopoDS_Vertex]] = {}
        self.legs: dict[int, tuple[TopoDS_Edge, TopoDS_Edge]] = {}

    def lay(self, corners: tuple[np.ndarray, np.ndarray]) -> Land:
        self._refuse_room(corners)
        foot = self._foot()
        self._refuse_overhang(corners)
        rim = rectangle_rim(*corners, self.level)
        around = plane_face(self._plane(), wire_of(rim.edges), [TopoDS.Wire_s(foot.Reversed())])
        return Land(self._sound(around), rim, self.width, self.run, sum(map(_is_upright, self.edges)))

    def cover(self) -> tuple[TopoDS_Face, ...]:
        foot = self._foot()
        return self._sound(plane_face(self._plane(), foot))

    def _plane(self) -> gp_Pln:
        return plane_through((0, 0, self.level), (0, 0, 1))

    def _foot(self) -> TopoDS_Wire:
        """Make all land and wall; return the closed line in which they meet the flat plane."""
        self.plan = plan_land(self.edges, self.width, self.run)
        feet = [self._patch(p) for p in self.plan.patches]
        return wire_of([*feet, *(self.loop[k] for k in self.plan.plain), *self._legs_on_plane()])

    def _sound(self, plane: TopoDS_Face) -> tuple[TopoDS_Face, ...]:
        faces = (plane, *self.faces)
        if any(not is_valid(f) for f in faces):
            raise KernelError("a face of the land is invalid")
        return faces

    def _refuse_room(self, corners: tuple[np.ndarray, np.ndarray]) -> None:
        outline = np.vstack([e.points[:, :2] for e in self.edges if e.lie is not Lie.LEVEL])
        low, high = (np.asarray(c)[:2] for c in corners)
        room = min(float((outline.min(axis=0) - low).min()), float((high - outline.max(axis=0)).min()))
        needed = self.width + self.run + FLAT_LEFT
        if room < needed:
            raise KernelError(
                f"a land {self.width:g} mm wide, its wall and {FLAT_LEFT:g} mm of flat plane take {needed:.1f} mm, the "
                f"block has {room:.1f} mm beside the part"
            )

    def _refuse_overhang(self, corners: tuple[np.ndarray, np.ndarray]) -> None:
        """Refuse a wall that leaves the block: round a sharp corner it reaches out further than elsewhere."""
        low, high = (np.asarray(c)[:2] for c in corners)
        for patch in self.plan.patches:
            left = np.minimum(patch.foot - low, high - patch.foot).min(axis=1)
            if left.min() < 0.5 * FLAT_LEFT:
                x, y = patch.foot[int(np.argmin(left))]
                raise KernelError(f"a land {self.width:g} mm wide and its wall leave the block near {x:.2f}, {y:.2f}")

    def _patch(self, patch: Patch) -> TopoDS_Edge:
        """Make the land and the wall of one piece; return the edge at the foot of the wall."""
        (rim_a, foot_a), (rim_b, foot_b) = self._ends(patch.start), self._ends(patch.end)
        (land_a, wall_a), (land_b, wall_b) = self._legs(patch.start), self._legs(patch.end)
        if len(patch.rim) == 2:
            rim, foot = line_edge(rim_a, rim_b), line_edge(foot_a, foot_b)
        else:
            rim = self._curve(patch, patch.rim, (rim_a, rim_b), None)
            foot = self._curve(patch, patch.foot, (foot_a, foot_b), self.level)
        if patch.edge < 0:
            plane = plane_through(patch.start.rim, (0.0, 0.0, 1.0))
            self.faces.append(plane_face(plane, wire_of([land_a, rim, land_b])))
        else:
            self.faces.append(ruled_face(self.loop[patch.edge], rim, (land_a, land_b)))
        self.faces.append(ruled_face(rim, foot, (wall_a, wall_b)))
        return foot

    def _curve(
        self, patch: Patch, plan: np.ndarray, ends: tuple[TopoDS_Vertex, TopoDS_Vertex], height: float | None
    ) -> TopoDS_Edge:
        """Return a spline over plan places, in the parameter of the line's own curve and as high as that."""
        curve = spline_of(self.loop[patch.edge])
        times = np.linspace(curve.FirstParameter(), curve.LastParameter(), len(plan))
        first, last = (vertex_point(v) for v in ends)
        if height is None:
            z = np.array([curve.Value(float(t)).Z() for t in times])
            share = np.linspace(0.0, 1.0, len(plan))
            z += (1.0 - share) * (first[2] - z[0]) + share * (last[2] - z[-1])
        else:
            z = np.full(len(plan), height)
        points = np.column_stack([plan, z])
        points[0], points[-1] = first, last
        return spline_edge(spline_through(points, times), *ends)

    def _ends(self, spoke: Spoke) -> tuple[TopoDS_Vertex, TopoDS_Vertex]:
        """Return the outer end of a spoke on the rim of the land and at the foot of the wall."""
        if id(spoke) not in self.ends:
            self.ends[id(spoke)] = vertex_at(spoke.rim), vertex_at((*spoke.foot, self.level))
        return self.ends[id(spoke)]

    def _legs(self, spoke: Spoke) -> tuple[TopoDS_Edge, TopoDS_Edge]:
        if id(spoke) not in self.legs:
            rim, foot = self._ends(spoke)
            vertex = TopExp.FirstVertex_s(self.loop[spoke.vertex], True)
            self.legs[id(spoke)] = line_edge(vertex, rim), line_edge(rim, foot)
        return self.legs[id(spoke)]

    def _legs_on_plane(self) -> list[TopoDS_Edge]:
        """Return the legs that bound the flat plane, where an edge on it meets the land."""
        plain, count = set(self.plan.plain), len(self.edges)
        legs: list[TopoDS_Edge] = []
        for patch in self.plan.patches:
            if (patch.start.vertex - 1) % count in plain:
                legs += self._legs(patch.start)
            if patch.end.vertex in plain:
                legs += self._legs(patch.end)
        return legs
