"""Lay an old part onto the new one: as drawn, or by the rigid motion under which most faces lie on each other."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from moldgen.errors import PartError
from moldgen.kernel.face_compare import SAME_PLACE, on_same_surface
from moldgen.kernel.face_signature import PartSigns
from moldgen.model.face_sign import FaceSign
from moldgen.model.part import Rows, Vector, vector
from moldgen.model.revision import Alignment
from moldgen.revision.congruent import STAY, Faces, Motion, Pairs
from moldgen.revision.motion_search import Candidate, best_motions, moved_by

TOLERANCES: Final = (SAME_PLACE, 10.0 * SAME_PLACE)
"""mm: faces match within the first; if few do, the second is tried: two writings of one shell may differ by 0.01 mm
(`moldgen.tolerances.SAME_SURFACE`)."""

MOST: Final = 0.5
"""Share of the faces, by the root of their areas, that must lie in place for "as drawn" without looking further; under
it a larger or smaller part is thought of (our choice)."""

ENOUGH: Final = 0.25
"""Share of the faces by which a motion is believed (our choice: where three quarters changed it is another part)."""

COARSE_GAIN: Final = 0.1
"""The second tolerance is only taken where it matches so much more of the faces (our choice)."""

FEWEST: Final = 3
"""Faces that must lie on each other at least: three planes fix a motion."""

WHOLE: Final = 0.98
"""Share by which a mirror image is believed (our choice: small faces may have changed as well)."""

OVERLAP: Final = 0.8
"""Share of the boxes of both parts that they have in common, from which they are taken as drawn (our choice)."""

LITTLE: Final = 0.01
"""Share of its size by which a changed part is not moved without a turn: its walls got thicker (our choice)."""

NO_TURN: Final = 1e-4
"""rad: a motion that turns by less only moves: 0.01 mm over 100 mm."""

STILL: Final = 1e-6
"""mm: a motion that moves no corner further is none."""


def align(old: PartSigns, new: PartSigns) -> Alignment:
    """Return how the old part is laid onto the new one.

    Faces lie on each other when center, boundary, area, spread and axis agree within `TOLERANCES`. In this order: most
    faces are in place; the rigid motion that brings most faces onto each other, of equal ones the smallest; the same
    for the whole part grown or shrunk; boxes that overlap almost wholly. Never a mirror image.

    Raises
    ------
    PartError : nothing fits, or the new part is the mirror image of the old one
    """
    first, second = Faces.of(old.signs), Faces.of(new.signs)
    found = _rigid(first, second, TOLERANCES[0])
    if found is None or found.share < MOST:
        coarse = _rigid(first, second, TOLERANCES[1])
        if coarse is not None and (found is None or coarse.share > found.share + COARSE_GAIN):
            found = coarse
    if found is not None and found.share >= MOST:
        _refuse_mirror(first, second, found)
        return _told(old, new, found)
    grown = _grown(first, second)
    if grown is not None:
        return _told(old, new, grown)
    if found is not None and _believed(found):
        _refuse_mirror(first, second, found)
        return _told(old, new, found)
    _refuse_mirror(first, second, found)
    if _overlap(old, new) >= OVERLAP:
        return _told(old, new, _Fit(STAY, 0.0, TOLERANCES[0], note="most faces changed, but the boxes agree"))
    raise _nothing_fits(found)


@dataclass(frozen=True)
class _Fit:
    """A motion, the share and the number of faces it matches, and how; `scale` comes before the motion."""

    motion: Motion
    share: float
    tolerance: float
    met: int = 0
    residual: float = 0.0
    scale: float = 1.0
    note: str = ""


def _rigid(old: Faces, new: Faces, tolerance: float) -> _Fit | None:
    """Return the motion that matches most, none at all if most faces are in place."""
    pairs = Pairs.of(old, new, tolerance)
    stay = _fit(pairs, STAY)
    if stay.share >= MOST:
        return stay
    motions = _best(pairs)
    if not motions:
        return stay if stay.met else None
    best = motions[0]
    if stay.met >= FEWEST and stay.share >= 0.8 * best.share:  # as drawn unless another place explains clearly more
        return stay
    if best.share < WHOLE and turn_of(best.motion.rotation)[0] < NO_TURN:
        size = float(np.linalg.norm(np.ptp(old.corners, axis=0)))
        if stay.met > 0 or moved_by(best.motion, old.corners) <= LITTLE * size:
            return stay  # a taller part whose top moved up: even one face that did not move says where it was drawn
    return _fit(pairs, best.motion, note=_ties(motions))


def _best(pairs: Pairs) -> list[Candidate]:
    """Return the best motions by all faces; where many are equal, the search looks at the rare ones only."""
    found = best_motions(pairs.rare())
    judged = [replace(c, share=pairs.share(pairs.hits(c.motion))) for c in found]
    best = max((c.share for c in judged), default=0.0)
    return [c for c in judged if c.share >= best - 1e-9]


def _ties(motions: Sequence[Candidate]) -> str:
    if motions[0].free:
        return "it is round about an axis and was turned as little as possible"
    if len(motions) > 1:
        return f"{len(motions)} positions fit equally well, the nearest to how it is drawn was taken"
    return ""


def _fit(pairs: Pairs, motion: Motion, note: str = "") -> _Fit:
    corners = pairs.old.corners
    straight = Motion(np.eye(3), motion.of(corners.mean(axis=0)) - corners.mean(axis=0))
    if np.abs(motion.of(corners) - straight.of(corners)).max() <= pairs.tolerance / 10.0:
        motion = straight  # the turn is noise
    if moved_by(motion, corners) <= STILL:
        motion = STAY
    hits = pairs.hits(motion)
    met = len(np.unique(pairs.first[hits]))
    return _Fit(motion, pairs.share(hits), pairs.tolerance, met, pairs.residual(motion, hits), note=note)


def _believed(fit: _Fit) -> bool:
    return fit.share >= ENOUGH and fit.met >= FEWEST


def _grown(old: Faces, new: Faces) -> _Fit | None:
    """Return the fit of the whole old part, made larger or smaller, if most of its faces match then.

    The motion is about the origin if the part was scaled about it, else it lays middle on middle.
    """
    for factor in _factors(old.signs, new.signs):
        bigger = Faces.of([s.scaled(factor) for s in old.signs])
        fit = _rigid(bigger, new, SAME_PLACE)
        if fit is None or fit.share < MOST or fit.met < FEWEST:
            continue
        rotation, shift = fit.motion.rotation, fit.motion.shift
        if float(np.linalg.norm(shift)) > SAME_PLACE:
            middle = old.corners.mean(axis=0)
            shift = factor * rotation @ middle + shift - rotation @ middle
        note = f"the whole part is {factor:.6g} times as large"
        note = f"{note}; {fit.note}" if fit.note else note
        motion = fit.motion if fit.motion is STAY else Motion(rotation, shift)
        return _Fit(motion, fit.share, fit.tolerance, fit.met, fit.residual, factor, note)
    return None


def _factors(old: Sequence[FaceSign], new: Sequence[FaceSign]) -> list[float]:
    """Return by how much the part may have grown: by its whole area, then by what most of its larger faces say."""
    total = float(np.sqrt(sum(s.area_mm2 for s in new) / sum(s.area_mm2 for s in old)))
    large = [sorted(signs, key=lambda s: -s.area_mm2)[:12] for signs in (old, new)]
    ratios = [
        float(np.sqrt(b.area_mm2 / a.area_mm2))
        for a in large[0]
        for b in large[1]
        if (a.kind, a.side) == (b.kind, b.side)
    ]
    votes = Counter(round(r, 5) for r in ratios)
    likely = [r for r, count in sorted(votes.items(), key=lambda v: (-v[1], v[0])) if count >= FEWEST][:2]
    exact = [float(np.median([r for r in ratios if abs(r - rough) <= 1e-5])) for rough in likely]
    return [f for f in (total, *exact) if 0.2 < f < 5.0 and abs(f - 1.0) > 2e-5]


def _refuse_mirror(old: Faces, new: Faces, found: _Fit | None) -> None:
    """Raise a PartError if the new part is the mirror image of the old one, and no rigid motion does as well."""
    if found is not None and (found.share >= WHOLE or found.motion is STAY):
        return
    mirror = _rigid(Faces.of([s.mirrored() for s in old.signs]), new, SAME_PLACE)
    share = 0.0 if found is None else found.share
    if mirror is not None and mirror.share >= WHOLE and mirror.share > share + 0.001:
        raise PartError(
            f"the new part is the mirror image of the old one: {mirror.met} of {len(old.signs)} faces lie on each "
            "other after mirroring, and no tool for one molds the other",
            remedy="check which of the two parts was exported; for the other hand, build a tool of its own",
        )


def _overlap(old: PartSigns, new: PartSigns) -> float:
    low, high = (np.array([part.body.box[k] for part in (old, new)]) for k in (0, 1))
    common = float(np.prod(np.maximum(high.min(axis=0) - low.max(axis=0), 0.0)))
    each = np.prod(high - low, axis=1)
    return common / max(float(each.sum()) - common, 1e-300)


def _nothing_fits(found: _Fit | None) -> PartError:
    share, met = (0.0, 0) if found is None else (found.share, found.met)
    return PartError(
        f"the new part cannot be laid onto the old one: the best rigid motion brings {met} faces onto each other, "
        f"{100 * share:.0f} % of all by the root of their areas, less than the {100 * ENOUGH:.0f} % (and {FEWEST} "
        f"faces) that would be believed; tried as drawn, moved and turned within {TOLERANCES[0]:g} and "
        f"{TOLERANCES[1]:g} mm, larger and smaller, and mirrored",
        remedy="check that both are versions of one part; a part that was redrawn must lie where the old one lay",
    )


def _told(old: PartSigns, new: PartSigns, fit: _Fit) -> Alignment:
    rotation, shift = fit.motion.rotation, fit.motion.shift
    a, b, c = (vector(row) for row in rotation)
    bare = Alignment((a, b, c), vector(shift), "", 0, 0, fit.residual, fit.scale)
    placed = placed_signs(old, bare)
    matched = sum(len(s.faces) for s, p in zip(old.signs, placed, strict=True) if _lies_on(p, new.signs))
    count = len(old.body.faces)
    note = f"; {fit.note}" if fit.note else ""
    tolerance = f" within {fit.tolerance:g} mm"
    how = f"{_moved_how(fit.motion)}: {matched} of {count} faces lie on the new part's{tolerance}{note}"
    return replace(bare, how=how, matched=matched, faces=count)


def placed_signs(old: PartSigns, alignment: Alignment) -> tuple[FaceSign, ...]:
    """Return the signs of the old part where it lies in the new part's coordinates, grown if the whole part was."""
    rotation, shift = grown_motion(old, alignment)
    return tuple(s.scaled(alignment.scale).placed(rotation, shift) for s in old.signs)


def grown_motion(old: PartSigns, alignment: Alignment) -> tuple[Rows, Vector]:
    """Return rotation and shift of the old part after it was grown about the origin; without growth, the alignment's.

    It was laid middle on middle, unless it was scaled about the origin: then there is no shift.
    """
    rotation, shift = np.array(alignment.rotation), np.array(alignment.translation)
    if alignment.scale != 1.0 and float(np.linalg.norm(shift)) > SAME_PLACE:
        shift = shift + (1.0 - alignment.scale) * rotation @ Faces.of(old.signs).corners.mean(axis=0)
    return alignment.rotation, vector(shift)


def _lies_on(sign: FaceSign, signs: Sequence[FaceSign]) -> bool:
    return any(on_same_surface(sign, other) for other in signs)


def _moved_how(motion: Motion) -> str:
    if motion is STAY:
        return "as drawn"
    by = ", ".join(f"{v + 0.0:.3f}" for v in np.round(motion.shift, 3))
    angle, axis = turn_of(motion.rotation)
    if angle * 180.0 / np.pi < 1e-6:
        return f"moved by {by} mm"
    about = ", ".join(f"{v + 0.0:.3f}" for v in np.round(axis, 3))
    return f"turned by {np.degrees(angle):.3f} deg about {about} and moved by {by} mm"


def turn_of(rotation: np.ndarray) -> tuple[float, np.ndarray]:
    """Return the angle [rad], 0 to pi, and the unit axis (3,) of a rotation."""
    skew = np.array([rotation[2, 1] - rotation[1, 2], rotation[0, 2] - rotation[2, 0], rotation[1, 0] - rotation[0, 1]])
    sine, cosine = 0.5 * float(np.linalg.norm(skew)), 0.5 * (float(np.trace(rotation)) - 1.0)
    angle = float(np.arctan2(sine, cosine))
    if sine > 1e-6:
        return angle, skew / np.linalg.norm(skew)
    if cosine > 0.0:
        return angle, np.array([0.0, 0.0, 1.0])
    both = 0.5 * (rotation + np.eye(3))
    column = both[:, int(np.argmax(np.diag(both)))]
    axis = column / np.linalg.norm(column)
    return angle, axis if axis[np.flatnonzero(np.abs(axis) > 1e-9)[0]] > 0.0 else -axis
