"""Ways of groups seen from each other, and the space that a body passes through, against closed forms."""

import math

import numpy as np
import pytest
from helpers import solids
from helpers.molding import straight

from moldgen.model.motion import Step, straight_steps, total_displacement
from moldgen.model.proof import Verdict
from moldgen.model.tool import Motion, Role
from moldgen.proof.bodies import ProofBody
from moldgen.proof.motion import MovingTool, Stretch, _Sweeper, stretches
from moldgen.proof.opening import prove_cavity_half, prove_ejection, prove_part

FAR = ProofBody("far", Role.CORE, Motion.CORE_HALF, solids.box((-500, -500, -500), (500, 500, 500)))
"""A body that reaches beyond every sweep here: nothing is carried on to a common level for it."""


def steps(*ways):
    return [Step(f"step {n}", (("a", way),)) for n, way in enumerate(ways, 1)]


def seen(found):
    return [(s.steps, tuple(s.start), tuple(s.way)) for s in found]


def test_steps_that_run_on_straight_are_one_stretch():
    found = stretches(steps((0, 0, 2), (0, 0, 3), (1, 0, 0)), "a", "b")
    assert seen(found) == [(("step 1", "step 2"), (0, 0, 0), (0, 0, 5)), (("step 3",), (0, 0, 5), (1, 0, 0))]


def test_a_way_back_over_the_same_ground_is_none_and_a_longer_one_is():
    assert len(stretches(steps((0, 0, 5), (0, 0, -2)), "a", "b")) == 1
    assert len(stretches(steps((0, 0, 5), (0, 0, -6)), "a", "b")) == 2
    assert len(stretches(steps((0, 0, 5), (1, 0, 0), (0, 0, -2)), "a", "b")) == 3  # back, but beside


def test_groups_that_move_alike_have_no_way_past_each_other():
    both = [Step("both", (("a", (1.0, 0, 2)), ("b", (1.0, 0, 2))))]
    assert stretches(both, "a", "b") == []
    assert seen(stretches(both, "b", "c")) == [(("both",), (0, 0, 0), (1, 0, 2))]


def test_the_way_of_one_is_that_of_the_other_turned_round():
    both = [Step("both", (("a", (1.0, 0, 2)), ("b", (0.5, 3, 0))))]
    (there,), (back,) = stretches(both, "a", "b"), stretches(both, "b", "a")
    assert tuple(there.way) == tuple(-back.way) == (0.5, -3, 2)


@pytest.mark.parametrize("way", [(0, 0, 7), (0, 0, -7), (5, 0, 0), (0, -4, 0), (3, 0, 6), (-2, 5, 3), (0.1, 0, -9)])
def test_a_box_passes_through_its_own_volume_and_three_shadows(way):
    """V = abc + bc |x| + ca |y| + ab |z| for a box a, b, c and a way x, y, z (closed form)."""
    sides, start = np.array([4.0, 5.0, 6.0]), np.array([10.0, -20.0, 30.0])
    body = ProofBody("box", Role.SLIDE, "slide 1", solids.box((0, 0, 0), tuple(sides)))
    swept = _Sweeper().swept(body, Stretch(("",), start, np.array(way, float)), FAR)
    whole = swept + body.mesh.translate(tuple(start))
    expected = np.prod(sides) * (1 + float((np.abs(way) / sides).sum()))
    assert whole.volume() == pytest.approx(expected, rel=1e-9)
    low, high = np.split(np.asarray(whole.bounding_box()), 2)
    assert low == pytest.approx(start + np.minimum(way, 0))
    assert high == pytest.approx(start + sides + np.maximum(way, 0))


@pytest.mark.parametrize("way", [(0, 0, 8), (6, 0, 0), (3, -4, 5)])
def test_a_ball_passes_through_a_capsule(way):
    """V = 4/3 pi r^3 + pi r^2 d (closed form), short by what a mesh of sag 0.02 mm lacks."""
    radius, length = 5.0, math.hypot(*way)
    body = ProofBody("ball", Role.SLIDE, "slide 1", solids.sphere(radius))
    swept = _Sweeper().swept(body, Stretch(("",), np.zeros(3), np.array(way, float)), FAR) + body.mesh
    assert swept.volume() == pytest.approx(math.pi * radius**2 * (4 / 3 * radius + length), rel=0.01)


def tool(*more):
    """A plate between two blocks, an ejector under it, and more bodies (name, group, low, high)."""
    boxes = [
        ("part", Motion.PART, (0, 0, 0), (20, 20, 5)),
        ("cavity", Motion.CAVITY_HALF, (-10, -10, 5), (30, 30, 20)),
        ("core", Motion.CORE_HALF, (-10, -10, -20), (30, 30, 0)),
        ("pin", Motion.EJECTOR, (8, 8, -40), (10, 10, -20)),
        *more,
    ]
    return [ProofBody(name, Role.CORE, group, solids.box(low, high)) for name, group, low, high in boxes]


HOOK = ("hook", Motion.CORE_HALF, (5, 5, 40), (15, 15, 45))


def test_a_short_way_does_not_hide_what_holds_the_part():
    short = (straight_steps(10.0, 60.0)[0], straight_steps(10.0, 60.0)[1])  # pushed 10 mm, then left there
    assert prove_part(MovingTool(tool(), short)).passed
    proof = prove_part(MovingTool(tool(HOOK), short))
    assert proof.verdict is Verdict.FAILED
    assert "part" in proof.detail and "hook" in proof.detail


def test_a_mold_that_hardly_opens_still_has_to_open():
    hardly = (Step("the mold opens", ((Motion.CAVITY_HALF, (0.0, 0.0, 1.0)),)),)
    assert prove_cavity_half(MovingTool(tool(), hardly)).passed
    assert prove_cavity_half(MovingTool(tool(HOOK), hardly)).verdict is Verdict.FAILED


def test_a_part_that_is_pushed_into_the_cavity_half_is_found():
    hardly = (Step("the mold opens", ((Motion.CAVITY_HALF, (0.0, 0.0, 4.0)),)), *straight_steps(10.0, 60.0)[1:])
    proof = prove_cavity_half(MovingTool(tool(), hardly))
    assert proof.verdict is Verdict.FAILED
    assert "the ejectors push" in proof.detail


def test_steps_that_leave_a_group_where_it_is_prove_nothing_of_it():
    nothing = MovingTool(tool(), ())
    assert [p.verdict for p in (prove_cavity_half(nothing), prove_part(nothing), prove_ejection(nothing, 10.0))] == [
        Verdict.NOT_RUN,
        Verdict.NOT_RUN,
        Verdict.NOT_RUN,
    ]


def test_a_claimed_stroke_must_be_the_one_of_the_steps():
    moving = straight([b for b in tool() if b.name != "core"] + tool()[2:3], 10.0)
    proof = prove_ejection(moving, 9.0)
    assert (proof.verdict, proof.figure) == (Verdict.FAILED, pytest.approx(1.0))
    assert "10 mm" in proof.detail and "9 mm" in proof.detail


def test_straight_steps_end_with_everything_apart():
    depth, stroke = 40.0, 12.0
    made = straight_steps(stroke, depth)
    z = {m: total_displacement(made, m)[2] for m in Motion}
    assert z[Motion.EJECTOR] == stroke and z[Motion.CORE_HALF] == 0.0
    assert z[Motion.PART] - z[Motion.CORE_HALF] >= depth
    assert z[Motion.CAVITY_HALF] - z[Motion.PART] >= depth
