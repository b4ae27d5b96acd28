"""Vertical curtains: from a closed loop straight along the pull to its foot on a level plane.

This rung of the parting surface always works. Every new edge and vertex is shared between its faces, so that shells
close without sewing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace
from OCP.Geom import Geom_Plane, Geom_Surface, Geom_SurfaceOfLinearExtrusion
from OCP.GeomAbs import GeomAbs_Line
from OCP.gp import gp_Dir
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex

from moldgen.errors import KernelError
from moldgen.kernel.build import (
    backward,
    curve_edge,
    flattened_curve,
    forward,
    line_edge,
    mended_face,
    plane_through,
    vertex_at,
    wire_of,
    with_curves_on_surface,
)
from moldgen.kernel.topology import directed_points, is_reversed, same_order, vertex_point
from moldgen.tolerances import MAX_EDGE_TOLERANCE, ON_PLANE

CROSSING = 1e-4
"""mm: an edge that goes this far to both sides of the level plane must be split there first."""


class EdgeLie(StrEnum):
    """How an edge of the loop lies to the level plane."""

    ON = "on the plane"
    VERTICAL = "vertical"
    OFF = "off the plane"


@dataclass(frozen=True)
class Curtain:
    """The foot loop on the level plane, and the vertical faces between the loop and its foot."""

    foot: tuple[TopoDS_Edge, ...]
    faces: tuple[TopoDS_Face, ...]
    lies: tuple[EdgeLie, ...]

    @property
    def off_plane(self) -> int:
        """How many edges of the loop needed a curtain."""
        return sum(lie is EdgeLie.OFF for lie in self.lies)


def hang_curtain(loop: Sequence[TopoDS_Edge], level: float) -> Curtain:
    """Return the curtain of a closed loop of directed edges down (or up) to the plane z = level [mm].

    Raises
    ------
    KernelError : an edge crosses the plane, or the kernel cannot make a face
    """
    return _Hanger(loop, level).hang()


class _Hanger:
    def __init__(self, loop: Sequence[TopoDS_Edge], level: float) -> None:
        self.loop = list(loop)
        self.level = level
        starts = [TopExp.FirstVertex_s(e, True) for e in self.loop]
        index = same_order(starts)
        self.at: list[int] = [index.FindIndex(v) - 1 for v in starts]
        self.vertices = [TopoDS.Vertex_s(index.FindKey(i + 1)) for i in range(index.Extent())]
        self.places = np.array([vertex_point(v) for v in self.vertices])
        reach = np.array([min(BRep_Tool.Tolerance_s(v), MAX_EDGE_TOLERANCE) for v in self.vertices])
        self.on_level = np.abs(self.places[:, 2] - level) < np.maximum(ON_PLANE, reach)
        self.lies = [self._lie(k) for k in range(len(self.loop))]
        self.column = self._columns()
        self.foot_of: dict[int, TopoDS_Vertex] = {}
        self.stack: dict[int, list[tuple[float, int, TopoDS_Vertex]]] = {}
        self._place_feet()
        self.risers: dict[tuple[int, int], TopoDS_Edge] = {}
        for k, lie in enumerate(self.lies):
            if lie is EdgeLie.VERTICAL:
                self.risers[self._key(self.at[k], self._next(k))] = self.loop[k]

    def hang(self) -> Curtain:
        foot: list[TopoDS_Edge] = []
        faces: list[TopoDS_Face] = []
        for k, edge in enumerate(self.loop):
            if self.lies[k] is EdgeLie.ON:
                foot.append(edge)
            elif self.lies[k] is EdgeLie.OFF:
                below, face = self._fall(k)
                foot.append(below)
                faces.append(face)
        return Curtain(tuple(foot), tuple(faces), tuple(self.lies))

    def _next(self, k: int) -> int:
        return self.at[(k + 1) % len(self.loop)]

    def _lie(self, k: int) -> EdgeLie:
        edge = self.loop[k]
        points = directed_points(edge, 9)
        tolerance = max(BRep_Tool.Tolerance_s(edge), 1e-7)
        level = np.abs(points[:, 2] - self.level).max() < max(ON_PLANE, tolerance)
        if level and self.on_level[self.at[k]] and self.on_level[self._next(k)]:
            return EdgeLie.ON
        length_in_plan = np.linalg.norm(np.diff(points[:, :2], axis=0), axis=1).sum()
        return EdgeLie.VERTICAL if length_in_plan < max(1e-5, 2 * tolerance) else EdgeLie.OFF

    def _columns(self) -> list[int]:
        """Join the vertices that vertical edges connect: they stand over one foot."""
        parent = list(range(len(self.vertices)))

        def root(i: int) -> int:
            while parent[i] != i:
                i = parent[i]
            return i

        for k, lie in enumerate(self.lies):
            if lie is EdgeLie.VERTICAL:
                parent[root(self.at[k])] = root(self._next(k))
        return [root(i) for i in range(len(self.vertices))]

    def _place_feet(self) -> None:
        for column in sorted(set(self.column)):
            members = [i for i, c in enumerate(self.column) if c == column]
            standing = [i for i in members if self.on_level[i]]
            foot = (
                self.vertices[standing[0]]
                if standing
                else vertex_at((self.places[members[0], 0], self.places[members[0], 1], self.level))
            )
            self.foot_of[column] = foot
            risen = [(float(self.places[i, 2]), i, self.vertices[i]) for i in members if not self.on_level[i]]
            self.stack[column] = sorted([*risen, (self.level, -1, foot)], key=lambda entry: entry[0])

    def _key(self, a: int, b: int) -> tuple[int, int]:
        names = [-1 - self.column[i] if self.on_level[i] else i for i in (a, b)]
        return min(names), max(names)

    def _side(self, vertex: int) -> list[TopoDS_Edge]:
        """Return the vertical edges from a vertex to its foot, one for each step between vertices of its column."""
        if self.on_level[vertex]:
            return []
        column = self.column[vertex]
        stack = self.stack[column]
        order = [number for _, number, _ in stack]
        start, end = order.index(vertex), order.index(-1)
        steps = range(start, end + 1) if end > start else range(start, end - 1, -1)
        side = []
        for a, b in pairwise(steps):
            names = [(-1 - column) if stack[i][1] < 0 else stack[i][1] for i in (a, b)]
            key = (min(names), max(names))
            if key not in self.risers:
                self.risers[key] = line_edge(stack[a][2], stack[b][2])
            side.append(self.risers[key])
        return side

    def _fall(self, k: int) -> tuple[TopoDS_Edge, TopoDS_Face]:
        """Return the foot of one off-plane edge, directed as the edge, and the face between them."""
        edge = self.loop[k]
        z = directed_points(edge, 17)[:, 2] - self.level
        if z.min() < -CROSSING and z.max() > CROSSING:
            raise KernelError(f"an edge of the parting line crosses the level {self.level:.4f}")
        start, end = self.at[k], self._next(k)
        if is_reversed(edge):
            start, end = end, start
        own = forward(edge)
        straight = BRepAdaptor_Curve(own).GetType() == GeomAbs_Line
        feet = self.foot_of[self.column[start]], self.foot_of[self.column[end]]
        foot, surface = self._straight_foot(own, feet) if straight else self._curved_foot(own, feet)
        wire = wire_of([own, foot, *self._side(start), *self._side(end)])
        maker = BRepBuilderAPI_MakeFace(surface, wire, straight)
        if not maker.IsDone():
            raise KernelError("no vertical face under an edge of the parting line")
        face = mended_face(maker.Face()) if straight else with_curves_on_surface(maker.Face(), surface)
        return (backward(foot) if is_reversed(edge) else foot), face

    def _straight_foot(
        self, edge: TopoDS_Edge, feet: tuple[TopoDS_Vertex, TopoDS_Vertex]
    ) -> tuple[TopoDS_Edge, Geom_Surface]:
        first, last = (vertex_point(v) for v in feet)
        dx, dy = (last - first)[:2]
        start = directed_points(edge, 2)[0]
        return line_edge(*feet), Geom_Plane(plane_through(start, (dy, -dx, 0.0)))

    def _curved_foot(
        self, edge: TopoDS_Edge, feet: tuple[TopoDS_Vertex, TopoDS_Vertex]
    ) -> tuple[TopoDS_Edge, Geom_Surface]:
        curve = flattened_curve(edge, 2, self.level)
        return curve_edge(curve, feet), Geom_SurfaceOfLinearExtrusion(curve, gp_Dir(0.0, 0.0, 1.0))
