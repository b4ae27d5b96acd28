"""Splitting vertical faces so that each half can form its own share of them."""

from __future__ import annotations

from typing import Any

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.level_split import level_curves, level_points, upright_lines
from moldgen.kernel.runoff import extreme_points
from moldgen.kernel.split import split_faces
from moldgen.parting.level import LevelSearch
from moldgen.release.kinds import FaceKinds, Kind

ABOVE_BELOW = 1e-3
"""mm: a face must reach this far to both sides of the level to be split there."""


def split_at_level(
    body: Body, kinds: FaceKinds, contact: np.ndarray, search: LevelSearch, level: float, *, all_faces: bool
) -> Body:
    """Return the body with its vertical faces split at z = level.

    First only the faces on the outline of the shadow are split, so that the outer line can run level across them. With
    `all_faces` every vertical face is, and those partly blocked both ways also along vertical lines through their
    vertices.
    """
    heights = body.face_heights
    at_outline = set(body.edge_faces[search.on_outline].ravel().tolist())
    vertical = kinds.numbers(Kind.VERTICAL).tolist()
    crossing = [
        f
        for f in vertical
        if (all_faces or f in at_outline)
        and heights[f, 0] < level - ABOVE_BELOW
        and heights[f, 1] > level + ABOVE_BELOW
    ]
    tools = level_curves([body.faces[f] for f in crossing], level) if crossing else []
    touched = list(crossing)
    if all_faces:
        for f in vertical:
            partly = (contact[f] > 0.02) & (contact[f] < 0.98)
            if body.face_areas[f] > 1e-2 and partly.any():
                lines = upright_lines(body.faces[f], *heights[f])
                tools += lines
                touched += [f] if lines else []
    return split_faces(body, sorted(set(touched)), tools) if tools else body


def split_at_extremes(body: Body, loop: list[Any]) -> Body:
    """Return the body with a vertex at each diagonal extreme of a loop, where its run-off turns a corner."""
    tools, touched = [], set()
    for number, vertex in extreme_points(loop):
        tools.append(vertex)
        touched |= {int(f) for f in body.edge_faces[body.edge_index.FindIndex(loop[number]) - 1]}
    return split_faces(body, sorted(touched), tools) if tools else body


def split_edges_at_level(body: Body, edges: list[int], level: float) -> Body:
    """Return the body with a vertex wherever one of the given edges passes through z = level."""
    tools, touched = [], set()
    for number in edges:
        points = level_points(body.edges[number], level)
        if points:
            tools += points
            touched |= {int(f) for f in body.edge_faces[number]}
    return split_faces(body, sorted(touched), tools) if tools else body
