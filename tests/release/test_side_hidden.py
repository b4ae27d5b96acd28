"""Undercuts that no slide reaches: lifters, honest refusals, and side actions given by the user."""

import numpy as np
import pytest

from moldgen.kernel.meshsolid import thick_pieces
from moldgen.model.side_action import SideGiven, SideKind, SideOptions
from moldgen.release.side_lifter import MOST_ANGLE

from .shapes import box, cut, cylinder, fuse
from .test_side_plan import CUP, WINDOW, covers, hit, planned, steel

LIP = fuse(CUP, box((1, 12, 5), (4, 18, 7)))
"""A cup, open below, with a lip 2 mm deep inside one wall."""

GROOVE = cut(cut(cylinder(15, 0, 20), cylinder(8, -1, 15)), cut(cylinder(10, 6, 9), cylinder(2, 0, 20)))
"""A cup with a groove round the inside."""


def test_internal_lip_gets_a_lifter():
    body, trapped, plan = planned(LIP, SideOptions(ejection_stroke=30.0))
    assert not plan.left
    (front,) = plan.fronts
    assert front.kind is SideKind.LIFTER
    assert np.allclose(front.release, (1, 0, 0))
    assert front.axis[2] < -np.cos(np.radians(MOST_ANGLE + 0.01)), "down into the core, leaning as lifters may"
    assert front.axis[0] < 0.0, "leaning away from its release, so that it moves along it as it rises"
    assert front.travel == pytest.approx(2.0, abs=0.3)
    assert covers(trapped, plan)
    assert not hit(body, trapped, front, np.array(front.release) * (front.travel + 0.5))
    moved = (steel(front) - trapped.part).translate((front.travel + 0.5, 0, 0))
    down = np.array([0.0, 0.0, -30.0])
    assert not [p for s in np.linspace(0, 1, 40) for p in thick_pieces(moved.translate(tuple(s * down)) ^ trapped.part)]


def test_short_stroke_leaves_the_lip_and_says_so():
    _, _, plan = planned(LIP, SideOptions(ejection_stroke=3.0))
    assert plan.fronts == ()
    (left,) = plan.left
    assert any("stroke" in t for t in left.tried)
    assert "slot" in left.remedy


def test_groove_round_the_inside_needs_a_collapsing_core():
    _, _, plan = planned(GROOVE)
    assert plan.fronts == ()
    (left,) = plan.left
    assert "collapsing core" in left.why


def test_given_direction_that_releases_is_used():
    _, trapped, plan = planned(WINDOW, SideOptions((SideGiven(SideKind.SLIDE, (-1, 0, 0), (0, 15, 9)),)))
    (front,) = plan.fronts
    assert front.given == 0
    assert covers(trapped, plan)


def test_given_direction_that_does_not_release_is_refused_with_its_place():
    _, _, plan = planned(WINDOW, SideOptions((SideGiven(SideKind.SLIDE, (0, 1, 0), (0, 15, 9)),)))
    assert plan.fronts == ()
    (left,) = plan.left
    assert "100 %" in left.why
    assert "20.00" in left.why, "the wall that blocks it starts at y = 20"


def test_given_outline_is_kept_and_the_rest_is_found():
    given = SideGiven(SideKind.SLIDE, (-1, 0, 0), (0, 15, 9), width=6.0, height=8.0)
    _, trapped, plan = planned(WINDOW, SideOptions((given,)))
    assert plan.fronts[0].given == 0 or plan.fronts[-1].given == 0
    (own,) = [f for f in plan.fronts if f.given == 0]
    assert np.ptp(own.outline[0], axis=0) == pytest.approx((6.0, 8.0))
    assert covers(trapped, plan)


def test_given_point_far_from_any_undercut_is_refused():
    _, _, plan = planned(WINDOW, SideOptions((SideGiven(SideKind.SLIDE, (1, 0, 0), (40, 15, 9)),)))
    assert "no undercut" in plan.left[0].why
