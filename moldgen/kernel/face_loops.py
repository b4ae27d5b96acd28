"""The outline of a face as loops in its surface parameters, and how chords across it cut it up."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepTools import BRepTools_WireExplorer
from OCP.TopAbs import TopAbs_FORWARD, TopAbs_WIRE
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face, TopoDS_Wire
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.errors import KernelError
from moldgen.kernel.polygon import contains, signed_area
from moldgen.kernel.topology import is_reversed, parts_of, walk

SAMPLES = 24
"""Points of one edge that stand for it where loops are told apart (our choice)."""


@dataclass(frozen=True)
class Use:
    """One use of an edge in the outline of a face that is taken forward (its material to the left).

    number : place of the edge in the index of all edges of the solid; curve : its curve in surface parameters
    """

    edge: TopoDS_Edge
    number: int
    curve: Any
    low: float
    high: float

    @property
    def backwards(self) -> bool:
        """True when the outline runs against the edge's own direction."""
        return is_reversed(self.edge)

    def at(self, parameter: float) -> np.ndarray:
        """Return the place in surface parameters, (2,)."""
        return np.array(self.curve.Value(float(parameter)).Coord())

    def samples(self, count: int = SAMPLES) -> np.ndarray:
        """Return places along the edge in running order, (count, 2)."""
        parameters = np.linspace(self.low, self.high, count)
        return np.array([self.at(t) for t in (parameters[::-1] if self.backwards else parameters)])


class Piece(NamedTuple):
    """A directed edge of a cut-up face, from corner to corner, with places along it in running order, (k, 2)."""

    edge: TopoDS_Edge
    start: int
    end: int
    places: np.ndarray


def outline(face: TopoDS_Face, index: TopTools_IndexedMapOfShape) -> list[list[Use]]:
    """Return the loops of a face, each in running order.

    Raises
    ------
    KernelError : the kernel cannot follow a wire, or an edge has no curve on the face
    """
    flat = TopoDS.Face_s(face.Oriented(TopAbs_FORWARD))
    loops = []
    for wire in walk(flat, TopAbs_WIRE):
        explorer, loop = BRepTools_WireExplorer(TopoDS.Wire_s(wire), flat), []
        while explorer.More():
            edge = explorer.Current()
            curve = BRep_Tool.CurveOnSurface_s(edge, flat, 0.0, 0.0)
            if curve is None:
                raise KernelError("an edge has no curve on its face")
            low, high = BRep_Tool.Range_s(edge, flat)
            loop.append(Use(edge, index.FindIndex(edge) - 1, curve, low, high))
            explorer.Next()
        if len(loop) != len(parts_of(wire)):
            raise KernelError("a wire of a face cannot be followed")
        loops.append(loop)
    return loops


def cut_up(pieces: Sequence[Sequence[Piece]], chords: Sequence[Piece]) -> list[list[list[Piece]]]:
    """Return the loops of the faces into which chords cut a face: for each face its outer loop first.

    pieces : the outline, loop by loop; chords : curves across it that meet each other and the outline only in corners.
    Corners are numbered over all loops; a ring starts and ends in a corner of its own.

    Raises
    ------
    KernelError : the loops do not nest, so the chords were not such
    """
    onward = _onward(pieces, chords)
    left = dict.fromkeys(sorted(onward))
    cycles = []
    while left:
        start = next(iter(left))
        cycle, at = [], start
        while at in left:
            del left[at]
            cycle.append(at)
            at = onward[at]
        if at != start:
            raise KernelError("the chords across a face do not part it")
        cycles.append(cycle)
    flat = [p for loop in pieces for p in loop]
    forth = flat + list(chords)
    back = [Piece(TopoDS.Edge_s(c.edge.Reversed()), c.end, c.start, c.places[::-1]) for c in chords]
    return _nested([[(forth + back)[k] for k in cycle] for cycle in cycles])


def _onward(pieces: Sequence[Sequence[Piece]], chords: Sequence[Piece]) -> dict[int, int]:
    """Return for each directed edge the next one around the face to its left.

    Numbers: the outline, then the chords forth, then the chords back.
    """
    size = sum(len(loop) for loop in pieces)
    onward: dict[int, int] = {}
    comes: dict[int, int] = {}
    first = 0
    for loop in pieces:
        for k in range(len(loop)):
            onward[first + k] = first + (k + 1) % len(loop)
            comes[loop[k].end] = first + k
        first += len(loop)
    flat = [p for loop in pieces for p in loop]
    # at each corner: chords that leave it (their number on the way out, on the way in, and their first places)
    fans: dict[int, list[tuple[int, int, np.ndarray]]] = {}
    for k, chord in enumerate(chords):
        forth, back = size + k, size + len(chords) + k
        fans.setdefault(chord.start, []).append((forth, back, chord.places))
        fans.setdefault(chord.end, []).append((back, forth, chord.places[::-1]))
    for corner, fan in fans.items():
        if corner not in comes:  # a ring alone: its two sides run round for ever
            onward.update({out: out for out, _, _ in fan})
            continue
        into = comes[corner]
        last = onward[into]
        behind = _heading(flat[into].places[::-1])
        for out, back, _ in sorted(fan, key=lambda f: (behind - _heading(f[2])) % (2.0 * math.pi)):
            onward[into] = out
            into = back
        onward[into] = last
    return onward


def _heading(places: np.ndarray) -> float:
    way = places[1] - places[0]
    return math.atan2(way[1], way[0])


def _nested(cycles: list[list[Piece]]) -> list[list[list[Piece]]]:
    """Sort loops into faces: those that run counter-clockwise are outer loops, the others holes of the smallest one
    around them.
    """
    polygons = [np.vstack([p.places[:-1] for p in cycle]) for cycle in cycles]
    areas = [signed_area(polygon) for polygon in polygons]
    outer = sorted((k for k, area in enumerate(areas) if area > 0.0), key=lambda k: areas[k])
    faces = {k: [cycles[k]] for k in outer}
    for k, area in enumerate(areas):
        if area > 0.0:
            continue
        around = [o for o in outer if areas[o] > -area and _holds(polygons[o], polygons[k])]
        if not around:
            raise KernelError("a loop of a cut-up face lies in none of its parts")
        faces[around[0]].append(cycles[k])
    return [faces[k] for k in sorted(faces)]


def _holds(polygon: np.ndarray, places: np.ndarray) -> bool:
    """True when most of the places lie inside the polygon (loops may touch in a place)."""
    return bool(contains(polygon, places).mean() > 0.5)


def face_of_loops(face: TopoDS_Face, loops: Sequence[Sequence[Piece]]) -> TopoDS_Face:
    """Return a face on the surface of `face` with the given loops as its wires, turned like `face`."""
    builder = BRep_Builder()
    new = TopoDS.Face_s(face.Oriented(TopAbs_FORWARD).EmptyCopied())
    builder.NaturalRestriction(new, False)
    for loop in loops:
        wire = TopoDS_Wire()
        builder.MakeWire(wire)
        for piece in loop:
            builder.Add(wire, piece.edge)
        wire.Closed(True)
        builder.Add(new, wire)
    return TopoDS.Face_s(new.Oriented(face.Orientation()))
