"""Lips of snap fits: small catch faces that side actions form, or that a half forms through a shut-off."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.kernel.polygon import contains
from moldgen.layout.steel_former import Ends, FormedPart
from moldgen.model.halves import Halves
from moldgen.rules.steel_safe import LIP_LEAST, LIP_MOST, LIP_THICK

FACES_PULL: Final = 0.5
"""Cosine to the pull from which a face catches (our choice: 60 deg)."""

SKIN: Final = 0.05
"""mm: how far over and under a catch face is looked along it."""

SMALLEST: Final = 0.2
"""mm^2: a smaller face is no catch face (our choice)."""

ROOM: Final = 1.5
"""Free way before a lip over its reach: less, and nothing could be pushed in to snap behind it (our choice)."""

ONE_LIP: Final = 3.0
"""mm: catch faces closer than this belong to one lip (our choice)."""

ALIKE: Final = 0.9
"""Cosine from which two lips point the same way (our choice)."""

FAR: Final = 1e3
"""mm: stands for a way that nothing ends."""

WAYS: Final = 24
"""Level directions in which the root of a lip is looked for."""


@dataclass(frozen=True)
class SnapLip:
    """One lip [mm, mold frame].

    catch : a point of the catch face, (3,); up : its outward normal, (3,)
    reach : from the root to the tip, level; thickness : of the lip under the catch face, along the pull
    tip : number of the face at the tip
    """

    catch: np.ndarray
    up: np.ndarray
    reach: Ends
    thickness: Ends
    tip: int


def snap_lips(part: FormedPart, halves: Halves) -> list[SnapLip]:
    """Return the lips of the part, by place: of each the catch face with the least reach."""
    steep = np.abs(part.mesh.facet_normals[:, 2]) > FACES_PULL
    found = _on(part, steep & (part.by_side >= 0))
    for loop in halves.parting_line[1:]:
        plan = np.asarray(loop, float)[:, :2]
        through = _on(part, steep & (part.by_side < 0) & contains(plan, part.mesh.centres[:, :2]))
        found += [lip for lip in through if _leaves(part, lip, plan)]
    found.sort(key=lambda lip: (*np.round([lip.reach.length, lip.thickness.length], 2), lip.catch.round(3).tolist()))
    kept: list[SnapLip] = []
    for lip in found:
        if not any(_one_lip(lip, other) for other in kept):
            kept.append(lip)
    return sorted(kept, key=lambda lip: lip.catch.round(3).tolist())


def _one_lip(lip: SnapLip, other: SnapLip) -> bool:
    """Return whether two catch faces are of one lip, or look at each other across the gap over one: one is the lip."""
    off = lip.catch - other.catch
    if np.linalg.norm(off) <= ONE_LIP:
        return True
    one, two = (x.reach.other - x.reach.one for x in (lip, other))
    alike = one @ two > ALIKE * np.linalg.norm(one) * np.linalg.norm(two)
    return bool(alike and lip.up[2] * other.up[2] < 0.0 and np.linalg.norm(off[:2]) <= LIP_MOST.default)


def _on(part: FormedPart, asked: np.ndarray) -> list[SnapLip]:
    """Return the lips whose catch faces lie among the triangles asked for, (t,) bool."""
    found = []
    for face in np.unique(part.mesh.face[asked]).tolist():
        rows = np.flatnonzero(asked & (part.mesh.face == face))
        if part.body.triangle_areas[rows].sum() >= SMALLEST:
            lip = _lip(part, rows)
            found += [] if lip is None else [lip]
    return found


def _leaves(part: FormedPart, lip: SnapLip, loop: np.ndarray) -> bool:
    """Return whether the way before a lip leads out of the shut-off over it, (n, 2): else it is a step in a hole."""
    outward = lip.reach.other - lip.reach.one
    outward /= np.linalg.norm(outward)
    over = lip.catch + SKIN * lip.up
    (free,), _ = part.probe.first(over[None, :], outward)
    end = over + (min(float(free), FAR) - SKIN) * outward
    return not contains(loop, end[None, :2])[0]


def _lip(part: FormedPart, rows: np.ndarray) -> SnapLip | None:
    """Return the lip whose catch face these triangles are; None where it is none."""
    weights = part.body.triangle_areas[rows]
    middle = np.average(part.mesh.centres[rows], axis=0, weights=weights)
    row = rows[int(np.argmin(np.linalg.norm(part.mesh.centres[rows] - middle, axis=1)))]
    point, up = part.mesh.centres[row], part.mesh.facet_normals[row]
    (drop,), (met,) = part.probe.first((middle + SKIN * up)[None, :], -up)
    if met >= 0 and part.mesh.face[met] == part.mesh.face[row] and drop < 2 * SKIN:  # the very middle, if it is there
        point, up = middle + (SKIN - drop) * up, part.mesh.facet_normals[met]
    turn = 2 * np.pi * np.arange(WAYS) / WAYS
    level = np.column_stack([np.cos(turn), np.sin(turn), np.zeros(WAYS)])
    ways = level - (level @ up)[:, None] * up  # along the catch face
    ways /= np.linalg.norm(ways, axis=1)[:, None]
    over = np.tile(point + SKIN * up, (WAYS, 1))
    gap, hit = part.probe.first(over, ways)
    first = int(np.argmin(gap.round(6)))
    if not np.isfinite(gap[first]):
        return None
    root_normal = part.mesh.facet_normals[hit[first]]
    outward = root_normal - (root_normal @ up) * up
    outward = outward / max(float(np.linalg.norm(outward)), 1e-9)
    return _measured(part, point, up, outward)


def _measured(part: FormedPart, point: np.ndarray, up: np.ndarray, outward: np.ndarray) -> SnapLip | None:
    """Return the lip with its sizes, None where they are not those of a lip."""
    over, under = (point + SKIN * up)[None, :], (point - SKIN * up)[None, :]
    (back,), (root,) = part.probe.first(over, -outward)
    (free,), _ = part.probe.first(over, outward)
    (ahead,), (tip,) = part.probe.first(under, outward)
    pull = np.array([0.0, 0.0, np.sign(up[2])])
    (thick,), (below,) = part.probe.first(under, -pull)
    if not (np.isfinite(back) and np.isfinite(ahead) and np.isfinite(thick)):
        return None
    level = outward * np.array([1.0, 1.0, 0.0])  # a lip reaches as far as it stands out, however its catch face leans
    reach = Ends(
        point - back * level, point + ahead * level, part.mesh.facet_normals[root], part.mesh.facet_normals[tip]
    )
    thickness = Ends(point, point - (thick + SKIN / abs(up[2])) * pull, up, part.mesh.facet_normals[below])
    fits = LIP_LEAST.default <= reach.length <= LIP_MOST.default and thickness.length <= LIP_THICK.default
    room = free >= ahead + ROOM * reach.length
    return SnapLip(point, up, reach, thickness, int(part.mesh.face[tip])) if fits and room else None
