"""How far a body reaches in a direction: the mesh says where to look, the surfaces and curves say how far exactly."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.BRepTopAdaptor import BRepTopAdaptor_FClass2d
from OCP.GeomAbs import GeomAbs_Line, GeomAbs_Plane
from OCP.gp import gp_Pnt2d
from OCP.ShapeAnalysis import ShapeAnalysis_Surface
from OCP.TopAbs import TopAbs_OUT
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face

from moldgen.kernel.body import Body
from moldgen.kernel.build import point
from moldgen.kernel.topology import edges_of

NEAR = 0.1
"""mm: faces whose mesh comes this close to the furthest vertex are looked at (twice the sag of the working mesh)."""

HALVINGS = 16
"""Steps of the pattern search; each halves its reach."""


def reach(body: Body, direction: np.ndarray) -> float:
    """Return the largest value of direction . p over the points p of a body; direction (3,), any length.

    Mesh vertices lie on the surface, so the result never overshoots; between them surfaces and edges are searched.
    """
    heights = body.mesh.vertices @ direction
    best = float(heights.max())
    on_face = np.full(len(body.faces), -np.inf)
    np.maximum.at(on_face, body.mesh.face, heights[body.mesh.triangles].max(axis=1))
    length = float(np.linalg.norm(direction))
    near = np.flatnonzero(on_face >= best - NEAR * length)
    if any(_is_flat_end(body, int(number), direction) for number in near):
        return best  # what bulges past a flat end by less than the sag of the mesh is not looked for
    for number in near:
        face = body.faces[number]
        mine = body.mesh.triangles[body.mesh.face == number].ravel()
        start = body.mesh.vertices[mine[np.argmax(heights[mine])]]
        best = max(best, _on_surface(face, start, direction))
        for edge in edges_of(face):
            if not BRep_Tool.Degenerated_s(edge):
                best = max(best, _on_edge(edge, direction, best - NEAR * length))
    return best


def _is_flat_end(body: Body, number: int, direction: np.ndarray) -> bool:
    heights = body.mesh.vertices[body.mesh.triangles[body.mesh.face == number]] @ direction
    return body.surface_kind(number) == "plane" and float(np.ptp(heights)) < 1e-9 * body.diagonal


def _on_surface(face: TopoDS_Face, start: np.ndarray, direction: np.ndarray) -> float:
    """Climb from a point of a face, without leaving the face."""
    surface = BRepAdaptor_Surface(face)
    if surface.GetType() == GeomAbs_Plane:
        return float("-inf")
    inside = BRepTopAdaptor_FClass2d(face, 1e-7)
    uv = ShapeAnalysis_Surface(BRep_Tool.Surface_s(face)).ValueOfUV(point(start), 1e-6)

    def height(u: float, v: float) -> float:
        if inside.Perform(gp_Pnt2d(u, v)) == TopAbs_OUT:
            return float("-inf")
        return float(np.dot(surface.Value(u, v).Coord(), direction))

    span = surface.LastUParameter() - surface.FirstUParameter(), surface.LastVParameter() - surface.FirstVParameter()
    return _climb(height, (uv.X(), uv.Y()), (0.1 * span[0], 0.1 * span[1]))


def _climb(height: Callable[[float, float], float], at: tuple[float, float], step: tuple[float, float]) -> float:
    best = height(*at)
    for _ in range(HALVINGS):
        for _ in range(20):
            around = [(at[0] + i * step[0], at[1] + j * step[1]) for i in (-1, 0, 1) for j in (-1, 0, 1) if i or j]
            top = max(around, key=lambda p: height(*p))
            if height(*top) <= best:
                break
            at, best = top, height(*top)
        step = (step[0] / 2, step[1] / 2)
    return best


def _on_edge(edge: TopoDS_Edge, direction: np.ndarray, least: float) -> float:
    curve = BRepAdaptor_Curve(edge)
    if curve.GetType() == GeomAbs_Line:
        return float("-inf")

    def height(t: float) -> float:
        return float(np.dot(curve.Value(float(t)).Coord(), direction))

    first, last = curve.FirstParameter(), curve.LastParameter()
    samples = np.linspace(first, last, 17)
    heights = [height(t) for t in samples]
    at = int(np.argmax(heights))
    if heights[at] < least:
        return heights[at]
    low, high = samples[max(at - 1, 0)], samples[min(at + 1, 16)]
    for _ in range(40):  # golden section
        a, b = high - 0.618034 * (high - low), low + 0.618034 * (high - low)
        low, high = (low, b) if height(a) > height(b) else (a, high)
    return max(height(0.5 * (low + high)), heights[at])
