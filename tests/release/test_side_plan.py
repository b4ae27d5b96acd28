"""Side actions for small parts whose answer a toolmaker knows; every front is tried against the part step by step."""

import numpy as np
import pytest
from helpers.solids import cylinder as bore

from moldgen.kernel.body import Body
from moldgen.kernel.mesh_prism import prism, region, turned
from moldgen.kernel.meshsolid import eroded, thick_pieces, union
from moldgen.model.side_action import SideKind, across
from moldgen.release.kinds import face_kinds
from moldgen.release.side_plan import plan_side_actions
from moldgen.release.trapped import trapped_volume

from .shapes import box, cut
from .shapes import turned as turned_part

CUP = cut(box((0, 0, 0), (40, 30, 20)), box((2, 2, -1), (38, 28, 18)))
WINDOW = cut(CUP, box((-1, 10, 6), (3, 20, 12)))


def planned(solid, options=None):
    body = Body(solid)
    kinds = face_kinds(body)
    trapped = trapped_volume(body, kinds)
    return body, trapped, plan_side_actions(body, kinds, trapped, options)


def steel(front):
    return turned(prism(region(front.outline), front.near, front.far), across(front.axis).T)


def hit(body, trapped, front, way):
    """The plastic that the steel of a front meets when it is moved along `way` in steps, thickest first."""
    part = eroded(body.mesh)
    moving = steel(front) - trapped.part
    found = [
        p for share in np.linspace(0.02, 1.0, 40) for p in thick_pieces(moving.translate(tuple(share * way)) ^ part)
    ]
    return sorted(found, key=lambda p: -p.volume())


def leaves(body, trapped, front):
    return not hit(body, trapped, front, np.array(front.release) * (front.far - front.near))


def covers(trapped, plan):
    all_steel = union([steel(f) for f in plan.fronts])
    return not [r for p in trapped.undercuts for r in thick_pieces(p.solid - all_steel)]


def test_window_in_a_wall_gets_one_slide_straight_out():
    body, trapped, plan = planned(WINDOW)
    assert not plan.left
    (front,) = plan.fronts
    assert front.kind is SideKind.SLIDE
    assert np.allclose(front.release, (-1, 0, 0))
    assert front.near == pytest.approx(-2.0), "ends flush with the inner wall, w = -x"
    assert front.clear == pytest.approx(0.0)
    assert front.travel == pytest.approx(2.0)
    assert covers(trapped, plan)
    assert leaves(body, trapped, front)


def test_the_wrong_way_is_found_by_the_motion_that_the_tests_use():
    body, trapped, plan = planned(WINDOW)
    assert hit(body, trapped, plan.fronts[0], np.array([0.0, 5.0, 0.0]))


def test_two_windows_in_one_wall_get_one_slide():
    _, trapped, plan = planned(cut(cut(CUP, box((-1, 5, 6), (3, 12, 12))), box((-1, 18, 6), (3, 25, 10))))
    assert len(trapped.undercuts) == 2
    (front,) = plan.fronts
    assert front.pieces == (0, 1)
    assert covers(trapped, plan)


def test_windows_in_two_walls_get_two_slides():
    _, trapped, plan = planned(cut(WINDOW, box((10, 27, 5), (30, 31, 12))))
    assert sorted(tuple(np.round(f.release, 6)) for f in plan.fronts) == [(-1, 0, 0), (0, 1, 0)]
    assert covers(trapped, plan)


def test_blind_side_bore_ends_in_the_wall():
    body, trapped, plan = planned(cut(box((0, 0, 0), (30, 30, 20)), bore(4.0, 13.0, (18, 15, 10), (1, 0, 0))))
    (front,) = plan.fronts
    assert np.allclose(front.release, (1, 0, 0))
    assert front.near < 18.0, "pushed into solid plastic"
    assert front.travel == pytest.approx(12.0, abs=0.01)
    assert covers(trapped, plan)
    assert leaves(body, trapped, front)


def test_plan_turns_with_the_part():
    _, _, plan = planned(WINDOW)
    body, trapped, after = planned(turned_part(WINDOW, 90.0))
    (one,), (other,) = plan.fronts, after.fronts
    x, y, z = one.release
    assert np.allclose(other.release, (-y, x, z), atol=1e-6)
    assert other.travel == pytest.approx(one.travel, abs=1e-4)
    assert leaves(body, trapped, other)


def test_a_part_that_opens_needs_none():
    _, _, plan = planned(CUP)
    assert plan.fronts == ()
    assert plan.left == ()
