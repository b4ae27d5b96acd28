"""Directions that the part itself suggests as its pull, and a frame that turns with the part."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moldgen.kernel.body import Body
from moldgen.kernel.face_axes import face_axis

SAME_AXIS = 0.999962
"""Cosine (0.5 deg) from which two axes count as one."""

FLAT_FACES, ROUND_FACES = 10, 8
"""How many directions of flat faces, and of axes of round and extruded faces, are tried. Our choice."""

WALLS = 6
"""Of so many directions of flat walls each two are taken together, and the line along both of them is tried."""

DRAFTED = 0.9945
"""Cosine (6 deg) up to which two flat directions are taken for walls drafted against each other: their mean counts."""

SKEW = 0.1
"""Sine of the least angle between two directions that fix a frame, or a line along two walls."""

DISTINCT = 0.02
"""Relative difference of two principal moments below which their axes are not defined."""

_Sized = list[tuple[np.ndarray, float]]


@dataclass(frozen=True)
class PartFrame:
    """A right-handed frame made of the part, so that it turns with the part.

    rows : (3, 3) unit vectors
    principal : those principal axes of inertia of the volume that are defined, (k, 3)
    flat, round : (axis, area [mm^2]) of flat faces by their normal, of round and extruded ones by axis; largest first
    """

    rows: np.ndarray
    principal: np.ndarray
    flat: _Sized
    round: _Sized

    def across(self, axis: np.ndarray) -> np.ndarray:
        """Return the rows x, y of a frame whose z is `axis`, (2, 3), turned as the part is."""
        base = self.rows[int(np.argmin(np.round(np.abs(self.rows @ axis), 6)))]
        first = np.cross(axis, base)
        first = first / np.linalg.norm(first)
        return np.stack([first, np.cross(axis, first)])


def part_frame(part: Body) -> PartFrame:
    """Return the frame of a part: its principal axes where they are defined, else its flats and its farthest corner."""
    centre, principal = _principal(part)
    flat, about = _flat(part), _round(part)
    arms = part.mesh.vertices - centre
    farthest = arms[int(np.argmax(np.round(np.linalg.norm(arms, axis=1) / part.diagonal, 6)))]
    rows: list[np.ndarray] = []
    for axis in [*principal, *(a for a, _ in flat), *(a for a, _ in about), farthest, *np.eye(3)]:
        rest = axis / np.linalg.norm(axis)
        for row in rows:
            rest = rest - (rest @ row) * row
        length = float(np.linalg.norm(rest))
        if length > SKEW:
            rows.append(_towards_mass(part, centre, farthest, rest / length))
        if len(rows) == 2:
            break
    rows.append(np.cross(rows[0], rows[1]))
    return PartFrame(np.stack(rows), principal, flat, about)


def pull_axes(frame: PartFrame, *, axes_only: bool = False) -> list[tuple[str, np.ndarray]]:
    """Return (source, unit axis) in the order of proposal, each line in space once.

    The order is that of the part's geometry: axes of coordinates give their name to a direction of the part that they
    coincide with, and otherwise come last.
    """
    named = [("axis z", np.eye(3)[2]), ("axis y", np.eye(3)[1]), ("axis x", np.eye(3)[0])]
    if axes_only:
        return named
    walls = _walls([axis for axis, _ in frame.flat])[:WALLS]
    along = [np.cross(a, b) for i, a in enumerate(walls) for b in walls[i + 1 :]]
    found = [
        *(("flat face", axis) for axis, _ in frame.flat[:FLAT_FACES]),
        *(("axis of round faces", axis) for axis, _ in frame.round[:ROUND_FACES]),
        *(("principal axis", axis) for axis in frame.principal),
        *(("along flat walls", line / np.linalg.norm(line)) for line in along if np.linalg.norm(line) > SKEW),
    ]
    kept: list[tuple[str, np.ndarray]] = []
    for source, axis in found + named:
        drawn = next(((s, a) for s, a in named if same_axis(axis, a)), (source, axis))
        if not any(same_axis(drawn[1], other) for _, other in kept):
            kept.append(drawn)
    return kept


def _walls(normals: list[np.ndarray]) -> list[np.ndarray]:
    """Return one direction for all flat walls that are drafted against each other, the largest first."""
    groups: list[list[np.ndarray]] = []
    for normal in normals:
        for group in groups:
            if same_axis(normal, group[0], DRAFTED):
                group.append(normal if normal @ group[0] > 0.0 else -normal)
                break
        else:
            groups.append([normal])
    means = [np.sum(group, axis=0) for group in groups]
    return [mean / np.linalg.norm(mean) for mean in means]


def same_axis(one: np.ndarray, other: np.ndarray, cosine: float = SAME_AXIS) -> bool:
    """Return whether two unit vectors lie along one line, either way."""
    return abs(float(one @ other)) >= cosine


def _principal(part: Body) -> tuple[np.ndarray, np.ndarray]:
    """Return the centre of the volume [mm] and the principal axes of inertia that are defined, (k, 3)."""
    middle = part.mesh.vertices.mean(axis=0)
    corners = part.mesh.corners - middle
    volume = np.einsum("ij,ij->i", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])) / 6.0
    total = float(volume.sum())
    centre = (volume[:, None] * corners.sum(axis=1)).sum(axis=0) / (4.0 * total)
    summed = corners.sum(axis=1)
    # second moments of the tetrahedra that the triangles form with the origin
    second = np.einsum("t,tki,tkj->ij", volume, corners, corners) + np.einsum("t,ti,tj->ij", volume, summed, summed)
    moments, axes = np.linalg.eigh(second / 20.0 / total - np.outer(centre, centre))
    clear = [all(abs(moments[k] - moments[j]) > DISTINCT * moments[-1] for j in range(3) if j != k) for k in range(3)]
    return centre + middle, axes[:, clear].T.reshape(-1, 3)


def _towards_mass(part: Body, centre: np.ndarray, farthest: np.ndarray, axis: np.ndarray) -> np.ndarray:
    """Return the axis with the sense in which more of the surface lies far out; of even parts, to the farthest corner.

    An axis of inertia has no sense of its own; without one the frame of a turned part would not be the turned frame.
    """
    height = (part.mesh.corners.mean(axis=1) - centre) @ axis / part.diagonal
    lopsided = float((part.triangle_areas * height**3).sum() / part.triangle_areas.sum())
    sense = lopsided if abs(lopsided) > 1e-6 else round(float(farthest @ axis) / part.diagonal, 6)
    return -axis if sense < 0.0 else axis


def _flat(part: Body) -> _Sized:
    """Return the normals of flat faces with their area, those with the most first."""
    first = np.searchsorted(part.mesh.face, np.arange(len(part.faces)))
    normal = part.mesh.normals[first]
    normal = normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-30)[:, None]
    return _grouped(part, {f: normal[f] for f in range(len(part.faces)) if part.surface_kind(f) == "plane"})


def _round(part: Body) -> _Sized:
    """Return the axes of round and extruded faces with their area, those with the most first."""
    axes = {f: face_axis(part, f) for f in range(len(part.faces))}
    return _grouped(part, {f: a for f, a in axes.items() if a is not None})


def _grouped(part: Body, axes: dict[int, np.ndarray]) -> _Sized:
    groups: _Sized = []
    for number in sorted(axes, key=lambda f: (-round(float(part.face_areas[f]), 3), f)):
        area = float(part.face_areas[number])
        for place, (other, sum_) in enumerate(groups):
            if same_axis(axes[number], other):
                groups[place] = (other, sum_ + area)
                break
        else:
            groups.append((axes[number], area))
    groups.sort(key=lambda g: -round(g[1], 3))
    return groups
