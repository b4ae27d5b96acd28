"""Steel of a front that the plastic parts from its outer end: the halves carry it, so it does not hold the front back.

A slide over a groove round a tube reaches through the tube's wall into its bore. What it has there is cut off from it
by the wall, and goes to the core, which fills the rest of the bore anyway.
"""

from __future__ import annotations

import numpy as np

from moldgen.kernel.mesh_prism import Region, bounds, box_of, prism, rectangle, region, triangles_region
from moldgen.kernel.meshsolid import MeshSolid, piece_mesh, thick_pieces
from moldgen.kernel.tracer import Tracer
from moldgen.release.side_choice import sample
from moldgen.release.side_space import LOOKS_BACK, View, clipped_above
from moldgen.tolerances import NOISE_THICKNESS

REACHED = 0.1
"""A piece of steel that ends this near [mm] to the far end of its front is held there."""

GRAZE = 0.02
"""Share of the rays from a piece that may meet plastic when it leaves along the pull: those at its rims."""


def steel_within(view: View, shape: Region, near: float) -> tuple[list[MeshSolid], list[MeshSolid]]:
    """Return the pieces of a front's steel that hang on its far end, and those that the plastic parts from it."""
    body = prism(shape, near, view.far)
    held: list[MeshSolid] = []
    loose: list[MeshSolid] = []
    for piece in thick_pieces(body - view.part):
        (held if float(box_of(piece)[1][2]) > view.far - REACHED else loose).append(piece)
    return held, loose


def held_back(view: View, need: Region, near: float, window: float) -> Region:
    """Return where, up to a window around a need, plastic stands before steel that hangs on a front's far end.

    Steel of an outline within the window lies within that of the window, so what is free of this region can leave.
    """
    low, high = bounds(need)
    low, high = low - window, high + window
    held, _ = steel_within(view, rectangle(low, high), near)
    ahead: list[np.ndarray] = []
    for piece in held:
        mesh = piece_mesh(piece)
        corners = mesh.vertices[mesh.triangles]
        facet = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        length = np.maximum(np.linalg.norm(facet, axis=1), 1e-300)
        met = (facet[:, 2] > LOOKS_BACK * length) & (corners[:, :, 2].max(axis=1) < view.far - REACHED)
        ahead += clipped_above(corners[met], near + NOISE_THICKNESS)
    return triangles_region(ahead) if ahead else region([])


def leaves_with_halves(tracer: Tracer, pieces: list[MeshSolid]) -> bool:
    """Return whether each piece (mold frame) can leave along the pull, up or down, as steel of a half does; by rays."""
    for piece in pieces:
        points = sample(piece)
        ways = ((0.0, 0.0, 1.0), (0.0, 0.0, -1.0))
        if min(float(tracer.blocked(points, way).mean()) for way in ways) > GRAZE:
            return False
    return True
