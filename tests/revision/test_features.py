"""What is said to have changed on a part, against changes that were made on purpose."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import BRepBuilderAPI_NurbsConvert

from moldgen.kernel.face_signature import part_signs
from moldgen.kernel.step_read import read_step
from moldgen.kernel.topology import compound_of, only_solid
from moldgen.model.part import Vector
from moldgen.model.revision import PartChange, PartChangeKind
from moldgen.revision.align import align
from moldgen.revision.features import part_changes
from tests.helpers.solids import box, cone, cut, cylinder, extruded, fuse, grown, shifted
from tests.kernel_io.test_step_read import write_raw
from tests.revision.conftest import solid_of
from tests.revision.part_changes import Change
from tests.revision.round_changes import ROUND_CHANGES
from tests.revision.test_align import away, rotation
from tests.revision.wall_changes import WALL_CHANGES

PULL: Vector = (0.0, 0.0, 1.0)
Kind = PartChangeKind


def tray(
    boss: tuple[float, float] = (20.0, 20.0),
    hole: float = 1.5,
    long: float = 80.0,
    thick: float = 2.0,
    rib: Any = None,
    posts: bool = True,
) -> Any:
    """A tray of `long` x 50 x 15, `thick` walls, open above, with a bored boss of radius 4, a post and a window."""
    solid = cut(box((0, 0, 0), (long, 50, 15)), box((thick, thick, 2), (long - thick, 50 - thick, 16)))
    solid = fuse(solid, cut(cylinder(4, 9, (*boss, 1.5)), cylinder(hole, 20, (*boss, 4))))
    if posts:
        solid = fuse(solid, cone(3, 2.5, 8, (60, 30, 2)))
    solid = cut(solid, box((40, 35, -1), (48, 40, 3)))
    return solid if rib is None else fuse(solid, rib)


def changes(old: Any, new: Any, pull: Vector | None = PULL) -> tuple[PartChange, ...]:
    before, after = part_signs(old), part_signs(new)
    return part_changes(before, after, align(before, after), pull)


def test_nothing_changed():
    assert changes(tray(), tray()) == ()
    assert changes(tray(), away(tray())) == ()


@pytest.mark.parametrize("move", [(2.0, 0.0), (-0.7, 0.4), (0.05, 0.0)])
def test_a_moved_boss_is_named_with_its_hole(move):
    (change,) = changes(tray(), tray(boss=(20 + move[0], 20 + move[1])))
    assert change.feature == "boss d 8 with hole d 3"
    assert change.kind is Kind.MOVED
    assert change.shift == pytest.approx((*move, 0.0), abs=1e-6)
    assert (len(change.old_faces), len(change.new_faces)) == (4, 4)  # wall, end, bore, its bottom
    low, high = np.array(change.box)
    assert low == pytest.approx((16 + move[0], 16 + move[1], 2), abs=0.1)
    assert high == pytest.approx((24 + move[0], 24 + move[1], 10.5), abs=0.1)


def test_a_moved_boss_is_found_on_a_part_that_was_turned_and_written_by_another_system(tmp_path):
    new = BRepBuilderAPI_NurbsConvert(away(tray(boss=(22.0, 20.0)))).Shape()
    read = read_step(write_raw(new, tmp_path / "new.step")).solid
    (change,) = changes(tray(), read, pull=None)
    assert change.feature == "boss d 8 with hole d 3"
    about = np.array([1.0, 2.0, 3.0]) / np.sqrt(14.0)
    assert change.shift == pytest.approx(rotation(33, about) @ (2, 0, 0), abs=1e-5)


def test_bosses_that_moved_apart_are_told_one_by_one():
    old, new = tray(), tray(boss=(22.0, 20.0))
    old, new = (fuse(s, cylinder(4, 9, (x, 30, 1.5))) for s, x in ((old, 40.0), (new, 37.0)))
    found = changes(old, new)
    assert [c.kind for c in found] == [Kind.MOVED, Kind.MOVED]
    assert sorted(c.shift for c in found) == [pytest.approx((-3, 0, 0)), pytest.approx((2, 0, 0))]


def test_a_boss_does_not_take_the_place_of_another():
    old = fuse(tray(posts=False), cylinder(3, 8, (60, 15, 2)), cylinder(3, 8, (60, 35, 2)))
    new = fuse(tray(posts=False), cylinder(3, 8, (60, 15, 2)))
    (change,) = changes(old, new)
    assert (change.kind, change.feature, len(change.old_faces)) == (Kind.GONE, "boss d 6", 2)
    (change,) = changes(new, old)
    assert (change.kind, change.feature, len(change.new_faces)) == (Kind.ADDED, "boss d 6", 2)
    assert change.at[:2] == pytest.approx((60, 35)), "its axis, not any point on it"


def test_a_wider_hole_tells_both_sizes():
    (change,) = changes(tray(), tray(hole=1.75))
    assert (change.kind, change.feature) == (Kind.RESIZED, "blind hole d 3")
    assert (change.was, change.now) == ("d 3 mm", "d 3.5 mm")
    assert change.told.endswith("resized from d 3 mm to d 3.5 mm")


def test_a_rib_that_is_added_gone_or_thicker():
    thin, thick = (box((30, 10, 1.5), (30 + t, 30, 8)) for t in (1.2, 1.6))
    (change,) = changes(tray(), tray(rib=thin))
    assert (change.kind, change.feature, len(change.new_faces)) == (Kind.ADDED, "rib 1.2 thick", 5)
    assert change.old_faces == ()
    (change,) = changes(tray(rib=thin), tray())
    assert (change.kind, change.feature, len(change.old_faces)) == (Kind.GONE, "rib 1.2 thick", 5)
    (change,) = changes(tray(rib=thin), tray(rib=thick))  # one side of it stays
    assert (change.kind, change.was, change.now) == (Kind.RESIZED, "1.2 mm thick", "1.6 mm thick")


def test_walls_that_are_thicker():
    found = changes(tray(), tray(thick=2.4))
    assert {(c.kind, c.was, c.now) for c in found} == {(Kind.RESIZED, "2 mm thick", "2.4 mm thick")}
    assert sum(len(c.old_faces) for c in found) == 4
    assert all(c.feature == "wall 2 thick" for c in found)


def test_a_longer_tray_has_a_wall_that_moved():
    (change,) = changes(tray(), tray(long=83.0))
    assert (change.kind, change.feature) == (Kind.MOVED, "wall 2 thick")
    assert change.shift == pytest.approx((3, 0, 0), abs=1e-6)
    assert len(change.old_faces) == 2  # its inside and its outside


def leaning(degrees: float) -> Any:
    """A block 40 x 30 x 10 whose side at x = 40 leans inward about its foot, with a hole in its top."""
    top = 40 - 10 * np.tan(np.radians(degrees))
    solid = extruded([(0, 0, 0), (40, 0, 0), (float(top), 0, 10), (0, 0, 10)], (0, 30, 0))
    return cut(solid, cylinder(3, 5, (10, 10, 6)))


def test_draft_is_told_against_the_pull():
    (change,) = changes(leaning(0), leaning(1.5))
    assert (change.kind, change.was, change.now) == (Kind.DRAFT, "0 deg", "1.5 deg")
    (change,) = changes(leaning(0), leaning(1.5), pull=None)
    assert (change.kind, change.was, change.now) == (Kind.RESHAPED, "", "")


def test_draft_on_a_boss():
    straight, drafted = cylinder(3, 8, (30, 30, 1)), cone(3.0 + 8 * np.tan(np.radians(1)), 3.0, 8, (30, 30, 1))
    (change,) = changes(fuse(tray(), straight), fuse(tray(), drafted))
    assert (change.kind, change.feature) == (Kind.DRAFT, "boss d 6")
    assert (change.was, change.now) == ("0 deg", "1 deg")


def test_a_part_scaled_as_a_whole_is_one_change():
    (change,) = changes(tray(), grown(tray(), 1.01))
    assert (change.kind, change.feature) == (Kind.RESIZED, "whole part")
    assert (change.was, change.now) == ("1", "1.01 times as large")
    whole, boss = changes(tray(), grown(tray(boss=(22.0, 20.0)), 1.01))
    assert whole.feature == "whole part"
    assert (boss.kind, boss.shift) == (Kind.MOVED, pytest.approx((2.02, 0, 0), abs=1e-6))


def test_several_changes_come_largest_first():
    found = changes(tray(), tray(boss=(22.0, 20.0), long=83.0, posts=False))
    assert [(c.kind, c.feature) for c in found] == [
        (Kind.MOVED, "wall 2 thick"),
        (Kind.MOVED, "boss d 8 with hole d 3"),
        (Kind.GONE, "boss d 5"),
    ]


def test_a_grille_of_many_equal_holes_did_not_change():
    """More pairs of equal faces than the search for a motion looks at: in place, all of them are asked."""
    plate = box((0, 0, 0), (80, 60, 2))
    slots = [box((4 + 6 * i, 4 + 6 * k, -1), (7 + 6 * i, 7 + 6 * k, 3)) for i in range(12) for k in range(9)]
    grille = cut_all(plate, slots)
    assert changes(grille, away(grille)) == ()


def cut_all(solid: Any, tools: list[Any]) -> Any:
    return only_solid(BRepAlgoAPI_Cut(solid, compound_of(tools)).Shape())


def test_the_same_faces_in_another_order_are_told_alike():
    first, second = (
        changes(tray(), new) for new in (tray(boss=(22.0, 20.0)), shifted(tray(boss=(22.0, 20.0)), 0, 0, 0))
    )
    assert [c.told for c in first] == [c.told for c in second]


@pytest.mark.parametrize("change", [c for c in (*ROUND_CHANGES, *WALL_CHANGES) if c.told], ids=lambda c: c.name)
def test_the_scripted_changes_are_named_and_nothing_else(change: Change):
    found = list(changes(solid_of(change.old), solid_of(change.new)))
    for told in change.told:
        fits = [c for c in found if told.word in c.feature and c.kind in told.kinds and near(c, told.at)]
        assert fits, (told, [c.told for c in found])
        found.remove(fits[0])
        if told.shift is not None:
            assert fits[0].shift == pytest.approx(told.shift, abs=1e-6)
        if told.by is not None:
            assert number(fits[0].now) - number(fits[0].was) == pytest.approx(told.by, abs=2e-3)
    assert found == []


def near(change: PartChange, at: Vector | None) -> bool:
    low, high = np.array(change.box)
    return at is None or bool(np.all(np.array(at) >= low - 1.0) and np.all(np.array(at) <= high + 1.0))


def number(text: str) -> float:
    found = re.search(r"-?\d+(\.\d+)?", text)
    assert found
    return float(found.group())


REAL = ["card_lid", "controller_base", "handheld_top", pytest.param("freeform_shell", marks=pytest.mark.slow)]


@pytest.mark.parametrize("name", REAL)
def test_a_real_part_that_was_only_turned_did_not_change(real_parts, tmp_path, name):
    if not (real_parts / f"{name}.step").exists():
        pytest.skip(f"no {name}")
    old = read_step(real_parts / f"{name}.step", find_crossings=False).solid
    new = read_step(write_raw(away(old), tmp_path / "new.step"), find_crossings=False).solid
    assert changes(old, new) == ()
