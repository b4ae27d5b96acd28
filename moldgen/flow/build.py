"""`moldgen build`: the whole way from a spec to a proved tool, stage by stage."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from moldgen.canon import to_json
from moldgen.errors import PartError, SpecError
from moldgen.finding import Finding, Notes, Severity
from moldgen.flow.build_tables import build_tables
from moldgen.flow.export import export_tool, exported_volumes, reread_bodies
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import JobResult, Options, verdict_code
from moldgen.flow.lay_out import lay_out, marked_points
from moldgen.flow.prepare import Prepared, ready
from moldgen.flow.prove import proof_findings
from moldgen.flow.record import component_files, component_record, file_record, notes_record, review_record
from moldgen.flow.review import Reviewed, refuse_undercuts, review, undercut_error
from moldgen.flow.tell import Tell
from moldgen.flow.words import direction_text
from moldgen.kernel.body import Body
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
from moldgen.spec.sections import Blocks
from moldgen.steel.bored import Materials
from moldgen.steel.make import make_tool
from moldgen.tolerances import ON_PLANE

MOST_FILLED = 0.1
"""Share of the part's volume that may be molded full: filling is for small undercuts (our choice)."""


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
    claims = Claims(float(np.prod(halves.high - halves.low)), bored.total_mm3, layout.stroke_mm, tool.steps)
    built = Built(reviewed, halves, layout, tool, claims, _accepted(reviewed) + notes)
    with tell.stage("export") as stage:
        export_tool(tool, folder, loaded.spec.output.step)
        stage.detail = "STEP files and tables"
    return _prove_and_record(built, folder, options, tell)


def _accepted(reviewed: Reviewed) -> Notes:
    """Return the notes of the review; undercuts that the spec accepts to be molded full no longer fail the build."""
    if reviewed.loaded.spec.parting.undercuts != "fill":
        return reviewed.notes
    findings = tuple(
        replace(f, severity=Severity.WARNING) if f.code == "release.trapped" else f for f in reviewed.notes.findings
    )
    return replace(reviewed.notes, findings=findings)


def _part_it(reviewed: Reviewed, tell: Tell) -> tuple[Halves, Notes]:
    spec, frame = reviewed.loaded.spec, reviewed.frame
    prepared, notes = reviewed.prepared, Notes()
    if prepared.trapped.pieces and spec.parting.undercuts == "fill":
        with tell.stage("fill the undercuts") as stage:
            prepared, notes = _filled(reviewed)
            stage.detail = f"{len(reviewed.prepared.trapped.pieces)} places"
    else:
        refuse_undercuts(reviewed)
    level = None if spec.parting.height is None else _mold_level(reviewed, spec.parting.height, prepared.body)
    fixed = spec.blocks.cavity_height is not None or spec.blocks.core_height is not None
    # the plane is known only after parting, and given heights count from it: then the blocks are sized twice
    section = spec.blocks
    if fixed and level is None:
        section = section.model_copy(update={"cavity_height": None, "core_height": None})
    corners, more = _blocks(reviewed, prepared, section, level, tell)
    parted = _parted(reviewed, prepared, corners, level, tell)
    if fixed and abs(parted.level - (np.inf if level is None else level)) > ON_PLANE:
        corners, more = _blocks(reviewed, prepared, spec.blocks, parted.level, tell)
        parted = _parted(reviewed, prepared, corners, parted.level, tell)
    return _halves(parted, *corners), notes + more + told(parted, frame)


def _blocks(
    reviewed: Reviewed, prepared: Prepared, section: Blocks, level: float | None, tell: Tell
) -> tuple[tuple[np.ndarray, np.ndarray], Notes]:
    with tell.stage("size the blocks") as stage:
        blocks, notes = size_blocks(prepared.body, reviewed.resin, section, level)
        low, high = np.asarray(blocks.low), np.asarray(blocks.high)
        stage.detail = " x ".join(f"{v:.0f}" for v in high - low) + " mm"
    return (low, high), notes


def _parted(
    reviewed: Reviewed,
    prepared: Prepared,
    corners: tuple[np.ndarray, np.ndarray],
    level: float | None,
    tell: Tell,
) -> Parted:
    with tell.stage("part the mold") as stage:
        avoid = marked_points(reviewed, "no_parting_line")
        part = prepared.trapped.part
        try:
            parted = part_halves(prepared.body, prepared.kinds, part, corners, level=level, avoid=avoid)
        except PartError as error:
            if prepared.trapped.pieces:  # rubs: thin, but they can keep the halves from closing around the part
                remedy = "taper these faces along the pull, or accept them filled with parting.undercuts: fill"
                raise undercut_error(reviewed, remedy, error.what) from error
            raise
        stage.detail = f"{len(parted.loops)} loops, {parted.sheet.outer.rung}"
    return parted


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
    gained = sum(p.volume_mm3 for p in before.trapped.pieces)
    share = gained / float(before.trapped.part.volume())
    remedy = "fill these places in the part, change them so that they taper along the pull, or give another pull"
    if share > MOST_FILLED:
        limit = f"{100 * share:.0f} % of the part's volume, more than the {100 * MOST_FILLED:.0f} % that makes sense"
        raise undercut_error(reviewed, remedy, f"they cannot be molded full: together they are {limit}")
    try:
        body, notes = fill_trapped(before.body, before.kinds, before.trapped.pieces, reviewed.frame)
    except PartError as error:
        why = f"{error.where}: {error.what}".removeprefix(": ")
        raise undercut_error(reviewed, remedy, f"they cannot be molded full: {why}") from error
    body, more = ready(body, reviewed.frame)
    kinds = face_kinds(body)
    trapped = trapped_volume(body, kinds)
    if trapped.undercuts:
        left = sum(p.volume_mm3 for p in trapped.undercuts)
        why = f"filled, {len(trapped.undercuts)} places of {left:.3f} mm^3 stay trapped"
        raise undercut_error(reviewed, remedy, f"they cannot be molded full: {why}")
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
    return Prepared(body, kinds, trapped), notes + more + Notes((finding,))


def _mold_level(reviewed: Reviewed, height: float, body: Body) -> float:
    """Return the mold z of a part coordinate along the pull, which must lie on the part."""
    base, unit = (reviewed.frame.to_mold(tuple(c * h for c in reviewed.pull.direction))[2] for h in (0.0, 1.0))  # type: ignore[arg-type]
    low, high = ((float(corner[2]) - base) / (unit - base) for corner in body.box)
    if not low - ON_PLANE <= height <= high + ON_PLANE:
        raise SpecError(
            f"the parting height {height:g} mm does not lie on the part, which reaches from {low:g} to {high:g} mm "
            "along the pull",
            where=reviewed.loaded.locate("parting.height"),
            remedy="give a height between these, or leave it out",
        )
    return base + height * (unit - base)


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
    record = {**_record(built, notes, proofs, exported_volumes(built.tool, bodies)), "files": file_record(folder)}
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
