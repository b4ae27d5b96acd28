"""The difference of two nearly equal solids, piece by piece, against closed forms and planted faults."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from moldgen.errors import KernelError
from moldgen.kernel import solid_difference as ladder
from moldgen.kernel.boolean import cut, fuse
from moldgen.kernel.measure import is_valid
from moldgen.kernel.piece_measure import depth_from, point_inside
from moldgen.kernel.place import turned
from moldgen.kernel.solid_difference import SolidDifference, fine_body, solid_difference
from moldgen.kernel.topology import compound_of, faces_of, only_solid
from tests.helpers.solids import box, cone, cylinder
from tests.revision.closed_forms import bar, crescent, frustum

BLOCK = ((-30.0, -20.0, 0.0), (30.0, 20.0, 25.0))


def steel(*pockets: Any, studs: tuple[Any, ...] = ()) -> Any:
    """A block with other things round it that never change, pockets cut and studs added."""
    always = [box((-25, -15, 20), (-15, 15, 26)), cylinder(3.0, 30.0, (-8, 13, -1)), cylinder(3.0, 30.0, (20, -12, -1))]
    body = only_solid(compound_of(cut(box(*BLOCK), [*always, *pockets])))
    return only_solid(compound_of(fuse([body, *studs]))) if studs else body


def boss_pocket(x: float, y: float = 0.0, low: float = 4.5, high: float = 4.0, floor: float = 10.0) -> Any:
    """A tapered round pocket from the top, 1 mm beyond it so that no faces coincide but its own."""
    step = (low - high) / (25.0 - floor)
    return cone(high, low + step, 26.0 - floor, (x, y, floor))


def difference(old: Any, new: Any, **more: Any) -> SolidDifference:
    return solid_difference(fine_body(old), fine_body(new), **more)


def volumes(pieces: Any) -> list[float]:
    return [p.volume_mm3 for p in pieces]


def test_a_boss_that_moved_by_2_mm_leaves_two_crescents() -> None:
    """pi r^2 less the lens of two circles 2 mm apart, integrated over the height of the tapered pocket."""
    found = difference(steel(boss_pocket(2.0)), steel(boss_pocket(4.0)))
    exact = crescent(4.0, 4.5, 15.0, 2.0)
    assert volumes(found.cut) == pytest.approx([exact], rel=1e-6)
    assert volumes(found.weld) == pytest.approx([exact], rel=1e-6)
    assert all(p.exact and is_valid(p.solid) for p in (*found.cut, *found.weld))


def test_a_wider_bore_is_a_ring() -> None:
    found = difference(steel(cylinder(2.0, 30.0, (5, 0, -1))), steel(cylinder(2.3, 30.0, (5, 0, -1))))
    assert volumes(found.cut) == pytest.approx([bar(4.6, 25.0) - bar(4.0, 25.0)], rel=1e-6)
    assert found.weld == ()


def test_a_thicker_stud_wants_weld_all_round() -> None:
    """A cone on the block: what is missing is the outer cone less the inner one."""
    studs = [cone(r, r - 0.5, 8.0, (5, 0, 25)) for r in (4.0, 4.4)]
    found = difference(steel(studs=(studs[0],)), steel(studs=(studs[1],)))
    assert found.cut == ()
    assert volumes(found.weld) == pytest.approx([frustum(4.4, 3.9, 8) - frustum(4.0, 3.5, 8)], rel=1e-6)


def test_a_deeper_floor_is_a_disc() -> None:
    was, now = (cylinder(5.0, 26.0 - floor, (5, 0, floor)) for floor in (10.0, 9.4))
    found = difference(steel(was), steel(now))
    assert volumes(found.cut) == pytest.approx([bar(10.0, 0.6)], rel=1e-6)
    body = fine_body(found.cut[0].solid)
    assert depth_from(body, fine_body(steel(was))) == pytest.approx(0.6, abs=1e-4)


def test_a_wall_that_moved_cuts_on_one_side_and_welds_on_the_other() -> None:
    was, now = (box((x, -5, 12), (x + 8, 5, 26)) for x in (0.0, 0.4))
    found = difference(steel(was), steel(now))
    assert volumes(found.cut) == pytest.approx([0.4 * 10 * 13], rel=1e-9)
    assert volumes(found.weld) == pytest.approx([0.4 * 10 * 13], rel=1e-9)


def test_far_places_are_pieces_of_their_own_largest_first() -> None:
    pins = [cylinder(1.5, 30.0, (x, 0, -1)) for x in (-5.0, 8.0)]
    wide = cylinder(2.0, 30.0, (22.0, 10.0, -1))
    found = difference(steel(), steel(*pins, wide))
    assert volumes(found.cut) == pytest.approx([bar(4.0, 25.0), bar(3.0, 25.0), bar(3.0, 25.0)], rel=1e-6)


def test_a_part_that_grew_as_a_whole_is_one_shell() -> None:
    """A box pocket scaled by 1.01 about the middle of its mouth: the larger box less the smaller one."""
    was, now = (box((-10 * k, -6 * k, 25 - 9 * k), (10 * k, 6 * k, 26)) for k in (1.0, 1.01))
    found = difference(steel(was), steel(now))
    assert volumes(found.cut) == pytest.approx([20 * 12 * 9 * (1.01**3 - 1)], rel=1e-6)


def test_equal_solids_have_no_pieces_however_they_were_meshed_or_moved() -> None:
    old = steel(boss_pocket(2.0), studs=(cylinder(3.0, 4.0, (14, 5, 25)),))
    away = turned(old, ((0.0, -1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)), (3.3, -7.1, 0.4))
    back = turned(away, ((0.0, 1.0, 0.0), (-1.0, 0.0, 0.0), (0.0, 0.0, 1.0)), (7.1, 3.3, -0.4))
    assert difference(old, back).none
    assert difference(old, steel(boss_pocket(2.0), studs=(cylinder(3.0, 4.0, (14, 5, 25)),))).none


def test_a_changed_neighbor_makes_no_slivers_of_a_round_face_that_stays() -> None:
    """The slot cuts into the long bore: its cylinder gets other edges, and other triangles all the way round."""
    bore = cylinder(6.0, 30.0, (5, 0, -1))
    slot = box((5, -1, 15), (15, 1, 26))
    found = difference(steel(bore), steel(bore, slot))
    inside = 2 * 10 * 10 - (1 * math.sqrt(35) + 36 * math.asin(1 / 6)) * 10  # a strip of the disc, x from 0 on
    assert volumes(found.cut) == pytest.approx([inside], rel=1e-6)
    assert found.weld == ()


@pytest.mark.parametrize(("deeper", "count"), [(0.005, 0), (0.03, 1)])
def test_noise_is_no_piece_and_what_is_over_it_is(deeper: float, count: int) -> None:
    was, now = (cylinder(5.0, 16.0 + d, (5, 0, 10.0 - d)) for d in (0.0, deeper))
    found = difference(steel(was), steel(now))
    assert volumes(found.cut) == pytest.approx([bar(10.0, deeper)] * count, rel=1e-6)


def test_only_the_inside_of_a_clip_counts() -> None:
    old, new = box(*BLOCK), only_solid(compound_of(cut(box((-35, -20, 0), (30, 20, 25)), [boss_pocket(2.0)])))
    assert len(difference(old, new).weld) == 1
    clip = (np.array([-29.95, -np.inf, -np.inf]), np.full(3, np.inf))
    found = difference(old, new, clip=clip)
    assert found.weld == ()
    assert volumes(found.cut) == pytest.approx([frustum(4.0, 4.5, 15.0)], rel=1e-6)


def test_depth_is_measured_from_the_old_steel_and_the_point_lies_inside() -> None:
    old = steel(boss_pocket(2.0))
    found = difference(old, steel(boss_pocket(4.0)))
    for piece in (found.cut[0], found.weld[0]):
        body = fine_body(piece.solid)
        # 2 mm farther out at one height: from the rim 2 mm, from the flank, which leans by 2 deg, 0.001 mm less
        assert depth_from(body, fine_body(old)) == pytest.approx(2.0, abs=0.01)
        at = point_inside(body)
        left = cut(piece.solid, [box(at - 1e-3, at + 1e-3)])
        assert sum(map(ladder.volume, left)) == pytest.approx(piece.volume_mm3 - 8e-9, abs=2e-9)


@pytest.mark.parametrize(("deeper", "count"), [(0.018, 0), (0.03, 1)])
def test_where_the_kernel_refuses_only_what_is_sure_is_told(
    deeper: float, count: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    def gives_up(*_: Any) -> list[Any]:
        raise KernelError("planted")

    was, now = (cylinder(5.0, 16.0 + d, (5, 0, 10.0 - d)) for d in (0.0, deeper))
    assert len(difference(steel(was), steel(now)).cut) == 1
    monkeypatch.setattr(ladder, "_in_box", gives_up)
    found = difference(steel(was), steel(now))
    assert [p.exact for p in found.cut] == [False] * count
    assert len(found.refused) == (1 if count == 0 else 3)


def test_a_film_that_the_kernel_refuses_spoils_no_piece_beside_it(monkeypatch: pytest.MonkeyPatch) -> None:
    """The slot's floor went down by 0.018 mm, and the box around that film reaches into the ring of the wider bore."""
    real = ladder._in_box

    def only_small(old: Any, new: Any, box_: Any, fuzzy: float) -> list[Any]:
        if (box_[1] - box_[0]).max() > 30.0:
            raise KernelError("planted")
        return real(old, new, box_, fuzzy)

    monkeypatch.setattr(ladder, "_in_box", only_small)
    slots = (box((-12, -5, 10.0 - d), (26, -3, 26)) for d in (0.0, 0.018))
    was, now = (steel(cylinder(r, 30.0, (5, 0, -1)), slot) for r, slot in zip((2.0, 2.3), slots, strict=True))
    found = difference(was, now)
    assert volumes(found.cut) == pytest.approx([bar(4.6, 25.0) - bar(4.0, 25.0)], rel=1e-6)
    assert [p.exact for p in found.cut] == [True]
    assert len(found.refused) == 1


def test_rungs_end_when_too_much_time_was_spent_on_refused_ones(monkeypatch: pytest.MonkeyPatch) -> None:
    def gives_up(*_: Any) -> list[Any]:
        raise KernelError("planted")

    clock = iter(range(0, 1000, 45))
    monkeypatch.setattr(ladder, "_spent", lambda: float(next(clock)))
    monkeypatch.setattr(ladder, "_in_box", gives_up)
    found = difference(steel(boss_pocket(2.0)), steel(boss_pocket(4.0)))
    assert len(found.refused) == 2  # the third would begin after 90 s
    assert [p.exact for p in (*found.cut, *found.weld)] == [False, False]


def test_facets_are_the_last_rung_and_say_so(monkeypatch: pytest.MonkeyPatch) -> None:
    def gives_up(*_: Any) -> list[Any]:
        raise KernelError("planted")

    monkeypatch.setattr(ladder, "_in_box", gives_up)
    found = difference(steel(boss_pocket(2.0)), steel(boss_pocket(4.0)))
    exact = crescent(4.0, 4.5, 15.0, 2.0)
    for pieces in (found.cut, found.weld):
        assert [p.exact for p in pieces] == [False]
        assert volumes(pieces) == pytest.approx([exact], rel=2e-3)
        assert is_valid(pieces[0].solid)
        assert len(faces_of(pieces[0].solid)) > 20
    assert len(found.refused) == 3
    assert all("planted" in reason for reason in found.refused)


@pytest.mark.parametrize("fault", ["a piece is missing", "a piece is too large", "old and new are swapped"])
def test_what_the_kernel_makes_wrong_is_refused(fault: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """A boolean that leaves out or adds steel agrees neither with the mesh nor with the volumes."""
    right = ladder._in_box

    def wrong(*given: Any) -> list[Any]:
        cuts, welds, old, new = right(*given)
        empty, much = compound_of([]), compound_of([cylinder(4.0, 1.0, (2, 0, 10))])
        return {
            "a piece is missing": [empty, welds, old, new],
            "a piece is too large": [compound_of([cuts, much]), welds, old, new],
            "old and new are swapped": [cuts, welds, new, compound_of([new, much])],
        }[fault]

    monkeypatch.setattr(ladder, "_in_box", wrong)
    found = difference(steel(boss_pocket(2.0)), steel(boss_pocket(4.0)))
    assert len(found.refused) == 3
    assert not any(p.exact for p in (*found.cut, *found.weld))


def test_the_same_pieces_in_the_same_order_every_time() -> None:
    old, new = steel(boss_pocket(2.0)), steel(boss_pocket(4.0), cylinder(1.5, 30.0, (-5, 0, -1)))
    one, other = difference(old, new), difference(old, new)
    assert volumes(one.cut) == volumes(other.cut)
    assert volumes(one.weld) == volumes(other.weld)
