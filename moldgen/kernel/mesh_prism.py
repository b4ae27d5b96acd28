"""Straight prisms and flat regions for side actions: mesh solids seen along an axis, and outlines across it.

All regions are flat, in the plane across an axis, [mm]; all solids here are in the frame of that axis (z along it).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeAlias

import manifold3d
import numpy as np

from moldgen.kernel.meshsolid import MeshSolid
from moldgen.kernel.polygon import signed_area

Region: TypeAlias = manifold3d.CrossSection
"""A flat region with holes; regions are united, cut and intersected with ``+``, ``-`` and ``^``."""

MITER = 2.0
"""How far a grown corner may run out, in steps of growth, before it is squared off: the least that Clipper allows."""


def turned(solid: MeshSolid, rows: np.ndarray) -> MeshSolid:
    """Return the solid in the frame whose axes are the rows, (3, 3); its transpose leads back."""
    return solid.transform(np.c_[rows, np.zeros(3)])


def shadow(solid: MeshSolid) -> Region:
    """Return what a solid covers, seen along z."""
    return Region(solid.project().to_polygons())


def region(outline: Sequence[np.ndarray]) -> Region:
    """Return the region within polygons (k, 2): outer ones counterclockwise, holes clockwise."""
    return Region([np.ascontiguousarray(p, np.float64) for p in outline])


def triangles_region(triangles: Sequence[np.ndarray]) -> Region:
    """Return what triangles or other convex polygons (k, 2) cover together, whichever way each runs."""
    ways = [np.ascontiguousarray(p if signed_area(p) > 0.0 else p[::-1], np.float64) for p in triangles]
    return Region(ways, manifold3d.FillRule.Positive)


def joined_regions(regions: Sequence[Region]) -> Region:
    """Return what regions cover together."""
    return Region.batch_boolean(list(regions), manifold3d.OpType.Add)


def rectangle(low: np.ndarray, high: np.ndarray) -> Region:
    """Return the rectangle between two corners (2,)."""
    return region([np.array([low, [high[0], low[1]], high, [low[0], high[1]]])])


def hull(shape: Region) -> Region:
    """Return the convex hull of a region."""
    return shape.hull()


def grown(shape: Region, by: float, smooth: float = 0.0) -> Region:
    """Return the region grown (or shrunk) by `by` [mm] with sharp corners, its outline simplified by `smooth` [mm]."""
    wider = shape.offset(by, manifold3d.JoinType.Miter, MITER) if by else shape
    return wider.simplify(smooth) if smooth > 0.0 else wider


def shifted(shape: Region, by: np.ndarray) -> Region:
    """Return the region moved by a vector (2,)."""
    return shape.translate((float(by[0]), float(by[1])))


def polygons(shape: Region) -> tuple[np.ndarray, ...]:
    """Return the polygons of a region, largest area first."""
    found = [np.asarray(p, dtype=float) for p in shape.to_polygons()]
    return tuple(sorted(found, key=lambda p: (-round(signed_area(p), 9), *np.round(p.min(axis=0), 9))))


def level_section(solid: MeshSolid, level: float) -> Region:
    """Return the section of a solid at a level."""
    return solid.slice(level)


def bounds(shape: Region) -> tuple[np.ndarray, np.ndarray]:
    """Return the lower and upper corner of a region, (2,) each."""
    left, bottom, right, top = shape.bounds()
    return np.array([left, bottom]), np.array([right, top])


def prism(shape: Region, near: float, far: float) -> MeshSolid:
    """Return the region carried from one level to another."""
    return shape.extrude(far - near).translate((0.0, 0.0, near))


def outline_mesh(outline: Sequence[np.ndarray], frame: np.ndarray, near: float, far: float) -> MeshSolid:
    """Return a straight prism where it stands; rows of `frame` are x, y, z of its own frame, it runs along z."""
    placed = np.column_stack([frame.T, frame[2] * near])
    return region(outline).extrude(far - near).transform(placed)


def split_level(solid: MeshSolid, level: float) -> tuple[MeshSolid, MeshSolid]:
    """Return what lies above and below a level."""
    above, below = solid.split_by_plane((0.0, 0.0, 1.0), level)
    return above, below


def box_of(solid: MeshSolid) -> tuple[np.ndarray, np.ndarray]:
    """Return the lower and upper corner of a solid, (3,) each."""
    box = np.asarray(solid.bounding_box(), dtype=float)
    return box[:3], box[3:]
