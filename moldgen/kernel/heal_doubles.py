"""Faces that an exporter wrote twice: each is kept once."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from OCP.BRepGProp import BRepGProp
from OCP.GProp import GProp_GProps
from OCP.TopoDS import TopoDS_Face

from moldgen.kernel.topology import vertex_point, vertices_of

SAME_PLACE: Final = 1e-4
"""Distance of corners and of centers of area [mm] under which two faces are one (our choice: the first gap that sewing
closes)."""

SAME_AREA: Final = 1e-6
"""Relative difference of area under which two faces are one."""


def without_doubles(faces: Sequence[TopoDS_Face]) -> list[TopoDS_Face]:
    """Return the faces without those that lie on an earlier one: same corners, same area, same center of area."""
    kept: list[TopoDS_Face] = []
    known: list[tuple[float, np.ndarray, np.ndarray]] = []
    for face in faces:
        size, center = _area_and_center(face)
        corners = np.array(sorted(tuple(np.round(vertex_point(v), 3)) for v in vertices_of(face))).reshape(-1, 3)
        if not any(_same(size, center, corners, other) for other in known):
            kept.append(face)
            known.append((size, center, corners))
    return kept


def _area_and_center(face: TopoDS_Face) -> tuple[float, np.ndarray]:
    properties = GProp_GProps()
    BRepGProp.SurfaceProperties_s(face, properties)
    return float(properties.Mass()), np.array(properties.CentreOfMass().Coord())


def _same(size: float, center: np.ndarray, corners: np.ndarray, other: tuple[float, np.ndarray, np.ndarray]) -> bool:
    if abs(size - other[0]) > SAME_AREA * size or len(corners) != len(other[2]):
        return False
    return bool(np.linalg.norm(center - other[1]) < SAME_PLACE and np.all(np.abs(corners - other[2]) < 2e-3))
