"""Why a place stays trapped: the reason is true, its figures are measured, places can be told in any frame."""

import math

import numpy as np
import pytest
from helpers.solids import cylinder as bore
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakePolygon
from OCP.BRepOffsetAPI import BRepOffsetAPI_ThruSections
from OCP.gp import gp_Pnt

from moldgen.kernel.body import Body
from moldgen.model.side_action import SideOptions, Unreleased
from moldgen.release.helical import lead_of

from .shapes import box, cut, cylinder, fuse
from .test_side_plan import CUP, planned

NARROW = fuse(fuse(CUP, box((1, 12, 5), (4, 18, 7))), box((5, 10, 0), (7, 20, 18.5)))
"""A cup with a lip 2 mm deep, and a rib that leaves 1 mm before the lip and stands from the roof down to the rim."""


def screw_strip(lead, radius=6.0):
    """A body whose one curved face is a strip of a screw surface (a helical ramp)."""
    sections = BRepOffsetAPI_ThruSections(True, False)
    for step in range(19):
        turn = math.radians(30.0 * step)
        out, z = np.array([math.cos(turn), math.sin(turn)]), lead * turn / (2.0 * math.pi)
        ring = BRepBuilderAPI_MakePolygon()
        for r, up in ((radius, 0.0), (radius + 3.0, 0.4), (radius + 3.0, 1.2), (radius, 1.6)):
            ring.Add(gp_Pnt(float(r * out[0]), float(r * out[1]), z + up))
        ring.Close()
        sections.AddWire(ring.Wire())
    sections.Build()
    return Body(sections.Shape())


def test_lead_of_a_screw_surface_is_found():
    body = screw_strip(4.0)
    leads = [lead_of(body, face) for face in range(len(body.faces))]
    assert max(leads) == pytest.approx(4.0, rel=0.03)


@pytest.mark.parametrize("solid", [cylinder(6, 0, 10), box((0, 0, 0), (5, 6, 7)), bore(5.0, 9.0, (1, 2, 3), (1, 0, 0))])
def test_faces_of_revolution_and_planes_are_no_thread(solid):
    body = Body(solid)
    assert [lead_of(body, face) for face in range(len(body.faces))] == [0.0] * len(body.faces)


def test_a_hook_without_room_says_gap_and_need():
    _, _, plan = planned(NARROW, SideOptions(ejection_stroke=30.0))
    hooks = [u for u in plan.left if "without room for a lifter" in u.why]
    assert hooks, [u.why for u in plan.left]
    (hook,) = hooks
    assert "leaves 1.0" in hook.why
    assert hook.at is not None and hook.at[0] == pytest.approx(5.0, abs=0.05), "the rib that stands in the way"


def test_places_and_ways_are_told_in_the_readers_coordinates():
    place = Unreleased(0, "wall at {at}, along {way}", "open at {change_at}", (), (1, 2, 3), (0, 0, 1), (4, 5, 6))
    why, remedy = place.told(lambda p: f"<{p[0]}>", lambda w: "up" if w[2] > 0 else "down")
    assert (why, remedy) == ("wall at <1>, along up", "open at <4>")


def test_what_stays_behind_a_wall_is_told_rather_than_the_whole():
    """A bore through one prong of a fork, rounded at its inner end too: a slide leaves only that rounding."""
    fork = cut(box((0, 0, 0), (20, 30, 30)), box((-1, 6, -1), (21, 24, 25)))
    inner = cut(fork, bore(4.0, 8.0, (10, -1, 15), (0, 1, 0)))
    widened = cut(inner, bore(5.0, 1.0, (10, 5, 15), (0, 1, 0)))
    _, _, plan = planned(widened, SideOptions(lifters=False, inclined=False))
    (left,) = plan.left
    assert "behind the part's own wall" in left.why
    assert left.at == pytest.approx((10, 5.5, 15), abs=0.3), "the widening behind the prong"
    assert left.change_at == left.at
    assert left.way == pytest.approx((0, -1, 0), abs=1e-9)
    assert "{" not in "".join(left.told(str, str))
