"""Where along the pull the halves should meet: level edges on the outline of the part's shadow."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import MeshSolid
from moldgen.release.kinds import FaceKinds, Kind

ON_OUTLINE = 0.06
"""mm: an edge this close to the outline of the shadow lies on it (the outline is a polygon of the mesh)."""

MOST_LEVELS = 8


@dataclass(frozen=True)
class LevelSearch:
    """Heights at which the part could be parted, best first, and which edges lie on the outline of its shadow.

    levels : heights [mm], by falling length of level outline edges
    lengths : length of those edges [mm], an edge between an upper and a lower face counted twice
    on_outline : (m,) bool
    """

    levels: tuple[float, ...]
    lengths: tuple[float, ...]
    on_outline: np.ndarray


def find_levels(body: Body, kinds: FaceKinds, part: MeshSolid) -> LevelSearch:
    """Return the candidate parting levels of a body whose pull is +z.

    Without a level outline edge the one candidate is the middle of the part.
    """
    on_outline = edges_on_outline(body, part)
    lengths: dict[float, float] = {}
    exact: dict[float, tuple[float, float]] = {}
    points = body.edge_points
    for edge, (a, b) in enumerate(body.edge_faces):
        if not on_outline[edge] or np.ptp(points[edge, :, 2]) > 1e-5:
            continue
        pair = {int(kinds.kind[a]), int(kinds.kind[b])}
        weight = 2 if pair == {Kind.UPPER, Kind.LOWER} else 1 if Kind.VERTICAL in pair and len(pair) == 2 else 0
        if weight:
            height, length = round(float(points[edge, 4, 2]), 3), float(body.edge_lengths[edge])
            lengths[height] = lengths.get(height, 0.0) + weight * length
            # heights are gathered rounded, but the plane has to lie exactly on the edges that it is to hold
            exact[height] = max(exact.get(height, (0.0, 0.0)), (length, float(points[edge, 4, 2])))
    best = sorted(lengths, key=lambda z: (-lengths[z], z))[:MOST_LEVELS]
    if not best:
        middle = float(body.box[0][2] + body.box[1][2]) / 2
        return LevelSearch((middle,), (0.0,), on_outline)
    return LevelSearch(tuple(exact[z][1] for z in best), tuple(lengths[z] for z in best), on_outline)


def edges_on_outline(body: Body, part: MeshSolid) -> np.ndarray:
    """Return which edges lie on the outline of the part's shadow along z, (m,) bool."""
    segments = np.vstack([np.column_stack([p, np.roll(p, -1, axis=0)]) for p in part.project().to_polygons()])
    start, along = segments[:, :2], segments[:, 2:] - segments[:, :2]
    length = np.maximum((along * along).sum(axis=1), 1e-18)
    found = np.zeros(len(body.edges), dtype=bool)
    for edge, points in enumerate(body.edge_points):
        for k in (1, 4, 7):
            offset = points[k, :2] - start
            t = np.clip((offset * along).sum(axis=1) / length, 0.0, 1.0)
            if (((t[:, None] * along - offset) ** 2).sum(axis=1)).min() >= ON_OUTLINE**2:
                break
        else:
            found[edge] = True
    return found
