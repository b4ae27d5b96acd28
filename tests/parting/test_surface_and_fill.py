"""Shut-offs by the lower rungs, which loop is the outer one, and undercuts filled."""

import math

import numpy as np
import pytest
from helpers import solids
from helpers.molding import block_around

from moldgen.errors import KernelError, PartError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.measure import area, is_valid, volume
from moldgen.kernel.topology import directed_points
from moldgen.parting import fill
from moldgen.parting.fill import fill_trapped
from moldgen.parting.surface import Rung, close_holes, closings, joined, outer_loop
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import face_kinds
from moldgen.release.trapped import trapped_volume

BLOCK = solids.box((0, 0, 0), (40, 30, 20))


def make_sheet(body, loops, outer, level, corners):
    return joined(next(closings(loops[outer], level, corners)), close_holes(body, loops, outer))


def round_faces(body, most_height):
    low = np.ptp(body.face_heights, axis=1) < most_height
    return low & np.array([body.surface_kind(f) == "cylinder" for f in range(len(body.faces))])


def with_rim_and_holes(solid, holes):
    """The loop round the bottom of a solid, then the loops of its holes."""
    body = Body(solid)
    bottom = np.isclose(body.face_heights[:, 1], body.box[0][2], atol=1e-6)
    (rim,) = boundary_loops(body, bottom)
    return body, [[backward(e) for e in reversed(rim)], *boundary_loops(body, holes(body))]


def sheet_of(solid, holes):
    body, loops = with_rim_and_holes(solid, holes)
    return make_sheet(body, loops, 0, float(body.box[0][2]), block_around(body))


def test_a_cross_hole_in_a_round_wall_is_shut_by_that_wall():
    # the rim stands on edge: level planes and curtains lie over themselves
    rod = solids.cut(solids.cylinder(10, 40), solids.cylinder(3, 40, at=(-20, -20, 20), along=(1, 1, 0)))
    sheet = sheet_of(rod, lambda body: round_faces(body, 7))
    assert [s.rung for s in sheet.shut_offs] == [Rung.HOST] * 2
    assert all("level" in s.refused[0] for s in sheet.shut_offs)


def test_a_cross_hole_over_a_corner_is_filled():
    corner = solids.cut(BLOCK, solids.cylinder(3, 90, at=(-20, -20, 10), along=(1, 1, 0)))
    body = Body(corner)
    numbers = [f for f in range(len(body.faces)) if body.surface_kind(f) == "cylinder"]
    loops = boundary_loops(body, np.isin(np.arange(len(body.faces)), numbers))
    bottom = np.isclose(body.face_heights[:, 1], 0.0)
    (rim,) = boundary_loops(body, bottom)
    at_corner = min(loops, key=lambda loop: sum(abs(v) for v in _first_point(loop)[:2]))
    sheet = make_sheet(body, [[backward(e) for e in reversed(rim)], at_corner], 0, 0.0, block_around(body))
    (shut,) = sheet.shut_offs
    assert shut.rung is Rung.FILLED
    assert shut.refused[-1] == "no neighbour holds the whole rim"
    # more than the flat section of the bore, less than the corner that the bore took away
    assert 9 * math.pi < area(sheet.faces[-1]) < math.sqrt(2) * 9 * math.pi


def _first_point(loop):
    return directed_points(loop[0], 2)[0]


def test_the_parting_plane_is_the_block_without_the_part():
    sheet = sheet_of(BLOCK, lambda body: np.zeros(len(body.faces), dtype=bool))
    (plane,) = sheet.faces
    assert area(plane) == pytest.approx(70 * 60 - 40 * 30)
    assert sheet.outer.rung is Rung.PLANE
    assert sheet.outer.span == pytest.approx((40, 30, 0))


def test_the_outer_loop_is_the_widest_and_others_that_run_with_it_are_told():
    plate = Body(solids.cut(BLOCK, solids.cylinder(4, 30, at=(10, 10, -5)), solids.cylinder(5, 30, at=(28, 15, -5))))
    loops = boundary_loops(plate, np.isclose(plate.face_heights[:, 0], 20.0))
    number, alike = outer_loop(loops)
    assert len(loops[number]) == 4
    assert alike == ()
    wrong = [loops[number], *([backward(e) for e in reversed(w)] for i, w in enumerate(loops) if i != number)]
    assert outer_loop(wrong) == (0, (1, 2))


def test_a_loop_that_crosses_the_given_level_is_refused():
    slanted = Body(solids.extruded([(0, 0, 0), (40, 0, 0), (40, 0, 20), (0, 0, 10)], (0, 30, 0)))
    top = np.arange(6) == int(np.argmax(slanted.face_centres[:, 2]))
    (rim,) = boundary_loops(slanted, top)
    with pytest.raises(KernelError, match="crosses the level"):
        make_sheet(slanted, [rim], 0, 15.0, block_around(slanted))


# --- undercuts ------------------------------------------------------------------------------------------------------

GROOVED = solids.cut(BLOCK, solids.box((-1, -1, 8), (41, 2.5, 12)))
DRILLED = solids.cut(BLOCK, solids.cylinder(3, 12, at=(20, -1, 10), along=(0, 1, 0)))
BUBBLE = solids.cut(BLOCK, solids.box((10, 10, 5), (20, 20, 12)))
MUSHROOM = solids.fuse(*(solids.cylinder(r, h, at=(0, 0, z)) for r, h, z in ((5, 24, -2), (12, 4, 20), (12, 4, -4))))

UNDERCUT = {
    # solid, volume of the trapped space by closed form
    "groove": (GROOVED, 40 * 2.5 * 4),
    "cross hole": (DRILLED, math.pi * 9 * 11),
    "bubble": (BUBBLE, 700.0),
    "spool": (MUSHROOM, math.pi * (144 - 25) * 20),
}


def trapped_in(solid):
    body = Body(solid)
    body, _ = imprint_silhouettes(body, face_kinds(body))
    kinds = face_kinds(body)
    return body, kinds, trapped_volume(body, kinds)


@pytest.mark.parametrize("name", UNDERCUT)
def test_a_filled_part_has_the_volume_of_part_and_trapped_space(name):
    solid, gap = UNDERCUT[name]
    body, kinds, trapped = trapped_in(solid)
    assert len(trapped.pieces) == 1
    filled, notes = fill_trapped(body, kinds, trapped.pieces)
    assert is_valid(filled.solid)
    assert volume(filled.solid) == pytest.approx(volume(solid) + gap, rel=1e-6)
    assert trapped_volume(filled, face_kinds(filled)).pieces == ()
    (decision,) = notes.decisions
    assert decision.rung
    assert f"{trapped.pieces[0].volume_mm3:.3f} mm^3" in decision.choice


def test_two_undercuts_are_filled_one_by_one():
    solid = solids.cut(GROOVED, solids.box((15, 20, 6), (25, 31, 9)))
    body, kinds, trapped = trapped_in(solid)
    filled, notes = fill_trapped(body, kinds, trapped.pieces)
    assert volume(filled.solid) == pytest.approx(40 * 30 * 20, rel=1e-9)
    assert len(notes.decisions) == 2


def test_a_part_without_undercuts_stays_as_it_is():
    body, kinds, trapped = trapped_in(BLOCK)
    filled, notes = fill_trapped(body, kinds, trapped.pieces)
    assert volume(filled.solid) == volume(BLOCK)
    assert notes.decisions == ()


def test_what_cannot_be_filled_is_named_by_its_place(monkeypatch):
    body, kinds, trapped = trapped_in(DRILLED)
    monkeypatch.setattr(fill, "cut", lambda *_: [])
    monkeypatch.setattr(fill, "common", lambda *_: [])
    monkeypatch.setattr(fill, "_whole_faces", lambda *_: "not now")
    with pytest.raises(PartError) as caught:
        fill_trapped(body, kinds, trapped.pieces)
    assert caught.value.where.startswith("face at")
    assert "0 solids" in caught.value.what
