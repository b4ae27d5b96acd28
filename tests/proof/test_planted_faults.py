"""The proofs pass a good tool, and find each planted fault: one test a fault."""

import math
from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from helpers import solids
from helpers.molding import changed, mold, straight, unproved, with_pin

from moldgen.errors import KernelError
from moldgen.kernel.topology import compound_of
from moldgen.model.proof import Proof, Verdict
from moldgen.model.tool import Motion, Role
from moldgen.proof import motion, rest
from moldgen.proof.bodies import ProofBody, placed_bodies
from moldgen.proof.opening import (
    CAVITY_OPENS,
    EJECTORS_MOVE,
    PART_LEAVES,
    prove_cavity_half,
    prove_ejection,
    prove_part,
)
from moldgen.proof.rest import APART, FILLED, SOUND
from moldgen.proof.run import prove_tool
from moldgen.tolerances import BALANCE, OPEN_OVERLAP

NAMES = [SOUND, FILLED, APART, CAVITY_OPENS, PART_LEAVES, EJECTORS_MOVE]
STROKE, CEILING = 10.0, 22.0


def hood():
    return solids.cut(solids.cone(30, 26, 25), solids.cone(28, 24, CEILING))


def pin(top=CEILING, at=(8.0, 0.0), radius=2.0, bottom=-40.0):
    return solids.cylinder(radius, top - bottom, at=(*at, bottom))


@cache
def tool(bore=2.0):
    """The hood's tool with one ejector pin in a bore of the core; what it claims."""
    made = mold(hood())
    bodies = made.bodies
    low = made.corners[0][2]
    core = solids.cut(made.parted.core, pin(bottom=low - 1, radius=bore))
    bored = math.pi * bore**2 * (CEILING - low)
    claims = replace(made.claims, bored_mm3=bored, stroke_mm=STROKE)
    return with_pin(changed(bodies, Role.CORE, core), pin()), claims


def role(bodies, wanted):
    return next(b for b in bodies if b.role is wanted)


def refused(role_, solid):
    """The proofs that fail when one body of the good tool is another solid."""
    bodies, claims = tool()
    return unproved(changed(bodies, role_, solid), claims)


def test_a_good_tool_passes_every_proof_in_order():
    bodies, claims = tool()
    proofs = prove_tool(bodies, claims)
    assert [p.name for p in proofs] == NAMES
    assert all(p.passed for p in proofs), proofs
    assert all(p.figure < p.limit or p.name == SOUND for p in proofs)


def test_a_boss_left_standing_in_the_cavity_overlaps_the_part():
    bodies, _ = tool()
    nub = solids.cylinder(0.5, 0.2, at=(0, 10, 24.9))  # 0.1 mm into the roof, 1 mm wide
    failed = refused(Role.CAVITY, solids.fuse(role(bodies, Role.CAVITY).solid, nub))
    assert failed[APART].figure == pytest.approx(0.1, rel=0.15)
    assert failed[APART].detail.startswith("part and cavity at")


@pytest.mark.parametrize("way", [(0.1, 0, 0), (0, -0.1, 0), (0, 0, 0.1)])
def test_a_core_a_tenth_out_of_place_is_seen_although_volumes_balance(way):
    bodies, _ = tool()
    failed = refused(Role.CORE, solids.shifted(role(bodies, Role.CORE).solid, *way))
    assert APART in failed
    assert "core" in failed[APART].detail
    assert FILLED not in failed


def test_a_mushroom_is_held_by_the_cavity():
    discs = [solids.cone(10, 9, 3, at=(0, 0, 12)), solids.cone(9, 10, 3, at=(0, 0, -3))]
    spool = solids.fuse(solids.cylinder(4, 12), *discs)
    made = mold(spool)
    failed = unproved(made.bodies, made.claims)
    held = failed.get(CAVITY_OPENS) or failed[PART_LEAVES]
    assert held.figure > 1.0
    assert "part at" in held.detail


def test_missing_volume_unbalances_the_block():
    bodies, claims = tool()
    groove = solids.box((35, -1, 3), (36, 0, 4))  # 1 mm^3 of 445 000, inside the steel where nothing meets it
    failed = refused(Role.CAVITY, solids.cut(role(bodies, Role.CAVITY).solid, groove))
    assert list(failed) == [FILLED]
    assert failed[FILLED].figure == pytest.approx(1.0 / (claims.block_mm3 - claims.bored_mm3), rel=1e-3)


def test_a_bore_that_is_not_claimed_unbalances_the_block():
    bodies, claims = tool()
    assert list(unproved(bodies, replace(claims, bored_mm3=claims.bored_mm3 - 1.0))) == [FILLED]


@pytest.mark.parametrize(
    ("broken", "words"),
    [
        (solids.unsound, "invalid"),
        (lambda s: s.Reversed(), "inside out"),
        (lambda s: compound_of([s, solids.box((50, 50, 50), (51, 51, 51))]), "2 solids"),
        (lambda s: compound_of([]), "0 solids"),
    ],
)
def test_an_unsound_solid_is_told_by_name(broken, words):
    bodies, _ = tool()
    failed = refused(Role.EJECTOR_PIN, broken(role(bodies, Role.EJECTOR_PIN).solid))
    assert failed[SOUND].figure == 1.0
    assert failed[SOUND].detail.startswith("ejector pin: ")
    assert words in failed[SOUND].detail


def test_a_pin_beside_its_bore_hits_the_core():
    failed = refused(Role.EJECTOR_PIN, pin(at=(8.15, 0.0)))
    assert failed[APART].detail.startswith("core and ejector pin at")


def test_a_pin_too_long_stands_in_the_part():
    failed = refused(Role.EJECTOR_PIN, pin(top=CEILING + 0.3))
    assert failed[APART].detail.startswith("part and ejector pin at")
    assert failed[APART].figure == pytest.approx(0.3, rel=0.2)


def test_a_pin_with_a_collar_under_the_core_runs_into_it():
    bodies, claims = tool()
    gap = 4.0
    low = float(role(bodies, Role.CORE).body.box[0][2])
    headed = solids.fuse(pin(), solids.cylinder(4, 3, at=(8, 0, low - gap - 3)))
    assert unproved(changed(bodies, Role.EJECTOR_PIN, headed), replace(claims, stroke_mm=gap - 0.1)) == {}
    failed = unproved(changed(bodies, Role.EJECTOR_PIN, headed), replace(claims, stroke_mm=gap + 0.2))
    assert list(failed) == [EJECTORS_MOVE]
    assert failed[EJECTORS_MOVE].detail.startswith("ejector pin against core")


# --- undercuts of the steel: how small -------------------------------------------------------------------------------


def held_by(depth, height=2.0):
    """A block with a bead of this depth all along one side, in a cavity that fits it exactly: the bead holds it."""
    part = solids.fuse(solids.box((0, 0, 0), (30, 20, 10)), solids.box((30, 0, 4), (30 + depth, 20, 4 + height)))
    low, high = (-15, -15, 0), (45, 35, 25)
    cavity = solids.cut(solids.box(low, high), part)
    core = solids.box((-15, -15, -15), (45, 35, 0))
    return [
        ProofBody("part", Role.PART, Motion.PART, part),
        ProofBody("cavity", Role.CAVITY, Motion.CAVITY_HALF, cavity),
        ProofBody("core", Role.CORE, Motion.CORE_HALF, core),
    ]


def test_a_bead_of_a_twentieth_holds_the_cavity():
    proof = prove_cavity_half(straight(held_by(0.05)))
    assert proof.verdict is Verdict.FAILED
    # a bead 2 mm high and 0.05 deep: 2 V / A is just under its depth
    assert proof.figure == pytest.approx(0.05, rel=0.1)


def test_a_rub_of_two_hundredths_passes():
    assert prove_cavity_half(straight(held_by(0.02))).passed


@pytest.mark.parametrize("height", [0.05, 0.2, 6.0])
def test_a_lip_however_thin_along_the_way_is_not_jumped_over(height):
    # samples 0.1, 1.0 or half the height apart would step over a lip of 0.05 mm; a sweep cannot
    proof = prove_cavity_half(straight(held_by(1.0, height)))
    assert proof.verdict is Verdict.FAILED
    assert proof.detail.startswith("cavity against part at 3")


@pytest.mark.parametrize(("gap", "passes"), [(0.02, True), (0.025, True), (0.04, False), (0.1, False)])
def test_a_round_cavity_too_small_is_measured_by_its_gap(gap, passes):
    # a ball in half a cavity of smaller radius: a crescent as thick as the difference, which facets must not hide
    made = mold(solids.sphere(10.0))
    low, high = made.corners
    cavity = solids.cut(solids.box((low[0], low[1], 0.0), high), solids.sphere(10.0 - gap))
    proof = rest.prove_rest(changed(made.bodies, Role.CAVITY, cavity))
    assert proof.figure == pytest.approx(gap, rel=0.02)
    assert proof.passed is passes


def test_the_part_must_leave_the_core_too():
    part, cavity, core = held_by(0.0001)
    upside_down = [
        replace(b, solid=solids.turned(b.solid, 180, about=(1, 0, 0)), motion=m)
        for b, m in zip(held_by(0.5), (Motion.PART, Motion.CORE_HALF, Motion.CAVITY_HALF), strict=True)
    ]
    assert prove_part(straight(upside_down)).verdict is Verdict.FAILED
    assert prove_part(straight([part, cavity, core])).passed


# --- proofs that do not run -----------------------------------------------------------------------------------------


def test_without_bodies_nothing_passes():
    proofs = prove_tool([], tool()[1])
    assert [p.name for p in proofs] == NAMES
    assert not any(p.passed for p in proofs[:2] + proofs[3:])


@pytest.mark.parametrize(
    ("gone", "not_run"),
    [
        (Motion.PART, [PART_LEAVES]),
        (Motion.CAVITY_HALF, [CAVITY_OPENS]),
        (Motion.CORE_HALF, [PART_LEAVES, EJECTORS_MOVE]),
        (Motion.EJECTOR, [EJECTORS_MOVE]),
    ],
)
def test_a_step_without_its_bodies_is_not_run(gone, not_run):
    bodies, claims = tool()
    proofs = prove_tool([b for b in bodies if b.motion is not gone], claims)
    assert [p.name for p in proofs if p.verdict is Verdict.NOT_RUN] == not_run
    assert all(p.figure is None and not p.passed and p.detail for p in proofs if p.name in not_run)


@pytest.mark.parametrize("stroke", [0.0, -3.0, math.nan])
def test_a_stroke_that_is_none_is_not_run(stroke):
    proof = prove_ejection(straight(tool()[0], stroke), stroke)
    assert (proof.verdict, proof.figure) == (Verdict.NOT_RUN, None)


def test_a_kernel_that_gives_up_on_one_question_leaves_the_others(monkeypatch):
    class ForeignError(Exception):
        pass

    def gives_up(*_):
        raise ForeignError("no")

    monkeypatch.setattr(rest, "balance", gives_up)
    monkeypatch.setattr(motion, "sweep_faces", gives_up)
    bodies, claims = tool()
    proofs = {p.name: p for p in prove_tool(bodies, claims)}
    assert list(proofs) == NAMES
    assert {n for n, p in proofs.items() if p.verdict is Verdict.NOT_RUN} == {
        FILLED,
        CAVITY_OPENS,
        PART_LEAVES,
        EJECTORS_MOVE,
    }
    assert proofs[SOUND].passed and proofs[APART].passed
    assert proofs[FILLED].limit == BALANCE and proofs[CAVITY_OPENS].limit == OPEN_OVERLAP
    assert "no" in proofs[FILLED].detail


def test_a_body_whose_mesh_does_not_close_proves_nothing():
    bodies, _ = tool()
    failed = refused(Role.CAVITY, solids.unsound(role(bodies, Role.CAVITY).solid))
    assert failed[SOUND].verdict is Verdict.FAILED
    assert {failed[n].verdict for n in (APART, CAVITY_OPENS)} == {Verdict.NOT_RUN}
    assert "not closed" in failed[APART].detail


def test_only_passed_counts_as_passed():
    assert [Proof("", v, 0.0, 1.0, "").passed for v in Verdict] == [True, False, False]


# --- bodies ---------------------------------------------------------------------------------------------------------


def test_each_position_is_a_body_of_its_own():
    block = solids.box((0, 0, 0), (2, 2, 2))
    bodies = placed_bodies(
        [
            ("core", Role.CORE, Motion.CORE_HALF, block, ((0.0, 0.0, 0.0),)),
            ("pin", Role.EJECTOR_PIN, Motion.EJECTOR, block, ((10.0, 0.0, 0.0), (0.0, 20.0, -5.0))),
        ]
    )
    assert [b.name for b in bodies] == ["core", "pin 1", "pin 2"]
    assert [tuple(b.body.box[0]) for b in bodies] == [(0, 0, 0), (10, 0, 0), (0, 20, -5)]
    assert bodies[2].mesh.volume() == pytest.approx(8.0)
    assert bodies[2].thin.volume() == pytest.approx((2 - 0.024) ** 3)


def test_bodies_far_apart_cannot_meet():
    def at(x):
        return ProofBody("b", Role.PART, Motion.PART, solids.box((x, 0, 0), (x + 1, 1, 1)))

    assert at(0).may_meet(at(1.0))
    assert not at(0).may_meet(at(1.5))
    assert at(0).may_meet(at(1.5), slack=0.6)


def test_an_open_mesh_has_no_eroded_solid():
    body = ProofBody("lid", Role.PART, Motion.PART, solids.unsound(solids.box((0, 0, 0), (1, 1, 1))))
    for ask in ("mesh", "thin"):
        with pytest.raises(KernelError, match="not closed"):
            getattr(body, ask)
    assert np.all(body.body.box[1] == 1.0)
