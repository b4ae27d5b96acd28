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
from moldgen.flow.words import spec_direction
from moldgen.model.proof import Proof
from moldgen.model.tool import Component, Tool


def review_record(reviewed: Reviewed) -> dict[str, Any]:
    """Return what is known of the part before steel: source, shrink, pull, faces against the pull, draft, traps."""
    part, frame = reviewed.part, reviewed.frame
    of_mold = reviewed.loaded.spec.shrink.convention == "mold"
    return {
        "moldgen": __version__,
        "spec": {"path": reviewed.loaded.path.name, "sha256": reviewed.loaded.sha256},
        "part": {
            "name": part.name,
            "source_sha256": part.source_sha256,
            "volume_mm3": part.volume_mm3,
            "area_mm2": part.area_mm2,
            "bounding_box_mm": part.bounding_box_mm,
            "faces": part.face_count,
            "healed": part.healed,
        },
        "resin": reviewed.resin.name,
        "shrink": {
            **dict(zip("xyz", frame.factors, strict=True)),
            "rule": f"mold = {'part / (1 - S)' if of_mold else 'part * (1 + S)'}",
            "fixed_point_mm": frame.fixed_point,
        },
        "pull": {
            "direction": reviewed.pull.direction,
            "how_chosen": reviewed.pull.how_chosen,
            "part_to_mold_rotation": frame.rotation,
            "candidates": [
                {"write_as": f"pull: {spec_direction(c.direction)}", **plain(c)} for c in reviewed.candidates
            ],
        },
        "release": reviewed.release,
    }


def notes_record(notes: Notes, proofs: Sequence[Proof] = ()) -> dict[str, Any]:
    """Return proofs, findings (gravest first), decisions and the calculation sheet."""
    return {
        "proofs": [{**plain(p), "passed": p.passed} for p in proofs],
        "findings": sorted_findings(notes.findings),
        "decisions": notes.decisions,
        "quantities": notes.quantities,
        "cautions": CAUTIONS,
        "timings_s": {},  # stage times differ on every run: they go to the terminal and to --json
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
