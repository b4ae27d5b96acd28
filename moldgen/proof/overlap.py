"""How deep one body reaches into another, beyond what their meshes can feign.

The kernel meshes some tori and cones with several times the sag that was asked for (measured: 0.08 instead of 0.02
mm). Where two bodies share such a face but trim it differently, their meshes cut into each other by that sag. So where
an overlap is over its limit, what the two meshes sag right there beyond what was asked for is taken off, up to
`MOST_OFF`; if that brings it under the limit, it is told with what was taken off.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.meshsolid import MeshSolid, thickness
from moldgen.proof.bodies import ProofBody
from moldgen.tolerances import EROSION, OPEN_OVERLAP, PROOF_DEFLECTION, SMALL_VOLUME

MOST_OFF = 0.1
"""mm: more is never taken off an overlap, however coarse the meshes are there."""

SAG_ASKED = 1.15 * PROOF_DEFLECTION
"""mm: the kernel rounds to whole steps, and may sag a little more than asked for without meaning anything by it."""

NUMBERS = 5
"""How many numbers tell a depth, see `Depth.numbers`."""

AROUND = 0.2
"""mm: triangles this close to an overlap count as its place."""


class Depth(NamedTuple):
    """Depth [mm] of the deepest overlap, its place [mm], and what was taken off for the sag of the meshes [mm]."""

    depth_mm: float
    at: tuple[float, float, float]
    off_mm: float

    @classmethod
    def of(cls, numbers: Sequence[float]) -> Depth:
        """Return a depth from its `numbers`."""
        depth, x, y, z, off = numbers
        return cls(depth, (x, y, z), off)

    @property
    def numbers(self) -> tuple[float, ...]:
        """Depth, place and what was taken off, (5,) [mm]."""
        return (self.depth_mm, *self.at, self.off_mm)

    @property
    def told(self) -> str:
        """The place, and what was taken off, in words."""
        x, y, z = self.at
        off = f", {self.off_mm:.3f} mm off for the sag of the meshes there" if self.off_mm else ""
        return f"at {x:.2f}, {y:.2f}, {z:.2f}{off}"


NONE = Depth(0.0, (0.0, 0.0, 0.0), 0.0)
"""No overlap."""


def deepest(one: MeshSolid, mesh: SurfaceMesh, other: ProofBody, shift: np.ndarray | float = 0.0) -> Depth:
    """Return the deepest overlap of a solid (whose surface is `mesh`, or was swept from it) with a body.

    shift : how far the solid was moved from where `mesh` is, (3,) [mm]
    """
    worst = NONE
    common = one ^ other.thin
    if common.num_tri() == 0:
        return worst
    for piece in common.decompose():
        if piece.volume() <= SMALL_VOLUME:
            continue
        depth, off = thickness(piece) + EROSION, 0.0
        if depth >= OPEN_OVERLAP:
            bounds = np.asarray(piece.bounding_box())
            back = bounds - np.tile(shift * np.ones(3), 2)
            off = min(MOST_OFF, _excess_near(mesh, back) + _excess_near(other.body.mesh, bounds))
            if depth - off >= OPEN_OVERLAP:
                off = 0.0  # an overlap all the same: told in full
        if depth - off > worst.depth_mm:
            x, y, z = (float(v) for v in piece.to_mesh64().vert_properties[0][:3])
            worst = Depth(depth - off, (x, y, z), off)
    return worst


def _excess_near(mesh: SurfaceMesh, bounds: np.ndarray) -> float:
    """Return by how much the mesh sags more than was asked for, in and around a box."""
    low, high = mesh.corners.min(axis=1), mesh.corners.max(axis=1)
    near = (low <= bounds[3:] + AROUND).all(axis=1) & (high >= bounds[:3] - AROUND).all(axis=1)
    return max(0.0, float(mesh.sag[near].max(initial=0.0)) - SAG_ASKED)
