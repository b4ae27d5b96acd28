"""From the prepared part to its halves: straight pull, undercuts filled, or undercuts formed by side actions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from moldgen.errors import KernelError, MoldgenError, PartError, SpecError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.flow.carry import accepted_block, at_accepted_level
from moldgen.flow.lay_out import marked_points
from moldgen.flow.prepare import Prepared, prepared_body
from moldgen.flow.review import Reviewed, refuse_undercuts, undercut_error
from moldgen.flow.side_plan import plan_sides, turned_back
from moldgen.flow.side_steel import Formed, with_room
from moldgen.flow.stages import Stages
from moldgen.flow.words import direction_text, point_text
from moldgen.kernel.body import Body
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.layout.blocks import size_blocks
from moldgen.layout.carry_block import block_between, found_again
from moldgen.layout.side_drive import Driven, drive_fronts
from moldgen.layout.slide_body import SideTask
from moldgen.model.halves import Halves
from moldgen.model.part import MoldFrame
from moldgen.model.side_action import Front, SidePlan
from moldgen.model.slide import Drive
from moldgen.parting.fill import fill_trapped
from moldgen.parting.halves import Parted, part_halves
from moldgen.parting.side_fill import filled_candidates, outside_fronts
from moldgen.parting.told import parting_line, steel_contacts, told
from moldgen.release.trapped import TrapPiece
from moldgen.spec.sections import Blocks
from moldgen.steel.forming import form_side_steel, narrowed, ways_in_turn
from moldgen.tolerances import ON_PLANE, OPEN_OVERLAP

MOST_FILLED = 0.1
"""Share of the part's volume that may be molded full: filling is for small undercuts (our choice)."""

NARROWER = (0.0, 0.06, 0.11)
"""mm: by how much the outlines of fronts are drawn in when the kernel cannot cut them as planned (our choice)."""

_REMEDY = "fill these places in the part, change them so that they taper along the pull, or give another pull"

Corners = tuple[np.ndarray, np.ndarray]


def part_mold(reviewed: Reviewed, stages: Stages, *, inclined: bool = True) -> tuple[Formed, Notes]:
    """Return the halves, with the forming steel of side actions where the part needs any.

    inclined : whether slides may leave at an angle to the parting plane

    Raises
    ------
    PartError : the part cannot be released as the spec asks; KernelError : see the stages
    """
    prepared, how = reviewed.prepared, reviewed.loaded.spec.parting.undercuts
    if not prepared.trapped.pieces:
        return _plain(reviewed, prepared, stages)
    if how == "fill":
        with stages.tell.stage("fill the undercuts") as stage:
            filled, notes = _filled(reviewed, prepared, prepared.trapped.pieces)
            stage.detail = f"{len(prepared.trapped.pieces)} places"
        made, more = _plain(reviewed, filled, stages)
        return made, notes + more
    if how == "refuse":
        refuse_undercuts(reviewed)
    if prepared.trapped.undercuts or reviewed.loaded.spec.side_actions.given or how == "release_or_fill":
        return _released(reviewed, prepared, stages, inclined)
    return _plain(reviewed, prepared, stages)


def _plain(reviewed: Reviewed, prepared: Prepared, stages: Stages) -> tuple[Formed, Notes]:
    parted, notes = _straight(reviewed, prepared, stages)
    return Formed(parted), notes


def _released(reviewed: Reviewed, prepared: Prepared, stages: Stages, inclined: bool) -> tuple[Formed, Notes]:
    """Return halves and side actions; what no side action releases is filled if the spec allows it."""
    notes, fills = Notes(), reviewed.loaded.spec.parting.undercuts == "release_or_fill"
    if fills and prepared.trapped.rubs:
        prepared, notes = _with_rubs_filled(reviewed, prepared, stages)
    if not prepared.trapped.undercuts and not reviewed.loaded.spec.side_actions.given:
        made, also = _plain(reviewed, prepared, stages)
        return made, notes + also
    plan, more = _planned(reviewed, prepared, stages, inclined)
    if plan.left and fills:
        pieces = tuple(prepared.trapped.pieces[u.piece] for u in plan.left if u.piece >= 0)
        with stages.tell.stage("fill what no side action releases") as stage:
            prepared, also = _filled(reviewed, prepared, pieces)
            notes += also
            stage.detail = f"{len(pieces)} places"
        if not prepared.trapped.undercuts:
            made, also = _plain(reviewed, prepared, stages)
            return made, notes + also
        plan, more = _planned(reviewed, prepared, stages, inclined)
    if plan.left:
        raise _unreleased(reviewed, plan)
    made, also = _with_sides(reviewed, prepared, plan, stages)
    return made, notes + more + also


def _planned(reviewed: Reviewed, prepared: Prepared, stages: Stages, inclined: bool) -> tuple[SidePlan, Notes]:
    with stages.tell.stage("plan the side actions") as stage:
        plan, notes = plan_sides(reviewed, prepared, inclined=inclined)
        stage.detail = _counted(plan)
    return plan, notes


def _with_rubs_filled(reviewed: Reviewed, prepared: Prepared, stages: Stages) -> tuple[Prepared, Notes]:
    """Return the part with its rubs filled, as it is where that cannot be done."""
    with stages.tell.stage("fill what rubs") as stage:
        try:
            filled, notes = _filled(reviewed, prepared, prepared.trapped.rubs)
        except PartError as error:
            stage.detail = "none: it cannot be done"
            why = error.what.split("\n")[0]
            return prepared, Notes(decisions=(Decision("rubs", "left as they are", why),))
        stage.detail = f"{len(prepared.trapped.rubs)} places"
    return filled, notes


def _counted(plan: SidePlan) -> str:
    kinds = [f.kind for f in plan.fronts]
    text = ", ".join(f"{kinds.count(k)} {k}{'s' if kinds.count(k) > 1 else ''}" for k in dict.fromkeys(kinds)) or "none"
    return f"{text}; {len(plan.left)} places left" if plan.left else text


def _unreleased(reviewed: Reviewed, plan: SidePlan) -> PartError:
    frame = reviewed.frame
    left = []
    for place in plan.left[:8]:
        told = place.told(
            lambda point: point_text(frame.to_part(point)), lambda way: direction_text(turned_back(frame, way))
        )
        left.append(f"place {place.piece + 1}: {'; '.join(told)}")
    remedy = "change the part as said, give another pull or the side actions by hand, or accept small places filled "
    remedy += "with parting.undercuts: release_or_fill"
    return undercut_error(reviewed, remedy, "no side action releases:\n      " + "\n      ".join(left))


def _with_sides(reviewed: Reviewed, prepared: Prepared, plan: SidePlan, stages: Stages) -> tuple[Formed, Notes]:
    refused: list[str] = []
    found = filled_candidates(prepared.body, prepared.kinds, prepared.trapped, plan.fronts, reviewed.frame)
    for filled in found:
        if isinstance(filled, str):
            refused.append(filled)
            continue
        try:
            whole, _ = prepared_body(filled.body, reviewed.frame)
            if whole.trapped.undercuts:
                refused.append(f"{filled.rung}: {len(whole.trapped.undercuts)} places stay trapped")
                continue
            made, notes = _formed(reviewed, whole, prepared.body, plan, stages)
        except MoldgenError as error:
            if isinstance(error, SpecError):
                raise
            refused.append(f"{filled.rung}: {error.told}")
            continue
        return made, notes
    raise PartError(
        "side actions were planned, but no steel could be made for them: " + "; ".join(refused),
        where=reviewed.loaded.locate("part"),
        remedy="give another pull, give the side actions by hand, or change the undercuts",
    )


def _formed(reviewed: Reviewed, filled: Prepared, part: Body, plan: SidePlan, stages: Stages) -> tuple[Formed, Notes]:
    """Return the halves of the filled part without the fronts; the block grows where slides need room.

    What room they need depends on the height of the parting plane, which is known only after parting: the lower end of
    the part is assumed first, and where that was wrong the mold is parted again.
    """
    section = reviewed.loaded.spec.blocks
    given = _given_level(reviewed, filled)
    guess = float(filled.body.box[0][2]) if given is None else given

    def room(corners: Corners, level: float) -> Corners:
        driven, _ = drive_fronts(plan.fronts, part, level)
        return with_room(corners, level, driven, SideTask(part, level, reviewed.resin), section)

    def sized(level: float) -> tuple[Corners, Notes]:
        corners, notes = _blocks(reviewed, filled, section, level, stages, accepted=False)
        wide, kept = room(corners, level), accepted_block(reviewed)
        if kept is None or found_again(block_between(*wide), kept):
            return wide, notes
        corners, notes = _blocks(reviewed, filled, section, level, stages)
        return room(corners, level), notes

    wide, notes = sized(guess)
    parted = _parted(reviewed, filled, wide, given, stages)
    parted, more = at_accepted_level(reviewed, parted, lambda z: _parted(reviewed, filled, wide, z, stages))
    if abs(parted.level - guess) > ON_PLANE:
        wide, notes = sized(parted.level)
        parted = _parted(reviewed, filled, wide, parted.level, stages)
    notes += more
    halves = _halves(parted, reviewed.frame, *wide)
    with stages.tell.stage("form the side actions") as stage:
        formed, more = _cut(halves, filled.body, part, plan.fronts)
        stage.detail = f"{len(formed.halves.sides)} side actions"
    return formed, notes + more + told(parted, reviewed.frame)


def _cut(halves: Halves, filled: Body, part: Body, fronts: Sequence[Front]) -> tuple[Formed, Notes]:
    """Return the fronts cut; where the kernel fails, with their outlines a little narrower.

    A wall of a front that only just touches a round face of the part leaves steel without thickness there.
    """
    refused: list[str] = []
    for by in NARROWER:
        own = [narrowed(front, by) for front in fronts] if by else list(fronts)
        uncovered = outside_fronts(filled, mesh_solid(part.mesh), own) if by else 0.0
        if uncovered >= OPEN_OVERLAP:
            refused.append(f"{by:g} mm narrower: {uncovered:.3f} mm of the undercuts would lie beside the fronts")
            continue
        driven, notes = drive_fronts(own, part, halves.level)
        try:
            driven = _in_turn(driven, (halves.low, halves.high))
            formed, more = form_side_steel(halves, part, [d.front for d in driven])
        except KernelError as error:
            refused.append(f"{by:g} mm narrower: {error.what}" if by else error.what)
            continue
        return Formed(formed, driven, part), notes + more
    raise KernelError("; ".join(refused))


def _in_turn(driven: tuple[Driven, ...], corners: Corners) -> tuple[Driven, ...]:
    """Return the fronts with those slides drawn by cylinders that share steel: these must move one after the other."""
    ways = ways_in_turn([d.front for d in driven], corners)
    return tuple(
        replace(d, front=replace(d.front, travel=ways[i]), drive=Drive.CYLINDER) if i in ways else d
        for i, d in enumerate(driven)
    )


def _given_level(reviewed: Reviewed, prepared: Prepared) -> float | None:
    height = reviewed.loaded.spec.parting.height
    return None if height is None else _mold_level(reviewed, height, prepared.body)


def _straight(reviewed: Reviewed, prepared: Prepared, stages: Stages) -> tuple[Halves, Notes]:
    """Return the halves of a part that leaves by a straight pull."""
    spec, level = reviewed.loaded.spec, _given_level(reviewed, prepared)
    fixed = spec.blocks.cavity_height is not None or spec.blocks.core_height is not None
    # the plane is known only after parting, and given heights count from it: then the blocks are sized twice
    section = spec.blocks
    if fixed and level is None:
        section = section.model_copy(update={"cavity_height": None, "core_height": None})
    corners, more = _blocks(reviewed, prepared, section, level, stages)
    parted = _parted(reviewed, prepared, corners, level, stages)
    parted, also = at_accepted_level(reviewed, parted, lambda z: _parted(reviewed, prepared, corners, z, stages))
    if fixed and abs(parted.level - (np.inf if level is None else level)) > ON_PLANE:
        corners, more = _blocks(reviewed, prepared, spec.blocks, parted.level, stages)
        parted = _parted(reviewed, prepared, corners, parted.level, stages)
    return _halves(parted, reviewed.frame, *corners), more + also + told(parted, reviewed.frame)


def _blocks(
    reviewed: Reviewed,
    prepared: Prepared,
    section: Blocks,
    level: float | None,
    stages: Stages,
    *,
    accepted: bool = True,
) -> tuple[Corners, Notes]:
    with stages.tell.stage("size the blocks") as stage:
        kept = accepted_block(reviewed) if accepted else None
        blocks, notes = size_blocks(prepared.body, reviewed.resin, section, level, kept)
        low, high = np.asarray(blocks.low), np.asarray(blocks.high)
        stage.detail = " x ".join(f"{v:.0f}" for v in high - low) + " mm"
    return (low, high), notes


def _parted(reviewed: Reviewed, prepared: Prepared, corners: Corners, level: float | None, stages: Stages) -> Parted:
    """Return the parted mold; of the part as it was prepared this is a stage, since little else bears on it."""
    avoid = marked_points(reviewed, "no_parting_line")

    def part() -> Parted:
        return _parted_now(reviewed, prepared, corners, (level, avoid), stages)

    if prepared is not reviewed.prepared:
        return part()
    plain = {"block": [c.tolist() for c in corners], "level": level, "kept clear": [p.tolist() for p in avoid]}
    return stages.make("part the mold", {"prepared part": reviewed.made, **plain}, part).value


def _parted_now(
    reviewed: Reviewed,
    prepared: Prepared,
    corners: Corners,
    asked: tuple[float | None, tuple[np.ndarray, ...]],
    stages: Stages,
) -> Parted:
    """Return the parted mold; `asked`: the level [mm], and points that the parting line keeps clear of (3,) [mm]."""
    level, avoid = asked
    with stages.tell.stage("part the mold") as stage:
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


def _halves(parted: Parted, frame: MoldFrame, low: np.ndarray, high: np.ndarray) -> Halves:
    return Halves(
        cavity=parted.cavity,
        core=parted.core,
        body=parted.body,
        cavity_side=parted.sides.cavity,
        level=parted.level,
        low=low,
        high=high,
        parting_line=parting_line(parted),
        contacts=steel_contacts(parted, frame),
    )


def _filled(reviewed: Reviewed, before: Prepared, pieces: tuple[TrapPiece, ...]) -> tuple[Prepared, Notes]:
    """Return the part with places molded full."""
    gained = sum(p.volume_mm3 for p in pieces)
    share = gained / float(before.trapped.part.volume())
    if share > MOST_FILLED:
        limit = f"{100 * share:.0f} % of the part's volume, more than the {100 * MOST_FILLED:.0f} % that makes sense"
        raise undercut_error(reviewed, _REMEDY, f"they cannot be molded full: together they are {limit}")
    try:
        body, notes = fill_trapped(before.body, before.kinds, pieces, reviewed.frame)
    except PartError as error:
        raise undercut_error(reviewed, _REMEDY, f"they cannot be molded full: {error.told}") from error
    filled, more = prepared_body(body, reviewed.frame)
    trapped = filled.trapped
    if trapped.undercuts and len(pieces) == len(before.trapped.pieces):
        left = sum(p.volume_mm3 for p in trapped.undercuts)
        why = f"filled, {len(trapped.undercuts)} places of {left:.3f} mm^3 stay trapped"
        raise undercut_error(reviewed, _REMEDY, f"they cannot be molded full: {why}")
    finding = Finding(
        code="release.filled",
        severity=Severity.WARNING,
        message=f"{len(pieces)} trapped places are molded full: the molded part has "
        f"{gained:.3f} mm^3 more than the drawn one",
        where=reviewed.loaded.locate("parting.undercuts"),
        value=gained,
        limit=0.0,
        unit="mm^3",
        remedy="machine these places after molding, change the part, or plan side actions",
    )
    return filled, notes + more + Notes((finding,))


def _mold_level(reviewed: Reviewed, height: float, body: Body) -> float:
    """Return the mold z of a part coordinate along the pull, which must lie on the part."""
    frame, pull = reviewed.frame, reviewed.pull.direction
    low, high = (frame.part_height(pull, float(corner[2])) for corner in body.box)
    if not low - ON_PLANE <= height <= high + ON_PLANE:
        raise SpecError(
            f"the parting height {height:g} mm does not lie on the part, which reaches from {low:g} to {high:g} mm "
            "along the pull",
            where=reviewed.loaded.locate("parting.height"),
            remedy="give a height between these, or leave it out",
        )
    return frame.mold_height(pull, height)
