"""From the tool to its output folder: STEP files and tables, proofs on what was written, pictures, the manifest."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from moldgen.canon import sha256_file, to_json
from moldgen.finding import Finding, Notes, Severity
from moldgen.flow.build_tables import build_tables
from moldgen.flow.export import export_tool, exported_files, exported_volumes, file_record, reread_bodies
from moldgen.flow.folder import MANIFEST
from moldgen.flow.job import JobResult, Options, verdict_code
from moldgen.flow.make_tool import Built
from moldgen.flow.prove import proof_findings
from moldgen.flow.record import component_files, component_record, notes_record, review_record
from moldgen.flow.reread import TOOL_FILE
from moldgen.flow.stages import Asked, Stages
from moldgen.flow.words import direction_text
from moldgen.kernel.beside import Beside
from moldgen.model.proof import Proof
from moldgen.output.pictures import PictureJob, start_pictures
from moldgen.output.tool_scene import tool_scene
from moldgen.proof.run import prove_tool
from moldgen.spec.declared import located_notes, without_folder

PICTURES = "pictures"


def write_tool(built: Built, folder: Path, options: Options, stages: Stages) -> JobResult:
    """Write a tool into a folder, prove what was written, and return what came of it.

    Raises
    ------
    KernelError : the kernel cannot translate the solids, or read them back
    OSError : a file cannot be written
    """
    export = _Export(built, folder, stages)
    pictures = _Pictures(built, folder, options, stages)
    try:
        proofs, volumes = _proved(built, folder, stages)
        notes = built.notes + Notes(proof_findings(proofs)) + pictures.finish()
        export.finish()
    finally:
        export.stop()
        pictures.stop()
    loaded = built.reviewed.loaded
    notes = located_notes(notes, loaded)
    record = {
        **_record(built, without_folder(notes, loaded), proofs, volumes),
        "files": file_record(built.tool, folder),
    }
    (folder / MANIFEST).write_text(to_json(record), encoding="utf-8")
    return _result(built, notes, proofs)


class _Export:
    """STEP files and tables, the components' files written by a process of their own while the tool is proved."""

    def __init__(self, built: Built, folder: Path, stages: Stages) -> None:
        self._built, self._folder = built, folder
        self._files: Beside[None] | None = None
        schema = built.reviewed.loaded.spec.output.step
        self._asked = stages.ask("export", {"tool": built.steel, "output.step": schema})
        if self._asked.made is not None:
            _write(self._asked.made.value, folder)
            return
        with stages.tell.stage("export") as stage:
            self._files = export_tool(built.tool, folder, schema)
            stage.detail = "STEP files and tables"

    def finish(self) -> None:
        """Wait until every file is there."""
        if self._files is not None:
            self._files.result()
            self._asked.keep({p: (self._folder / p).read_bytes() for p in exported_files(self._built.tool)})

    def stop(self) -> None:
        """End the writing if it is still under way."""
        if self._files is not None:
            self._files.stop()


def _write(files: dict[str, bytes], folder: Path) -> None:
    for path, data in files.items():
        (folder / path).parent.mkdir(exist_ok=True)
        (folder / path).write_bytes(data)


def _proved(built: Built, folder: Path, stages: Stages) -> tuple[tuple[Proof, ...], dict[str, float]]:
    """Return the proofs of the exported assembly, and the volume of each component as read back [mm^3]."""

    def prove() -> tuple[tuple[Proof, ...], dict[str, float]]:
        with stages.tell.stage("prove the tool") as stage:
            bodies = reread_bodies(built.tool, folder, stages.memory)
            proofs = prove_tool(bodies, built.claims)
            stage.detail = f"{sum(p.passed for p in proofs)} of {len(proofs)} passed"
            return proofs, exported_volumes(built.tool, bodies)

    listed = [(c.name, c.role, c.motion, c.positions) for c in built.tool.components]
    inputs = {TOOL_FILE: sha256_file(folder / TOOL_FILE), "components": listed, "claims": built.claims}
    return stages.make("prove the tool", inputs, prove).value


class _Pictures:
    """The pictures, drawn by a process of their own while the tool is proved; nothing if they are not wanted."""

    def __init__(self, built: Built, folder: Path, options: Options, stages: Stages) -> None:
        self._folder, self._stages = folder / PICTURES, stages
        self._job: PictureJob | None = None
        self._asked: Asked[dict[str, bytes]] | None = None
        reviewed = built.reviewed
        if not (options.pictures and reviewed.loaded.spec.output.pictures):
            return
        title = (reviewed.part.name, reviewed.resin.name, direction_text(reviewed.pull.direction))
        gate, stroke = built.layout.gate.at, built.layout.stroke_mm
        self._asked = stages.ask(
            "draw the pictures",
            {"tool": built.steel, "halves": built.shaped, "title": title, "gate": gate, "stroke": stroke},
        )
        self._folder.mkdir()
        if self._asked.made is not None:
            _write(self._asked.made.value, self._folder)
            return
        self._job = start_pictures(tool_scene(built.tool, built.halves, title, gate, stroke), self._folder)

    def finish(self) -> Notes:
        """Wait for the pictures, and return what is missing."""
        if self._job is None or self._asked is None:
            return Notes()
        with self._stages.tell.stage("draw the pictures") as stage:
            result = self._job.finish()
            stage.detail = "none: see the findings" if result.missing else "done"
        if result.missing:
            return Notes((_missing(result.missing),))
        self._asked.keep({path.name: path.read_bytes() for path in result.files})
        return Notes()

    def stop(self) -> None:
        """End the drawing if it is still under way."""
        if self._job is not None:
            self._job.stop()


def _missing(what: str) -> Finding:
    return Finding(
        code="pictures.missing",
        severity=Severity.CAUTION,
        message=f"pictures were not drawn: {what}",
        where=PICTURES,
        remedy="the tool itself is complete",
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
    record["steel_safe"] = built.steel_safe
    record["components"] = [component_record(c, files[c.name], volumes[c.name]) for c in built.tool.components]
    record["claims"] = built.claims
    return {**record, **notes_record(notes, proofs)}


def _result(built: Built, notes: Notes, proofs: tuple[Proof, ...]) -> JobResult:
    code = verdict_code(notes.findings, proofs)
    proved = "proved" if all(p.passed for p in proofs) else "NOT proved"
    return JobResult(
        exit_code=code,
        headline=f"{built.reviewed.part.name}: {len(built.tool.components)} components, {proved}",
        tables=build_tables(built.tool, built.layout, built.steel_safe),
        proofs=proofs,
        findings=notes.findings,
        decisions=notes.decisions,
        first_pass=True,
    )
