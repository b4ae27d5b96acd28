"""`moldgen check`: the part against its pull, as tables and as a manifest; no steel."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from moldgen.canon import to_json
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import JobResult, Table, verdict_code
from moldgen.flow.record import notes_record, review_record
from moldgen.flow.review import Reviewed, review
from moldgen.flow.stages import Stages
from moldgen.flow.words import point_text, spec_direction
from moldgen.spec.declared import located_notes, without_folder
from moldgen.spec.load import LoadedSpec

MOST_ROWS = 20
"""Rows of a table on the terminal; the manifest has all of them."""

MOST_PULLS = 5
"""Pulls on the terminal; the manifest has the others, with the reasons."""


def check_part(loaded: LoadedSpec, folder: Path, stages: Stages) -> JobResult:
    """Review the part and write the manifest of the review into `folder`."""
    reviewed = review(loaded, stages)
    reviewed = replace(reviewed, notes=located_notes(reviewed.notes, loaded))
    record = {**review_record(reviewed), **notes_record(without_folder(reviewed.notes, loaded))}
    (folder / MANIFEST).write_text(to_json(record), encoding="utf-8")
    code = verdict_code(reviewed.notes.findings)
    undercuts = len(reviewed.prepared.trapped.undercuts)
    verdict = f"{undercuts} undercuts hold it" if undercuts else "a straight pull releases it"
    return JobResult(
        exit_code=code,
        headline=f"{reviewed.part.name}: {verdict}",
        tables=review_tables(reviewed),
        findings=reviewed.notes.findings,
        decisions=reviewed.notes.decisions,
    )


def review_tables(reviewed: Reviewed) -> tuple[Table, ...]:
    """Return the tables of the review: pull candidates, faces by direction, draft, trapped space."""
    return tuple(t for t in (_pulls(reviewed), _faces(reviewed), _draft(reviewed), _trapped(reviewed)) if t.rows)


def _pulls(reviewed: Reviewed) -> Table:
    rows = tuple(
        (
            spec_direction(c.direction),
            c.source,
            round(c.score, 3),
            round(100.0 * c.trapped_share, 2),
            c.side_actions,
            round(c.unreleased_mm2, 1),
            round(c.unevenness_mm, 2),
            round(c.level_mm, 2),
            round(c.depth_mm, 1),
            round(c.projected_mm2 / 100, 2),
        )
        for c in reviewed.candidates[:MOST_PULLS]
    )
    reach = ("pull:", "from", "score", "out of reach [%]", "side actions", "not freed [mm2]")
    columns = (*reach, "uneven line [mm]", "line at [mm]", "depth [mm]", "projected [cm2]")
    return Table("pulls tried, best first (side actions and what they do not free: estimates)", columns, rows)


def _faces(reviewed: Reviewed) -> Table:
    rows = tuple((c.kind, c.count, round(c.area_mm2, 2)) for c in reviewed.release.faces if c.count)
    return Table("faces against the pull", ("looks", "faces", "area [mm2]"), rows)


def _draft(reviewed: Reviewed) -> Table:
    summary = reviewed.release.draft
    short = [r for r in summary.rows if r.below_mm2 > 0 and r.mean_deg < summary.required_deg - 1e-3]
    short.sort(key=lambda r: (-round(r.area_mm2, 3), r.face))
    rows = tuple(
        (
            point_text(r.at, 2),
            r.surface,
            r.half.value,
            round(r.least_deg, 3),
            round(summary.required_deg, 3),
            round(r.area_mm2, 2),
        )
        for r in short[:MOST_ROWS]
    )
    more = f" (largest {MOST_ROWS} of {len(short)})" if len(short) > MOST_ROWS else ""
    columns = ("face at", "surface", "formed by", "draft [deg]", "asked [deg]", "area [mm2]")
    return Table(f"faces with too little draft{more}", columns, rows)


def _trapped(reviewed: Reviewed) -> Table:
    rows = tuple(
        (
            point_text(p.at, 2),
            p.grip.value,
            len(p.faces),
            round(p.area_mm2, 2),
            round(p.depth_mm, 2),
            round(p.thickness_mm, 3),
            round(p.volume_mm3, 3),
        )
        for p in reviewed.release.trapped[:MOST_ROWS]
    )
    columns = ("face at", "grip", "faces", "area [mm2]", "depth [mm]", "thickness [mm]", "volume [mm3]")
    return Table("trapped space", columns, rows)
