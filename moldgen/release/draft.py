"""Draft of every face against the pull: how much, on which half, and whether it is enough."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from moldgen.finding import Finding, Point, Severity
from moldgen.kernel.body import Body
from moldgen.kernel.slope import sine_range
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.release.place import face_at

ANGLE_NOISE = 1e-3
"""Degrees by which a draft may miss the requirement: exporters write angles with about six digits."""

WALL_HEIGHT = 1.0
"""A stretch below the required draft inside a face that is otherwise steep enough counts when it reaches this far
[mm] along the pull (our choice): what is shorter is the run-out of a rounding, and clears as soon as it moves."""

TOUCHED = 0.02
"""Share of a vertical face with material above or below it that decides which half forms it."""


class Half(StrEnum):
    """The half of the mold that forms a face."""

    CAVITY = "cavity"
    CORE = "core"
    EITHER = "either"
    BOTH = "both"


@dataclass(frozen=True)
class FaceDraft:
    """Draft of one face: its angle to the pull, 0 for a wall along it, 90 for a face square to it [deg].

    mean_deg is weighted by area; below_mm2 is the area under the required angle, and below_mm its extent along the
    pull; at is a point on the face, in the frame of the body.
    """

    face: int
    surface: str
    half: Half
    least_deg: float
    most_deg: float
    mean_deg: float
    area_mm2: float
    below_mm2: float
    below_mm: float
    at: Point


def draft_table(
    body: Body, kinds: FaceKinds, required_deg: float, contact: np.ndarray | None = None
) -> tuple[FaceDraft, ...]:
    """Return the draft of every face, in face order.

    Exact on planes, cylinders and cones; elsewhere from the exact normals at the nodes of the mesh.

    Parameters
    ----------
    required_deg : the angle against which `below_mm2` is measured, texture allowance included
    contact : (f, 2), what `vertical_contact` found; without it a vertical face is formed by either half
    """
    count = len(body.faces)
    face, area = body.mesh.face, body.triangle_areas
    normal = body.mesh.normals
    angle = np.degrees(np.arctan2(np.abs(normal[:, 2]), np.hypot(normal[:, 0], normal[:, 1])))
    least, most = np.full(count, 90.0), np.zeros(count)
    np.minimum.at(least, face, angle)
    np.maximum.at(most, face, angle)
    total = np.maximum(body.face_areas, 1e-30)
    mean = np.bincount(face, area * angle, count) / total
    low = angle < required_deg - ANGLE_NOISE
    below = np.bincount(face[low], area[low], count)
    reach = _reach(body, low)
    exact = [sine_range(f) for f in body.faces]
    half = _halves(kinds, contact)
    rows = []
    for number in range(count):
        angles = (float(least[number]), float(most[number]), float(mean[number]))
        under, high = float(below[number]), float(reach[number])
        sines = exact[number]
        if sines is not None:
            angles = _exact_angles(sines, angles[2])
            if angles[0] == angles[1]:  # one angle all over: the whole face is below or none of it
                short = angles[0] < required_deg - ANGLE_NOISE
                under = float(total[number]) if short else 0.0
                high = float(np.ptp(body.face_heights[number])) if short else 0.0
        x, y, z = (float(c) for c in body.face_places[number])
        area_mm2 = float(total[number])
        rows.append(
            FaceDraft(number, body.surface_kind(number), half[number], *angles, area_mm2, under, high, (x, y, z))
        )
    return tuple(rows)


def draft_findings(table: tuple[FaceDraft, ...], required_deg: float) -> tuple[Finding, ...]:
    """Return one finding for each face with too little draft, the largest first.

    A face has too little when its mean angle is below the requirement, or when a stretch of it below the requirement
    reaches `WALL_HEIGHT` along the pull (not asked of cylinders, spheres and tori: these are roundings).
    """
    short = [row for row in table if _too_small(row, required_deg)]
    short.sort(key=lambda row: (-round(row.below_mm2, 3), row.face))
    return tuple(_finding(row, required_deg) for row in short)


def _too_small(row: FaceDraft, required_deg: float) -> bool:
    if row.mean_deg < required_deg - ANGLE_NOISE:
        return True
    return row.surface not in ("plane", "cylinder", "cone", "sphere", "torus") and row.below_mm >= WALL_HEIGHT


def _finding(row: FaceDraft, required_deg: float) -> Finding:
    whole = row.below_mm2 > 0.99 * row.area_mm2
    parts = "" if whole else f" on {row.below_mm2:.3g} of its {row.area_mm2:.3g} mm2"
    return Finding(
        "draft.too_small",
        Severity.WARNING,
        f"the {row.surface} has {round(row.least_deg, 3):g} deg of draft, {required_deg:.3g} deg are asked for{parts}",
        where=f"{face_at(row.surface, row.at)}, formed by {_formed_by(row.half)}",
        at=row.at,
        value=row.least_deg,
        limit=required_deg,
        unit="deg",
        remedy=f"lean the wall {required_deg:.3g} deg out of the pull, or lower draft.minimum in the spec",
    )


def _formed_by(half: Half) -> str:
    return {Half.EITHER: "either half", Half.BOTH: "neither half alone"}.get(half, f"the {half}")


def _exact_angles(sines: tuple[float, float], mean: float) -> tuple[float, float, float]:
    """Return least, most and mean angle from the range of n.d; the mean of the mesh is kept where the angle varies."""
    ends = [float(np.degrees(np.arcsin(min(1.0, abs(s))))) for s in sines]
    least = 0.0 if sines[0] < 0.0 < sines[1] else min(ends)
    least = 0.0 if least < 1e-9 else least
    most = max(ends)
    if most - least < 1e-6:
        return least, least, least
    return least, most, min(max(mean, least), most)


def _reach(body: Body, chosen: np.ndarray) -> np.ndarray:
    """Return the extent along z of the chosen triangles of each face, (f,) [mm]."""
    count = len(body.faces)
    z = body.mesh.corners[chosen][:, :, 2]
    face = body.mesh.face[chosen]
    low, high = np.full(count, np.inf), np.full(count, -np.inf)
    np.minimum.at(low, face, z.min(axis=1, initial=np.inf))
    np.maximum.at(high, face, z.max(axis=1, initial=-np.inf))
    return np.asarray(np.maximum(high - low, 0.0))


def _halves(kinds: FaceKinds, contact: np.ndarray | None) -> list[Half]:
    half = [Half.EITHER] * len(kinds.kind)
    for number, kind in enumerate(kinds.kind):
        if kind == Kind.UPPER:
            half[number] = Half.CAVITY
        elif kind == Kind.LOWER:
            half[number] = Half.CORE
        elif kind == Kind.STRADDLING:
            half[number] = Half.BOTH
        elif contact is not None:
            below, above = contact[number] > TOUCHED
            half[number] = (
                Half.BOTH if below and above else Half.CAVITY if below else Half.CORE if above else Half.EITHER
            )
    return half
