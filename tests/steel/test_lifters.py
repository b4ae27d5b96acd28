"""A hook under the roof of a box, released by a lifter: its place in the block, and its whole way with the part."""

from __future__ import annotations

import math
from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from helpers.side_molds import SideMold, X, failed, inner_solid, largest, outer_solid, prism, shell
from helpers.solids import box, common, cut, fuse

from moldgen.catalog import resin
from moldgen.kernel.body import Body
from moldgen.kernel.measure import volume
from moldgen.layout.side_actions import lay_out_sides
from moldgen.layout.side_drive import Driven
from moldgen.layout.slide_body import SideTask
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.layout import BlockLayout
from moldgen.model.motion import Step
from moldgen.model.side_action import Front, SideKind, across
from moldgen.model.slide import Drive
from moldgen.model.tool import Role
from moldgen.proof.opening import SIDES_MOVE
from moldgen.steel.side_motion import opening_steps

ANGLE = 9.0
BLOCK = BlockLayout((-60.0, -50.0, -40.0), (60.0, 50.0, 60.0))
REACH = 4.0
"""mm: how far the hook's foot stands out."""


def hook_front() -> Front:
    """8 mm wide both ways; at the roof (z = 28) it begins at the hook's stem, x = 2; it leans down toward -x."""
    slope = math.radians(ANGLE)
    axis = (-math.sin(slope), 0.0, -math.cos(slope))
    frame = across(axis)
    at_roof = frame @ np.array([[2.0, 0.0, 28.0], [10.0, 0.0, 28.0]]).T
    low, high = sorted(at_roof[:2].T.tolist())
    wide = 0 if abs(high[0] - low[0]) > abs(high[1] - low[1]) else 1
    low[1 - wide], high[1 - wide] = low[1 - wide] - 4.0, high[1 - wide] + 4.0
    (a, b), (c, d) = low, high
    outline = np.array([(a, b), (c, b), (c, d), (a, d)])
    near = float(frame[2] @ np.array([6.0, 0.0, 29.0]))
    return Front(SideKind.LIFTER, axis, X, (outline,), near, near + 60.0, near + 12.0, REACH, (0,), "by hand")


@cache
def hooked() -> Body:
    hook = fuse(box((0.0, -4.0, 18.0), (2.0, 4.0, 28.5)), box((0.0, -4.0, 18.0), (2.0 + REACH, 4.0, 20.0)))
    return Body(fuse(shell(), hook))


@cache
def lifter_mold() -> SideMold:
    front, part = hook_front(), hooked().solid
    low, high = np.asarray(BLOCK.low), np.asarray(BLOCK.high)
    tool = common(prism(front, front.far + 60.0), box(low, (high[0], high[1], 29.9)))
    steel = largest(tool, part)
    core = cut(fuse(box(low, (high[0], high[1], 0.0)), inner_solid()), part, tool)
    cavity = cut(box((low[0], low[1], 0.0), high), outer_solid())
    mold = SideMold((), (Driven(front, Drive.ANGLED_PIN),))
    task = SideTask(hooked(), 0.0, resin("ABS"))
    mold.__dict__["block"] = BLOCK
    mold.__dict__["planned"] = lay_out_sides(mold.driven, mold.names, task, BLOCK, 35.0)
    mold.__dict__["halves"] = Halves(
        cavity, core, Body(shell()), np.zeros(0, bool), 0.0, low, high, (), (SideSteel("lifter 1", front, steel),), part
    )  # fmt: skip
    return mold


def test_every_proof_holds_with_a_lifter() -> None:
    assert failed(lifter_mold()) == set()


def test_a_lifter_fills_its_place_in_the_block() -> None:
    """Block = cavity + core + lifter + part, to the last part in 1e9."""
    made = lifter_mold().made
    (lifter,) = [c for c in made.components if c.role is Role.LIFTER]
    total = sum(volume(s) for s in (made.halves.cavity, made.halves.core, lifter.solid, hooked().solid))
    assert total == pytest.approx(120.0 * 100.0 * 100.0, rel=1e-9)


def test_the_table_says_where_the_lifter_leaves_the_core() -> None:
    (hole,) = lifter_mold().made.holes
    shift = (28.0 + 40.0) * math.tan(math.radians(ANGLE))
    assert (hole.x_mm, hole.y_mm, hole.z_from_mm) == pytest.approx((6.0 - shift, 0.0, -40.0))
    across_x = 8.0 * math.cos(math.radians(ANGLE))
    assert hole.diameter_mm == pytest.approx(math.hypot(across_x, 8.0))


@pytest.mark.parametrize("share", [0.0, 0.5, -1.0], ids=["straight up", "too little", "the wrong way"])
def test_a_lifter_that_moves_otherwise_is_found(share: float) -> None:
    steps = [
        Step(s.name, tuple((g, (share * m[0], m[1], m[2])) if g == "lifter 1" else (g, m) for g, m in s.moves))
        for s in opening_steps(lifter_mold().layout, 80.0, 35.0, 40.0)
    ]
    assert SIDES_MOVE in failed(lifter_mold(), steps)


def test_a_stroke_too_short_for_the_hook_is_found() -> None:
    """20 mm at 9 deg are 3.2 mm sideways; the hook stands out by 4."""
    steps = opening_steps(lifter_mold().layout, 80.0, 20.0, 60.0)
    assert SIDES_MOVE in failed(lifter_mold(), steps)
    front = replace(hook_front(), travel=REACH)
    task = SideTask(hooked(), 0.0, resin("ABS"))
    notes = lay_out_sides((Driven(front, Drive.ANGLED_PIN),), ["lifter 1"], task, BLOCK, 20.0)[1]
    assert [f.code for f in notes.findings] == ["side.lifter_travel"]
