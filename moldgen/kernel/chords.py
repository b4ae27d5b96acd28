"""Chords: level curves of a face's slope, led exactly from one place of its outline to another."""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np
from OCP.BRep import BRep_Tool
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS, TopoDS_Face
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.errors import KernelError
from moldgen.kernel.face_loops import SAMPLES, Use, outline
from moldgen.kernel.marching import Chain, level_chains
from moldgen.kernel.slope import Slope, root_between
from moldgen.tolerances import SHORT_EDGE


class End(NamedTuple):
    """Where a chord meets the outline: a use of an edge (loop, place in it) and the parameter on the edge's curve."""

    loop: int
    place: int
    parameter: float


@dataclass
class Chord:
    """A curve across a face: places in surface parameters, (k, 2), and its ends on the outline (none for a ring)."""

    places: np.ndarray
    ends: tuple[End, End] | None


@dataclass
class Cut:
    """A face that is to be split."""

    face: TopoDS_Face
    slope: Slope
    loops: list[list[Use]]
    chords: list[Chord] = field(default_factory=list)

    def use(self, end: End) -> Use:
        """Return the use of an edge that an end lies on."""
        return self.loops[end.loop][end.place]


def cut_for(face: TopoDS_Face, index: TopTools_IndexedMapOfShape, sine: float) -> Cut:
    """Return a face with the chords that its level curves n.z = sine make across it; the mesh of the face must exist.

    Raises
    ------
    KernelError : a curve cannot be followed to the outline of the face
    """
    cut = Cut(face, Slope(face, sine), outline(face, index))
    segments = _segments(cut)
    for chain in level_chains(face, cut.slope):
        for part in _beside_poles(cut, chain):
            chord = _chord(cut, part, segments)
            if chord is not None and not _hugs_outline(cut, chord):
                cut.chords.append(chord)
    return cut


Segments = dict[tuple[int, int], tuple[int, int, float, float]]


def _segments(cut: Cut) -> Segments:
    """Return for each side of a triangle on the outline (two mesh nodes) its loop, its use and its two parameters."""
    location = TopLoc_Location()
    mesh = BRep_Tool.Triangulation_s(cut.face, location)
    found: Segments = {}
    for loop, uses in enumerate(cut.loops):
        for place, use in enumerate(uses):
            for (a, s), (b, t) in pairwise(_nodes(use, mesh, location)):
                found[min(a, b), max(a, b)] = loop, place, s, t
    return found


def _nodes(use: Use, mesh: Any, location: TopLoc_Location) -> list[tuple[int, float]]:
    """Return the mesh nodes along a use of an edge, with their parameters.

    A seam has two rows of nodes; which one belongs to which of its uses is not kept reliably, so the places decide.
    """
    best: tuple[float, list[tuple[int, float]]] = np.inf, []
    for edge in (use.edge, use.edge.Reversed()):
        polygon = BRep_Tool.PolygonOnTriangulation_s(TopoDS.Edge_s(edge), mesh, location)
        if polygon is None or not polygon.HasParameters():
            continue
        row = [(polygon.Node(i) - 1, polygon.Parameter(i)) for i in range(1, polygon.NbNodes() + 1)]
        node, parameter = row[len(row) // 2]
        gap = float(np.linalg.norm(np.array(mesh.UVNode(node + 1).Coord()) - use.at(parameter)))
        if gap < best[0]:
            best = gap, row
    return best[1]


class _Part(NamedTuple):
    """A piece of a chain; an end at a pole says where in surface parameters, the others which mesh side they are on."""

    points: np.ndarray
    closed: bool
    ends: tuple[tuple[int, int] | np.ndarray, tuple[int, int] | np.ndarray]


def _beside_poles(cut: Cut, chain: Chain) -> list[_Part]:
    """Cut a chain where it runs through a pole: there it changes its parameters without moving."""
    poles = [u for loop in cut.loops for u in loop if BRep_Tool.Degenerated_s(u.edge)]
    if not poles:
        return [_Part(*chain)]
    tips = np.array([cut.slope.point(*p.at(p.low)) for p in poles])
    points = np.array([cut.slope.point(*p) for p in chain.points])
    near = (np.linalg.norm(points[:, None] - tips[None], axis=2) < SHORT_EDGE).any(axis=1)
    if not near.any():
        return [_Part(*chain)]
    away = np.flatnonzero(~near)
    runs = [r for r in np.split(away, np.flatnonzero(np.diff(away) > 1) + 1) if len(r)]
    if chain.closed and len(runs) > 1 and not near[0]:  # the ring's first point is in the middle of a run
        runs = [np.concatenate([runs[-1], runs[0][1:]]), *runs[1:-1]]
    last = len(points) - 1
    parts = []
    for run in runs:
        first_end = chain.ends[0] if run[0] == 0 and not chain.closed else chain.points[run[0]]
        last_end = chain.ends[1] if run[-1] == last and not chain.closed else chain.points[run[-1]]
        parts.append(_Part(chain.points[run], False, (first_end, last_end)))
    return parts


def _chord(cut: Cut, part: _Part, segments: Segments) -> Chord | None:
    """Return the chord along a part of a chain, its ends exactly on the outline; None if it is too short."""
    if part.closed:
        return Chord(part.points, None)
    ends = []
    for side in part.ends:
        ends.append(_at_pole(cut, side) if isinstance(side, np.ndarray) else _on_outline(cut, side, segments))
    inner = part.points[1:-1] if len(part.points) > 2 else part.points[:0]
    places = np.vstack([cut.use(ends[0]).at(ends[0].parameter), inner, cut.use(ends[1]).at(ends[1].parameter)])
    points = np.array([cut.slope.point(*p) for p in places])
    if float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum()) < SHORT_EDGE:
        return None
    return Chord(places, (ends[0], ends[1]))


def _on_outline(cut: Cut, side: tuple[int, int], segments: Segments) -> End:
    """Return the root of the slope on the outline between two neighbouring mesh nodes."""
    if side not in segments:
        raise KernelError("a silhouette ends in the middle of a face: its mesh does not reach its outline")
    loop, place, s, t = segments[side]
    use = cut.loops[loop][place]
    return End(loop, place, root_between(lambda p: cut.slope(*use.at(p)), s, t))


def _at_pole(cut: Cut, place: np.ndarray) -> End:
    """Return the end at the pole nearest to a place in surface parameters, straight across from it."""
    best: tuple[float, End] | None = None
    for loop, uses in enumerate(cut.loops):
        for number, use in enumerate(uses):
            if not BRep_Tool.Degenerated_s(use.edge):
                continue
            first, way = use.at(use.low), use.at(use.high) - use.at(use.low)
            share = float(np.clip((place - first) @ way / (way @ way), 0.0, 1.0))
            gap = float(np.linalg.norm(cut.slope.point(*first) - cut.slope.point(*place)))
            if best is None or gap < best[0]:
                best = gap, End(loop, number, use.low + share * (use.high - use.low))
    if best is None:
        raise KernelError("a silhouette ends at a pole that the face does not have")
    return best[1]


def _hugs_outline(cut: Cut, chord: Chord) -> bool:
    """True when a chord stays so close to the outline that it would cut off nothing that can be seen."""
    uses = [u for loop in cut.loops for u in loop]
    line = [np.array([cut.slope.point(*p) for p in u.samples(97)]) for u in uses]
    start = np.vstack([p[:-1] for p in line])
    way = np.vstack([np.diff(p, axis=0) for p in line])
    size = np.maximum((way * way).sum(axis=1), 1e-300)
    for place in _spread(chord.places):
        here = cut.slope.point(*place) - start
        share = np.clip((here * way).sum(axis=1) / size, 0.0, 1.0)
        if np.linalg.norm(here - share[:, None] * way, axis=1).min() > 0.5 * SHORT_EDGE:
            return False
    return True


def _spread(places: np.ndarray) -> np.ndarray:
    """Return places at about even distances along a polyline: of a straight chord only the ends are known."""
    along = np.append(0.0, np.cumsum(np.linalg.norm(np.diff(places, axis=0), axis=1)))
    wanted = np.linspace(0.0, along[-1], SAMPLES)
    return np.column_stack([np.interp(wanted, along, places[:, k]) for k in range(2)])
