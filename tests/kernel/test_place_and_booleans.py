"""Shrink and turn (ISO 294-4), and booleans that tell what came out."""

import math

import numpy as np
import pytest
from helpers import solids

from moldgen.kernel.body import Body
from moldgen.kernel.boolean import common, copied, cut, fuse, inside_box, prism
from moldgen.kernel.measure import bounding_box, centroid, is_valid, volume, volume_adaptive
from moldgen.kernel.place import moved, to_mold
from moldgen.kernel.topology import faces_of
from moldgen.model.part import MoldFrame

UPRIGHT = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
Y_UP = ((1.0, 0.0, 0.0), (0.0, 0.0, -1.0), (0.0, 1.0, 0.0))
K = 1 / (1 - 0.018)

EVERY_KIND = solids.fuse(
    solids.box((0, 0, 0), (20, 20, 10)),
    solids.cylinder(3, 5, at=(5, 5, 10)),
    solids.cone(4, 2, 6, at=(14, 14, 10)),
    solids.shifted(solids.sphere(3), 20, 10, 5),
)


def kinds(solid):
    body = Body(solid)
    return sorted(body.surface_kind(f) for f in range(len(body.faces)))


def test_a_hundred_millimetres_at_1_8_percent_are_101_833():
    # ISO 294-4: shrinkage is referred to the mold, so mold = part / (1 - S)
    block = to_mold(solids.box((0, 0, 0), (100, 100, 100)), MoldFrame((K, K, K), (0, 0, 0), UPRIGHT))
    low, high = bounding_box(block)
    assert high - low == pytest.approx([101.833] * 3, abs=5e-4)
    assert volume(block) == pytest.approx(100**3 / 0.982**3, rel=1e-12)


@pytest.mark.parametrize("fixed", [(0.0, 0.0, 0.0), (10.0, 10.0, 5.0), (-7.0, 30.0, 2.0)])
def test_the_fixed_point_stays(fixed):
    frame = MoldFrame((K, K, K), fixed, UPRIGHT)
    before, after = centroid(EVERY_KIND), centroid(to_mold(EVERY_KIND, frame))
    assert frame.to_mold(fixed) == pytest.approx(fixed)
    for a, b, f in zip(before, after, fixed, strict=True):
        assert b - f == pytest.approx((a - f) / 0.982, rel=1e-9)


def test_uniform_scaling_keeps_every_surface_what_it_is():
    grown = to_mold(EVERY_KIND, MoldFrame((K, K, K), (0, 0, 0), Y_UP))
    assert kinds(grown) == kinds(EVERY_KIND)
    assert {"plane", "cylinder", "cone", "sphere"} <= set(kinds(grown))
    assert is_valid(grown)


def test_scaling_by_axes_keeps_volumes_but_no_cylinder():
    # det of the scaling; a cylinder becomes elliptic, which the kernel can only keep as a free surface
    frame = MoldFrame((1.02, 1.01, 1.005), (3, 4, 5), UPRIGHT)
    stretched = to_mold(EVERY_KIND, frame)
    # the default integration is 1e-3 off on these free surfaces
    assert volume_adaptive(stretched) == pytest.approx(volume(EVERY_KIND) * 1.02 * 1.01 * 1.005, rel=1e-6)
    assert not {"cylinder", "cone", "sphere"} & set(kinds(stretched))
    low, high = bounding_box(stretched)
    assert tuple(low) == pytest.approx(frame.to_mold((0, 0, 0)), abs=1e-6)
    assert high[0] == pytest.approx(frame.to_mold((23, 0, 0))[0], abs=1e-6)


def test_solid_and_points_go_the_same_way():
    frame = MoldFrame((K, K, K), (1, 2, 3), Y_UP)
    ball = solids.sphere(2, at=(8, -5, 4))
    assert centroid(to_mold(ball, frame)) == pytest.approx(frame.to_mold((8, -5, 4)), abs=1e-9)
    assert frame.to_part(frame.to_mold((8, -5, 4))) == pytest.approx((8, -5, 4))


def test_moved_shapes_share_their_geometry():
    block = solids.box((0, 0, 0), (1, 2, 3))
    there = moved(block, (10, 0, -1))
    assert centroid(there) == pytest.approx((10.5, 1.0, 0.5))
    assert there.TShape() == block.TShape()
    assert copied(block).TShape() != block.TShape()


def test_cut_fuse_and_common_obey_the_law_of_inclusion():
    one, other = solids.box((0, 0, 0), (10, 10, 10)), solids.sphere(4, at=(10, 5, 5))
    both = sum(map(volume, common(one, other)))
    assert both == pytest.approx(2 * math.pi * 64 / 3, rel=1e-6)  # half of the ball
    assert sum(map(volume, cut(one, [other]))) == pytest.approx(1000 - both, rel=1e-9)
    assert sum(map(volume, fuse([one, other]))) == pytest.approx(1000 + both, rel=1e-6)


def test_all_pieces_come_back():
    bar = solids.box((0, 0, 0), (30, 5, 5))
    pieces = cut(bar, [solids.box((9, -1, -1), (11, 6, 6)), solids.box((19, -1, -1), (21, 6, 6))])
    assert sorted(round(volume(p), 9) for p in pieces) == [200.0, 225.0, 225.0]
    assert cut(bar, [solids.box((-1, -1, -1), (31, 6, 6))]) == []
    assert common(bar, solids.box((50, 0, 0), (51, 1, 1))) == []
    assert len(fuse([bar])) == 1


def test_a_prism_has_area_times_height():
    top = max(faces_of(solids.cylinder(3, 10)), key=lambda f: bounding_box(f)[0][2])
    assert volume(prism(top, 4.0)) == pytest.approx(36 * math.pi)
    assert bounding_box(prism(top, -4.0))[0][2] == pytest.approx(6.0)


def test_inside_a_box_means_on_every_side():
    block = solids.box((0, 0, 0), (10, 10, 10))
    low, high = np.zeros(3), np.full(3, 10.0)
    assert inside_box(block, low, high)
    for axis in range(3):
        tight = high.copy()
        tight[axis] = 9.8
        assert not inside_box(block, low, tight)
        assert not inside_box(block, low + np.eye(3)[axis] * 0.2, high)
