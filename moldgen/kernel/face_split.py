"""Faces split by hand at the level curves of their slope: no boolean, so nothing else of the solid can change.

The mesh settles which edges of the outline a curve starts and ends on; the ends are then roots of the slope on those
edges, the edges get vertices there, and the wires are rebuilt.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, Final

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepLib import BRepLib
from OCP.GCPnts import GCPnts_AbscissaPoint
from OCP.Geom2d import Geom2d_Line
from OCP.GeomAbs import GeomAbs_C2
from OCP.gp import gp_Dir2d, gp_Pnt2d
from OCP.TopAbs import TopAbs_FORWARD, TopAbs_REVERSED
from OCP.TopExp import TopExp
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Vertex
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import forward, vertex_at
from moldgen.kernel.chords import Chord, Cut, cut_for
from moldgen.kernel.edge_split import chain_of, stray
from moldgen.kernel.face_loops import Piece, Use, cut_up, face_of_loops, outline
from moldgen.kernel.guard import operation
from moldgen.kernel.marching import curve_through, interpolated
from moldgen.kernel.measure import is_valid
from moldgen.kernel.shells import solid_from_faces
from moldgen.kernel.slope import Slope
from moldgen.kernel.topology import edges_of, same_order
from moldgen.tolerances import SHORT_EDGE

SAME_SHARE: Final = 1e-4
"""Part of the length of an edge without extent (at a pole) within which two places on it are one (our choice)."""

STRAIGHT: Final = 1e-9
"""Share of its own length by which a curve may leave a parameter line and still be taken as that line (our choice)."""

ALONG: Final = 1.1
"""Tolerance of a new edge or vertex over the largest distance found (our choice)."""


@dataclass
class _Stations:
    """The new parameters on one edge, ascending, and which one each wanted parameter became.

    Station 0 is the first vertex, station k the k-th new parameter, the last one the last vertex.
    """

    kept: list[float]
    station: dict[float, int]


def split_at_level(body: Body, numbers: Iterable[int], sine: float = 0.0) -> Body:
    """Return the body with the given faces split where their outward unit normal n has n.z = sine.

    Pieces narrower than `SHORT_EDGE` are not cut off; ends closer than that to a vertex move onto it. The body is
    returned as it is when no curve parts any of the faces.

    Raises
    ------
    KernelError : a curve cannot be followed to the outline of its face, or the result is not a valid solid
    """
    wanted = sorted(numbers)
    _ = body.mesh  # the chains are read from the triangles
    with operation("split faces by hand", operands=[body.faces[i] for i in wanted]):
        index = same_order(edges_of(body.solid))
        cuts = {i: cut_for(body.faces[i], index, sine) for i in wanted}
        cuts = {i: cut for i, cut in cuts.items() if cut.chords}
        if not cuts:
            return body
        stations = _stations(cuts, index)
        chains = _edge_chains(body, stations, index)
        faces: list[TopoDS_Face] = []
        for number, face in enumerate(body.faces):
            faces += _faces(_cut_of(cuts, number, face, index, chains), stations, chains)
        result = solid_from_faces(faces)
        if result.complaint:
            raise KernelError(f"splitting {len(cuts)} faces by hand left an invalid solid ({result.complaint})")
        return body.like(result.solid)


def _cut_of(
    cuts: Mapping[int, Cut],
    number: int,
    face: TopoDS_Face,
    index: TopTools_IndexedMapOfShape,
    chains: Mapping[int, list[TopoDS_Edge]],
) -> Cut | TopoDS_Face:
    """Return the face as one to be rebuilt when it is split or one of its edges is; else the face itself."""
    if number in cuts:
        return cuts[number]
    if not any(index.FindIndex(e) - 1 in chains for e in edges_of(face)):
        return face
    return Cut(face, Slope(face), outline(face, index))


def _stations(cuts: Mapping[int, Cut], index: TopTools_IndexedMapOfShape) -> dict[int, _Stations]:
    """Return where edges get new vertices: places closer than `SHORT_EDGE` to each other or to a vertex are one."""
    wanted: dict[int, set[float]] = {}
    for cut in cuts.values():
        for chord in cut.chords:
            for end in chord.ends or ():
                wanted.setdefault(cut.use(end).number, set()).add(end.parameter)
    return {n: _merged(TopoDS.Edge_s(index.FindKey(n + 1)), sorted(p)) for n, p in sorted(wanted.items())}


def _merged(edge: TopoDS_Edge, parameters: list[float]) -> _Stations:
    if BRep_Tool.Degenerated_s(edge):
        low, high = BRep_Tool.Range_s(edge)

        def apart(s: float, t: float) -> bool:
            return bool(abs(t - s) > SAME_SHARE * (high - low))

    else:
        curve = BRepAdaptor_Curve(edge)
        low, high = curve.FirstParameter(), curve.LastParameter()

        def apart(s: float, t: float) -> bool:
            return float(GCPnts_AbscissaPoint.Length_s(curve, s, t)) > SHORT_EDGE

    kept: list[float] = []
    station: dict[float, int] = {}
    for t in parameters:
        if not apart(low, t):
            station[t] = 0
        elif not apart(t, high):
            station[t] = -1
        else:
            if not kept or apart(kept[-1], t):
                kept.append(t)
            station[t] = len(kept)
    return _Stations(kept, {t: len(kept) + 1 if k < 0 else k for t, k in station.items()})


def _edge_chains(
    body: Body, stations: Mapping[int, _Stations], index: TopTools_IndexedMapOfShape
) -> dict[int, list[TopoDS_Edge]]:
    """Return the pieces of each edge that gets new vertices, in the edge's own direction."""
    users: dict[int, list[TopoDS_Face]] = {}
    for face in body.faces:
        for edge in edges_of(face):
            users.setdefault(index.FindIndex(edge) - 1, []).append(face)
    chains = {}
    for number, found in stations.items():
        if not found.kept:
            continue
        edge = forward(TopoDS.Edge_s(index.FindKey(number + 1)))
        if BRep_Tool.Degenerated_s(edge):
            chains[number] = _pole_chain(edge, found.kept)
        else:
            chains[number] = chain_of(edge, found.kept, stray(edge, users[number]))
    return chains


def _pole_chain(edge: TopoDS_Edge, parameters: list[float]) -> list[TopoDS_Edge]:
    """Return the pieces of an edge without extent: all of them from its one vertex to itself."""
    builder = BRep_Builder()
    low, high = BRep_Tool.Range_s(edge)
    vertex = TopExp.FirstVertex_s(edge)
    pieces = []
    for start, end in pairwise([low, *parameters, high]):
        piece = TopoDS.Edge_s(edge.EmptyCopied())
        builder.Add(piece, vertex.Oriented(TopAbs_FORWARD))
        builder.Add(piece, vertex.Oriented(TopAbs_REVERSED))
        builder.Range(piece, start, end)
        builder.Degenerated(piece, True)
        pieces.append(piece)
    return pieces


def _faces(
    cut: Cut | TopoDS_Face, stations: Mapping[int, _Stations], chains: Mapping[int, list[TopoDS_Edge]]
) -> list[TopoDS_Face]:
    """Return the faces that a face becomes."""
    if not isinstance(cut, Cut):
        return [cut]
    pieces, corners = _pieces(cut, stations, chains)
    chords = []
    ring = sum(len(loop) for loop in pieces)
    for chord in cut.chords:
        if chord.ends is None:
            start = end = ring
            ring += 1
        else:
            start, end = (
                corners[e.loop, e.place, stations[cut.use(e).number].station[e.parameter]] for e in chord.ends
            )
        made = _chord_piece(cut, chord, (start, end), [p for loop in pieces for p in loop])
        chords += [made] if made is not None else []
    made_faces = [face_of_loops(cut.face, loops) for loops in cut_up(pieces, chords)]
    bad = sum(not is_valid(f) for f in made_faces)
    if bad:
        raise KernelError(f"splitting a face by hand left {bad} invalid faces of {len(made_faces)}")
    return made_faces


def _pieces(
    cut: Cut, stations: Mapping[int, _Stations], chains: Mapping[int, list[TopoDS_Edge]]
) -> tuple[list[list[Piece]], dict[tuple[int, int, int], int]]:
    """Return the outline in pieces, and the corner at each (loop, use, station). Corner k starts the k-th piece."""
    loops: list[list[Piece]] = []
    corners: dict[tuple[int, int, int], int] = {}
    first = 0
    for loop, uses in enumerate(cut.loops):
        counts = [len(chains.get(use.number, [None])) for use in uses]
        size, at = sum(counts), 0
        made = []
        for place, (use, count) in enumerate(zip(uses, counts, strict=True)):
            edges = chains.get(use.number, [use.edge])
            kept = stations[use.number].kept if use.number in chains else []
            bounds = [use.low, *kept, use.high]
            for station in range(count + 1):
                step = count - station if use.backwards else station
                corners[loop, place, station] = first + (at + step) % size
            order = range(count - 1, -1, -1) if use.backwards else range(count)
            for k in order:
                edge = TopoDS.Edge_s(edges[k].Oriented(use.edge.Orientation()))
                part = Use(edge, use.number, use.curve, bounds[k], bounds[k + 1])
                made.append(Piece(edge, first + at, first + (at + 1) % size, part.samples()))
                at += 1
        loops.append(made)
        first += size
    return loops, corners


def _chord_piece(cut: Cut, chord: Chord, ends: tuple[int, int], outline_pieces: list[Piece]) -> Piece | None:
    """Return the edge along a chord between two corners of the outline (or of its own, for a ring)."""
    places = chord.places.copy()
    if chord.ends is not None:
        places[0], places[-1] = (outline_pieces[c].places[0] for c in ends)
    exact = curve_through(cut.slope, places, chord.ends is None)
    if exact is None:
        return None
    if chord.ends is None:
        vertex = vertex_at(cut.slope.point(*exact[0]))
        vertices = vertex, vertex
    else:
        vertices = _start_vertex(outline_pieces[ends[0]]), _start_vertex(outline_pieces[ends[1]])
    edge = _edge_along(cut.face, exact, chord.ends is None, vertices)
    return Piece(edge, *ends, exact)


def _start_vertex(piece: Piece) -> TopoDS_Vertex:
    return TopExp.FirstVertex_s(piece.edge, True)


def _edge_along(
    face: TopoDS_Face, places: np.ndarray, closed: bool, vertices: tuple[TopoDS_Vertex, TopoDS_Vertex]
) -> TopoDS_Edge:
    """Return an edge on a face through places in its surface parameters; a line of the surface where it is one."""
    builder, edge, location = BRep_Builder(), TopoDS_Edge(), TopLoc_Location()
    surface = BRep_Tool.Surface_s(face, location)
    spread = np.ptp(places, axis=0)
    fixed = int(np.argmin(spread))
    turned = False
    if not closed and spread[fixed] < STRAIGHT * spread[1 - fixed]:
        turned = bool(places[-1][1 - fixed] < places[0][1 - fixed])
        at = float(places[0][fixed])
        flat: Any = Geom2d_Line(
            gp_Pnt2d(*((at, 0.0) if fixed == 0 else (0.0, at))), gp_Dir2d(float(fixed), 1.0 - fixed)
        )
        space = surface.UIso(at) if fixed == 0 else surface.VIso(at)
        low, high = sorted((float(places[0][1 - fixed]), float(places[-1][1 - fixed])))
        builder.MakeEdge(edge, space, location, 1e-7)
    else:
        flat = interpolated(places, closed)
        low, high = flat.FirstParameter(), flat.LastParameter()
        builder.MakeEdge(edge)
    builder.UpdateEdge(edge, flat, surface, location, 1e-7)
    start, end = vertices[::-1] if turned else vertices
    builder.Add(edge, start.Oriented(TopAbs_FORWARD))
    builder.Add(edge, end.Oriented(TopAbs_REVERSED))
    builder.Range(edge, low, high)
    if BRepAdaptor_Curve(edge).Is3DCurve() is False:
        BRepLib.BuildCurves3d_s(edge, 1e-6, GeomAbs_C2, 14, 200)
    _tolerate(face, edge, (start, end))
    return TopoDS.Edge_s(edge.Reversed()) if turned else edge


def _tolerate(face: TopoDS_Face, edge: TopoDS_Edge, vertices: tuple[TopoDS_Vertex, TopoDS_Vertex]) -> None:
    """Give an edge and its vertices the tolerances that they have."""
    builder = BRep_Builder()
    builder.UpdateEdge(edge, ALONG * stray(edge, [face]))
    curve = BRepAdaptor_Curve(edge)
    for vertex, t in zip(vertices, (curve.FirstParameter(), curve.LastParameter()), strict=True):
        gap = BRep_Tool.Pnt_s(vertex).Distance(curve.Value(t))
        builder.UpdateVertex(vertex, ALONG * max(gap, BRep_Tool.Tolerance_s(edge)))
