"""The outside of a block: four walls and a lid, sharing edges with the parting surface inside it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face, TopoDS_Vertex

from moldgen.kernel.build import line_edge, plane_face, plane_through, vertex_at, wire_of
from moldgen.kernel.topology import vertex_point


@dataclass(frozen=True)
class Rim:
    """Where the parting surface meets the outside of the block, counter-clockwise from the south-west corner.

    corners : the four corners; sides : the edges from each corner to the next, which may rise and fall
    """

    corners: tuple[TopoDS_Vertex, ...]
    sides: tuple[tuple[TopoDS_Edge, ...], ...]

    @property
    def edges(self) -> tuple[TopoDS_Edge, ...]:
        """All edges, in order."""
        return tuple(e for side in self.sides for e in side)


def rectangle_rim(low: np.ndarray, high: np.ndarray, level: float) -> Rim:
    """Return the rim of the rectangle low..high (x, y) at z = level [mm]."""
    places = [(low[0], low[1]), (high[0], low[1]), (high[0], high[1]), (low[0], high[1])]
    corners = [vertex_at((x, y, level)) for x, y in places]
    return Rim(tuple(corners), tuple((line_edge(corners[i], corners[(i + 1) % 4]),) for i in range(4)))


def block_outside(rim: Rim, lid: float) -> list[TopoDS_Face]:
    """Return the four walls from the rim to z = lid and the lid itself."""
    places = [vertex_point(v) for v in rim.corners]
    top = [vertex_at((p[0], p[1], lid)) for p in places]
    lid_edges = [line_edge(top[i], top[(i + 1) % 4]) for i in range(4)]
    posts = [line_edge(rim.corners[i], top[i]) for i in range(4)]
    faces = []
    for i in range(4):
        along = places[(i + 1) % 4] - places[i]
        wall = plane_through(places[i], (along[1], -along[0], 0.0))
        faces.append(plane_face(wall, wire_of([*rim.sides[i], posts[(i + 1) % 4], lid_edges[i], posts[i]])))
    faces.append(plane_face(plane_through((0.0, 0.0, lid), (0.0, 0.0, 1.0)), wire_of(lid_edges)))
    return faces
