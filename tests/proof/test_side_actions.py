"""Side actions that move: good tools of plain boxes pass, and each planted fault is found, with the step and the pair.

The slide tool: a block of 20 x 20 x 10 mm with a pocket 5 mm deep in its +x side. A slide runs on the core, drawn out
by an angled pin in the cavity half. The lifter tool: a lid with a lip on the inside of one wall.
"""

import math
from dataclasses import replace
from functools import cache

import pytest
from helpers import solids
from helpers.molding import unproved

from moldgen.model.motion import Step
from moldgen.model.proof import Verdict
from moldgen.model.tool import Motion, Role
from moldgen.proof.bodies import ProofBody
from moldgen.proof.opening import CAVITY_OPENS, EJECTORS_MOVE, PART_LEAVES, SIDES_MOVE
from moldgen.proof.run import Claims, prove_tool
from moldgen.tolerances import EROSION

ANGLE = math.radians(18.0)
STROKE, TRAVEL = 15.0, 6.0
DRAWN = TRAVEL / math.tan(ANGLE)
"""How far the mold opens while the angled pin draws the slide [mm]."""

SLIDE, OTHER_SLIDE, LIFTER = "slide 1", "slide 2", "lifter 1"


def up(by):
    return (0.0, 0.0, by)


EJECTION = (
    Step("the ejectors push", ((Motion.EJECTOR, up(STROKE)), (Motion.PART, up(STROKE)))),
    Step("the part is taken off", ((Motion.PART, up(40.0)),)),
)


def opening(*moves, name="the mold opens", height=DRAWN):
    """The cavity half goes up, and the side actions their ways."""
    return Step(name, ((Motion.CAVITY_HALF, up(height)), *moves))


WIDE = opening(name="the mold opens wide", height=60.0)
GOOD = (opening((SLIDE, (TRAVEL, 0.0, 0.0))), WIDE, *EJECTION)


def moving(bodies, steps, stroke=STROKE):
    """The proofs that fail of those about motion: the closed tool has tests of its own."""
    failed = unproved(bodies, Claims(1.0, 0.0, stroke, tuple(steps)))
    return {name: p for name, p in failed.items() if name in (CAVITY_OPENS, PART_LEAVES, EJECTORS_MOVE, SIDES_MOVE)}


def changed(bodies, name, solid):
    assert name in [b.name for b in bodies]
    return tuple(replace(b, solid=solid) if b.name == name else b for b in bodies)


def only_side(bodies, steps, *words):
    """The side actions' proof fails, alone, and its detail has these words."""
    failed = moving(bodies, steps)
    assert list(failed) == [SIDES_MOVE]
    proof = failed[SIDES_MOVE]
    assert proof.verdict is Verdict.FAILED and proof.figure >= proof.limit
    assert all(word in proof.detail for word in words), proof.detail
    return proof


# --- slides -----------------------------------------------------------------------------------------------------------


def angled_pin(radius=2.0, low=-5.0, high=22.0):
    """A round bar in the plane y = 10, through x = 32 on the parting plane; its foot leans out, and draws by 6 mm."""
    lean = math.tan(ANGLE)
    length = (high - low) / math.cos(ANGLE)
    return solids.cylinder(radius, length, at=(32.0 - low * lean, 10.0, low), along=(-lean, 0.0, 1.0))


@cache
def slide_tool():
    """Part, cavity with its angled pin, core, slide and one ejector pin."""
    pocket = solids.box((15, 8, 3), (20, 12, 7))
    part = solids.cut(solids.box((0, 0, 0), (20, 20, 10)), pocket)
    slide = solids.cut(solids.fuse(solids.box((20, 5, 0), (45, 15, 12)), pocket), angled_pin())
    cavity = solids.cut(
        solids.box((-20, -20, 0), (60, 40, 25)),
        solids.box((0, 0, 0), (20, 20, 10)),
        solids.box((20, 5, 0), (60, 15, 12)),
        angled_pin(),
    )
    pin = solids.cylinder(1.5, 40, at=(5, 10, -40))
    core = solids.cut(solids.box((-20, -20, -20), (60, 40, 0)), pin, solids.box((25, 7, -20), (45, 13, 0)))
    return (
        ProofBody("part", Role.PART, Motion.PART, part),
        ProofBody("cavity", Role.CAVITY, Motion.CAVITY_HALF, cavity),
        ProofBody("core", Role.CORE, Motion.CORE_HALF, core),
        ProofBody("slide", Role.SLIDE, SLIDE, slide),
        ProofBody("angled pin", Role.ANGLED_PIN, Motion.CAVITY_HALF, angled_pin()),
        ProofBody("ejector pin", Role.EJECTOR_PIN, Motion.EJECTOR, pin),
    )


def test_a_slide_on_its_angled_pin_passes():
    proofs = {p.name: p for p in prove_tool(slide_tool(), Claims(1.0, 0.0, STROKE, GOOD))}
    assert list(proofs)[3:] == [CAVITY_OPENS, PART_LEAVES, EJECTORS_MOVE, SIDES_MOVE]
    assert all(proofs[name].passed for name in list(proofs)[2:]), proofs
    assert proofs[SIDES_MOVE].figure < 0.03  # pin in its bore, slide on the core: touching, not rubbing


def test_a_straight_tool_has_no_side_actions_to_prove():
    straight = [b for b in slide_tool() if b.motion != SLIDE]
    assert SIDES_MOVE not in [p.name for p in prove_tool(straight, Claims(1.0, 0.0, STROKE, GOOD))]


def test_a_slide_that_goes_in_instead_of_out_runs_into_the_part():
    bare = [b for b in slide_tool() if b.role is not Role.ANGLED_PIN]
    proof = only_side(bare, (opening((SLIDE, (-TRAVEL, 0.0, 0.0))), *GOOD[1:]), "slide", "part", "the mold opens")
    assert proof.figure > 1.0


def test_a_slide_that_goes_across_its_pin_is_found():
    only_side(slide_tool(), (opening((SLIDE, (0.0, TRAVEL, 0.0))), *GOOD[1:]), "slide", "the mold opens")


def test_a_slide_slower_than_its_pin_is_found():
    bodies = [b for b in slide_tool() if b.role in (Role.ANGLED_PIN, Role.SLIDE, Role.CORE)]
    proof = moving(bodies, (opening((SLIDE, (TRAVEL - 0.5, 0.0, 0.0))), *GOOD[1:]))[SIDES_MOVE]
    assert proof.verdict is Verdict.FAILED
    assert "angled pin" in proof.detail and "slide" in proof.detail


@pytest.mark.parametrize(("travel", "found"), [(3.0, True), (4.9, True), (4.98, False), (5.0, False)])
def test_a_slide_that_stops_short_is_hit_by_the_part_when_it_is_ejected(travel, found):
    steps = (opening((SLIDE, (travel, 0.0, 0.0))), *GOOD[1:])
    bare = [b for b in slide_tool() if b.role is not Role.ANGLED_PIN]
    if found:
        proof = only_side(bare, steps, "part", "slide", "the ejectors push")
        assert proof.figure == pytest.approx(1.0 if travel == 3.0 else 0.1, rel=0.4)  # 2 V / A of what is left in
    else:
        assert moving(bare, steps) == {}


def test_a_pin_too_long_is_still_in_the_slide_when_that_stops():
    long = changed(slide_tool(), "angled pin", angled_pin(low=-18.0))
    long = changed(long, "slide", solids.cut(slide_tool()[3].solid, angled_pin(low=-18.0)))
    only_side(long, GOOD, "angled pin", "slide", "the mold opens wide")


def test_the_order_of_the_steps_counts():
    late = (opening(height=TRAVEL), WIDE, EJECTION[0], Step("the slide moves", ((SLIDE, (TRAVEL, 0.0, 0.0)),)))
    bare = [b for b in slide_tool() if b.role is not Role.ANGLED_PIN]
    only_side(bare, (*late, EJECTION[1]), "part", "slide", "the ejectors push")


@pytest.mark.parametrize(("x", "found"), [(50.0, True), (54.0, False)])
def test_an_ejector_pin_under_the_drawn_slide_runs_into_it(x, found):
    pin = solids.cylinder(1.5, 20, at=(x, 10, -20))
    bodies = [*slide_tool(), ProofBody("far pin", Role.EJECTOR_PIN, Motion.EJECTOR, pin)]
    core = next(b for b in bodies if b.role is Role.CORE)
    bodies = changed(bodies, "core", solids.cut(core.solid, pin))
    if found:
        only_side(bodies, GOOD, "far pin against slide", "the ejectors push")
    else:
        assert moving(bodies, GOOD) == {}


@pytest.mark.parametrize(("travel", "found"), [(2.0, True), (TRAVEL, False)])
def test_a_slide_that_catches_up_with_another_is_found(travel, found):
    other = ProofBody("other slide", Role.SLIDE, OTHER_SLIDE, solids.box((47, 5, 0), (55, 15, 12)))
    steps = (opening((SLIDE, (TRAVEL, 0.0, 0.0)), (OTHER_SLIDE, (travel, 0.0, 0.0))), *GOOD[1:])
    if found:
        only_side([*slide_tool(), other], steps, "slide", "other slide", "the mold opens")
    else:
        assert moving([*slide_tool(), other], steps) == {}


def test_a_fin_of_a_twentieth_in_the_way_of_a_slide_is_not_jumped_over():
    core = next(b for b in slide_tool() if b.role is Role.CORE)
    finned = solids.fuse(core.solid, solids.box((48, 8, -1), (48.05, 12, 1)))
    proof = only_side(changed(slide_tool(), "core", finned), GOOD, "slide", "core", "48.")
    # eroded on both of its sides, a free-standing fin reads thinner than it is by one erosion
    assert proof.figure == pytest.approx(0.05 - EROSION, rel=0.05)


def buried():
    """The slide tool with its slide in the cavity half: there is steel under the slide, and no pin."""
    body, pocket = solids.box((20, 5, 2), (60, 15, 9)), solids.box((15, 8, 3), (20, 12, 7))
    block = solids.box((0, 0, 0), (20, 20, 10))
    cavity = solids.cut(solids.box((-20, -20, 0), (60, 40, 25)), block, body)
    bodies = [b for b in slide_tool() if b.role is not Role.ANGLED_PIN]
    return changed(changed(bodies, "cavity", cavity), "slide", solids.fuse(body, pocket))


def test_a_cavity_that_lifts_before_the_slide_has_left_it_is_found():
    out = Step("the slide moves", ((SLIDE, (46.0, 0.0, 0.0)),))
    assert moving(buried(), (out, WIDE, *EJECTION)) == {}
    only_side(buried(), (WIDE, out, *EJECTION), "slide", "cavity", "the mold opens wide")
    short = replace(out, moves=((SLIDE, (30.0, 0.0, 0.0)),))  # free of the part, not of the cavity
    only_side(buried(), (short, WIDE, *EJECTION), "slide", "cavity", "the mold opens wide")


def test_a_side_action_that_no_step_moves_is_not_proved():
    failed = moving(slide_tool(), (opening(), *GOOD[1:]))
    assert failed[SIDES_MOVE].verdict is Verdict.NOT_RUN
    assert SLIDE in failed[SIDES_MOVE].detail


# --- lifters ----------------------------------------------------------------------------------------------------------


@cache
def lifter_tool(rib=11.0):
    """A lid with a lip inside one wall, a rib that hangs from its roof, and a lifter that leans in by 1 : 5."""
    inside = solids.box((2, 2, 0), (28, 18, 8))
    lip, hanging = solids.box((2, 5, 2), (4, 15, 4)), solids.box((rib, 2, 4), (rib + 1, 18, 8))
    part = solids.fuse(solids.cut(solids.box((0, 0, 0), (30, 20, 10)), inside), lip, hanging)
    corners = [(2, 5, 8), (2, 5, 0), (-2, 5, -20), (2, 5, -20), (7.6, 5, 8)]
    bar = solids.extruded(corners, (0.0, 10.0, 0.0))
    core = solids.cut(solids.fuse(solids.box((-20, -20, -20), (50, 40, 0)), inside), hanging, bar)
    cavity = solids.cut(solids.box((-20, -20, 0), (50, 40, 30)), solids.box((0, 0, 0), (30, 20, 10)))
    pin = solids.cylinder(1.5, 28, at=(20, 10, -20))
    return (
        ProofBody("part", Role.PART, Motion.PART, part),
        ProofBody("cavity", Role.CAVITY, Motion.CAVITY_HALF, cavity),
        ProofBody("core", Role.CORE, Motion.CORE_HALF, solids.cut(core, pin)),
        ProofBody("lifter", Role.LIFTER, LIFTER, solids.cut(bar, lip)),
        ProofBody("ejector pin", Role.EJECTOR_PIN, Motion.EJECTOR, pin),
    )


def lifting(x, z=STROKE):
    moves = ((LIFTER, (x, 0.0, z)), *EJECTION[0].moves)
    return (WIDE, replace(EJECTION[0], moves=moves), EJECTION[1])


def test_a_lifter_that_leans_in_far_enough_passes():
    assert moving(lifter_tool(), lifting(3.0)) == {}


def test_a_lifter_that_runs_into_a_rib_of_the_part_is_found():
    only_side(lifter_tool(rib=10.0), lifting(3.0), "lifter", "part", "the ejectors push")


def test_a_lifter_that_does_not_come_off_the_lip_is_found_when_the_part_is_taken_off():
    # the lip is 2 mm deep; a bar that leans less would take it less far: both leave the core free here
    bodies = [b for b in lifter_tool() if b.role is not Role.CORE]
    proof = moving(bodies, lifting(1.0))[SIDES_MOVE]
    assert proof.verdict is Verdict.FAILED and "the part is taken off" in proof.detail
    assert SIDES_MOVE not in moving(bodies, lifting(2.0))


def test_a_lifter_that_goes_another_way_than_its_bore_is_found():
    only_side(lifter_tool(), lifting(3.5), "lifter", "core", "the ejectors push")


def test_a_lifter_that_goes_the_wrong_way_runs_into_the_wall():
    bodies = [b for b in lifter_tool() if b.role is not Role.CORE]
    proof = moving(bodies, lifting(-3.0))[SIDES_MOVE]
    assert proof.verdict is Verdict.FAILED and "lifter" in proof.detail and "part" in proof.detail
