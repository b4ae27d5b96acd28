"""How far the melt must flow from a place to every other place of the part: shortest ways inside the plastic."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.sparse import coo_matrix, csr_matrix
from scipy.sparse.csgraph import connected_components, dijkstra
from scipy.spatial import cKDTree

from moldgen.layout.view import PartView

FEWEST_NODES, MOST_NODES = 500, 1200
NEIGHBOURS: Final = 18
"""Nearest nodes that each node may be linked with."""

FAR_LINKS: Final = 12
"""Nodes anywhere that each node may be linked with besides: straight ways over flat regions, which a chain of near
nodes would make some 10 % too long."""

DETOUR: Final = 1.5
"""Factor on straight links that join what has no free link."""


@dataclass(frozen=True)
class FlowPaths:
    """Nodes halfway through the wall, (n, 3) [mm], and links that stay inside the plastic.

    surface : (n, 3) the points on the surface above the nodes; triangle : (n,) below them; wall : (n,) [mm]
    """

    nodes: np.ndarray
    surface: np.ndarray
    triangle: np.ndarray
    wall: np.ndarray
    links: csr_matrix

    def longest(self, places: np.ndarray, through: int = 4) -> tuple[np.ndarray, np.ndarray]:
        """Return for each place (k, 3) the length of the longest of all shortest ways [mm] and the node at its end.

        through : nodes beside the place by which the melt may set out; more are slower and come nearer to the truth
        """
        near, node = cKDTree(self.nodes).query(places, k=through)
        near, node = near.reshape(len(places), -1), node.reshape(len(places), -1)
        known, row = np.unique(node, return_inverse=True)
        ways = dijkstra(self.links, directed=False, indices=known)
        ways[~np.isfinite(ways)] = 0.0
        best = (near[:, :, None] + ways[row.reshape(node.shape)]).min(axis=1)
        return best.max(axis=1), best.argmax(axis=1)


def find_flow_paths(view: PartView) -> FlowPaths:
    """Return the network of ways inside the part. The same part gives the same network."""
    areas = view.body.triangle_areas
    count = int(np.clip(areas.sum() / (4.0 * view.wall**2), FEWEST_NODES, MOST_NODES))
    surface, triangle = _spread(view, count)
    normal = view.normals[triangle]
    wall = view.thickness(surface, normal)
    nodes = surface - normal * (0.5 * np.minimum(wall, 2.0 * view.wall))[:, None]
    return FlowPaths(nodes, surface, triangle, wall, _links(view, nodes))


def _spread(view: PartView, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Return points spread evenly over the surface, (n, 3), and their triangles."""
    total = np.cumsum(view.body.triangle_areas)
    number = np.arange(count)
    triangle = np.minimum(np.searchsorted(total, (number + 0.5) / count * total[-1]), len(total) - 1)
    # additive recurrence of the plastic number: even in every triangle, and no random numbers
    u, v = (0.5 + 0.7548776662466927 * number) % 1.0, (0.5 + 0.5698402909980532 * number) % 1.0
    fold = u + v > 1.0
    u, v = np.where(fold, 1.0 - u, u), np.where(fold, 1.0 - v, v)
    p = view.mesh.corners[triangle]
    return p[:, 0] + u[:, None] * (p[:, 1] - p[:, 0]) + v[:, None] * (p[:, 2] - p[:, 0]), triangle


def _links(view: PartView, nodes: np.ndarray) -> csr_matrix:
    count = len(nodes)
    _, other = cKDTree(nodes).query(nodes, k=min(NEIGHBOURS + 1, count))
    strides = np.unique(np.round(count * (0.6180339887498949 * np.arange(1, FAR_LINKS + 1) % 1.0)).astype(int))
    far = (np.arange(count)[:, None] + strides) % count
    other = np.column_stack([other, far])
    one = np.repeat(np.arange(count), other.shape[1])
    pairs = np.unique(np.sort(np.column_stack([one, other.ravel()]), axis=1), axis=0)
    pairs = pairs[pairs[:, 0] != pairs[:, 1]]
    free = view.probe.free(nodes[pairs[:, 0]], nodes[pairs[:, 1]])
    pairs = pairs[free]
    length = np.maximum(np.linalg.norm(nodes[pairs[:, 0]] - nodes[pairs[:, 1]], axis=1), 1e-6)
    graph = coo_matrix((length, (pairs[:, 0], pairs[:, 1])), shape=(count, count)).tocsr()
    return _joined(graph, nodes)


def _joined(graph: csr_matrix, nodes: np.ndarray) -> csr_matrix:
    """Return the network with each separate piece linked to the largest one where they are nearest."""
    pieces, label = connected_components(graph, directed=False)
    if pieces == 1:
        return graph
    main = int(np.bincount(label).argmax())
    inside = np.flatnonzero(label == main)
    tree = cKDTree(nodes[inside])
    gap, place = tree.query(nodes)
    rows, columns, lengths = [], [], []
    for piece in range(pieces):
        if piece == main:
            continue
        own = np.flatnonzero(label == piece)
        best = own[np.argmin(gap[own])]
        rows.append(best)
        columns.append(inside[place[best]])
        lengths.append(max(DETOUR * float(gap[best]), 1e-6))
    extra = coo_matrix((lengths, (rows, columns)), shape=graph.shape).tocsr()
    return graph + extra
