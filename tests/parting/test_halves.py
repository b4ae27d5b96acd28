"""Halves of simple parts: the rung that each loop is closed by, and every proof of the tool they make."""

import math
from functools import cache

import numpy as np
import pytest
from helpers import solids
from helpers.molding import block_mm3, mold, unproved

from moldgen.kernel.measure import volume
from moldgen.kernel.topology import faces_of
from moldgen.model.part import MoldFrame
from moldgen.parting.accept import HalvesCheck, check_halves
from moldgen.parting.surface import Rung
from moldgen.parting.told import parting_line, told
from moldgen.proof.opening import EJECTORS_MOVE
from moldgen.tolerances import BALANCE, OPEN_OVERLAP

STILL = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)))


def hood(below=None):
    """A round hood with draft whose rim follows the top of a solid."""
    outer, inner = solids.cone(30, 26, 25), solids.cone(28, 24, 22)
    return solids.cut(outer, below, inner) if below else solids.cut(outer, inner)


def ramp(a, b, run):
    """Everything below a step from z = a up to z = b on a ramp `run` mm long."""
    half = run / 2
    line = [(-40, a), (-half, a), (half, b), (40, b)]
    return solids.extruded([(-40, -40, -30), *((x, -40, z) for x, z in line), (40, -40, -30)], (0, 80, 0))


WAVE = solids.shifted(solids.under_curve([2, 4, 6, 3, 1, 2.5, 0], 80, 80, floor=-30), -40, -40, 0)
ARCH = solids.cut(
    solids.cylinder(30, 60, along=(1, 0, 0)),
    solids.cylinder(27, 60, along=(1, 0, 0)),
    solids.box((-1, -40, -40), (61, 40, 8)),
)
PLATE_HOLES = {
    "plain": [solids.cylinder(4, 14, at=(10, 20, -1))],
    "drafted": [solids.cone(4, 5, 14, at=(25, 20, -1))],
    "stepped": [solids.cylinder(3, 14, at=(40, 20, -1)), solids.cylinder(6, 7, at=(40, 20, 6))],
    "square": [solids.box((52, 14, -1), (60, 26, 13))],
    "countersunk": [solids.cylinder(2, 14, at=(72, 10, -1)), solids.cone(2, 5.001, 3.001, at=(72, 10, 9))],
    "drafted downward": [solids.cone(6, 5, 14, at=(80, 28, -1))],
}
PLATE = solids.cut(solids.box((0, 0, 0), (90, 40, 12)), *(t for tools in PLATE_HOLES.values() for t in tools))

PARTS = {
    # part: (solid, rung of the outer loop, rungs of the shut-offs)
    "flat box": (solids.box((0, 0, 0), (40, 30, 10)), Rung.PLANE, []),
    "drafted disc": (solids.cone(20, 17, 12), Rung.PLANE, []),
    "cup": (hood(), Rung.PLANE, []),
    "stepped rim": (hood(ramp(0, 6, 10)), Rung.LAND, []),
    "rim with an upright step": (hood(ramp(-20, 6, 0.0)), Rung.LAND, []),
    "free rim": (hood(WAVE), Rung.LAND, []),
    "arch": (ARCH, Rung.LAND, []),
    "cylinder on its side": (solids.cylinder(8, 40, along=(1, 0, 0)), Rung.PLANE, []),
    "ball": (solids.sphere(10), Rung.PLANE, []),
    "ring": (solids.torus(20, 6), Rung.PLANE, [Rung.PLANE]),
    "plate of holes": (PLATE, Rung.PLANE, [Rung.PLANE] * 6),
    "slot in a leaning wall": (
        solids.cut(solids.cone(30, 20, 20), solids.cone(28.5, 18.5, 18.5), solids.box((22, -3, -5), (27, 3, 40))),
        Rung.PLANE,
        [Rung.HOST],
    ),
    "holes in an arch": (
        solids.cut(ARCH, solids.cylinder(5, 40, at=(15, 0, 0)), solids.box((45, -3, 0), (52, 3, 40))),
        Rung.LAND,
        [Rung.LID] * 2,
    ),
}


@cache
def molded(name):
    return mold(PARTS[name][0])


@pytest.mark.parametrize("name", PARTS)
def test_the_halves_fit_and_every_proof_of_their_tool_passes(name):
    made = molded(name)
    assert made.parted.check.proved, made.parted.check.complaint
    assert list(unproved(made.bodies, made.claims)) == [EJECTORS_MOVE]  # it has none: not run, so not passed


@pytest.mark.parametrize("name", PARTS)
def test_each_loop_is_closed_by_the_best_rung_that_holds_it(name):
    sheet = molded(name).parted.sheet
    assert sheet.outer.rung is PARTS[name][1], sheet.outer.refused
    assert [s.rung for s in sheet.shut_offs] == PARTS[name][2]


@pytest.mark.parametrize("name", PARTS)
def test_cavity_core_and_part_fill_the_block(name):
    made = molded(name)
    parted = made.parted
    total = volume(parted.cavity) + volume(parted.core) + volume(PARTS[name][0])
    assert total == pytest.approx(block_mm3(made.corners), rel=1e-5)


@pytest.mark.parametrize("name", PARTS)
def test_every_face_of_the_part_is_a_face_of_just_one_half(name):
    parted = molded(name).parted
    for number, face in enumerate(parted.body.faces):
        owners = [any(face.IsSame(f) for f in faces_of(half)) for half in (parted.cavity, parted.core)]
        assert owners == [bool(parted.sides.cavity[number]), not parted.sides.cavity[number]]


@pytest.mark.parametrize("name", PARTS)
def test_the_parting_line_is_closed_and_lies_on_the_part(name):
    parted = molded(name).parted
    lines = parting_line(parted)
    assert len(lines) == 1 + len(PARTS[name][2])
    for line in lines:
        assert line[0] == pytest.approx(line[-1])
    for place in lines[0][:: max(1, len(lines[0]) // 12)]:
        assert parted.body.nearest_face(place)[1] < 0.06  # the sag of the working mesh


def test_the_line_round_a_cylinder_on_its_side_is_its_silhouette():
    # rectangle 40 x 16 at the height of the axis
    (line,) = parting_line(molded("cylinder on its side").parted)
    assert np.abs(line[:, 2]).max() < 1e-9
    assert np.linalg.norm(np.diff(line, axis=0), axis=1).sum() == pytest.approx(2 * (40 + 16))


def test_the_lines_of_a_ring_are_its_two_equators():
    outer, inner = parting_line(molded("ring").parted)
    assert np.hypot(*outer[:, :2].T) == pytest.approx(26.0, abs=1e-6)
    assert np.hypot(*inner[:, :2].T) == pytest.approx(14.0, abs=1e-6)


def test_half_a_ball_is_in_each_half():
    made = molded("ball")
    for half in (made.parted.cavity, made.parted.core):
        assert volume(half) == pytest.approx(block_mm3(made.corners) / 2 - 2 * math.pi * 1000 / 3, rel=1e-6)


def test_shut_offs_of_a_drafted_hole_lie_at_its_narrow_end():
    shut_offs = molded("plate of holes").parted.sheet.shut_offs
    places = {"narrows downward": (25, 20), "narrows upward": (80, 28), "stepped": (40, 20), "countersunk": (72, 10)}
    heights = {
        name: next(s.at[2] for s in shut_offs if abs(s.at[0] - x) < 8 and abs(s.at[1] - y) < 8)
        for name, (x, y) in places.items()
    }
    # a step leaves the choice of either end of the narrow bore
    assert heights.pop("stepped") in (pytest.approx(0.0), pytest.approx(6.0))
    assert heights.pop("countersunk") in (pytest.approx(0.0), pytest.approx(9.0))
    assert heights == {"narrows downward": pytest.approx(0.0), "narrows upward": pytest.approx(12.0)}


def test_upright_steps_are_told_with_their_height_and_leaning_ones_are_not():
    corners = [(0, 0, 0), (30, 0, 0), (30, 0, 6), (60, 0, 6), (60, 0, 9), (27, 0, 9), (27, 0, 3), (0, 0, 3)]
    (finding,) = told(mold(solids.extruded(corners, (0, 30, 0))).parted, STILL).findings
    assert finding.code == "parting.no_draft"
    assert "3.00 mm high" in finding.message  # from the top of the low flange to the bottom of the high one
    assert told(molded("stepped rim").parted, STILL).findings == ()


def test_a_steep_step_is_told_with_its_angle_and_place():
    # the wall of the hood leans 9 deg: its edge at the step rises as steeply, and the land begins upright there
    (finding,) = told(molded("rim with an upright step").parted, STILL).findings
    assert (finding.code, finding.unit, finding.limit) == ("parting.steep", "deg", 5.0)
    assert finding.value < 5.0
    assert finding.at[0] == pytest.approx(0.0, abs=3.0)  # the step lies at x = 0
    assert 25.0 < abs(finding.at[1]) < 40.0  # on the wall or the land beside it


def test_what_was_decided_is_told_with_its_rung():
    decisions = {d.topic: d for d in told(molded("plate of holes").parted, STILL).decisions}
    assert decisions["parting surface"].rung == Rung.PLANE
    assert decisions["shut-off"].choice == "6 of 6 holes"
    assert decisions["parting line"].choice.startswith("7 loops")


# --- what the user decides ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("level", [0.0, 4.0, 7.5, 10.0])
def test_a_given_level_is_kept(level):
    made = mold(solids.box((0, 0, 0), (40, 30, 10)), level=level)
    assert made.parted.level == level
    assert made.parted.check.proved
    (line,) = parting_line(made.parted)
    assert line[:, 2] == pytest.approx(level)
    assert volume(made.parted.core) == pytest.approx(70 * 60 * (level + 15) - 1200 * level)


@pytest.mark.parametrize("level", [40.0, 10.0, -5.0])
def test_a_level_that_leaning_walls_do_not_allow_is_told(level):
    parted = mold(hood(), level=level, margin=30.0).parted
    assert parted.check.proved
    assert parted.sheet.outer.rung is Rung.PLANE
    assert parted.level == pytest.approx(0.0, abs=1e-9)  # where the hood is widest
    (finding,) = told(parted, STILL).findings
    assert (finding.code, finding.limit) == ("parting.level_moved", level)


def test_a_level_that_is_kept_needs_no_finding():
    assert told(mold(solids.box((0, 0, 0), (40, 30, 10)), level=4.0).parted, STILL).findings == ()


@pytest.mark.parametrize("avoid", [(20.0, 15.0, 0.0), (20.0, 15.0, 10.0)])
def test_the_line_keeps_away_from_a_marked_face(avoid):
    made = mold(solids.box((0, 0, 0), (40, 30, 10)), avoid=(np.array(avoid),))
    assert made.parted.check.proved
    (line,) = parting_line(made.parted)
    assert abs(line[:, 2] - avoid[2]).min() == pytest.approx(10.0)


def test_a_part_with_an_undercut_gives_no_proved_halves():
    # a spool along the pull: what lies between its collars is held
    made = mold(
        solids.fuse(*(solids.cylinder(r, h, at=(0, 0, z)) for r, h, z in ((5, 20, 0), (12, 4, 20), (12, 4, -4))))
    )
    assert not made.parted.check.proved
    assert made.parted.check.balance < BALANCE  # the volumes are right, the tool does not open
    failed = unproved(made.bodies, made.claims)
    assert failed["the cavity half opens"].figure > 1.0
    assert len(made.parted.refused) >= 4


# --- the quick check ------------------------------------------------------------------------------------------------


def test_the_check_of_halves_sees_each_kind_of_misfit():
    made = mold(hood())  # of its own: the check compares meshes, and proofs refine those of the solids they are given
    parted, block = made.parted, block_mm3(made.corners)

    def check(cavity=parted.cavity, core=parted.core, block=block):
        return check_halves(cavity, core, parted.body, block)

    assert check().proved
    assert check(block=block * (1 + 1e-5)).balance == pytest.approx(1e-5, rel=1e-3)
    lifted = check(core=solids.shifted(parted.core, 0, 0, 0.1))
    assert lifted.static_mm == pytest.approx(0.1, rel=0.1)
    assert lifted.balance < BALANCE  # volumes alone do not see it
    aside = check(cavity=solids.shifted(parted.cavity, 0.2, 0, 0))
    assert aside.static_mm > OPEN_OVERLAP
    assert not any(c.proved for c in (lifted, aside, check(block=block * 1.01)))
    assert "0.1" in lifted.complaint


def test_figures_at_their_limit_are_not_inside_it():
    assert HalvesCheck(0.0, 0.0, 0.0, 0.0).proved
    for figures in ((BALANCE, 0, 0, 0), (0, OPEN_OVERLAP, 0, 0), (0, 0, OPEN_OVERLAP, 0), (0, 0, 0, OPEN_OVERLAP)):
        assert not HalvesCheck(*figures).proved
    assert HalvesCheck(math.nan, 0.0, 0.0, 0.0).proved is False
