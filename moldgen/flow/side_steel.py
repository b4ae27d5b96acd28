"""Side actions from their fronts to components: drives, room in the block, bodies, and how the tool opens."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from moldgen.catalog import Resin, preferred_size_up
from moldgen.errors import KernelError, PartError
from moldgen.finding import Finding, Notes, Severity
from moldgen.flow.tell import Tell
from moldgen.kernel.body import Body
from moldgen.layout.ejection import ejector_stroke
from moldgen.layout.side_actions import lay_out_sides, room_needed
from moldgen.layout.side_drive import Driven, is_level
from moldgen.layout.slide_body import SideTask
from moldgen.layout.view import PartView
from moldgen.model.halves import Halves
from moldgen.model.layout import BlockLayout
from moldgen.model.side_action import SideKind
from moldgen.model.slide import Drive, SideLayout, SlideLayout
from moldgen.model.tool import Motion
from moldgen.rules.slide import slide_travel_practice
from moldgen.spec.sections import Blocks, Ejection
from moldgen.steel.side_actions import SideCut, cut_side_actions

Corners = tuple[np.ndarray, np.ndarray]


@dataclass(frozen=True)
class Formed:
    """The halves, and the fronts of the side actions with their drives, in the order of `halves.sides`."""

    halves: Halves
    driven: tuple[Driven, ...] = ()
    part: Body | None = None


def with_room(corners: Corners, level: float, driven: Sequence[Driven], task: SideTask, section: Blocks) -> Corners:
    """Return the corners of a block that also holds the slides; what the spec gives of its size stays."""
    room = room_needed(driven, task)
    if room is None:
        return corners
    low, high = np.minimum(corners[0], room.low), np.maximum(corners[1], room.high)
    for axis, fixed in ((0, section.length), (1, section.width)):
        if fixed is not None:
            low[axis], high[axis] = corners[0][axis], corners[1][axis]
            continue
        size = round(float(high[axis] - low[axis]), 6)  # an accepted block is known to six decimals
        more = preferred_size_up(size, "edge") - size
        low[axis], high[axis] = low[axis] - more / 2, high[axis] + more / 2
    if section.cavity_height is None:
        high[2] = level + preferred_size_up(round(float(high[2]) - level, 5), "thickness")
    else:
        high[2] = corners[1][2]
    if section.core_height is None:
        low[2] = level - preferred_size_up(round(level - float(low[2]), 5), "thickness")
    else:
        low[2] = corners[0][2]
    return low, high


def make_sides(formed: Formed, resin: Resin, section: Ejection, tell: Tell) -> tuple[SideCut, SideLayout, Notes]:
    """Return halves and components of the side actions.

    Where bodies with guides find no room, the fronts run out of the block as they are, drawn by cylinders.

    Raises
    ------
    KernelError, PartError : not even that can be made
    """
    halves = formed.halves
    if not halves.sides or formed.part is None:
        return SideCut(halves, (), (), (), Notes()), SideLayout(), Notes()
    task = SideTask(formed.part, halves.level, resin)
    block = BlockLayout(_corner(halves.low), _corner(halves.high))
    with tell.stage("make the side actions") as stage:
        stroke, _ = ejector_stroke(PartView(halves), section)
        plain: dict[str, PartError | KernelError] = {}
        while True:
            try:
                layout, notes = _laid_out(formed, plain, task, block, stroke)
                made = cut_side_actions(halves, layout, task.material)
                break
            except (PartError, KernelError) as error:
                culprits = _culprits(error, formed, plain)
                if not culprits:
                    raise
                plain |= dict.fromkeys(culprits, error)
        notes += Notes(tuple(_no_body(name, error) for name, error in plain.items()))
        stage.detail = f"{len(layout.slides)} slides, {len(layout.lifters)} lifters"
    return made, layout, notes + made.notes


def _laid_out(
    formed: Formed, plain: Mapping[str, PartError | KernelError], task: SideTask, block: BlockLayout, stroke: float
) -> tuple[SideLayout, Notes]:
    """Return the layout; slides named in `plain` are nothing but their fronts, each in a bore of its own outline."""
    named = [(s.name, d) for s, d in zip(formed.halves.sides, formed.driven, strict=True) if s.name not in plain]
    layout, notes = lay_out_sides([d for _, d in named], [n for n, _ in named], task, block, stroke)
    slides = list(layout.slides)
    for side in formed.halves.sides:
        if side.name in plain:
            carried = Motion.CAVITY_HALF if side.in_cavity else Motion.CORE_HALF
            travel = slide_travel_practice(max(side.front.travel, 1.0))
            slides.append(
                SlideLayout(side.name, (side.name,), side.front.axis, Drive.CYLINDER, carried, None, travel, 0.0, 0.0)
            )
    return replace(layout, slides=tuple(slides)), notes


def _culprits(error: PartError | KernelError, formed: Formed, plain: Mapping[str, object]) -> list[str]:
    """Return the level slides that an error names, or all of them where it names none; those made plain are left out.

    A slide that leaves at an angle has no body in any case: what it fails on is no matter of room.
    """
    level = {
        side.name
        for side, one in zip(formed.halves.sides, formed.driven, strict=True)
        if one.front.kind is SideKind.SLIDE and is_level(one.front) and side.name not in plain
    }
    told = f"{error.where} {error.what}"
    named = [name for name in sorted(level) if re.search(rf"{re.escape(name)}(?!\d)", told)]
    others = [s.name for s in formed.halves.sides if s.name not in level and re.search(rf"{s.name}(?!\d)", told)]
    return named if named or others else sorted(level)


def _corner(corner: np.ndarray) -> tuple[float, float, float]:
    x, y, z = (float(v) for v in corner)
    return (x, y, z)


def _no_body(name: str, error: PartError | KernelError) -> Finding:
    return Finding(
        "side.no_body",
        Severity.WARNING,
        f"{name} has no body with guides and locking face: {error.what}; it is drawn as a straight core that a "
        "cylinder pulls before the mold opens, and nothing but the cylinder holds it against the melt",
        where=name,
        remedy="give a larger block or other side actions, or let the toolmaker design the bodies",
    )
