"""An accepted block stays where it stands; it grows only at the sides where the changed part asks for more steel."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.blocks import size_blocks
from moldgen.layout.carry_block import KeptBlock
from moldgen.model.layout import BlockLayout
from moldgen.spec.sections import Blocks

from .shapes import plate, view_of

PART = plate(60.0, 40.0, 12.0)


def sized(shape, kept: KeptBlock | None, section: Blocks | None = None) -> tuple[BlockLayout, str]:
    """Return the block round a part, and why it is as it is."""
    layout, notes = size_blocks(view_of(shape).body, resin("ABS"), section or Blocks(), 0.0, kept)
    (decision,) = [d for d in notes.decisions if d.topic == "blocks"]
    return layout, decision.why


def as_kept(layout: BlockLayout) -> KeptBlock:
    """Return a block as an accepted layout has it, with the parting plane at 0."""
    (x, y, z), (x1, y1, z1) = layout.low, layout.high
    return KeptBlock(((x + x1) / 2, (y + y1) / 2, 0.0), x1 - x, y1 - y, z1, -z)


@pytest.fixture(scope="module")
def first() -> BlockLayout:
    return sized(PART, None)[0]


def test_on_the_same_part_it_is_the_same_to_the_last_digit(first: BlockLayout) -> None:
    kept = as_kept(first)
    x, y, z = kept.at
    near = KeptBlock((x + 4e-7, y, z), kept.length, kept.width, kept.cavity_height, kept.core_height)
    assert sized(PART, near)[0] == first


def test_it_stays_where_the_part_grows_within_its_spare_steel(first: BlockLayout) -> None:
    wider = plate(60.5, 40.0, 12.0).translate((0.25, 0.0, 0.0))
    layout, why = sized(wider, as_kept(first))
    assert layout == first
    assert "kept" in why
    assert sized(wider, None)[0] != first, "without the accepted one it would follow the middle of the part"


def test_only_the_side_that_must_grow_grows() -> None:
    section = Blocks(wall=25.0)  # 125 x 100 mm round 60 x 40: 32.5 and 30 mm are there
    base = sized(PART, None, section)[0]
    longer = plate(80.0, 40.0, 12.0).translate((10.0, 0.0, 0.0))  # 20 mm longer at +x: from -30 to 50
    layout, why = sized(longer, as_kept(base), section)
    assert layout.low == base.low
    assert layout.high[1:] == base.high[1:]
    assert layout.high[0] >= 50.0 + 25.0
    assert "+x side by" in why
    assert "12.50 mm of steel beside the part, 25.00 mm are needed" in why
    assert "-x side" not in why
    assert "y side" not in why


def test_a_part_that_moved_makes_the_block_grow_there_with_enough_steel(first: BlockLayout) -> None:
    section = Blocks(wall=25.0)
    base = as_kept(sized(PART, None, section)[0])
    layout, why = sized(PART.translate((0.0, -15.0, 0.0)), base, section)
    assert layout.low[1] <= -35.0 - 25.0 + 1e-6
    assert layout.high == base.high
    assert layout.low[0] == base.low[0]
    assert "25.00 mm are needed" in why


def test_a_higher_part_raises_the_top_only(first: BlockLayout) -> None:
    layout, why = sized(plate(60.0, 40.0, 45.0), as_kept(first))
    assert layout.high[2] > first.high[2]
    assert layout.low[2] <= first.low[2]
    assert "top by" in why


def test_what_the_spec_gives_comes_first(first: BlockLayout) -> None:
    layout, _ = sized(PART, as_kept(first), Blocks(length=200.0, cavity_height=60.0))
    assert layout.high[0] - layout.low[0] == 200.0
    assert layout.high[2] == 60.0
    assert layout.low[1:] == first.low[1:]


@pytest.mark.parametrize("shift", [(150.0, 0.0, 0.0), (55.0, -45.0, 0.0), (0.0, 0.0, 80.0)])
def test_a_part_that_stands_elsewhere_gets_a_block_of_its_own(first: BlockLayout, shift: tuple[float, ...]) -> None:
    part = PART.translate(shift)
    body = view_of(part).body
    layout, notes = size_blocks(body, resin("ABS"), Blocks(), shift[2], as_kept(first))
    assert layout == size_blocks(body, resin("ABS"), Blocks(), shift[2])[0]
    (decision,) = [d for d in notes.decisions if d.topic == "blocks"]
    assert "the part does not stand in the accepted block" in decision.why
    assert [f.where for f in notes.findings if f.code == "accepted.dropped"] == ["blocks"]


def test_a_part_that_outgrew_the_block_still_stands_in_it(first: BlockLayout) -> None:
    layout, why = sized(plate(400.0, 40.0, 12.0).translate((170.0, 0.0, 0.0)), as_kept(first))
    assert layout.low[0] == first.low[0], "it got longer at +x only"
    assert "+x side by" in why


def least_walls(first: BlockLayout) -> tuple[float, float, float]:
    """Return what the rules want at -x, over and under PART: what is needed is told where nothing is left."""
    kept = as_kept(first)
    bare = KeptBlock(kept.at, 60.0, kept.width, 12.0, 0.1)
    _, why = sized(PART, bare)
    return tuple(float(n) for n in re.findall(r"([0-9.]+) mm are needed", why))[1:]


SLACK = {"x": 0, "over": 1, "under": 2}


@pytest.mark.parametrize("where", sorted(SLACK))
@pytest.mark.parametrize(("share", "stays"), [(1.01, True), (0.985, True), (0.975, False)])
def test_a_hair_of_missing_steel_is_a_caution_and_not_another_block(
    first: BlockLayout, where: str, share: float, stays: bool
) -> None:
    least, kept = least_walls(first), as_kept(first)
    steel = share * least[SLACK[where]]
    size = {"x": ("length", 60.0 + 2 * steel), "over": ("cavity_height", 12.0 + steel), "under": ("core_height", steel)}
    key, value = size[where]
    accepted = replace(kept, **{key: value})
    layout, notes = size_blocks(view_of(PART).body, resin("ABS"), Blocks(), 0.0, accepted)
    low, high = np.array(layout.low), np.array(layout.high)
    assert (np.allclose(low, accepted.low) and np.allclose(high, accepted.high)) is stays
    told = [f for f in notes.findings if f.code == "accepted.thin_wall"]
    assert len(told) == ((2 if where == "x" else 1) if share == 0.985 else 0)
    for finding in told:
        assert finding.where == f"blocks.{key}"
        assert finding.value == pytest.approx(steel, abs=1e-3)
        assert finding.limit == pytest.approx(least[SLACK[where]], abs=6e-3)


def test_a_wall_that_the_spec_gives_is_kept_in_full() -> None:
    section = Blocks(wall=25.0)
    kept = replace(as_kept(sized(PART, None, section)[0]), length=60.0 + 2 * 24.7)
    layout, why = sized(PART, kept, section)
    assert layout.high[0] >= 30.0 + 25.0
    assert "25.00 mm are needed" in why
