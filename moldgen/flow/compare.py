"""`moldgen compare`: two output folders of `build`, and what of the steel, the layout and the numbers changed."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from moldgen import __version__
from moldgen.canon import to_json
from moldgen.errors import ExitCode
from moldgen.finding import Finding, Severity
from moldgen.flow.compare_tables import compare_headline, compare_tables
from moldgen.flow.folder import MANIFEST, MANIFEST_KEY
from moldgen.flow.job import JobResult
from moldgen.flow.reread import read_listing
from moldgen.flow.tell import Tell
from moldgen.kernel.face_signature import part_signs
from moldgen.kernel.step_write import Looks, write_assembly, write_component
from moldgen.model.part import UPRIGHT
from moldgen.model.revision import Alignment, Comparison, Fate, PartChange, Work
from moldgen.model.tool import Component, Motion, Role
from moldgen.output import palette
from moldgen.output.compare_page import write_compare_page
from moldgen.output.compare_pictures import DrawnComparison, draw_comparison
from moldgen.output.compare_scene import compare_picture
from moldgen.output.compare_words import comparison_json
from moldgen.revision.align import align
from moldgen.revision.causes import Causes
from moldgen.revision.features import part_changes
from moldgen.revision.items import paired_items
from moldgen.revision.numbers import choice_changes, number_changes, placed_record
from moldgen.revision.placing import place_old
from moldgen.revision.steel import ComparedComponent, compare_steel
from moldgen.revision.tool_record import ToolRecord, tool_record

COMPARISON = "compare.json"
PIECES = "pieces.step"
"""All pieces of steel in one file, where they stand in the new mold, in the colours of what is done to them."""

STEP_FOLDER = "step"

DOUBTFUL = 0.25
"""With less than this share of the old part's faces on the new one, the alignment is told as doubtful (our choice)."""

RESIDUAL = 0.01
"""mm: with a larger distance between faces that match, too (our choice)."""


@dataclass(frozen=True, eq=False)
class Compared:
    """A comparison with the bodies it was made from, one for each of its components."""

    comparison: Comparison
    components: tuple[ComparedComponent, ...]


def compare_folders(old: Path, new: Path, folder: Path, tell: Tell, *, pictures: bool = True) -> JobResult:
    """Compare the tools of two output folders and write the answer into `folder`.

    Raises
    ------
    SpecError : a folder is no output of a build
    PartError : a STEP file is missing or damaged, or the parts have nothing in common
    """
    tools = _tool(old), _tool(new)
    compared = compare_tools(*tools, tell, _names(old, new))
    with tell.stage("write the answer") as stage:
        _write(compared, tools, folder)
        stage.detail = f"{sum(len(c.pieces) for c in compared.components)} pieces of steel"
    drawn = DrawnComparison()
    if pictures:
        with tell.stage("draw the pictures") as stage:
            drawn = _drawn(compared, folder / "pictures")
            stage.detail = drawn.missing or "done"
    write_compare_page(compared.comparison, drawn, folder)
    comparison = compared.comparison
    return JobResult(
        ExitCode.OK,  # also when steel is missing: that is the answer, not a failure
        compare_headline(comparison),
        tables=compare_tables(comparison),
        findings=comparison.findings,
        first_pass=True,
    )


def compare_tools(old: ToolRecord, new: ToolRecord, tell: Tell, names: tuple[str, str]) -> Compared:
    """Return what changed between two tools, with the bodies.

    names : what to call them

    Raises
    ------
    PartError : as `compare_folders`
    """
    with tell.stage("align the parts") as stage:
        alignment, part = _part_compared(old, new)
        stage.detail = alignment.how
    placing = place_old(old.frame, new.frame, alignment)
    before = placed_record(old.record, alignment, placing)
    items = paired_items(old, new, placing)
    causes = Causes(new.frame, part, items, _whole(old, new))
    with tell.stage("compare the steel") as stage:
        components, findings = compare_steel(old, new, placing, causes)
        stage.detail = f"{sum(c.change.fate is not Fate.UNCHANGED for c in components)} of {len(components)} changed"
    comparison = Comparison(
        *names,
        alignment,
        part,
        tuple(c.change for c in components),
        tuple(p.change() for p in items if not p.same),
        number_changes(before, new.record, part),
        (
            *_alignment_findings(alignment),
            *(f for tool, name in zip((old, new), names, strict=True) for f in _not_as_built(tool, name)),
            *_choices(before, new.record),
            *_steel_findings(components),
            *findings,
        ),
    )
    return Compared(comparison, tuple(components))


def _tool(folder: Path) -> ToolRecord:
    read_listing(folder)  # says what is wrong with a folder that is no tool
    record: Any = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
    return tool_record(folder, record)


def _names(old: Path, new: Path) -> tuple[str, str]:
    """Return the names of two folders, without what is above them: the answer must not depend on where they lie."""
    one, other = old.resolve().name, new.resolve().name
    return (one, other) if one != other else (f"{one} (old)", f"{other} (new)")


def _part_compared(old: ToolRecord, new: ToolRecord) -> tuple[Alignment, tuple[PartChange, ...]]:
    """Return how the parts lie on each other and what changed; equal files of equal tools need no look."""
    parts = [next((c for c in t.components if c.role is Role.PART), None) for t in (old, new)]
    if parts[0] is not None and parts[1] is not None and parts[0].digest == parts[1].digest and old.frame == new.frame:
        count = int(new.record["part"].get("faces", 0))
        how = f"as drawn: {count} of {count} faces, the two files of the part are equal"
        return Alignment(UPRIGHT, (0.0, 0.0, 0.0), how, count, count, 0.0), ()
    before, after = part_signs(old.part_solid()), part_signs(new.part_solid())
    alignment = align(before, after)
    x, y, z = (float(v) for v in new.record["pull"]["direction"])
    return alignment, part_changes(before, after, alignment, (x, y, z))


def _whole(old: ToolRecord, new: ToolRecord) -> str:
    if old.frame.factors != new.frame.factors:
        was, now = (", ".join(f"{k:.5f}" for k in dict.fromkeys(t.frame.factors)) for t in (old, new))
        return f"shrink factor {now} instead of {was}"
    return ""


def _alignment_findings(alignment: Alignment) -> tuple[Finding, ...]:
    share = alignment.matched / max(alignment.faces, 1)
    if share >= DOUBTFUL and alignment.residual_mm <= RESIDUAL:
        return ()
    what = f"only {alignment.matched} of {alignment.faces} faces" if share < DOUBTFUL else "the faces that match"
    return (
        Finding(
            code="compare.alignment",
            severity=Severity.WARNING,
            message=f"the old part may not lie on the new one as meant: {alignment.how}",
            where=what,
            value=alignment.residual_mm if share >= DOUBTFUL else share,
            limit=RESIDUAL if share >= DOUBTFUL else DOUBTFUL,
            unit="mm" if share >= DOUBTFUL else "of the faces",
            remedy="look at the pieces of steel: if they are everywhere, compare a version in between",
        ),
    )


def _not_as_built(tool: ToolRecord, name: str) -> tuple[Finding, ...]:
    """Return a warning if STEP files of a tool are not those that its manifest lists: they are compared as they are."""
    listed = tool.record.get("files", {})
    other = [c.name for c in tool.components if listed.get(f"step/{c.file.name}", c.digest) != c.digest]
    if not other:
        return ()
    return (
        Finding(
            code="compare.not_as_built",
            severity=Severity.WARNING,
            message=f"{name}: STEP files were changed since the tool was built: {', '.join(other)}",
            where=name,
            remedy="numbers are those of the tool as built; build it again if the change was not meant",
        ),
    )


def _choices(old: Mapping[str, Any], new: Mapping[str, Any]) -> tuple[Finding, ...]:
    return tuple(
        Finding(
            code="compare.choice",
            severity=Severity.CAUTION,
            message=f"another {c.topic}: {c.now or 'none'} instead of {c.was or 'none'}",
            where=c.topic,
            remedy="if that was not meant, fix it in the spec and build again",
        )
        for c in choice_changes(old, new)
    )


def _steel_findings(components: Sequence[ComparedComponent]) -> tuple[Finding, ...]:
    missing = [c.change for c in components if c.change.fate is Fate.WELD]
    return tuple(
        Finding(
            code="compare.weld",
            severity=Severity.CAUTION,
            message=f"{c.new}: steel is missing, in pieces: {sum(p.work is Work.WELD for p in c.pieces)}",
            where=c.new,
            at=next(p.at_part for p in c.pieces if p.work is Work.WELD),
            value=c.weld_mm3,
            unit="mm^3",
            remedy="weld, or set in an insert; or change the part so that steel is only cut",
        )
        for c in missing
    )


def _write(compared: Compared, tools: tuple[ToolRecord, ToolRecord], folder: Path) -> None:
    """Write the pieces as STEP files, the comparison, and a manifest that says whose output this is."""
    (folder / STEP_FOLDER).mkdir()
    looks = Looks({Role.CORE.value: palette.CUT.colour, Role.CAVITY.value: palette.WELD.colour})  # as on the page
    listed: list[Component] = []
    for component in compared.components:
        for piece, body in zip(component.change.pieces, component.pieces, strict=True):
            role = Role.CORE if piece.work is Work.CUT else Role.CAVITY  # only its colour is meant
            name = Path(piece.file).stem.replace("_", " ")
            listed.append(Component(name, role, body.solid, component.change.material, Motion.CORE_HALF))
            write_component(listed[-1], folder / piece.file, looks)
    if listed:
        write_assembly(listed, folder / PIECES, looks, name="steel to cut and to weld")
    (folder / COMPARISON).write_text(comparison_json(compared.comparison), encoding="utf-8")
    manifest = {
        MANIFEST_KEY: __version__,
        "comparison": COMPARISON,
        "old": {"name": compared.comparison.old, "spec": tools[0].record.get("spec")},
        "new": {"name": compared.comparison.new, "spec": tools[1].record.get("spec")},
    }
    (folder / MANIFEST).write_text(to_json(manifest), encoding="utf-8")


def _drawn(compared: Compared, folder: Path) -> DrawnComparison:
    pictures = [
        compare_picture(c.change, c.steel.mesh, [b.mesh for b in c.pieces])
        for c in compared.components
        if c.steel is not None
    ]
    if not pictures:
        return DrawnComparison()
    return draw_comparison(pictures, folder)
