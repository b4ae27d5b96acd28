"""Blocks: they hold the part with the walls that the rules ask for, in preferred sizes; given sizes are checked."""

import pytest

from moldgen.catalog import preferred_size_up, resin
from moldgen.errors import SpecError
from moldgen.layout.blocks import size_blocks
from moldgen.rules.cavity_wall import cavity_side_wall, cavity_side_wall_practice, parting_gap_limit
from moldgen.spec.sections import Blocks

from .shapes import box, cup, lid, plate, view_of

ABS = resin("ABS")


def sized(shape, blocks=None, level=0.0):
    body = view_of(shape).body
    layout, notes = size_blocks(body, ABS, blocks or Blocks(), level)
    return body, layout, notes


@pytest.mark.parametrize("shape", [box(), cup(), lid(), plate(120, 20, 4)], ids=["box", "cup", "lid", "strip"])
def test_walls_hold_the_melt_and_sizes_are_preferred(shape):
    body, layout, notes = sized(shape)
    low, high = body.box
    assert notes.findings == ()
    for axis in (0, 1):
        size = layout.high[axis] - layout.low[axis]
        assert size == pytest.approx(preferred_size_up(size - 1e-6, "edge"))
        wall = min(low[axis] - layout.low[axis], layout.high[axis] - high[axis])
        along = (high - low)[1 - axis]
        assert wall >= cavity_side_wall_practice(along) - 1e-6
        moved = cavity_side_wall(ABS.cavity_pressure.high, max(high[2], 1.0), along, wall, 190e3)
        assert moved <= parting_gap_limit(ABS.vent_depth.high) * 1.2  # a softer steel than any in the catalog
    up, down = layout.high[2], -layout.low[2]
    assert (up, down) == pytest.approx(
        (preferred_size_up(up - 1e-6, "thickness"), preferred_size_up(down - 1e-6, "thickness"))
    )


def test_the_part_stands_in_the_middle():
    _, layout, _ = sized(box().translate((33.0, -8.0, 0.0)))
    middle = [(a + b) / 2 for a, b in zip(layout.low, layout.high, strict=True)]
    assert middle[:2] == pytest.approx((33.0, -8.0))


def test_heights_count_from_the_parting_plane():
    _, layout, _ = sized(box(), Blocks(cavity_height=80.0, core_height=60.0), level=10.0)
    assert (layout.low[2], layout.high[2]) == pytest.approx((-50.0, 90.0))


def test_given_sizes_are_kept():
    _, layout, notes = sized(box(), Blocks(length=180.0, width=150.0))
    assert layout.high[0] - layout.low[0] == pytest.approx(180.0)
    assert layout.high[1] - layout.low[1] == pytest.approx(150.0)
    assert notes.findings == ()


@pytest.mark.parametrize("key", ["length", "wall", "cavity_height", "core_height"])
def test_thin_steel_is_told_with_value_and_limit(key):
    value = {"length": 84.0, "wall": 10.0, "cavity_height": 48.0, "core_height": 12.0}[key]
    _, _, notes = sized(box(), Blocks(**{key: value}))
    findings = [f for f in notes.findings if f.code == "blocks.thin_steel"]
    assert findings
    assert all(f.value < f.limit for f in findings)


@pytest.mark.parametrize(("key", "value"), [("length", 50.0), ("width", 45.0), ("cavity_height", 40.0)])
def test_blocks_that_do_not_hold_the_part_are_refused(key, value):
    with pytest.raises(SpecError, match="steel") as caught:
        sized(box(), Blocks(**{key: value}))
    assert caught.value.where == f"blocks.{key}"
    assert "at least" in caught.value.remedy


def test_a_deep_cavity_never_gets_thinner_walls():
    sizes = [sized(box(depth=depth))[1] for depth in (10.0, 30.0, 60.0, 120.0)]
    widths = [layout.high[0] - layout.low[0] for layout in sizes]
    assert widths == sorted(widths)


def test_core_block_holds_the_fit_of_the_pins():
    _, plain, _ = sized(plate(40, 40, 20))
    bored = plate(40, 40, 20).cut(plate(1, 1, 1)).faces("<Z").workplane().hole(15.8, 12)
    _, deep, _ = sized(bored)
    assert deep.low[2] <= plain.low[2]
    assert -deep.low[2] >= 2 * 16.0 + 5.0 + 7.0
