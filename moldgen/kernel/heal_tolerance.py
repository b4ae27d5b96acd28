"""Stated tolerances against true gaps: what is stated far too loose is tightened, what is needed is kept."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.ShapeFix import ShapeFix_ShapeTolerance
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_VERTEX
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape, TopoDS_Solid

from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import edge_faces_map, faces_of, same_order, vertex_point, vertices_of
from moldgen.tolerances import MAX_EDGE_TOLERANCE

SAMPLES: Final = 61

MARGIN: Final = 1.2
"""Tightened tolerance over the largest gap found at the samples (our choice)."""

TIGHTEST: Final = 1e-6
"""No tolerance is made smaller than this [mm] (our choice: ten times the kernel's own precision)."""


def tightened(solid: TopoDS_Solid) -> tuple[int, int]:
    """Tighten the tolerances stated above `MAX_EDGE_TOLERANCE` whose true gaps are smaller.

    Returns how many faces, edges and vertices were tightened, and how many stay above that.

    The true gap of an edge is the largest distance between its curve in space, its curves on its faces and its
    vertices. No geometry changes. Where the kernel does not call the result valid, all stays as it was.
    """
    needed = _needed(solid)
    loose = [(s, kind, stated, need) for s, kind, stated, need in needed if stated > max(MAX_EDGE_TOLERANCE, need)]
    setter = ShapeFix_ShapeTolerance()
    for shape, kind, _, need in loose:
        setter.SetTolerance(shape, need, kind)
    if loose and not is_valid(solid):
        for shape, kind, stated, _ in loose:
            setter.SetTolerance(shape, stated, kind)
        loose = []
    shut = sum(need <= MAX_EDGE_TOLERANCE for *_, need in loose)
    return len(loose), sum(stated > MAX_EDGE_TOLERANCE for _, _, stated, _ in needed) - shut


def _needed(solid: TopoDS_Solid) -> list[tuple[TopoDS_Shape, Any, float, float]]:
    """Return each face, edge and vertex with its kind, its stated tolerance and the one that it needs [mm]."""
    found: list[tuple[TopoDS_Shape, Any, float, float]] = []
    vertices = vertices_of(solid)
    index, at_vertex = same_order(vertices), np.full(len(vertices), TIGHTEST)
    links = edge_faces_map(solid)
    for i in range(1, links.Extent() + 1):
        edge, users = TopoDS.Edge_s(links.FindKey(i)), links.FindFromIndex(i)
        along, ends = 0.0, 0.0
        if not BRep_Tool.Degenerated_s(edge):
            gaps = [_gaps(edge, TopoDS.Face_s(face)) for face in (users.First(), users.Last())]
            along, ends = max(g[0] for g in gaps), max(g[1] for g in gaps)
        need = max(TIGHTEST, MARGIN * along)
        found.append((edge, TopAbs_EDGE, float(BRep_Tool.Tolerance_s(edge)), need))
        for vertex in (TopExp.FirstVertex_s(edge), TopExp.LastVertex_s(edge)):
            place = index.FindIndex(vertex) - 1
            at_vertex[place] = max(at_vertex[place], need, MARGIN * ends)
    found += [(f, TopAbs_FACE, float(BRep_Tool.Tolerance_s(f)), TIGHTEST) for f in faces_of(solid)]
    stated = [float(BRep_Tool.Tolerance_s(v)) for v in vertices]
    found += [(v, TopAbs_VERTEX, s, float(n)) for v, s, n in zip(vertices, stated, at_vertex, strict=True)]
    return found


def _gaps(edge: TopoDS_Edge, face: TopoDS_Face) -> tuple[float, float]:
    """Return how far the curve of an edge lies from its curve on a face, and from its vertices at its ends [mm]."""
    curve, surface = BRepAdaptor_Curve(edge), BRepAdaptor_Surface(face)
    first, last = BRep_Tool.Range_s(edge)
    times = np.linspace(first, last, SAMPLES)
    flat = BRep_Tool.CurveOnSurface_s(edge, face, 0.0, 0.0)
    places = [flat.Value(float(t)) for t in times]
    on_face = np.array([surface.Value(p.X(), p.Y()).Coord() for p in places])
    in_space = np.array([curve.Value(float(t)).Coord() for t in times])
    along = float(np.linalg.norm(on_face - in_space, axis=1).max())
    ends = 0.0
    for k, vertex in ((0, TopExp.FirstVertex_s(edge)), (-1, TopExp.LastVertex_s(edge))):
        at = vertex_point(vertex)
        ends = max(ends, *(float(np.linalg.norm(p[k] - at)) for p in (on_face, in_space)))
    return along, ends
