"""Which way each face looks: up to the cavity, down to the core, along the pull, or both ways."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from moldgen.kernel.body import Meshed
from moldgen.tolerances import SIGN_NOISE, VERTICAL_SINE


class Kind(IntEnum):
    """How a face stands against the pull (+z)."""

    UPPER = 0
    LOWER = 1
    VERTICAL = 2
    STRADDLING = 3


@dataclass(frozen=True)
class FaceKinds:
    """Every face of a body against the pull.

    overhang : (f, 2) float [mm], width of the part of the face that looks up / down, seen along the pull: its
        projected area over its extent. A face 0.1 deg off vertical and 5 mm high has 0.009 mm.
    kind : (f,) int, one `Kind` per face
    sine : (t,) float, n.d of each triangle from the exact surface normals
    """

    overhang: np.ndarray
    kind: np.ndarray
    sine: np.ndarray

    def numbers(self, *kinds: Kind) -> np.ndarray:
        """Return the face numbers of the given kinds, ascending."""
        return np.flatnonzero(np.isin(self.kind, kinds))


def face_kinds(body: Meshed) -> FaceKinds:
    """Classify the faces of a body whose pull is +z.

    The judge is a distance, not an angle: a sign of n.d that costs less than `SIGN_NOISE` of overhang is noise of the
    model or of its mesh, whatever the angle.
    """
    mesh = body.mesh
    sine = mesh.normals[:, 2] / np.maximum(np.linalg.norm(mesh.normals, axis=1), 1e-30)
    overhang = np.column_stack(
        [_overhang(body, sine, sine > VERTICAL_SINE), _overhang(body, sine, sine < -VERTICAL_SINE)]
    )
    up, down = overhang[:, 0] >= SIGN_NOISE, overhang[:, 1] >= SIGN_NOISE
    kind = np.select([up & down, up, down], [Kind.STRADDLING, Kind.UPPER, Kind.LOWER], Kind.VERTICAL)
    return FaceKinds(overhang, kind.astype(np.int8), sine)


def _overhang(body: Meshed, sine: np.ndarray, chosen: np.ndarray) -> np.ndarray:
    """Return per face the projected area of the chosen triangles over the diagonal of their box, both along z."""
    mesh, count = body.mesh, len(body.faces)
    face = mesh.face[chosen]
    # by the exact normals: facets of a vertical wall between nodes that do not face each other project areas of noise
    area = np.bincount(face, (body.triangle_areas * np.abs(sine))[chosen], count)
    corners = mesh.corners[chosen][:, :, :2]
    low, high = np.full((count, 2), np.inf), np.full((count, 2), -np.inf)
    np.minimum.at(low, face, corners.min(axis=1))
    np.maximum.at(high, face, corners.max(axis=1))
    extent = np.linalg.norm(np.where(high >= low, high - low, 0.0), axis=1)
    return np.where(extent > 0.0, area / np.maximum(extent, 1e-12), 0.0)
