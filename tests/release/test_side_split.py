"""Grooves round the outside: two slides that part in a plane; what they have inside a tube stays with the core."""

import numpy as np
import pytest

from moldgen.kernel.mesh_prism import box_of, turned
from moldgen.kernel.meshsolid import eroded, thick_pieces
from moldgen.model.side_action import SideKind, across
from moldgen.release.side_split import opposite_ways

from .shapes import box, cut, cylinder, fuse
from .test_side_plan import covers, planned, steel

SPOOL = cut(cylinder(15, 0, 20), cut(cylinder(16, 6, 14), cylinder(11, 5, 15)))
"""A rod with a groove 4 mm deep round its outside."""

TUBE = cut(SPOOL, cylinder(8, -1, 21))
NECK = cut(fuse(fuse(cylinder(10, 0, 20), cylinder(12, 4, 6)), cylinder(12, 9, 11)), cylinder(8, -1, 18))
"""A bottle's neck, closed above, with two rings round it."""


def pieces_of(trapped, front):
    """The steel of a front that hangs on its outer end, and what the plastic cuts off from it."""
    held, loose = [], []
    for piece in thick_pieces(steel(front) - trapped.part):
        far = float(box_of(turned(piece, across(front.axis)))[1][2])
        (held if far > front.far - 0.1 else loose).append(piece)
    return held, loose


def depth_met(body, pieces, way):
    part = eroded(body.mesh)
    return sum(
        float(met.volume())
        for piece in pieces
        for share in np.linspace(0.02, 1.0, 30)
        for met in thick_pieces(piece.translate(tuple(share * np.asarray(way))) ^ part)
    )


@pytest.mark.parametrize("solid", [SPOOL, TUBE, NECK], ids=["rod", "tube", "neck"])
def test_grooves_round_the_outside_get_two_slides_that_part_in_one_plane(solid):
    body, trapped, plan = planned(solid)
    assert not plan.left
    first, second = plan.fronts
    assert first.kind is second.kind is SideKind.SLIDE
    assert np.allclose(np.array(first.release) + np.array(second.release), 0.0, atol=1e-12)
    assert first.near == pytest.approx(-second.near, abs=1e-9), "both end at the same plane"
    assert first.near == pytest.approx(0.0, abs=1e-6), "through the axis"
    assert covers(trapped, plan)
    for front in plan.fronts:
        held, loose = pieces_of(trapped, front)
        assert depth_met(body, held, np.array(front.release) * 30.0) == 0.0
        for piece in loose:
            ways = [depth_met(body, [piece], (0, 0, z)) for z in (25.0, -25.0)]
            assert min(ways) == 0.0, "what stays in the bore leaves with a half"
        assert bool(loose) == (solid is not SPOOL)


def test_a_slide_the_wrong_way_is_found_by_the_motion_that_the_tests_use():
    body, trapped, plan = planned(TUBE)
    held, loose = pieces_of(trapped, plan.fronts[0])
    assert depth_met(body, held, -np.array(plan.fronts[0].release) * 30.0) > 0.0
    assert depth_met(body, loose, np.array(plan.fronts[0].release) * 30.0) > 0.0


@pytest.mark.sweep  # a minute
def test_a_groove_opposite_on_the_inside_keeps_the_slides_out_and_is_named():
    both = cut(TUBE, cut(cylinder(9.5, 8, 12), cylinder(2, 0, 20)))
    _, trapped, plan = planned(both)
    assert len(trapped.undercuts) == 2
    assert any("collapsing core" in u.why for u in plan.left)


def test_a_square_post_with_a_groove_gets_two_slides():
    post = cut(box((-10, -10, 0), (10, 10, 20)), cut(box((-11, -11, 6), (11, 11, 14)), box((-7, -7, 5), (7, 7, 15))))
    _, trapped, plan = planned(post)
    assert not plan.left
    assert len(plan.fronts) == 2
    assert covers(trapped, plan)


def test_of_opposite_ways_one_is_kept():
    ways = np.array([[1.0, 0, 0], [-1, 0, 0], [0, 1, 0], [0.6, 0.8, 0], [-0.6, -0.8, 0]])
    assert opposite_ways(ways).tolist() == [[1, 0, 0], [0, 1, 0], [0.6, 0.8, 0]]
