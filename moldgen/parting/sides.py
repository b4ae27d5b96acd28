"""Which half forms each face: a minimum cut over the graph of faces."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import breadth_first_order, maximum_flow

from moldgen.kernel.body import Body
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.tolerances import ISLAND_OVERHANG

HEIGHT_WEIGHT = 20.0
"""An edge costs its length plus this many times the area between it and the parting level, over the diagonal."""

NEVER = 10**8
"""Capacity of a tie that must not be cut."""

CONTACT_SHARE = 0.03
"""A vertical face with less of its area facing material in a direction counts as open that way (rays are samples)."""

MOSTLY = 3.0
"""A vertical face blocked both ways follows the direction that is blocked this many times more."""

SMALLEST_FACE = 1e-3
"""mm^2: smaller vertical faces follow their neighbours."""


@dataclass(frozen=True)
class Sides:
    """The half that forms each face.

    cavity : (f,) bool, True where the cavity half forms the face, False where the core half does
    cost : value of the minimum cut, comparable between levels of the same body
    torn : vertical faces that have material both above and below them, so that neither half can form them whole
    """

    cavity: np.ndarray
    cost: int
    torn: tuple[int, ...]


def assign_sides(
    body: Body, kinds: FaceKinds, contact: np.ndarray, level: float, costly_faces: frozenset[int] = frozenset()
) -> Sides:
    """Return the half of each face so that the line between the halves is short and near z = level [mm].

    contact : (f, 2) share of each vertical face with material below it and above it
    costly_faces : faces along which the parting line should not run
    """
    tied, torn = _ties(body, kinds, contact)
    capacity = _edge_costs(body, level, costly_faces)
    count = len(body.faces)
    a, b = body.edge_faces[:, 0], body.edge_faces[:, 1]
    to_cavity, to_core = np.flatnonzero(tied == 1), np.flatnonzero(tied == 0)
    source, sink = count, count + 1
    rows = np.concatenate([a, b, np.full(len(to_cavity), source), to_core])
    columns = np.concatenate([b, a, to_cavity, np.full(len(to_core), sink)])
    values = np.concatenate([capacity, capacity, np.full(len(to_cavity) + len(to_core), NEVER)])
    graph = csr_matrix((values.astype(np.int32), (rows, columns)), shape=(count + 2, count + 2))
    graph.sum_duplicates()
    flow = maximum_flow(graph, source, sink)
    residual = graph - flow.flow
    residual.data[residual.data < 0] = 0
    residual.eliminate_zeros()
    cavity = np.zeros(count + 2, dtype=bool)
    cavity[breadth_first_order(residual, source, return_predecessors=False)] = True
    return Sides(_join_islands(body, kinds, cavity[:count]), int(flow.flow_value), torn)


def _ties(body: Body, kinds: FaceKinds, contact: np.ndarray) -> tuple[np.ndarray, tuple[int, ...]]:
    """Return 1 (cavity), 0 (core) or -1 (free) for each face, and the faces that neither half can form whole."""
    upper, lower = kinds.overhang[:, 0], kinds.overhang[:, 1]
    tied = np.full(len(body.faces), -1)
    straddling = kinds.kind == Kind.STRADDLING
    tied[(kinds.kind == Kind.UPPER) | (straddling & (upper >= lower))] = 1
    tied[(kinds.kind == Kind.LOWER) | (straddling & (upper < lower))] = 0
    vertical = (kinds.kind == Kind.VERTICAL) & (body.face_areas > SMALLEST_FACE)
    below, above = contact[:, 0], contact[:, 1]
    rests, covered = vertical & (below > CONTACT_SHARE), vertical & (above > CONTACT_SHARE)
    torn = rests & covered
    tied[(rests & ~covered) | (torn & (below > MOSTLY * above))] = 1
    tied[(covered & ~rests) | (torn & (above > MOSTLY * below))] = 0
    return tied, tuple(int(f) for f in np.flatnonzero(torn))


def _edge_costs(body: Body, level: float, costly_faces: frozenset[int]) -> np.ndarray:
    points = body.edge_points
    run = np.linalg.norm(np.diff(points[:, :, :2], axis=1), axis=2)
    height = np.abs(0.5 * (points[:, 1:, 2] + points[:, :-1, 2]) - level)
    cost = body.edge_lengths + HEIGHT_WEIGHT * (run * height).sum(axis=1) / body.diagonal
    if costly_faces:
        cost[np.isin(body.edge_faces, sorted(costly_faces)).any(axis=1)] *= 10.0
    return np.asarray((1e6 * cost / body.diagonal / 20).astype(np.int64).clip(max=NEVER // 10) + 1)


def _join_islands(body: Body, kinds: FaceKinds, cavity: np.ndarray) -> np.ndarray:
    """Turn islands of faces whose overhang is noise to the side of their surroundings, until none is left."""
    cavity = cavity.copy()
    for _ in range(3):
        changed = False
        for island in _islands(body, cavity):
            side = cavity[island[0]]
            against = kinds.overhang[island, 0 if side else 1]
            if (against <= ISLAND_OVERHANG).all() and len(island) < int((cavity == side).sum()):
                cavity[island] = not side
                changed = True
        if not changed:
            break
    return cavity


def _islands(body: Body, cavity: np.ndarray) -> list[list[int]]:
    """Return the connected groups of faces of one side."""
    seen = np.zeros(len(cavity), dtype=bool)
    groups = []
    for seed in range(len(cavity)):
        if seen[seed]:
            continue
        seen[seed] = True
        group, waiting = [seed], [seed]
        while waiting:
            at = waiting.pop()
            for edge in body.edges_at_face[at]:
                a, b = body.edge_faces[edge]
                other = int(b if a == at else a)
                if not seen[other] and cavity[other] == cavity[at]:
                    seen[other] = True
                    group.append(other)
                    waiting.append(other)
        groups.append(sorted(group))
    return groups
