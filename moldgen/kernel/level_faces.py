"""Splitting vertical faces along a level line by hand: exact, fast, and sharing every edge with the neighbours.

The kernel's splitter took 16 s for one such face on a real part. A vertical face is ruled along the pull, so its level
line is a straight line in the surface's parameters; where that does not hold the face is left to the splitter.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge
from OCP.BRepLib import BRepLib
from OCP.BRepTools import BRepTools
from OCP.Geom2d import Geom2d_Line
from OCP.GeomAbs import GeomAbs_Plane
from OCP.gp import gp_Dir2d, gp_Pnt2d
from OCP.TopAbs import TopAbs_FORWARD, TopAbs_REVERSED
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Shape, TopoDS_Vertex, TopoDS_Wire

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import line_edge
from moldgen.kernel.edge_split import split_edges
from moldgen.kernel.level_split import level_parameters
from moldgen.kernel.measure import is_valid
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.topology import parts_of, vertex_point, vertices_of

ON_LEVEL = 1e-6
"""mm: a vertex or a point of the dividing line this close to the level lies on it."""


def split_vertical_faces(body: Body, faces: Sequence[int], level: float) -> tuple[Body, list[int]]:
    """Return the body with vertical faces split at z = level, and the numbers (in it) of those left whole.

    Raises
    ------
    KernelError : the pieces do not make a sound solid
    """
    edges = sorted({e for f in faces for e in body.edges_at_face[f]})
    places = {e: found for e in edges if (found := level_parameters(body.edges[e], level))}
    cut = split_edges(body, places) if places else body  # faces keep their numbers
    pieces: list[TopoDS_Face] = []
    left_faces = []
    for number, face in enumerate(cut.faces):
        halves = _halves(face, level) if number in set(faces) else None
        if number in set(faces) and halves is None:
            left_faces.append(face)
        pieces += halves or [face]
    if len(pieces) == len(cut.faces):
        return body, list(faces)
    result = solid_from_faces(pieces)
    if result.gap:  # each piece was checked when it was made
        raise KernelError(f"splitting {len(faces)} walls at height {level:.3f}: {result.gap}")
    split = body.like(result.solid)
    return split, [split.face_index.FindIndex(f) - 1 for f in left_faces]


def _halves(face: TopoDS_Face, level: float) -> list[TopoDS_Face] | None:
    """Return the upper and lower piece of a face whose outline crosses the level just twice, else None."""
    flat = TopoDS.Face_s(face.Oriented(TopAbs_FORWARD))
    outer = BRepTools.OuterWire_s(flat)
    holes = [w for w in parts_of(flat) if not w.IsSame(outer)]
    if any(_spans(hole, level) for hole in holes):
        return None
    edges = [TopoDS.Edge_s(e) for e in parts_of(outer.Oriented(TopAbs_FORWARD))]
    if outer.Orientation() == TopAbs_REVERSED:
        edges = [TopoDS.Edge_s(e.Reversed()) for e in reversed(edges)]
    starts = [TopExp.FirstVertex_s(e, True) for e in edges]
    on = [i for i, v in enumerate(starts) if abs(vertex_point(v)[2] - level) < ON_LEVEL]
    if len(on) != 2 or any(s.IsSame(starts[on[0]]) for s in (starts[on[1]],)):
        return None
    i, j = on
    first, second = edges[i:j], edges[j:] + edges[:i]
    sides = [_side(chain, level) for chain in (first, second)]
    if sorted(sides) != [-1, 1]:
        return None
    line = _level_edge(flat, starts[i], starts[j], level)
    if line is None:
        return None
    pieces = []
    for chain, closing, side in ((first, line.Reversed(), sides[0]), (second, line, sides[1])):
        own = [h for h in holes if side * (vertex_point(vertices_of(h)[0])[2] - level) > 0]
        piece = _piece(flat, [*chain, TopoDS.Edge_s(closing)], own)
        if not is_valid(piece):
            return None
        pieces.append(TopoDS.Face_s(piece.Oriented(face.Orientation())))
    return pieces


def _side(chain: list[TopoDS_Edge], level: float) -> int:
    """Return 1 for a chain above the level, -1 for one below, 0 for one on both sides or along it."""
    z = np.concatenate([[vertex_point(v)[2] for v in vertices_of(e)] for e in chain]) - level
    if (z > -ON_LEVEL).all() and z.max() > ON_LEVEL:
        return 1
    return -1 if (z < ON_LEVEL).all() and z.min() < -ON_LEVEL else 0


def _spans(wire: TopoDS_Shape, level: float) -> bool:
    z = np.array([vertex_point(v)[2] for v in vertices_of(wire)]) - level
    return len(z) < 2 or not ((z > ON_LEVEL).all() or (z < -ON_LEVEL).all())


def _level_edge(face: TopoDS_Face, start: TopoDS_Vertex, end: TopoDS_Vertex, level: float) -> TopoDS_Edge | None:
    surface = BRepAdaptor_Surface(face)
    if surface.GetType() == GeomAbs_Plane:
        return line_edge(start, end)
    a, b = BRep_Tool.Parameters_s(start, face), BRep_Tool.Parameters_s(end, face)
    along = np.array([b.X() - a.X(), b.Y() - a.Y()])
    length = float(np.linalg.norm(along))
    if length < 1e-9:
        return None
    for share in np.linspace(0.0, 1.0, 17):
        if abs(surface.Value(a.X() + share * along[0], a.Y() + share * along[1]).Z() - level) > ON_LEVEL:
            return None
    line = Geom2d_Line(gp_Pnt2d(a.X(), a.Y()), gp_Dir2d(along[0], along[1]))
    maker = BRepBuilderAPI_MakeEdge(line, BRep_Tool.Surface_s(face), start, end, 0.0, length)
    if not maker.IsDone():
        return None
    edge = maker.Edge()
    return edge if BRepLib.BuildCurves3d_s(edge) else None


def _piece(face: TopoDS_Face, edges: Sequence[TopoDS_Edge], holes: Sequence[TopoDS_Shape]) -> TopoDS_Face:
    builder = BRep_Builder()
    piece = TopoDS.Face_s(face.EmptyCopied())
    wire = TopoDS_Wire()
    builder.MakeWire(wire)
    for edge in edges:
        builder.Add(wire, edge)
    wire.Closed(True)
    builder.Add(piece, wire)
    for hole in holes:
        builder.Add(piece, hole)
    return piece
