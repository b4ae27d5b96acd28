"""Laws of the halves: volumes balance; turning, mirroring and scaling the part turns, mirrors and scales them."""

import math
from functools import cache

import numpy as np
import pytest
from helpers import solids
from helpers.molding import block_mm3, mold
from hypothesis import given, settings
from hypothesis import strategies as st

from moldgen.kernel.measure import joint_volume, volume
from moldgen.parting.surface import Rung
from moldgen.parting.told import parting_line
from moldgen.tolerances import BALANCE

FEW = settings(deadline=None, max_examples=25, derandomize=True)

RAMP = [(-40, -40, -30), (-40, -40, 0), (-5, -40, 0), (5, -40, 6), (40, -40, 6), (40, -40, -30)]

PARTS = {
    "plate with a boss": lambda: solids.cut(
        solids.fuse(solids.box((-20, -12, 0), (20, 12, 5)), solids.cone(6, 5, 8, at=(-8, 3, 5))),
        solids.cylinder(3, 20, at=(10, -2, -5)),
    ),
    "rising rim": lambda: solids.cut(
        solids.cone(30, 26, 25), solids.extruded(RAMP, (0, 80, 0)), solids.cone(28, 24, 22)
    ),
    "bar with a slope": lambda: solids.cut(
        solids.under_curve([8, 14, 21, 12, 17, 9], 60, 30), solids.cone(5, 4, 30, at=(30, 15, -1))
    ),
}


@cache
def part(name):
    return PARTS[name]()


@cache
def molded(name):
    return mold(part(name))


def line_points(made):
    """Every end of the parting line's edges and a dozen points along each, in one array."""
    return np.vstack(parting_line(made.parted))


def apart(one, other):
    """The largest distance from a point of one line to the nearest point of another, both ways."""
    gap = np.linalg.norm(one[:, None] - other[None], axis=2)
    return max(gap.min(axis=1).max(), gap.min(axis=0).max())


def step_of(points):
    """The largest distance between neighbours on a line: lines sampled elsewhere lie no farther apart."""
    return np.linalg.norm(np.diff(points, axis=0), axis=1).max()


@pytest.mark.parametrize("name", PARTS)
def test_the_halves_are_proved_and_balance(name):
    made = molded(name)
    assert made.parted.check.proved, made.parted.check.complaint
    assert made.parted.check.balance < BALANCE


@pytest.mark.parametrize("degrees", [90.0, 37.0])
@pytest.mark.parametrize("name", PARTS)
def test_turning_the_part_about_the_pull_turns_the_parting_line(name, degrees):
    there = mold(solids.turned(part(name), degrees))
    assert there.parted.check.proved, there.parted.check.complaint
    assert there.parted.level == pytest.approx(molded(name).parted.level, abs=1e-6)
    c, s = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
    here = line_points(molded(name)) @ np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])
    assert apart(here, line_points(there)) < step_of(here)
    assert same_share(molded(name), there)


@pytest.mark.parametrize("name", PARTS)
def test_a_mirrored_part_has_the_mirrored_line(name):
    there = mold(solids.mirrored(part(name)))
    assert there.parted.check.proved, there.parted.check.complaint
    here = line_points(molded(name)) * [-1.0, 1.0, 1.0]
    assert apart(here, line_points(there)) < step_of(here)
    for one, other in zip(halves(molded(name)), halves(there), strict=True):
        assert volume(one) == pytest.approx(volume(other), rel=1e-6)


@pytest.mark.parametrize("factor", [0.5, 3.0])
@pytest.mark.parametrize("name", PARTS)
def test_a_part_scaled_has_the_line_scaled(name, factor):
    there = mold(solids.grown(part(name), factor), corners=scaled(molded(name).corners, factor))
    assert there.parted.check.proved, there.parted.check.complaint
    assert there.parted.level == pytest.approx(factor * molded(name).parted.level, abs=1e-6)
    here = factor * line_points(molded(name))
    assert apart(here, line_points(there)) < step_of(here)
    # integrated as one, so that the errors on their common wall cancel
    assert joint_volume(halves(there)) == pytest.approx(factor**3 * joint_volume(halves(molded(name))), rel=1e-6)
    # a land, round the part or in a hole, is as wide on a small part as on a large one; all else scales
    sheets = [m.parted.sheet for m in (molded(name), there)]
    if not any(loop.land_mm or loop.rung is Rung.LID for sheet in sheets for loop in (sheet.outer, *sheet.shut_offs)):
        for one, other in zip(halves(molded(name)), halves(there), strict=True):
            assert volume(other) == pytest.approx(factor**3 * volume(one), rel=1e-6)


def scaled(corners, factor):
    return factor * corners[0], factor * corners[1]


def halves(made):
    return made.parted.cavity, made.parted.core


def same_share(one, other):
    """True when both cavities form the same area of the part."""
    shares = [m.parted.body.face_areas[m.parted.sides.cavity].sum() for m in (one, other)]
    return shares[0] == pytest.approx(shares[1], rel=1e-3)


@pytest.mark.parametrize("name", PARTS)
def test_the_same_part_gives_the_same_halves(name):
    again = mold(PARTS[name]())
    assert np.array_equal(line_points(again), line_points(molded(name)))
    assert volume(again.parted.cavity) == volume(molded(name).parted.cavity)


@pytest.mark.parametrize("name", PARTS)
def test_a_larger_block_changes_no_line(name):
    wide = mold(part(name), margin=40.0)
    assert np.array_equal(line_points(wide), line_points(molded(name)))


# --- random plates --------------------------------------------------------------------------------------------------

kinds = st.sampled_from(["hole", "taper", "boss"])
spot = st.tuples(st.floats(0.1, 0.9), st.floats(0.1, 0.9), st.floats(0.5, 3.0), kinds)
plate = st.tuples(
    st.floats(30, 80), st.floats(20, 60), st.floats(3, 15), st.lists(spot, max_size=4), st.floats(0.0, 360.0)
)


def plate_of(length, width, height, spots, degrees):
    """A plate with holes, tapered holes and bosses that stand apart; and its volume by closed form."""
    solid, expected = solids.box((0, 0, 0), (length, width, height)), length * width * height
    taken = []
    for u, v, radius, kind in spots:
        x, y = u * length, v * width
        clear = min(x, y, length - x, width - y) > radius + 2.5
        if not clear or any(math.hypot(x - a, y - b) < radius + r + 2.5 for a, b, r in taken):
            continue
        taken.append((x, y, radius + 1.0))
        if kind == "boss":
            solid = solids.fuse(solid, solids.cone(radius + 1, radius, 4, at=(x, y, height)))
            expected += math.pi * 4 * ((radius + 1) ** 2 + (radius + 1) * radius + radius**2) / 3
        else:
            top = radius + (1.0 if kind == "taper" else 0.0)
            at = (x, y, 0)
            tool = solids.cone(radius, top, height, at) if top > radius else solids.cylinder(radius, height, at)
            solid = solids.cut(solid, tool)
            expected -= math.pi * height * (radius**2 + radius * top + top**2) / 3
    return solids.turned(solid, degrees), expected


@FEW
@given(plate)
def test_random_plates_give_halves_that_balance(values):
    solid, expected = plate_of(*values)
    assert volume(solid) == pytest.approx(expected, rel=1e-9)
    made = mold(solid)
    assert made.parted.check.proved, made.parted.check.complaint
    block = block_mm3(made.corners)
    total = volume(made.parted.cavity) + volume(made.parted.core) + expected
    assert abs(total - block) / block < BALANCE
    bored = sum(kind != "boss" for *_, kind in values[3])
    assert len(made.parted.sheet.shut_offs) <= bored


@FEW
@given(plate, st.floats(0.5, 4.0))
def test_random_plates_scale(values, factor):
    solid, _ = plate_of(*values)
    here = mold(solid)
    there = mold(solids.grown(solid, factor), corners=scaled(here.corners, factor))
    assert volume(there.parted.core) == pytest.approx(factor**3 * volume(here.parted.core), rel=1e-6)
    assert len(there.parted.loops) == len(here.parted.loops)
