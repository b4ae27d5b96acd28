"""Volume, area, centre and extent against closed forms; integration of shared walls; what is and is not valid."""

import math

import numpy as np
import pytest
from helpers import solids

from moldgen.kernel import measure
from moldgen.kernel.level_split import level_curves
from moldgen.kernel.split import split_shape
from moldgen.kernel.topology import compound_of, faces_of, solids_of

CLOSED_FORMS = {
    # solid, volume, area
    "block": (solids.box((1, 2, 3), (11, 22, 33)), 6000.0, 2 * (200 + 300 + 600)),
    "cylinder": (solids.cylinder(3, 10), math.pi * 90, 2 * math.pi * 3 * (3 + 10)),
    "frustum": (solids.cone(5, 2, 4), math.pi * 4 * (25 + 10 + 4) / 3, math.pi * (25 + 4 + 7 * 5)),  # slant 3-4-5
    "cone": (solids.cone(3, 0, 4), math.pi * 12, math.pi * 3 * (3 + 5)),
    "ball": (solids.sphere(7), 4 * math.pi * 343 / 3, 4 * math.pi * 49),
    "ring": (solids.torus(20, 6), 2 * math.pi**2 * 20 * 36, 4 * math.pi**2 * 120),  # Pappus
    "wedge": (solids.extruded([(0, 0, 0), (3, 0, 0), (0, 0, 4)], (0, 10, 0)), 60.0, 12 + 10 * (3 + 4 + 5)),
}


@pytest.mark.parametrize("name", CLOSED_FORMS)
def test_volume_and_area_are_the_closed_forms(name):
    solid, volume, area = CLOSED_FORMS[name]
    assert measure.volume(solid) == pytest.approx(volume, rel=1e-9)
    assert measure.volume_adaptive(solid) == pytest.approx(volume, rel=1e-8)
    assert measure.area(solid) == pytest.approx(area, rel=1e-9)


def test_the_centre_of_a_cone_is_a_quarter_up():
    assert measure.centroid(solids.cone(3, 0, 4, at=(5, -2, 1))) == pytest.approx((5.0, -2.0, 2.0), abs=1e-9)


def test_the_box_round_a_tilted_cylinder_is_tight():
    # half height of a cylinder of radius 3 and length 10 tilted by 30 deg: 5 cos 30 + 3 sin 30
    low, high = measure.bounding_box(solids.turned(solids.cylinder(3, 10, at=(0, 0, -5)), 30, about=(1, 0, 0)))
    half = 5 * math.cos(math.pi / 6) + 3 * math.sin(math.pi / 6)
    assert (low[2], high[2]) == pytest.approx((-half, half), abs=1e-6)
    assert (low[0], high[0]) == pytest.approx((-3, 3), abs=1e-6)


def wavy_neighbours():
    """Two solids that share one spline wall and fill the box 60 x 30 x 40."""
    below = solids.under_curve([8, 14, 21, 12, 17, 9], 60, 30)
    above = solids.cut(solids.box((0, 0, 0), (60, 30, 40)), below)
    return below, above


def test_neighbours_that_share_a_spline_wall_fill_their_box():
    pair = wavy_neighbours()
    assert measure.joint_volume(pair) == pytest.approx(72000.0, rel=1e-9)
    assert measure.joint_volume_fine(pair) == pytest.approx(72000.0, rel=1e-9)
    assert measure.balance(pair, 72000.0, 1e-6) < 1e-9


def test_the_fine_way_needs_no_plane_through_the_origin():
    # divergence theorem: a plane contributes area x distance / 3, with the sign of its side
    away = solids.shifted(solids.fuse(solids.box((0, 0, 0), (4, 5, 6)), solids.cylinder(1, 3, at=(2, 2, 6))), 9, -7, 3)
    assert measure.joint_volume_fine([away]) == pytest.approx(120 + 3 * math.pi, rel=1e-9)


@pytest.mark.parametrize("expected", [72000.0 * (1 + 2e-6), 72000.0 * (1 - 2e-6), 73000.0])
def test_a_missing_volume_is_seen_by_every_way(expected):
    assert measure.balance(wavy_neighbours(), expected, 1e-6) == pytest.approx(abs(72000 / expected - 1), rel=1e-3)


def test_a_claim_of_less_than_nothing_does_not_balance():
    assert measure.balance([solids.box((0, 0, 0), (1, 1, 1))], -5.0, 1e-6) == pytest.approx(1.2)


def test_an_open_shell_called_a_solid_is_not_valid():
    solid = solids.box((0, 0, 0), (5, 5, 5))
    assert measure.is_valid(solid)
    assert not measure.is_valid(solids.unsound(solid))


def test_measures_of_a_compound_add_up():
    two = compound_of([solids.sphere(1), solids.shifted(solids.sphere(2), 9, 0, 0)])
    assert len(solids_of(two)) == 2
    assert measure.volume(two) == pytest.approx(4 * math.pi * 9 / 3, rel=1e-9)


def test_splitting_faces_changes_no_volume():
    solid = solids.cone(5, 2, 4)
    halved = split_shape(solid, level_curves(faces_of(solid), 1.5))
    assert len(faces_of(halved)) == len(faces_of(solid)) + 1
    assert measure.volume(halved) == pytest.approx(measure.volume(solid), rel=1e-12)
    assert np.all(measure.bounding_box(halved)[1] <= measure.bounding_box(solid)[1] + 1e-9)
