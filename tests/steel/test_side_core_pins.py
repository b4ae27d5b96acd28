"""A block of plastic with a long round bore from its side, through which the parting plane goes."""

from __future__ import annotations

import math
from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from helpers.side_molds import SideMold, X, block_of, failed, largest, prism
from helpers.solids import box, common, cut, cylinder

from moldgen.catalog import resin
from moldgen.kernel.body import Body
from moldgen.kernel.measure import volume
from moldgen.layout.side_actions import lay_out_sides
from moldgen.layout.side_core_pins import round_front
from moldgen.layout.side_drive import drive_fronts
from moldgen.layout.slide_body import SideTask
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.side_action import Front, SideKind
from moldgen.model.slide import Drive
from moldgen.model.tool import Role

RADIUS, DEPTH, SIDE = 2.0, 14.0, 10.0
CORNERS = 24


def bore_front(corners: int = CORNERS, depth: float = DEPTH) -> Front:
    """The bore from x = 10 inward, with an outline that lies a little outside it."""
    turn = 2 * math.pi * (np.arange(corners) + 0.5) / corners
    reach = 1.02 * RADIUS / math.cos(math.pi / corners)
    outline = reach * np.column_stack([np.cos(turn), np.sin(turn)])
    return Front(SideKind.SLIDE, X, X, (outline,), SIDE - depth, SIDE + 1.0, SIDE, depth, (0,), "by hand")


@cache
def bored() -> Body:
    return Body(cut(box((-10.0, -8.0, -6.0), (SIDE, 8.0, 6.0)), cylinder(RADIUS, DEPTH, (SIDE - DEPTH, 0.0, 0.0), X)))


@cache
def bored_mold() -> SideMold:
    task = SideTask(bored(), 0.0, resin("ABS"))
    driven, _ = drive_fronts([bore_front()], bored(), 0.0)
    mold = SideMold((), driven)
    block = block_of(driven, task)
    low, high = np.asarray(block.low), np.asarray(block.high)
    tool = common(prism(driven[0].front, high[0]), box(low, high))
    full = box((-10.0, -8.0, -6.0), (SIDE, 8.0, 6.0))
    cavity = cut(box((low[0], low[1], 0.0), high), full, tool)
    core = cut(box(low, (high[0], high[1], 0.0)), full, tool)
    steel = SideSteel("slide 1", driven[0].front, largest(tool, bored().solid))
    mold.__dict__["block"] = block
    mold.__dict__["planned"] = lay_out_sides(driven, mold.names, task, block, 35.0)
    mold.__dict__["halves"] = Halves(
        cavity, core, Body(full), np.zeros(0, bool), 0.0, low, high, (), (steel,), bored().solid
    )
    return mold


def test_a_long_round_front_becomes_a_pin() -> None:
    found = round_front(bore_front())
    assert found is not None
    over_corners = 2 * 1.02 * RADIUS / math.cos(math.pi / CORNERS)
    assert (found.u, found.z) == pytest.approx((0.0, 0.0), abs=1e-9)
    assert found.diameter == pytest.approx(over_corners, rel=1e-3)
    assert found.slenderness == pytest.approx(DEPTH / over_corners, rel=1e-3)
    assert found.shank == 4.5


@pytest.mark.parametrize(
    "front",
    [
        bore_front(depth=9.0),
        bore_front(corners=6),
        replace(bore_front(), outline=(bore_front().outline[0] * np.array([1.0, 1.1]),)),
    ],
    ids=["short", "hexagon", "oval"],
)
def test_other_fronts_stay_in_the_slide(front: Front) -> None:
    assert round_front(front) is None


def test_every_proof_holds_with_a_side_core_pin() -> None:
    assert bored_mold().driven[0].drive is Drive.ANGLED_PIN
    assert failed(bored_mold()) == set()


def test_the_pin_has_the_volume_of_its_pieces() -> None:
    """The bore's own cylinder, the outline's prism from the part to the slide, the shank in the slide."""
    (slide,) = bored_mold().layout.slides
    (pin,) = slide.core_pins
    (made,) = [c for c in bored_mold().made.components if c.role is Role.SIDE_CORE_PIN]
    assert slide.body is not None
    points = bored_mold().driven[0].front.outline[0]
    x, y = points[:, 0], points[:, 1]
    area = 0.5 * float((x * np.roll(y, -1) - y * np.roll(x, -1)).sum())
    shank = math.pi / 4 * pin.diameter**2 * pin.depth
    whole = math.pi * RADIUS**2 * DEPTH + area * (slide.body.start - SIDE) + shank
    assert volume(made.solid) == pytest.approx(whole, rel=1e-6)
    assert made.motion == "slide 1"


def test_a_slender_pin_is_told() -> None:
    """Free length over diameter 3.4 of a limit of 5: nothing; twice as long: a warning."""
    assert "side.slender_core_pin" not in {f.code for f in bored_mold().planned[1].findings}
    longer = replace(bored_mold().driven[0], front=replace(bore_front(), near=SIDE - 2 * DEPTH))
    task = SideTask(bored(), 0.0, resin("ABS"))
    notes = lay_out_sides((longer,), ["slide 1"], task, block_of((longer,), task), 35.0)[1]
    assert "side.slender_core_pin" in {f.code for f in notes.findings}
