"""Boxes with windows, their halves and forming steel, made by hand with simple booleans: every volume is known.

The part is a box open at the bottom (z = 0, the parting plane), 60 x 40 x 30 outside with walls of 2 mm. Windows go
through its walls. Halves are those of the box with its windows filled, less the fronts.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cache, cached_property

import numpy as np
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut

from helpers.solids import box, common, cut, extruded, fuse
from moldgen.catalog import resin
from moldgen.finding import Notes
from moldgen.kernel.body import Body
from moldgen.kernel.measure import volume
from moldgen.kernel.topology import solids_of
from moldgen.layout.side_actions import lay_out_sides, room_needed
from moldgen.layout.side_drive import Driven, drive_fronts, steel_names
from moldgen.layout.slide_body import SideTask
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.layout import BlockLayout
from moldgen.model.motion import Step
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import SideLayout
from moldgen.model.tool import Motion, Role
from moldgen.proof.bodies import ProofBody, placed_bodies
from moldgen.proof.opening import EJECTORS_MOVE
from moldgen.proof.run import Claims, prove_tool
from moldgen.steel.side_actions import SideCut, cut_side_actions
from moldgen.steel.side_motion import opening_steps

LENGTH, WIDTH, TALL, WALL = 60.0, 40.0, 30.0, 2.0
X, Y = (1.0, 0.0, 0.0), (0.0, 1.0, 0.0)
MINUS_X = (-1.0, 0.0, 0.0)

Opening = tuple[tuple[float, float, float], float, float, float, float]
"""Axis, and the window from left to right and from low to high in the frame across it."""

ONE: tuple[Opening, ...] = ((X, -6.0, 6.0, 10.0, 18.0),)
"""A window in the wall that looks to +x."""


def outside(axis):
    """Where the outer wall stands along a level axis."""
    return LENGTH / 2 if abs(axis[0]) > 0.5 else WIDTH / 2


def outer_solid(lean: float = 0.0):
    """The box without its inside; its walls to +x and -x lean inward by `lean` over the height."""
    return _leaning(LENGTH / 2, WIDTH / 2, 0.0, TALL, lean)


def inner_solid(lean: float = 0.0):
    """The inside of the box, and 1 mm below it."""
    return _leaning(LENGTH / 2 - WALL, WIDTH / 2 - WALL, -1.0, TALL - WALL, lean)


def _leaning(half, wide, low, high, lean):
    out, back = half - lean * low / TALL, half - lean * high / TALL
    corners = [(-out, -wide, low), (out, -wide, low), (back, -wide, high), (-back, -wide, high)]
    return extruded(corners, (0.0, 2 * wide, 0.0))


def shell(lean: float = 0.0):
    """The box without windows."""
    return cut(outer_solid(lean), inner_solid(lean))


def window_front(opening: Opening) -> Front:
    """The front that fills one window, straight across it or at an angle in plan."""
    axis, left, right, low, high = opening
    rim, frame = outside(axis), across(axis)
    wall = 0 if abs(axis[0]) > 0.5 else 1
    outline = np.array([(left, low), (right, low), (right, high), (left, high)])
    way = abs(axis[wall])
    sign = 1.0 if axis[wall] > 0 else -1.0
    inner, outer = ([(sign * at - u * frame[0][wall]) * sign / way for u in (left, right)] for at in (rim - WALL, rim))
    near, clear = min(inner), max(outer)
    return Front(SideKind.SLIDE, axis, axis, (outline,), near, clear + 1.0, clear, clear - near, (0,), "by hand")


def prism(front: Front, far: float, near: float | None = None):
    """The solid of a front with one polygon, up to a coordinate along its axis."""
    frame, start = across(front.axis), front.near if near is None else near
    (polygon,) = front.outline
    points = np.column_stack([polygon, np.full(len(polygon), start)]) @ frame
    return extruded([tuple(p) for p in points.tolist()], tuple((frame[2] * (far - start)).tolist()))


def largest(solid, *tools):
    """The largest piece of what is left of a solid."""
    for tool in tools:
        solid = max(solids_of(BRepAlgoAPI_Cut(solid, tool).Shape()), key=volume)
    return solid


@cache
def part(openings: tuple[Opening, ...] = ONE, lean: float = 0.0):
    """The box with its windows."""
    fronts = [window_front(o) for o in openings]
    return Body(cut(shell(lean), *(prism(f, f.clear + 1.0, f.near - 1.0 - lean) for f in fronts)))


def task(openings: tuple[Opening, ...] = ONE, lean: float = 0.0) -> SideTask:
    """What the slides of the box share."""
    return SideTask(part(openings, lean), 0.0, resin("ABS"))


@cache
def driven(openings: tuple[Opening, ...] = ONE) -> tuple[Driven, ...]:
    """The fronts of the windows with their drives."""
    return drive_fronts([window_front(o) for o in openings], part(openings), 0.0)[0]


def block_of(fronts: Sequence[Driven], one: SideTask, wall: float = 30.0) -> BlockLayout:
    """A block that holds part and slides."""
    low, high = one.part.box
    low, high = low - wall, high + wall
    room = room_needed(fronts, one)
    if room is not None:
        low, high = np.minimum(low, room.low), np.maximum(high, room.high)
    return BlockLayout(tuple(float(v) for v in low), tuple(float(v) for v in high))


@dataclass(frozen=True)
class SideMold:
    """Everything from fronts to halves of one box; `driven` may be replaced before the layout is asked for."""

    openings: tuple[Opening, ...]
    driven: tuple[Driven, ...]
    lean: float = 0.0

    @cached_property
    def names(self) -> list[str]:
        """slide 1, slide 2, ..., in order."""
        return steel_names(self.driven)

    @cached_property
    def block(self) -> BlockLayout:
        """The closed block."""
        return block_of(self.driven, task(self.openings, self.lean))

    @cached_property
    def planned(self) -> tuple[SideLayout, Notes]:
        """The layout of the slides."""
        return lay_out_sides(self.driven, self.names, task(self.openings, self.lean), self.block, 35.0)

    @property
    def layout(self) -> SideLayout:
        """The layout of the slides, without its notes."""
        return self.planned[0]

    @cached_property
    def halves(self) -> Halves:
        """Halves of the filled box without the fronts, and the fronts' steel up to the side of the block."""
        low, high = np.asarray(self.block.low), np.asarray(self.block.high)
        cavity = cut(box((low[0], low[1], 0.0), high), outer_solid(self.lean))
        core = fuse(box(low, (high[0], high[1], 0.0)), inner_solid(self.lean))
        steels = []
        for name, one in zip(self.names, self.driven, strict=True):
            frame = across(one.front.axis)
            far = float(np.abs(frame[2]) @ np.maximum(np.abs(low), np.abs(high)))
            tool = prism(one.front, far)
            tool = common(tool, box(low, high))
            cavity, core = cut(cavity, tool), cut(core, tool)
            before = [prism(d.front, far) for d in self.driven[: len(steels)] if one.under]
            steels.append(SideSteel(name, one.front, largest(tool, part(self.openings, self.lean).solid, *before)))
        return Halves(cavity, core, Body(shell(self.lean)), np.zeros(0, bool), 0.0, low, high, (), tuple(steels),
                      part(self.openings, self.lean).solid)  # fmt: skip

    @cached_property
    def made(self) -> SideCut:
        """The side actions cut."""
        return cut_side_actions(self.halves, self.layout, "1.2311")

    @cached_property
    def bodies(self) -> list[ProofBody]:
        """Everything as the proofs see it."""
        here = ((0.0, 0.0, 0.0),)
        own = [
            ("part", Role.PART, Motion.PART, self.halves.real_part, here),
            ("cavity", Role.CAVITY, Motion.CAVITY_HALF, self.made.halves.cavity, here),
            ("core", Role.CORE, Motion.CORE_HALF, self.made.halves.core, here),
        ]
        return placed_bodies([*own, *((c.name, c.role, c.motion, c.solid, c.positions) for c in self.made.components)])


@cache
def side_mold(openings: tuple[Opening, ...] = ONE) -> SideMold:
    """The mold of a box with windows, drives as moldgen finds them."""
    return SideMold(openings, driven(openings))


def claims(mold: SideMold, steps: Sequence[Step] | None = None) -> Claims:
    """What a mold claims; steps other than its own plant a fault."""
    block = float(np.prod(mold.halves.high - mold.halves.low))
    bored = sum(r.volume_mm3 for r in mold.made.removed)
    own = opening_steps(mold.layout, 80.0, 35.0, 40.0)
    return Claims(block, bored, 35.0, own if steps is None else tuple(steps))


def failed(mold: SideMold, steps: Sequence[Step] | None = None) -> set[str]:
    """Names of the proofs that do not hold; a mold without ejectors has nothing to ask of them."""
    proofs = prove_tool(mold.bodies, claims(mold, steps))
    assert len(proofs) == 7
    return {p.name for p in proofs if not p.passed and p.name != EJECTORS_MOVE}


def leaning_mold() -> SideMold:
    """A window in a wall that leans 2 mm over 30: the core's wall under the window stands further out than its top."""
    lean = 2.0
    inner, outer = LENGTH / 2 - WALL - 18.0 * lean / TALL, LENGTH / 2 - 10.0 * lean / TALL
    front = replace(window_front(ONE[0]), near=inner, clear=outer, travel=LENGTH / 2 - inner)
    return SideMold(ONE, drive_fronts([front], part(ONE, lean), 0.0)[0], lean)


def oblique(degrees: float) -> tuple[Opening, ...]:
    """A window through the wall to +x whose slide leaves at an angle in plan."""
    turn = math.radians(degrees)
    middle = -(LENGTH / 2 - WALL / 2) * math.sin(turn)
    return (((math.cos(turn), math.sin(turn), 0.0), middle - 5.0, middle + 5.0, 10.0, 18.0),)
