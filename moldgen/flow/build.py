"""`moldgen build`: the whole way from a spec to a proved tool, stage by stage."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from moldgen.canon import to_json
from moldgen.finding import Finding, Notes, Severity
from moldgen.flow.export import export_tool, reread_bodies
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import JobResult, Options, Table, verdict_code
from moldgen.flow.lay_out import lay_out, marked_points
from moldgen.flow.prepare import Prepared, ready
from moldgen.flow.prove import proof_findings
from moldgen.flow.record import component_files, component_record, file_record, notes_record, review_record
from moldgen.flow.review import Reviewed, refuse_undercuts, review
from moldgen.flow.tell import Tell
from moldgen.kernel.measure import volume
from moldgen.layout.blocks import size_blocks
from moldgen.model.halves import Halves
from moldgen.model.layout import Layout
from moldgen.model.proof import Proof
from moldgen.model.tool import Tool
from moldgen.output.pictures import PictureJob, start_pictures
from moldgen.output.tool_scene import tool_scene
from moldgen.parting.fill import fill_trapped
from moldgen.parting.halves import Parted, part_halves
from moldgen.parting.told import parting_line, told
from moldgen.proof.run import Claims, prove_tool
from moldgen.release.kinds import face_kinds
from moldgen.release.trapped import trapped_volume
from moldgen.spec.load import LoadedSpec
from moldgen.steel.bored import Materials
from moldgen.steel.make import make_tool


@dataclass(frozen=True)
class Built:
    """The tool with everything that was known on the way to it."""

    reviewed: Reviewed
    halves: Halves
    layout: Layout
    tool: Tool
    claims: Claims
    notes: Notes


def build_tool(loaded: LoadedSpec, folder: Path, options: Options, tell: Tell) -> JobResult:
    """Build, export and prove the tool of a spec into `folder`.

    Raises
    ------
    PartError : the part cannot be molded as asked; SpecError, KernelError : see the stages
    """
    reviewed = review(loaded, tell)
    halves, notes = _part_it(reviewed, tell)
    with tell.stage("lay out pins and gate") as stage:
        layout, more = lay_out(reviewed, halves)
        notes += more
        stage.detail = (
            f"{len(layout.ejector_pins)} ejector pins, {len(layout.core_pins)} core pins, {layout.gate.kind} gate"
        )
    with tell.stage("cut the steel") as stage:
        tool, bored, more = make_tool(halves, layout, _materials(reviewed))
        notes += more
        stage.detail = f"{len(tool.components)} components"
    claims = Claims(float(np.prod(halves.high - halves.low)), bored.total_mm3, layout.stroke_mm)
    built = Built(reviewed, halves, layout, tool, claims, reviewed.notes + notes)
    with tell.stage("export") as stage:
        export_tool(tool, folder, loaded.spec.output.step)
        stage.detail = "STEP files and tables"
    return _prove_and_record(built, folder, options, tell)


def _part_it(reviewed: Reviewed, tell: Tell) -> tuple[Halves, Notes]:
    spec, frame = reviewed.loaded.spec, reviewed.frame
    prepared, notes = reviewed.prepared, Notes()
    if prepared.trapped.pieces and spec.parting.undercuts == "fill":
        with tell.stage("fill the undercuts") as stage:
            prepared, notes = _filled(reviewed)
            stage.detail = f"{len(reviewed.prepared.trapped.pieces)} places"
    else:
        refuse_undercuts(reviewed)
    with tell.stage("size the blocks") as stage:
        blocks, more = size_blocks(prepared.body, reviewed.resin, spec.blocks)
        notes += more
        low, high = np.asarray(blocks.low), np.asarray(blocks.high)
        stage.detail = " x ".join(f"{v:.0f}" for v in high - low) + " mm"
    with tell.stage("part the mold") as stage:
        avoid = marked_points(reviewed, "no_parting_line")
        level = None if spec.parting.height is None else _mold_level(reviewed, spec.parting.height)
        parted = part_halves(
            prepared.body, prepared.kinds, prepared.trapped.part, (low, high), level=level, avoid=avoid
        )
        notes += told(parted, frame)
        stage.detail = f"{len(parted.loops)} loops, {parted.sheet.outer.rung}"
    return _halves(parted, low, high), notes


def _halves(parted: Parted, low: np.ndarray, high: np.ndarray) -> Halves:
    return Halves(
        cavity=parted.cavity,
        core=parted.core,
        body=parted.body,
        cavity_side=parted.sides.cavity,
        level=parted.level,
        low=low,
        high=high,
        parting_line=parting_line(parted),
    )


def _filled(reviewed: Reviewed) -> tuple[Prepared, Notes]:
    before = reviewed.prepared
    body, notes = fill_trapped(before.body, before.kinds, before.trapped, reviewed.frame)
    body, more = ready(body, reviewed.frame)
    kinds = face_kinds(body)
    gained = sum(p.volume_mm3 for p in before.trapped.pieces)
    finding = Finding(
        code="release.filled",
        severity=Severity.WARNING,
        message=f"{len(before.trapped.pieces)} trapped places are molded full: the molded part has "
        f"{gained:.3f} mm^3 more than the drawn one",
        where=reviewed.loaded.locate("parting.undercuts"),
        value=gained,
        limit=0.0,
        unit="mm^3",
        remedy="machine these places after molding, change the part, or plan side actions",
    )
    return Prepared(body, kinds, trapped_volume(body, kinds)), notes + more + Notes((finding,))


def _mold_level(reviewed: Reviewed, height: float) -> float:
    """Return the mold z of a part coordinate along the pull."""
    x, y, z = (c * height for c in reviewed.pull.direction)
    return reviewed.frame.to_mold((x, y, z))[2]


def _materials(reviewed: Reviewed) -> Materials:
    blocks = reviewed.loaded.spec.blocks
    return Materials(
        part=reviewed.resin.name,
        cavity=blocks.cavity_material or blocks.material,
        core=blocks.core_material or blocks.material,
    )


def _prove_and_record(built: Built, folder: Path, options: Options, tell: Tell) -> JobResult:
    """Prove the exported files while the pictures are drawn in a process of their own, then write the manifest."""
    pictures = _start_pictures(built, folder, options)
    try:
        with tell.stage("prove the tool") as stage:
            proofs = prove_tool(reread_bodies(built.tool, folder), built.claims)
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
    record = {**_record(built, notes, proofs), "files": file_record(folder)}
    (folder / MANIFEST).write_text(to_json(record), encoding="utf-8")
    return _result(built, notes, proofs)


def _start_pictures(built: Built, folder: Path, options: Options) -> PictureJob | None:
    if not (options.pictures and built.reviewed.loaded.spec.output.pictures):
        return None
    reviewed = built.reviewed
    pull = ", ".join(f"{v + 0.0:g}" for v in reviewed.pull.direction)
    title = (reviewed.part.name, reviewed.resin.name, pull)
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


def _record(built: Built, notes: Notes, proofs: tuple[Proof, ...]) -> dict[str, Any]:
    files = component_files(built.tool)
    record = review_record(built.reviewed)
    record["parting"] = {
        "level_mm": built.halves.level,
        "loops": len(built.halves.parting_line),
        "block_mm": [built.halves.low.tolist(), built.halves.high.tolist()],
    }
    record["layout"] = built.layout
    record["components"] = [component_record(c, files[c.name], volume(c.solid)) for c in built.tool.components]
    record["claims"] = built.claims
    return {**record, **notes_record(notes, proofs)}


def _result(built: Built, notes: Notes, proofs: tuple[Proof, ...]) -> JobResult:
    code = verdict_code(notes.findings, proofs)
    proved = "proved" if all(p.passed for p in proofs) else "NOT proved"
    rows = tuple((c.name, c.role.value, len(c.positions), c.material, c.note) for c in built.tool.components)
    return JobResult(
        exit_code=code,
        headline=f"{built.reviewed.part.name}: {len(built.tool.components)} components, {proved}",
        tables=(Table("components", ("name", "role", "quantity", "material", "note"), rows),),
        proofs=proofs,
        findings=notes.findings,
        decisions=notes.decisions,
        first_pass=True,
    )
