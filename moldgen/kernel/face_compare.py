"""How two faces, known by their signs, are alike: in one place, on one surface, about one axis, of one form."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from moldgen.model.face_sign import FaceSign, SurfaceKind

SAME_PLACE: Final = 1e-3
"""mm: two faces that are nowhere further apart lie in one place (our choice: a tenth of the 0.01 mm by which two
writings of one shell may differ, and well under what a mold maker measures)."""

_KINDS: Final = tuple(SurfaceKind)


def on_same_surface(a: FaceSign, b: FaceSign, tolerance: float = SAME_PLACE) -> bool:
    """True when two faces keep to one surface, seen from the same side, within `tolerance` [mm], and reach each other.

    A free face is only the same where its boundary is, too.
    """
    if a.kind is not b.kind or a.side != b.side:
        return False
    if a.kind is SurfaceKind.FREE:
        return in_same_place(a, b, tolerance)
    apart = float(np.linalg.norm(np.array(b.center) - np.array(a.center)))
    return apart <= a.reach_mm + b.reach_mm and surface_gap(a, b) <= tolerance


def surface_gap(a: FaceSign, b: FaceSign) -> float:
    """Return how far the surfaces of two faces of one kind, not free, are apart over both faces, roughly [mm]."""
    reach = a.reach_mm + b.reach_mm
    if a.kind is SurfaceKind.PLANE:
        apart = np.array(b.center) - np.array(a.center)
        tilt = float(np.linalg.norm(np.array(a.axis) - np.array(b.axis))) * reach / 2.0
        return max(tilt, abs(float(apart @ np.array(a.axis))), abs(float(apart @ np.array(b.axis))))
    offset = np.array(b.at) - np.array(a.at)
    tilt = 0.0 if a.kind is SurfaceKind.SPHERE else _tilt(a, b) * reach / 2.0
    if a.kind in (SurfaceKind.SPHERE, SurfaceKind.TORUS):
        return max(tilt, abs(a.radius - b.radius), abs(a.minor - b.minor), float(np.linalg.norm(offset)))
    axis = np.array(a.axis)
    along = float(offset @ axis)
    beside = float(np.linalg.norm(offset - along * axis))
    leaning = float(abs(np.radians(a.angle_deg - b.angle_deg))) * reach
    growth = float(np.tan(np.radians(a.angle_deg)))
    return max(tilt, beside, leaning, abs(a.radius + along * growth - b.radius))


def _tilt(a: FaceSign, b: FaceSign) -> float:
    """Return the angle between two axes, small ones in rad; the sense counts for cones only."""
    first, second = np.array(a.axis), np.array(b.axis)
    straight = float(np.linalg.norm(first - second))
    return straight if a.kind is SurfaceKind.CONE else min(straight, float(np.linalg.norm(first + second)))


def in_same_place(a: FaceSign, b: FaceSign, tolerance: float = SAME_PLACE) -> bool:
    """True when two faces are the same all over within `tolerance` [mm]: surface, center, area and spread."""
    if a.kind is not b.kind or a.side != b.side:
        return False
    if float(np.linalg.norm(np.array(a.center) - np.array(b.center))) > tolerance:
        return False
    reach = max(a.reach_mm, b.reach_mm, tolerance)
    around = max(a.perimeter_mm, b.perimeter_mm, 4.0 * float(np.sqrt(a.area_mm2)))
    if abs(a.area_mm2 - b.area_mm2) > tolerance * around:
        return False
    if float(np.abs(np.array(a.spread) - np.array(b.spread)).max()) > 4.0 * tolerance * reach:
        return False
    if float(np.linalg.norm(np.array(a.rim) - np.array(b.rim))) > 2.0 * tolerance:
        return False
    return a.kind is SurfaceKind.FREE or on_same_surface(a, b, tolerance)


def coaxial(a: FaceSign, b: FaceSign, tolerance: float = SAME_PLACE) -> bool:
    """True when two round faces share their axis, of either sense, within `tolerance` [mm] over their reach."""
    axis = np.array(a.axis)
    offset = np.array(b.at) - np.array(a.at)
    tilt = float(np.linalg.norm(np.cross(axis, np.array(b.axis)))) * (a.reach_mm + b.reach_mm)
    return tilt <= 2.0 * tolerance and float(np.linalg.norm(offset - float(offset @ axis) * axis)) <= tolerance


def _form_numbers(signs: Sequence[FaceSign]) -> np.ndarray:
    """Return what stays the same however a face is moved, as lengths [mm], (n, 9).

    Square root of the area, the radii, the reach along three principal axes, the reach of the half angle over the
    face, perimeter / 4, and how far the center of the boundary lies from that of the face: on a floor where a boss
    moved by little, only the last one changes by much.
    """
    rows = []
    for s in signs:
        principal = np.linalg.eigvalsh(np.array(s.spread_rows))
        reach = np.sqrt(np.maximum(principal, 0.0))
        lean = np.radians(s.angle_deg) * s.reach_mm
        rim = float(np.linalg.norm(np.array(s.rim) - np.array(s.center)))
        rows.append([np.sqrt(s.area_mm2), s.radius, s.minor, *reach, lean, s.perimeter_mm / 4.0, rim])
    return np.array(rows).reshape(-1, 9)


def same_form(a: Sequence[FaceSign], b: Sequence[FaceSign], tolerance: float = SAME_PLACE) -> np.ndarray:
    """Return which faces are congruent, wherever they are, (len(a), len(b)) bool.

    tolerance : by how much sizes may differ [mm]
    """
    if not len(a) or not len(b):
        return np.zeros((len(a), len(b)), dtype=bool)
    kinds = (
        np.array([[_KINDS.index(s.kind), s.side] for s in a]),
        np.array([[_KINDS.index(s.kind), s.side] for s in b]),
    )
    same = np.all(kinds[0][:, None] == kinds[1][None], axis=2)
    first, second = _form_numbers(a), _form_numbers(b)
    for k in range(first.shape[1]):
        same &= np.abs(first[:, None, k] - second[None, :, k]) <= tolerance
    return np.asarray(same)
