"""Splitting edges at points of theirs, by hand: no boolean, so nothing else of the solid can change."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import pairwise

import numpy as np
from OCP.BOPTools import BOPTools_AlgoTools
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Surface
from OCP.TopAbs import TopAbs_FORWARD, TopAbs_REVERSED
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import forward, vertex_at
from moldgen.kernel.measure import is_valid
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import parts_of

STRAY = 1.2
"""Tolerance of the pieces over the largest distance found between the curves of the edge."""

STRAY_SAMPLES = 60


def split_edges(body: Body, places: Mapping[int, Sequence[float]]) -> Body:
    """Return the body with new vertices on edges, at the given parameters of their curves.

    Every face keeps its surface; an edge becomes a chain of edges on the same curves. (The kernel's splitter loses the
    faces of closed edges here.)

    Raises
    ------
    KernelError : the result is not a valid solid
    """
    chains = {}
    for number, found in places.items():
        if found:
            edge = forward(body.edges[number])
            beside = [body.faces[i] for i in body.edge_faces[number]]
            chains[number] = chain_of(edge, sorted(found), stray(edge, beside))
    touched = {int(f) for number in chains for f in body.edge_faces[number]}
    faces = [_rebuilt(body, face, chains) if i in touched else face for i, face in enumerate(body.faces)]
    result = solid_from_faces(faces)
    bad = sum(not is_valid(faces[i]) for i in touched)
    if result.gap or bad:
        raise KernelError(f"splitting {len(places)} edges left {bad} invalid faces {result.gap}".rstrip())
    return body.like(result.solid)


def parameter_range(edge: TopoDS_Edge) -> tuple[float, float]:
    """Return the first and last parameter of an edge on its curve."""
    curve = BRepAdaptor_Curve(edge)
    return float(curve.FirstParameter()), float(curve.LastParameter())


def place_on(edge: TopoDS_Edge, parameters: Sequence[float]) -> np.ndarray:
    """Return the places on an edge's curve at parameters of it, (n, 3) [mm]."""
    curve = BRepAdaptor_Curve(edge)
    return np.array([curve.Value(float(t)).Coord() for t in parameters]).reshape(-1, 3)


def _rebuilt(body: Body, face: TopoDS_Face, chains: Mapping[int, list[TopoDS_Edge]]) -> TopoDS_Face:
    """Return the face on its own surface with wires in which the chains stand for their edges, in running order."""
    builder = BRep_Builder()
    flat = face.Oriented(TopAbs_FORWARD)
    new = flat.EmptyCopied()
    for wire in parts_of(flat):
        loop = TopoDS_Wire()
        builder.MakeWire(loop)
        for edge in parts_of(wire.Oriented(TopAbs_FORWARD)):
            chain = chains.get(body.edge_index.FindIndex(edge) - 1)
            if chain is None:
                builder.Add(loop, edge)
                continue
            backwards = edge.Orientation() == TopAbs_REVERSED
            for piece in reversed(chain) if backwards else chain:
                builder.Add(loop, piece.Oriented(edge.Orientation()))
        loop.Closed(True)
        builder.Add(new, loop.Oriented(wire.Orientation()))
    return TopoDS.Face_s(new.Oriented(face.Orientation()))


def stray(edge: TopoDS_Edge, faces: Sequence[TopoDS_Face]) -> float:
    """Return a tolerance [mm] that holds for every piece of an edge between these faces.

    The kernel judges an edge by 23 samples of its curve in space against its curve on each face; pieces are sampled
    elsewhere and may stray further than the whole did.
    """
    curve = BRepAdaptor_Curve(edge)
    parameters = np.linspace(curve.FirstParameter(), curve.LastParameter(), STRAY_SAMPLES)
    worst = BRep_Tool.Tolerance_s(edge)
    for face in faces:
        surface = BRepAdaptor_Surface(face)
        flat = BRep_Tool.CurveOnSurface_s(edge, face, 0.0, 0.0)
        if flat is None:
            continue
        for t in parameters:
            at = flat.Value(float(t))
            worst = max(worst, curve.Value(float(t)).Distance(surface.Value(at.X(), at.Y())))
    return STRAY * float(worst)


def chain_of(edge: TopoDS_Edge, parameters: Sequence[float], tolerance: float) -> list[TopoDS_Edge]:
    """Return the pieces of an edge between its ends and new vertices at ascending parameters of its curve."""
    curve = BRepAdaptor_Curve(edge)
    stations: list[tuple[float, TopoDS_Vertex]] = [(curve.FirstParameter(), TopExp.FirstVertex_s(edge))]
    builder = BRep_Builder()
    for t in parameters:
        vertex = vertex_at(curve.Value(t).Coord())
        builder.UpdateVertex(vertex, tolerance)
        stations.append((t, vertex))
    stations.append((curve.LastParameter(), TopExp.LastVertex_s(edge)))
    for _, vertex in (stations[0], stations[-1]):
        builder.UpdateVertex(vertex, tolerance)
    pieces = []
    for (t0, start), (t1, end) in pairwise(stations):
        piece = TopoDS_Edge()
        first = TopoDS.Vertex_s(start.Oriented(TopAbs_FORWARD))
        last = TopoDS.Vertex_s(end.Oriented(TopAbs_REVERSED))
        BOPTools_AlgoTools.MakeSplitEdge_s(edge, first, t0, last, t1, piece)
        builder.UpdateEdge(piece, tolerance)
        pieces.append(TopoDS.Edge_s(piece.Oriented(TopAbs_FORWARD)))
    return pieces
