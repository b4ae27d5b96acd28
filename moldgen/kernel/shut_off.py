"""How steep steel stands against steel: the least angle between the pull and the faces that both halves share."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from OCP.TopoDS import TopoDS_Face

from moldgen.kernel.mesh import surface_mesh, tessellate

SLIVER = 1e-3
"""mm: a triangle less high than this over its longest side shows no direction (and closes nothing)."""


@dataclass(frozen=True)
class LeastAngle:
    """The steepest place of a surface.

    deg : angle between surface and pull there, 0 for an upright face, 90 for a level one; at : the place [mm]
    upright_mm2 : area of the faces that is steeper than 1 deg
    """

    deg: float
    at: tuple[float, float, float]
    upright_mm2: float


def least_angle(faces: Sequence[TopoDS_Face]) -> LeastAngle:
    """Return the least angle between the pull (z) and the faces, over their triangles with exact normals.

    Raises
    ------
    KernelError : a face cannot be meshed
    """
    for face in faces:
        tessellate(face)
    mesh = surface_mesh(list(faces))
    corners, area = mesh.corners, mesh.areas()
    longest = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
    sine = np.abs(mesh.normals[:, 2]) / np.maximum(np.linalg.norm(mesh.normals, axis=1), 1e-300)
    angle = np.degrees(np.arcsin(np.minimum(sine, 1.0)))
    shown = 2.0 * area > SLIVER * longest
    if not shown.any():
        shown = np.ones(len(area), dtype=bool)
    place = int(np.argmin(np.where(shown, np.round(angle, 6), math.inf)))
    x, y, z = (float(v) for v in corners[place].mean(axis=0))
    return LeastAngle(round(float(angle[place]), 6), (x, y, z), float(area[shown & (angle < 1.0)].sum()))
