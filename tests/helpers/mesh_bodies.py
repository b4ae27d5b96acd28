"""Meshes of simple bodies from numpy alone, for the tests of the pictures."""

from __future__ import annotations

import numpy as np

from moldgen.output.scene import SceneBody


def box(name: str, role: str, low, high, offset=(0.0, 0.0, 0.0)) -> SceneBody:
    """A box, one face id a side, its twelve edges as feature edges."""
    low, high = np.array(low, float), np.array(high, float)
    corners = np.array([[x, y, z] for x in (0, 1) for y in (0, 1) for z in (0, 1)])
    vertices = low + corners * (high - low)
    quads = [(0, 1, 3, 2), (4, 6, 7, 5), (0, 4, 5, 1), (2, 3, 7, 6), (0, 2, 6, 4), (1, 5, 7, 3)]
    triangles = [(a, b, c) for a, b, c, _ in quads] + [(a, c, d) for a, _, c, d in quads]
    edges = [vertices[[i, j]] for i in range(8) for j in range(i) if (corners[i] != corners[j]).sum() == 1]
    return SceneBody(name, role, vertices, np.array(triangles), tuple(edges), np.array(list(range(6)) * 2), offset)


def cylinder(name: str, role: str, centre, radius: float, span, offset=(0.0, 0.0, 0.0)) -> SceneBody:
    """An upright cylinder: wall 0, bottom 1, top 2."""
    n = 48
    turn = np.arange(n) / n * 2.0 * np.pi
    ring = np.stack([centre[0] + radius * np.cos(turn), centre[1] + radius * np.sin(turn)], axis=1)
    rims = [np.column_stack([ring, np.full(n, z)]) for z in span]
    caps = np.array([[*centre, z] for z in span])
    i, j = np.arange(n), (np.arange(n) + 1) % n
    wall = np.concatenate([np.stack([i, j, j + n], 1), np.stack([i, j + n, i + n], 1)])
    bottom, top = np.stack([j, i, 0 * i + 2 * n], 1), np.stack([i + n, j + n, 0 * i + 2 * n + 1], 1)
    faces = np.repeat([0, 1, 2], [2 * n, n, n])
    edges = tuple(np.concatenate([rim, rim[:1]]) for rim in rims)
    return SceneBody(
        name, role, np.concatenate([*rims, caps]), np.concatenate([wall, bottom, top]), edges, faces, offset
    )
