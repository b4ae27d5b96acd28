"""What a slide meets of the part: how far the part reaches in a window, and whether steel is clear when it leaves."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import manifold3d
import numpy as np

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.kernel.meshsolid import MeshSolid, eroded, mesh_solid, overlap_depth, thick_pieces
from moldgen.tolerances import OPEN_OVERLAP

STEPS = (0.05, 0.2, 0.5, 1.0, 2.0)
"""mm: first places on its way at which steel is held against the part; then eighths of the way. The motion proof, which
sweeps, decides."""

CORNER = 1e-6
"""mm: corners of an outline closer than this are one."""


@dataclass(frozen=True)
class Window:
    """A rectangle across an axis: u and z from low to high, in the frame `across(axis)` [mm]."""

    left: float
    right: float
    low: float
    high: float

    @property
    def outline(self) -> tuple[np.ndarray, ...]:
        """The rectangle as an outline."""
        corners = [(self.left, self.low), (self.right, self.low), (self.right, self.high), (self.left, self.high)]
        return (np.array(corners),)


def extent_in(mesh: SurfaceMesh, frame: np.ndarray, window: Window, high: float = np.inf) -> np.ndarray | None:
    """Return all corners of the part inside a window, in the frame (k, 3) [mm]; None when there is no part.

    high : coordinate along the frame's z up to which the part is looked at
    """
    own = mesh.vertices @ frame.T
    far = min(float(own[:, 2].max()) + 1.0, high)
    near = float(own[:, 2].min()) - 1.0
    if far <= near:
        return None
    inside = mesh_solid(mesh) ^ outline_mesh(window.outline, frame, near, far)
    if inside.num_tri() == 0:
        return None
    return np.asarray(np.asarray(inside.to_mesh64().vert_properties)[:, :3] @ frame.T)


def outline_mesh(outline: Sequence[np.ndarray], frame: np.ndarray, near: float, far: float) -> MeshSolid:
    """Return a straight prism as a mesh solid; rows of `frame` are x, y, z of its own frame."""
    section = manifold3d.CrossSection([np.asarray(p, float) for p in outline], manifold3d.FillRule.Positive)
    placed = np.column_stack([frame.T, frame[2] * near])
    return section.extrude(far - near).transform(placed)


def lowered(outline: Sequence[np.ndarray], level: float) -> tuple[np.ndarray, ...]:
    """Return an outline together with everything between it and a height under it; y of the outline points up."""
    polygons = [np.asarray(p, float) for p in outline]
    section = manifold3d.CrossSection(polygons, manifold3d.FillRule.Positive)
    shadows = [section]
    for polygon in section.to_polygons():
        for start, end in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
            if max(start[1], end[1]) <= level + CORNER or abs(start[0] - end[0]) < CORNER:
                continue
            foot = min(level, start[1], end[1])
            quad = np.array([[start[0], foot], [end[0], foot], end, start])
            shadows.append(manifold3d.CrossSection([quad if end[0] > start[0] else quad[::-1]]))
    joined = manifold3d.CrossSection.batch_boolean(shadows, manifold3d.OpType.Add).simplify(CORNER)
    return tuple(np.asarray(p, float) for p in joined.to_polygons())


def outline_gain(outline: Sequence[np.ndarray], larger: Sequence[np.ndarray]) -> float:
    """Return by how much area one outline is larger than another [mm^2]."""
    areas = [manifold3d.CrossSection([np.asarray(p, float) for p in o], manifold3d.FillRule.Positive).area()
             for o in (outline, larger)]  # fmt: skip
    return float(areas[1] - areas[0])


@dataclass(frozen=True)
class Taken:
    """The steel that a prism takes outside the part.

    start : where it begins, along the axis [mm]; depth : how deep it would cut into the part on its way out [mm]
    volume : [mm^3]
    """

    start: float
    depth: float
    volume: float


def steel_outside(
    mesh: SurfaceMesh, outline: Sequence[np.ndarray], frame: np.ndarray, near: float, far: float
) -> Taken | None:
    """Return what a prism takes of the steel outside the part and how clear that is when it leaves along the axis.

    Only pieces that reach `far` count: the others stay where they are, or go with another body. None: there are none.
    """
    part, thin = mesh_solid(mesh), eroded(mesh)
    steel = outline_mesh(outline, frame, near, far) - part
    pieces, start, depth, volume = [], far, 0.0, 0.0
    for piece in thick_pieces(steel):
        along = np.asarray(piece.to_mesh64().vert_properties)[:, :3] @ frame[2]
        if along.max() > far - CORNER - 1e-4:
            pieces.append(piece)
            start = min(start, float(along.min()))
    if not pieces:
        return None
    way = float((mesh.vertices @ frame[2]).max()) - start
    steps = sorted({s for s in STEPS if s < way} | {way * k / 8 for k in range(1, 9)}) if way > 0.0 else []
    for piece in pieces:
        volume += float(piece.volume())
        for step in steps:
            if thin is not None:
                depth = max(depth, overlap_depth(piece.translate([float(v) for v in frame[2] * step]), thin))
            if depth > OPEN_OVERLAP:
                break
    return Taken(start, depth, volume)
