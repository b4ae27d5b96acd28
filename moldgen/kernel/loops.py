"""The edges between two groups of faces, directed and chained into closed loops."""

from __future__ import annotations

import numpy as np
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Edge, TopoDS_Face
from OCP.TopTools import TopTools_IndexedMapOfShape

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.topology import walk

DirectedEdge = tuple[TopoDS_Edge, int, int]
"""An edge as one of its faces uses it, with the numbers of its first and last vertex."""


def boundary_loops(body: Body, inside: np.ndarray) -> list[list[TopoDS_Edge]]:
    """Return the simple closed loops of edges between faces where `inside` (f,) is true and those where it is not.

    Edges are directed as the inside faces use them. A loop that touches itself at a vertex is returned as two.

    Raises
    ------
    KernelError : a chain of edges does not close
    """
    edges = _directed_edges(body, inside)
    leaving: dict[int, list[int]] = {}
    for number, (_, start, _) in enumerate(edges):
        leaving.setdefault(start, []).append(number)
    used = [False] * len(edges)
    loops: list[list[TopoDS_Edge]] = []
    for first in range(len(edges)):
        if not used[first]:
            loops += _simple_loops(first, edges, leaving, used)
    return loops


def _directed_edges(body: Body, inside: np.ndarray) -> list[DirectedEdge]:
    vertices = TopTools_IndexedMapOfShape()
    edges = []
    for number, (a, b) in enumerate(body.edge_faces):
        if inside[a] == inside[b]:
            continue
        edge = _as_used(body.faces[a if inside[a] else b], body.edges[number])
        start = vertices.Add(TopExp.FirstVertex_s(edge, True))
        edges.append((edge, start, vertices.Add(TopExp.LastVertex_s(edge, True))))
    return edges


def _as_used(face: TopoDS_Face, edge: TopoDS_Edge) -> TopoDS_Edge:
    for occurrence in walk(face, TopAbs_EDGE):
        if occurrence.IsSame(edge):
            return TopoDS.Edge_s(occurrence)
    raise KernelError("an edge is missing from its own face")


def _simple_loops(
    first: int, edges: list[DirectedEdge], leaving: dict[int, list[int]], used: list[bool]
) -> list[list[TopoDS_Edge]]:
    """Follow edges from `first`; each time the path meets itself, cut off the loop it closed."""
    loops = []
    path: list[int] = []
    place = {edges[first][1]: 0}
    at = first
    while True:
        used[at] = True
        path.append(at)
        end = edges[at][2]
        if end in place:
            loop = path[place[end] :]
            loops.append([edges[k][0] for k in loop])
            del path[place[end] :]
            for k in loop:
                if edges[k][1] != end:
                    place.pop(edges[k][1], None)
            if not path:
                return loops
        else:
            place[end] = len(path)
        following = [k for k in leaving.get(end, []) if not used[k]]
        if not following:
            raise KernelError("the parting line does not close")
        at = following[0]
