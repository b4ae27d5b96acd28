"""Curves and points at which a level plane, or vertical lines, divide the faces of a body."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepAlgoAPI import BRepAlgoAPI_Section
from OCP.gp import gp_Dir, gp_Pln, gp_Pnt
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape
from scipy.optimize import brentq

from moldgen.errors import KernelError
from moldgen.kernel.build import line_edge, vertex_at
from moldgen.kernel.split import split_shape
from moldgen.kernel.topology import compound_of, edge_faces_map, edges_of, vertex_point, vertices_of
from moldgen.tolerances import SHORT_EDGE

SAMPLES = 33

SAME_PLACE = 1e-4
"""mm: two points closer than this are one."""


def level_curves(faces: Sequence[TopoDS_Face], level: float) -> list[TopoDS_Edge]:
    """Return the edges in which faces meet the plane z = level [mm]."""
    section = BRepAlgoAPI_Section(compound_of(faces), gp_Pln(gp_Pnt(0, 0, level), gp_Dir(0, 0, 1)), False)
    section.Build()
    if not section.IsDone():
        raise KernelError(f"no section at height {level:.4f}")
    return [e for e in edges_of(section.Shape()) if chord(e) > SHORT_EDGE]


def level_parameters(edge: TopoDS_Edge, level: float) -> list[float]:
    """Return the curve parameters at which an edge passes through the plane z = level, its ends excepted.

    Where it only touches the plane it does not pass.
    """
    curve = BRepAdaptor_Curve(edge)
    parameters = np.linspace(curve.FirstParameter(), curve.LastParameter(), SAMPLES)

    def height(t: float) -> float:
        return float(curve.Value(float(t)).Z()) - level

    heights = [height(t) for t in parameters]
    ends = [curve.Value(float(t)) for t in (parameters[0], parameters[-1])]
    found: list[float] = []
    for i in range(SAMPLES - 1):
        if (heights[i] < 0.0) != (heights[i + 1] < 0.0):  # a sample may lie on the plane exactly
            t = float(brentq(height, parameters[i], parameters[i + 1], xtol=1e-13))
            if found and curve.Value(t).Distance(curve.Value(found[-1])) < SAME_PLACE:
                found.pop()  # up and down again at one place: a touch
            elif all(curve.Value(t).Distance(end) > SAME_PLACE for end in ends):
                found.append(t)
    return found


def upright_lines(face: TopoDS_Face, low: float, high: float) -> list[TopoDS_Edge]:
    """Return vertical lines inside a vertical face through its vertices, clipped to the face."""
    places: list[np.ndarray] = []
    for vertex in vertices_of(face):
        xy = vertex_point(vertex)[:2]
        if all(np.hypot(*(xy - p)) >= SAME_PLACE for p in places):
            places.append(xy)
    if len(places) < 3:
        return []
    lines = [line_edge(vertex_at((x, y, low - 1.0)), vertex_at((x, y, high + 1.0))) for x, y in places]
    pieces = [e for e in _inner_edges(split_shape(face, lines)) if chord(e) > SHORT_EDGE]
    return [e for e in pieces if np.ptp([vertex_point(v)[:2] for v in vertices_of(e)], axis=0).max() < SAME_PLACE]


def _inner_edges(shape: TopoDS_Shape) -> list[TopoDS_Edge]:
    """Return the edges between two faces of a shape: not its outline."""
    links = edge_faces_map(shape)
    users = [(links.FindKey(i), links.FindFromIndex(i)) for i in range(1, links.Extent() + 1)]
    return [TopoDS.Edge_s(e) for e, faces in users if faces.Size() == 2 and not faces.First().IsSame(faces.Last())]


def chord(edge: TopoDS_Edge) -> float:
    """Return the distance between the ends of an edge, or its sampled length when it is closed [mm]."""
    first, last = TopExp.FirstVertex_s(edge), TopExp.LastVertex_s(edge)
    if first.IsSame(last):
        curve = BRepAdaptor_Curve(edge)
        middle = curve.Value(0.5 * (curve.FirstParameter() + curve.LastParameter()))
        return 2.0 * float(middle.Distance(curve.Value(curve.FirstParameter())))
    return float(np.linalg.norm(vertex_point(first) - vertex_point(last)))
