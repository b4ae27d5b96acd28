"""From the reviewed part to the tool, stage by stage: halves and side actions, layout, steel."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from moldgen.errors import PartError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.flow.carry import block_of
from moldgen.flow.lay_out import lay_out
from moldgen.flow.part_mold import part_mold
from moldgen.flow.review import Reviewed
from moldgen.flow.side_steel import make_sides
from moldgen.flow.stages import Made, Stages
from moldgen.flow.tell import Tell
from moldgen.layout.side_drive import is_level
from moldgen.layout.steel_safe import steel_safe_advice
from moldgen.layout.view import PartView
from moldgen.model.halves import Halves
from moldgen.model.layout import Layout
from moldgen.model.side_action import SideKind
from moldgen.model.slide import SideLayout
from moldgen.model.steel_safe import SteelSafe
from moldgen.model.tool import Tool
from moldgen.proof.run import Claims
from moldgen.spec.declared import key_values, narrowed
from moldgen.steel.bored import Materials
from moldgen.steel.make import make_tool
from moldgen.steel.side_actions import SideCut
from moldgen.steel.side_motion import opening_steps

FORM_KEYS = ("parting", "side_actions", "blocks", "ejection.stroke", "marks")
LAYOUT_KEYS = ("core_pins", "ejection", "gate", "marks")
SAFE_KEYS = ("steel_safe",)
"""The keys of the spec that the halves, the layout and the steel-safe advice depend on."""


@dataclass(frozen=True)
class Shaped:
    """The halves with the room for side actions cut, and these."""

    sides: SideCut
    side_layout: SideLayout
    notes: Notes

    @property
    def halves(self) -> Halves:
        """The halves."""
        return self.sides.halves


@dataclass(frozen=True)
class Steel:
    """The tool, and what it claims about itself."""

    tool: Tool
    claims: Claims
    notes: Notes


@dataclass(frozen=True)
class Built:
    """The tool with everything that was known on the way to it; `steel_safe` is where steel may be left on."""

    reviewed: Reviewed
    shaped: Made[Shaped]
    layout: Layout
    steel: Made[Steel]
    steel_safe: tuple[SteelSafe, ...]
    notes: Notes

    @property
    def halves(self) -> Halves:
        """The halves."""
        return self.shaped.value.halves

    @property
    def tool(self) -> Tool:
        """The tool."""
        return self.steel.value.tool

    @property
    def claims(self) -> Claims:
        """What the tool claims about itself."""
        return self.steel.value.claims


def build_along(reviewed: Reviewed, stages: Stages) -> Built:
    """Return the tool of a part along its pull.

    Raises
    ------
    PartError, SpecError, KernelError : no tool can be made, see the stages
    """
    spec, tell = reviewed.loaded.spec, stages.tell
    shaped: Made[Shaped] = stages.make(
        "form the halves",
        {**key_values(spec, FORM_KEYS), **_given(reviewed), "accepted block": block_of(reviewed.accepted)},
        lambda: _shaped(_narrow(reviewed, FORM_KEYS), stages),
    )
    layout, more = stages.make(
        "lay out pins and gate",
        {**key_values(spec, LAYOUT_KEYS), **_given(reviewed), "halves": shaped, "accepted layout": reviewed.accepted},
        lambda: _laid_out(_narrow(reviewed, LAYOUT_KEYS), shaped.value, tell),
    ).value
    materials = _materials(reviewed)
    steel: Made[Steel] = stages.make(
        "cut the steel",
        {"halves": shaped, "layout": layout, "materials": materials},
        lambda: _cut(shaped.value, layout, materials, tell),
    )
    advice, told = stages.make(
        "look for dimensions to be tuned",
        {**key_values(spec, SAFE_KEYS), **_given(reviewed), "halves": shaped, "layout": layout},
        lambda: _advised(_narrow(reviewed, SAFE_KEYS), shaped.value, layout, tell),
    ).value
    notes = _settled(reviewed, shaped.value.halves) + shaped.value.notes + more + steel.value.notes + told
    return Built(reviewed, shaped, layout, steel, advice, notes)


def _given(reviewed: Reviewed) -> dict[str, object]:
    return {"prepared part": reviewed.made, "frame of the mold": reviewed.frame, "resin": reviewed.resin}


def _narrow(reviewed: Reviewed, keys: tuple[str, ...]) -> Reviewed:
    """Return what a stage may see: of the spec nothing but `keys`."""
    return replace(reviewed, loaded=narrowed(reviewed.loaded, keys), notes=Notes())


def _shaped(reviewed: Reviewed, stages: Stages) -> Shaped:
    formed, notes = part_mold(reviewed, stages)
    section = reviewed.loaded.spec.ejection
    try:
        sides, side_layout, more = make_sides(formed, reviewed.resin, section, stages.tell)
    except PartError as error:
        if all(is_level(d.front) or d.front.kind is SideKind.LIFTER for d in formed.driven):
            raise
        # a slide that leaves at an angle finds no way out of the block: what it was to form is left to other means
        formed, notes = part_mold(reviewed, stages, inclined=False)
        notes += Notes(decisions=(Decision("side actions", "none that leave at an angle", error.what, error.where),))
        sides, side_layout, more = make_sides(formed, reviewed.resin, section, stages.tell)
    return Shaped(sides, side_layout, notes + more)


def _laid_out(reviewed: Reviewed, shaped: Shaped, tell: Tell) -> tuple[Layout, Notes]:
    with tell.stage("lay out pins and gate") as stage:
        layout, notes = lay_out(reviewed, shaped.halves, shaped.side_layout)
        stage.detail = (
            f"{len(layout.ejector_pins)} ejector pins, {len(layout.core_pins)} core pins, {layout.gate.kind} gate"
        )
    return layout, notes


def _cut(shaped: Shaped, layout: Layout, materials: Materials, tell: Tell) -> Steel:
    halves, stroke = shaped.halves, layout.stroke_mm
    with tell.stage("cut the steel") as stage:
        tool, bored, notes = make_tool(halves, layout, materials, shaped.sides)
        depth = float(halves.high[2] - halves.low[2])
        tool = replace(tool, steps=opening_steps(shaped.side_layout, 2.0 * depth + stroke, stroke, depth))
        stage.detail = f"{len(tool.components)} components"
    return Steel(tool, Claims(float(np.prod(halves.high - halves.low)), bored.total_mm3, stroke, tool.steps), notes)


def _advised(reviewed: Reviewed, shaped: Shaped, layout: Layout, tell: Tell) -> tuple[tuple[SteelSafe, ...], Notes]:
    with tell.stage("look for dimensions to be tuned") as stage:
        view = PartView(shaped.halves, reviewed.frame, shaped.side_layout)
        section = reviewed.loaded.spec.steel_safe
        advice, notes = steel_safe_advice(view, layout, section, reviewed.resin, reviewed.frame)
        stage.detail = f"{len(advice)} found" if advice else "none"
    return advice, notes


def _settled(reviewed: Reviewed, halves: Halves) -> Notes:
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
