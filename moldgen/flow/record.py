"""`manifest.json`: everything that was decided, measured, proved and found, as plain data."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from moldgen import __version__
from moldgen.canon import plain
from moldgen.finding import Notes
from moldgen.flow.report import CAUTIONS, sorted_findings
from moldgen.flow.review import Reviewed
from moldgen.model.proof import Proof
from moldgen.model.tool import Component, Tool
from moldgen.release.kinds import Kind


def review_record(reviewed: Reviewed) -> dict[str, Any]:
    """Return what is known of the part before steel: source, shrink, pull, faces against the pull, draft, traps."""
    part, frame = reviewed.part, reviewed.frame
    low, high = part.bounding_box_mm
    return {
        "moldgen": __version__,
        "spec": {"path": reviewed.loaded.path.name, "sha256": reviewed.loaded.sha256},
        "part": {
            "name": part.name,
            "source_sha256": part.source_sha256,
            "volume_mm3": part.volume_mm3,
            "area_mm2": part.area_mm2,
            "bounding_box_mm": [low, high],
            "faces": part.face_count,
            "healed": part.healed,
        },
        "resin": reviewed.resin.name,
        "shrink": {
            **dict(zip("xyz", frame.factors, strict=True)),
            "rule": f"mold = {'part / (1 - S)' if reviewed.loaded.spec.shrink.convention == 'mold' else 'part * (1 + S)'}",
            "fixed_point_mm": frame.fixed_point,
        },
        "pull": {
            "direction": reviewed.pull.direction,
            "how_chosen": reviewed.pull.how_chosen,
            "part_to_mold_rotation": frame.rotation,
            "candidates": reviewed.candidates[:12],
        },
        "release": _release_record(reviewed),
    }


def _release_record(reviewed: Reviewed) -> dict[str, Any]:
    prepared = reviewed.prepared
    areas = prepared.body.face_areas
    kinds = {
        kind.name.lower(): {
            "faces": int((prepared.kinds.kind == kind).sum()),
            "area_mm2": float(areas[prepared.kinds.kind == kind].sum()),
        }
        for kind in Kind
    }
    trapped = [
        {
            "grip": piece.grip,
            "at": reviewed.frame.to_part(piece.at),
            "area_mm2": piece.area_mm2,
            "depth_mm": piece.depth_mm,
            "height_mm": piece.height_mm,
            "thickness_mm": piece.thickness_mm,
            "volume_mm3": piece.volume_mm3,
            "faces": [
                {"at": reviewed.frame.to_part(_place(prepared.body.face_places[f])), "area_mm2": a}
                for f, a in piece.faces
            ],
        }
        for piece in prepared.trapped.pieces
    ]
    drafts = [{**plain(row), "at": reviewed.frame.to_part(row.at), "half": row.half.value} for row in reviewed.draft]
    return {"faces": kinds, "trapped": trapped, "draft_asked_deg": reviewed.required_draft_deg, "draft": drafts}


def notes_record(notes: Notes, proofs: Sequence[Proof] = ()) -> dict[str, Any]:
    """Return proofs, findings (gravest first), decisions and the calculation sheet."""
    return {
        "proofs": [{**plain(p), "passed": p.passed} for p in proofs],
        "findings": sorted_findings(notes.findings),
        "decisions": notes.decisions,
        "quantities": notes.quantities,
        "cautions": CAUTIONS,
    }


def component_record(component: Component, file: Path, volume_mm3: float) -> dict[str, Any]:
    """Return one component as the manifest lists it."""
    return {
        "name": component.name,
        "role": component.role,
        "file": file,
        "material": component.material,
        "volume_mm3": volume_mm3,
        "position": component.positions[0],
        "positions": component.positions,
        "moves_with": component.motion,
        "note": component.note,
    }


def component_files(tool: Tool) -> dict[str, Path]:
    """Return the file of each component inside the output folder."""
    return {c.name: Path("step") / f"{c.name.replace(' ', '_')}.step" for c in tool.components}


def _place(point: Any) -> tuple[float, float, float]:
    x, y, z = (float(v) for v in point)
    return (x, y, z)
