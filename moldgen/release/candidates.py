"""Axes worth trying as the pull: those of the part's coordinates, of its inertia, and of its largest flat faces."""

from __future__ import annotations

import numpy as np

from moldgen.kernel.body import Body

SAME_AXIS = 0.999962
"""Cosine (0.5 deg) from which two axes count as one."""

FLAT_FACES = 4
"""How many directions of flat faces are tried."""

DISTINCT = 0.02
"""Relative difference of two principal moments below which their axes are not defined."""


def pull_axes(part: Body, *, axes_only: bool = False) -> list[tuple[str, np.ndarray]]:
    """Return (source, unit axis) in the order of proposal, each line in space once."""
    axes = [("axis z", np.eye(3)[2]), ("axis y", np.eye(3)[1]), ("axis x", np.eye(3)[0])]
    if axes_only:
        return axes
    kept: list[tuple[str, np.ndarray]] = []
    for source, axis in axes + _principal(part) + _flat(part):
        if all(abs(float(axis @ other)) < SAME_AXIS for _, other in kept):
            kept.append((source, axis))
    return kept


def _principal(part: Body) -> list[tuple[str, np.ndarray]]:
    """Return the principal axes of inertia of the volume that are defined."""
    corners = part.mesh.corners
    corners = corners - part.mesh.vertices.mean(axis=0)
    volume = np.einsum("ij,ij->i", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])) / 6.0
    total = float(volume.sum())
    centre = (volume[:, None] * corners.sum(axis=1)).sum(axis=0) / (4.0 * total)
    summed = corners.sum(axis=1)
    # second moments of the tetrahedra that the triangles form with the origin
    second = np.einsum("t,tki,tkj->ij", volume, corners, corners) + np.einsum("t,ti,tj->ij", volume, summed, summed)
    moments, axes = np.linalg.eigh(second / 20.0 / total - np.outer(centre, centre))
    clear = [all(abs(moments[k] - moments[j]) > DISTINCT * moments[-1] for j in range(3) if j != k) for k in range(3)]
    return [("principal axis", _pointed(axes[:, k])) for k in range(3) if clear[k]]


def _flat(part: Body) -> list[tuple[str, np.ndarray]]:
    """Return the normals of flat faces, those with the most area first."""
    groups: list[tuple[np.ndarray, float]] = []
    flat = [f for f in range(len(part.faces)) if part.surface_kind(f) == "plane"]
    first = np.searchsorted(part.mesh.face, np.arange(len(part.faces)))
    for number in sorted(flat, key=lambda f: (-round(float(part.face_areas[f]), 6), f)):
        normal = part.mesh.normals[first[number]]
        axis = _pointed(normal / np.linalg.norm(normal))
        area = float(part.face_areas[number])
        for place, (other, sum_) in enumerate(groups):
            if abs(float(axis @ other)) >= SAME_AXIS:
                groups[place] = (other, sum_ + area)
                break
        else:
            groups.append((axis, area))
    groups.sort(key=lambda g: -round(g[1], 6))
    return [("flat face", axis) for axis, _ in groups[:FLAT_FACES]]


def _pointed(axis: np.ndarray) -> np.ndarray:
    """Return the axis with its largest component positive."""
    largest = int(np.argmax(np.round(np.abs(axis), 9)))
    return axis if axis[largest] > 0.0 else -axis
