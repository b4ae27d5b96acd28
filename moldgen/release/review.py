"""The release review: what `moldgen check` tells about a part before any steel is made."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from moldgen.finding import Finding, Notes, Point, Severity
from moldgen.kernel.body import Body
from moldgen.model.part import MoldFrame
from moldgen.release.draft import FaceDraft, Half, draft_findings, draft_table
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.release.place import face_at, face_place, part_point
from moldgen.release.trapped import Grip, Trapped, TrapPiece


@dataclass(frozen=True)
class KindCount:
    """How many faces look one way, and their area."""

    kind: str
    count: int
    area_mm2: float


@dataclass(frozen=True)
class TrappedFace:
    """A face that a trapped piece touches; `at` is a point on the face, in part coordinates [mm]."""

    surface: str
    area_mm2: float
    at: Point


@dataclass(frozen=True)
class TrappedPlace:
    """One trapped piece in plain numbers; `at` is on the trapped face, in part coordinates [mm]."""

    grip: Grip
    at: Point
    area_mm2: float
    depth_mm: float
    height_mm: float
    thickness_mm: float
    volume_mm3: float
    faces: tuple[TrappedFace, ...]


@dataclass(frozen=True)
class DraftSummary:
    """Draft of the part against what is asked for. `rows` has every face, points in part coordinates."""

    required_deg: float
    least_deg: float
    faces_below: int
    area_below_mm2: float
    rows: tuple[FaceDraft, ...]


@dataclass(frozen=True)
class ReleaseReview:
    """How the part leaves the steel along its pull."""

    faces: tuple[KindCount, ...]
    halves: tuple[KindCount, ...]
    draft: DraftSummary
    trapped: tuple[TrappedPlace, ...]

    @property
    def releases(self) -> bool:
        """True when two halves are enough: no undercut is left (rubs are)."""
        return all(t.grip is Grip.RUB for t in self.trapped)


def review_release(
    body: Body,
    kinds: FaceKinds,
    trapped: Trapped,
    required_deg: float,
    *,
    contact: np.ndarray | None = None,
    frame: MoldFrame | None = None,
) -> tuple[ReleaseReview, Notes]:
    """Return the review of a body that stands in the mold frame, and its findings with points in part coordinates.

    Parameters
    ----------
    kinds, trapped, contact : what `face_kinds`, `trapped_volume` and `vertical_contact` found on this body
    required_deg : draft asked for, texture allowance included
    frame : how part points became mold points; None if the body stands in its own coordinates
    """
    rows = tuple(_in_part(row, frame) for row in draft_table(body, kinds, required_deg, contact))
    short = draft_findings(rows, required_deg)
    places = tuple(_trapped_place(body, piece, frame) for piece in trapped.pieces)
    review = ReleaseReview(
        faces=_by_kind(body, kinds),
        halves=_by_half(rows),
        draft=DraftSummary(
            required_deg,
            min((row.least_deg for row in rows), default=90.0),
            len(short),
            sum(row.below_mm2 for row in rows),
            rows,
        ),
        trapped=places,
    )
    return review, Notes(trapped_findings(body, trapped, frame) + short)


def trapped_findings(body: Body, trapped: Trapped, frame: MoldFrame | None = None) -> tuple[Finding, ...]:
    """Return one finding for each trapped piece, points in part coordinates: undercuts fail, rubs are cautions."""
    return tuple(_trapped_finding(body, piece, frame) for piece in trapped.pieces)


def _trapped_finding(body: Body, piece: TrapPiece, frame: MoldFrame | None) -> Finding:
    at = part_point(piece.at, frame)
    surface = face_at(body.surface_kind(piece.face) if piece.face >= 0 else "inner", at)
    size = f"{piece.area_mm2:.3g} mm2 of plastic, {piece.depth_mm:.3g} mm deep, {piece.height_mm:.3g} mm high"
    if piece.grip is Grip.RUB:
        return Finding(
            "release.rub",
            Severity.CAUTION,
            f"steel rubs on opening: {size}, {piece.thickness_mm:.2g} mm thick",
            where=surface,
            at=at,
            value=piece.thickness_mm,
            limit=0.0,
            unit="mm",
            remedy="give the wall draft, or accept a drag mark",
        )
    return Finding(
        "release.trapped",
        Severity.FAILURE,
        f"plastic holds the steel: {size}",
        where=surface,
        at=at,
        value=piece.area_mm2,
        limit=0.0,
        unit="mm2",
        remedy="change the part so that steel can leave along the pull, or pull another way",
    )


def _trapped_place(body: Body, piece: TrapPiece, frame: MoldFrame | None) -> TrappedPlace:
    faces = tuple(
        TrappedFace(body.surface_kind(number), area, face_place(body, number, frame)[0]) for number, area in piece.faces
    )
    return TrappedPlace(
        piece.grip,
        part_point(piece.at, frame),
        piece.area_mm2,
        piece.depth_mm,
        piece.height_mm,
        piece.thickness_mm,
        piece.volume_mm3,
        faces,
    )


def _in_part(row: FaceDraft, frame: MoldFrame | None) -> FaceDraft:
    return row if frame is None else replace(row, at=part_point(row.at, frame))


def _by_kind(body: Body, kinds: FaceKinds) -> tuple[KindCount, ...]:
    return tuple(
        KindCount(k.name.lower(), int((kinds.kind == k).sum()), float(body.face_areas[kinds.kind == k].sum()))
        for k in Kind
    )


def _by_half(rows: tuple[FaceDraft, ...]) -> tuple[KindCount, ...]:
    return tuple(
        KindCount(half.value, sum(r.half is half for r in rows), sum(r.area_mm2 for r in rows if r.half is half))
        for half in Half
    )
