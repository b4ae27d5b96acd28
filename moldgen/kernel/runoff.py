"""Run-off: the parting line carried level, straight out to the four sides of the block.

From its four diagonal extremes the loop falls into four chains; each is carried square to its side of the block (north
to +y, west to -x, ...), and the corners between are level rectangles. The surface can be seen whole along the pull, so
it opens; it is as steep as the parting line itself, and vertical only where that is.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace
from OCP.Geom import Geom_SurfaceOfLinearExtrusion
from OCP.GeomAbs import GeomAbs_Line
from OCP.gp import gp_Dir
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex
from scipy.optimize import minimize_scalar

from moldgen.errors import KernelError
from moldgen.kernel.build import (
    backward,
    curve_edge,
    flattened_curve,
    forward,
    line_edge,
    mended_face,
    plane_face,
    plane_through,
    vertex_at,
    wire_of,
    with_curves_on_surface,
)
from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import directed_points, edge_points, is_reversed, same_order, vertex_point
from moldgen.kernel.walls import Rim

DIAGONALS = ((1, 1), (-1, 1), (-1, -1), (1, -1))
"""North-east, north-west, south-west, south-east: counter-clockwise seen along -z."""

BACKTRACK = 1e-7
"""mm: how far a chain may run against its own direction before it is refused."""

UPRIGHT = 1e-5
"""mm: an edge that covers no more than this, seen along the pull, is vertical."""

Loop = Sequence[TopoDS_Edge]


@dataclass(frozen=True)
class RunOff:
    """Faces from the loop to the sides of the block, the rim they leave there, and how many of them stand upright."""

    faces: tuple[TopoDS_Face, ...]
    rim: Rim
    upright: int


@dataclass(frozen=True)
class _Way:
    """One side of the block: the axis square to it, where it lies, and the axis and sense of travel along it."""

    axis: int
    value: float
    along: int
    sense: int


def extreme_parameters(loop: Loop) -> list[tuple[int, float]]:
    """Return (edge number, curve parameter) where a diagonal extreme of the loop lies inside an edge.

    The edge must be split there.
    """
    found = []
    for dx, dy in DIAGONALS:
        reach = [float((edge_points(e, 33)[:, :2] @ (dx, dy)).max()) for e in loop]
        ends = max(float(vertex_point(TopExp.FirstVertex_s(e, True))[:2] @ (dx, dy)) for e in loop)
        number = int(np.argmax(reach))
        if reach[number] > ends + 1e-4:
            found.append((number, _furthest(loop[number], dx, dy)))
    return found


def run_off(loop: Loop, low: np.ndarray, high: np.ndarray) -> RunOff:
    """Return the run-off of a loop that is counter-clockwise seen along -z, out to the rectangle low..high (x, y).

    Raises
    ------
    KernelError : a chain doubles back on its way along the side, or the kernel cannot make a face
    """
    return _Runner(loop, low, high).run()


def _is_upright(edge: TopoDS_Edge) -> bool:
    """True when an edge runs along the pull, so that what it is carried along is a vertical face."""
    return bool(np.ptp(edge_points(edge, 9)[:, :2], axis=0).max() < UPRIGHT)


def _furthest(edge: TopoDS_Edge, dx: int, dy: int) -> float:
    curve = BRepAdaptor_Curve(edge)
    parameters = np.linspace(curve.FirstParameter(), curve.LastParameter(), 33)

    def depth(t: float) -> float:
        place = curve.Value(float(t))
        return -float(dx * place.X() + dy * place.Y())

    best = int(np.argmin([depth(t) for t in parameters]))
    bounds = parameters[max(best - 1, 0)], parameters[min(best + 1, 32)]
    return float(minimize_scalar(depth, bounds=bounds, method="bounded", options={"xatol": 1e-10}).x)


class _Runner:
    def __init__(self, loop: Loop, low: np.ndarray, high: np.ndarray) -> None:
        self.loop = list(loop)
        starts = [TopExp.FirstVertex_s(e, True) for e in self.loop]
        index = same_order(starts)
        self.at = [index.FindIndex(v) - 1 for v in starts]
        self.vertices = [TopoDS.Vertex_s(index.FindKey(i + 1)) for i in range(index.Extent())]
        self.places = np.array([vertex_point(v) for v in starts])
        self.ways = (
            _Way(1, float(high[1]), 0, -1),
            _Way(0, float(low[0]), 1, -1),
            _Way(1, float(low[1]), 0, 1),
            _Way(0, float(high[0]), 1, 1),
        )
        self.corner_xy = [(high[0], high[1]), (low[0], high[1]), (low[0], low[1]), (high[0], low[1])]
        self.far: dict[tuple[int, int], TopoDS_Vertex] = {}
        self.spokes: dict[tuple[int, int], TopoDS_Edge] = {}

    def run(self) -> RunOff:
        count = len(self.loop)
        extremes = [int(np.argmax(self.places[:, :2] @ d)) for d in DIAGONALS]
        faces: list[TopoDS_Face] = []
        sides: list[list[TopoDS_Edge]] = []
        for way, (first, last) in enumerate(zip(extremes, [*extremes[1:], extremes[0]], strict=True)):
            side = []
            k = first
            while k != last:
                far, face = self._carry(k, way)
                side.append(far)
                faces.append(face)
                k = (k + 1) % count
            sides.append(side)
        corners = [vertex_at((*xy, self.places[e][2])) for xy, e in zip(self.corner_xy, extremes, strict=True)]
        for n, extreme in enumerate(extremes):
            faces.append(self._corner(n, extreme, corners[n], sides))
        # sides run north, west, south, east; a rim starts at its south-west corner and runs south, east, north, west
        order = (2, 3, 0, 1)
        rim = Rim(tuple(corners[i] for i in order), tuple(tuple(sides[i]) for i in order))
        if any(not is_valid(f) for f in faces):
            raise KernelError("a face of the run-off is invalid")
        return RunOff(tuple(faces), rim, sum(_is_upright(e) for e in self.loop))

    def _corner(self, number: int, extreme: int, corner: TopoDS_Vertex, sides: list[list[TopoDS_Edge]]) -> TopoDS_Face:
        """Return the level rectangle at one diagonal extreme; add its outer edges to the sides it touches."""
        before, after = (number - 1) % 4, number
        ends = [self._far(extreme, way) for way in (before, after)]
        outer = [line_edge(ends[0], corner), line_edge(corner, ends[1])]
        sides[before].append(outer[0])
        sides[after].insert(0, outer[1])
        wire = wire_of([self._spoke(extreme, before), *outer, self._spoke(extreme, after)])
        return plane_face(plane_through(self.places[extreme], (0.0, 0.0, 1.0)), wire)

    def _far(self, k: int, way: int) -> TopoDS_Vertex:
        key = (self.at[k], way)
        if key not in self.far:
            place = self.places[k].copy()
            place[self.ways[way].axis] = self.ways[way].value
            self.far[key] = vertex_at(place)
        return self.far[key]

    def _spoke(self, k: int, way: int) -> TopoDS_Edge:
        key = (self.at[k], way)
        if key not in self.spokes:
            self.spokes[key] = line_edge(self.vertices[self.at[k]], self._far(k, way))
        return self.spokes[key]

    def _carry(self, k: int, number: int) -> tuple[TopoDS_Edge, TopoDS_Face]:
        """Return the far edge of one edge of a chain, and the face between them."""
        edge, way = self.loop[k], self.ways[number]
        points = directed_points(edge, 33)
        travel = way.sense * np.diff(points[:, way.along])
        if travel.min() < -BACKTRACK:
            raise KernelError("the parting line doubles back along a side of the block")
        if np.ptp(points[:, way.along]) < UPRIGHT and np.ptp(points[:, way.axis]) > UPRIGHT:
            raise KernelError("the parting line runs square to a side of the block")
        following = (k + 1) % len(self.loop)
        ends = self._far(k, number), self._far(following, number)
        own = forward(edge)
        if is_reversed(edge):
            ends = ends[1], ends[0]
        straight = BRepAdaptor_Curve(own).GetType() == GeomAbs_Line
        direction = np.eye(3)[way.axis]
        if straight:
            far = line_edge(*ends)
            surface = plane_through(points[0], np.cross(direction, points[-1] - points[0]))
        else:
            curve = flattened_curve(own, way.axis, way.value)
            far = curve_edge(curve, ends)
            surface = Geom_SurfaceOfLinearExtrusion(curve, gp_Dir(*direction))
        wire = wire_of([own, far, self._spoke(k, number), self._spoke(following, number)])
        if straight:
            face = mended_face(plane_face(surface, wire))
        else:
            face = with_curves_on_surface(BRepBuilderAPI_MakeFace(surface, wire, False).Face(), surface)
        return (backward(far) if is_reversed(edge) else far), face
