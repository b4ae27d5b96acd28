"""Boxes with windows, their halves and forming steel, made by hand with simple booleans: every volume is known.

The part is a box open at the bottom (z = 0, the parting plane), 60 x 40 x 30 outside with walls of 2 mm. Windows go
through its walls. Halves are those of the box with its windows filled, less the fronts.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np

from helpers.solids import box, cut, fuse
from moldgen.catalog import resin
from moldgen.kernel.body import Body
from moldgen.layout.side_actions import lay_out_sides, room_needed
from moldgen.layout.side_drive import Driven, drive_fronts
from moldgen.layout.slide_body import SideTask
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.layout import BlockLayout
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import SideLayout

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


def shell():
    """The box without windows."""
    inner = box((-LENGTH / 2 + WALL, -WIDTH / 2 + WALL, -1.0), (LENGTH / 2 - WALL, WIDTH / 2 - WALL, TALL - WALL))
    return cut(box((-LENGTH / 2, -WIDTH / 2, 0.0), (LENGTH / 2, WIDTH / 2, TALL)), inner)


def window_front(opening: Opening) -> Front:
    """The front that fills one window."""
    axis, left, right, low, high = opening
    rim = outside(axis)
    outline = np.array([(left, low), (right, low), (right, high), (left, high)])
    return Front(SideKind.SLIDE, axis, axis, (outline,), rim - WALL, rim + 1.0, rim, WALL, (0,), "by hand")


def prism(front: Front, far: float, near: float | None = None):
    """The solid of a front with a rectangular outline, up to a coordinate along its axis."""
    frame = across(front.axis)
    points = np.vstack(list(front.outline))
    low, high = points.min(axis=0), points.max(axis=0)
    start = front.near if near is None else near
    corners = np.array([(*low, start), (*high, far)]) @ frame
    return box(corners.min(axis=0), corners.max(axis=0))


@cache
def part(openings: tuple[Opening, ...] = ONE):
    """The box with its windows."""
    fronts = [window_front(o) for o in openings]
    return Body(cut(shell(), *(prism(f, f.clear + 1.0, f.near - 1.0) for f in fronts)))


def task(openings: tuple[Opening, ...] = ONE) -> SideTask:
    """What the slides of the box share."""
    return SideTask(part(openings), 0.0, resin("ABS"))


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


def side_names(fronts: Sequence[Driven]) -> list[str]:
    """slide 1, slide 2, ..."""
    return [f"slide {n}" for n in range(1, len(fronts) + 1)]


@cache
def laid_out(openings: tuple[Opening, ...] = ONE) -> tuple[SideLayout, BlockLayout]:
    """Slides of the box, and its block."""
    fronts, one = driven(openings), task(openings)
    block = block_of(fronts, one)
    return lay_out_sides(fronts, side_names(fronts), one, block, 35.0)[0], block


@cache
def halves(openings: tuple[Opening, ...] = ONE) -> Halves:
    """Halves of the filled box without the fronts, and the fronts' steel up to the side of the block."""
    fronts, (_, block) = driven(openings), laid_out(openings)
    low, high = np.asarray(block.low), np.asarray(block.high)
    outer = box((-LENGTH / 2, -WIDTH / 2, 0.0), (LENGTH / 2, WIDTH / 2, TALL))
    plug = box((-LENGTH / 2 + WALL, -WIDTH / 2 + WALL, -1.0), (LENGTH / 2 - WALL, WIDTH / 2 - WALL, TALL - WALL))
    cavity = cut(box((low[0], low[1], 0.0), high), outer)
    core = fuse(box(low, (high[0], high[1], 0.0)), plug)
    steels = []
    for name, one in zip(side_names(fronts), fronts, strict=True):
        frame = across(one.front.axis)
        far = float(max(frame[2] @ low, frame[2] @ high))
        tool = prism(one.front, far)
        cavity = cut(cavity, tool)
        steels.append(SideSteel(name, one.front, cut(tool, part(openings).solid)))
    return Halves(cavity, core, Body(shell()), np.zeros(0, bool), 0.0, low, high, (), tuple(steels),
                  part(openings).solid)  # fmt: skip
