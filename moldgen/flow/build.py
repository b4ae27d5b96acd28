"""`moldgen build`: the whole way from a spec to a proved tool, stage by stage."""

from __future__ import annotations

import shutil
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from moldgen.canon import to_json
from moldgen.errors import KernelError, PartError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.flow.build_tables import build_tables
from moldgen.flow.export import export_tool, exported_volumes, file_record, reread_bodies
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import JobResult, Options, verdict_code
from moldgen.flow.lay_out import lay_out
from moldgen.flow.part_mold import part_mold
from moldgen.flow.prove import proof_findings
from moldgen.flow.record import component_files, component_record, notes_record, review_record
from moldgen.flow.review import Reviewed, open_part, review_along
from moldgen.flow.side_steel import make_sides
from moldgen.flow.tell import Tell
from moldgen.flow.words import direction_text
from moldgen.kernel.beside import Beside
from moldgen.layout.side_drive import is_level
from moldgen.model.halves import Halves
from moldgen.model.layout import Layout
from moldgen.model.proof import Proof
from moldgen.model.side_action import SideKind
from moldgen.model.tool import Tool
from moldgen.output.pictures import PictureJob, start_pictures
from moldgen.output.tool_scene import tool_scene
from moldgen.proof.run import Claims, prove_tool
from moldgen.spec.load import LoadedSpec
from moldgen.steel.bored import Materials
from moldgen.steel.make import make_tool
from moldgen.steel.side_motion import opening_steps


@dataclass(frozen=True)
class Built:
    """The tool with everything that was known on the way to it."""

    reviewed: Reviewed
    halves: Halves
    layout: Layout
    tool: Tool
    claims: Claims
    notes: Notes


MOST_PULLS = 4
"""How many pulls of an automatic choice are tried before the part is refused (our choice: each takes seconds)."""

ASIDE = ".first"
"""Folder inside the output for the files of a tool that was built but not proved, while another pull is tried."""


def build_tool(loaded: LoadedSpec, folder: Path, options: Options, tell: Tell) -> JobResult:
    """Build, export and prove the tool of a spec into `folder`.

    Where the pull is auto, the next pull is tried when one gives no tool or none that is proved. If none is proved, the
    first tool stands; if none gives a tool, the best pull's refusal.

    Raises
    ------
    PartError : the part cannot be molded as asked; SpecError, KernelError : see the stages
    """
    source = open_part(loaded, tell)
    errors: list[PartError | KernelError] = []
    refused: list[str] = []
    first: JobResult | None = None
    for number, pull in enumerate(source.pulls[:MOST_PULLS]):
        try:
            built = _built_along(review_along(loaded, source, number, tell, tuple(refused)), tell)
            result = _written(built, folder, options, tell)
        except (PartError, KernelError) as error:
            errors.append(error)
            short = error.what.split("\n")[0].rstrip(":")
            refused.append(f"{direction_text(pull.direction)}: {short}")
            _empty(folder)
            continue
        if all(p.passed for p in result.proofs) or len(source.pulls) == 1:
            shutil.rmtree(folder / ASIDE, ignore_errors=True)
            return result
        failed = ", ".join(p.name for p in result.proofs if not p.passed)
        refused.append(f"{direction_text(pull.direction)}: a tool, but not proved: {failed}")
        if first is None:
            first = result
            _set_aside(folder)
        _empty(folder)
    if first is not None:
        _bring_back(folder)
        return first
    if len(refused) > 1:
        errors[0].what += "\n  other pulls that were tried:\n    " + "\n    ".join(refused[1:])
    raise errors[0]


def _empty(folder: Path) -> None:
    """Delete what is in a folder, except what was set aside."""
    for path in folder.iterdir():
        if path.name == ASIDE:
            continue
        if path.is_dir():
            shutil.rmtree(path)
        else:
            path.unlink()


def _set_aside(folder: Path) -> None:
    found = sorted(folder.iterdir())
    (folder / ASIDE).mkdir()
    for path in found:
        path.rename(folder / ASIDE / path.name)


def _bring_back(folder: Path) -> None:
    _empty(folder)
    for path in sorted((folder / ASIDE).iterdir()):
        path.rename(folder / path.name)
    (folder / ASIDE).rmdir()


def _written(built: Built, folder: Path, options: Options, tell: Tell) -> JobResult:
    with tell.stage("export") as stage:
        files = export_tool(built.tool, folder, built.reviewed.loaded.spec.output.step)
        stage.detail = "STEP files and tables"
    try:
        return _prove_and_record(built, files, folder, options, tell)
    finally:
        files.stop()


def _built_along(reviewed: Reviewed, tell: Tell) -> Built:
    formed, notes = part_mold(reviewed, tell)
    section = reviewed.loaded.spec.ejection
    try:
        sides, side_layout, more = make_sides(formed, reviewed.resin, section, tell)
    except PartError as error:
        if all(is_level(d.front) or d.front.kind is SideKind.LIFTER for d in formed.driven):
            raise
        # a slide that leaves at an angle finds no way out of the block: what it was to form is left to other means
        formed, notes = part_mold(reviewed, tell, inclined=False)
        notes += Notes(decisions=(Decision("side actions", "none that leave at an angle", error.what, error.where),))
        sides, side_layout, more = make_sides(formed, reviewed.resin, section, tell)
    halves, notes = sides.halves, notes + more
    with tell.stage("lay out pins and gate") as stage:
        layout, more = lay_out(reviewed, halves, side_layout)
        notes += more
        stage.detail = (
            f"{len(layout.ejector_pins)} ejector pins, {len(layout.core_pins)} core pins, {layout.gate.kind} gate"
        )
    with tell.stage("cut the steel") as stage:
        tool, bored, more = make_tool(halves, layout, _materials(reviewed), sides)
        notes += more
        depth = float(halves.high[2] - halves.low[2])
        stroke = layout.stroke_mm
        tool = replace(tool, steps=opening_steps(side_layout, 2.0 * depth + stroke, stroke, depth))
        stage.detail = f"{len(tool.components)} components"
    claims = Claims(float(np.prod(halves.high - halves.low)), bored.total_mm3, layout.stroke_mm, tool.steps)
    return Built(reviewed, halves, layout, tool, claims, _accepted(reviewed, halves) + notes)


def _accepted(reviewed: Reviewed, halves: Halves) -> Notes:
    """Return the notes of the review; undercuts that side actions form, or that are molded full, fail no longer."""

    def settled(finding: Finding) -> Finding:
        if finding.code != "release.trapped":
            return finding
        if halves.sides:
            return replace(finding, severity=Severity.NOTE, remedy="nothing: a side action forms it, see the decisions")
        return replace(finding, severity=Severity.WARNING)

    return replace(reviewed.notes, findings=tuple(settled(f) for f in reviewed.notes.findings))


def _materials(reviewed: Reviewed) -> Materials:
    blocks = reviewed.loaded.spec.blocks
    return Materials(
        part=reviewed.resin.name,
        cavity=blocks.cavity_material or blocks.material,
        core=blocks.core_material or blocks.material,
    )


def _prove_and_record(built: Built, files: Beside[None], folder: Path, options: Options, tell: Tell) -> JobResult:
    """Prove the exported files while the pictures are drawn in a process of their own, then write the manifest."""
    pictures = _start_pictures(built, folder, options)
    try:
        with tell.stage("prove the tool") as stage:
            bodies = reread_bodies(built.tool, folder)
            proofs = prove_tool(bodies, built.claims)
            stage.detail = f"{sum(p.passed for p in proofs)} of {len(proofs)} passed"
        notes = built.notes + Notes(proof_findings(proofs))
        if pictures is not None:
            with tell.stage("draw the pictures") as stage:
                missing = _missing(pictures)
                notes += Notes(missing)
                stage.detail = "none: see the findings" if missing else "done"
    finally:
        if pictures is not None:
            pictures.stop()
    files.result()
    record = {
        **_record(built, notes, proofs, exported_volumes(built.tool, bodies)),
        "files": file_record(built.tool, folder),
    }
    (folder / MANIFEST).write_text(to_json(record), encoding="utf-8")
    return _result(built, notes, proofs)


def _start_pictures(built: Built, folder: Path, options: Options) -> PictureJob | None:
    if not (options.pictures and built.reviewed.loaded.spec.output.pictures):
        return None
    reviewed = built.reviewed
    title = (reviewed.part.name, reviewed.resin.name, direction_text(reviewed.pull.direction))
    scene = tool_scene(built.tool, built.halves, title, built.layout.gate.at, built.layout.stroke_mm)
    (folder / "pictures").mkdir()
    return start_pictures(scene, folder / "pictures")


def _missing(pictures: PictureJob) -> tuple[Finding, ...]:
    result = pictures.finish()
    if not result.missing:
        return ()
    return (
        Finding(
            code="pictures.missing",
            severity=Severity.CAUTION,
            message=f"pictures were not drawn: {result.missing}",
            where="pictures",
            remedy="the tool itself is complete",
        ),
    )


def _record(built: Built, notes: Notes, proofs: tuple[Proof, ...], volumes: dict[str, float]) -> dict[str, Any]:
    files = component_files(built.tool)
    record = review_record(built.reviewed)
    record["parting"] = {
        "level_mm": built.halves.level,
        "loops": len(built.halves.parting_line),
        "block_mm": [built.halves.low.tolist(), built.halves.high.tolist()],
        "least_shut_off_deg": min((c.least_deg for c in built.halves.contacts), default=None),
        "contacts": built.halves.contacts,
    }
    record["layout"] = built.layout
    record["components"] = [component_record(c, files[c.name], volumes[c.name]) for c in built.tool.components]
    record["claims"] = built.claims
    return {**record, **notes_record(notes, proofs)}


def _result(built: Built, notes: Notes, proofs: tuple[Proof, ...]) -> JobResult:
    code = verdict_code(notes.findings, proofs)
    proved = "proved" if all(p.passed for p in proofs) else "NOT proved"
    return JobResult(
        exit_code=code,
        headline=f"{built.reviewed.part.name}: {len(built.tool.components)} components, {proved}",
        tables=build_tables(built.tool, built.layout),
        proofs=proofs,
        findings=notes.findings,
        decisions=notes.decisions,
        first_pass=True,
    )
