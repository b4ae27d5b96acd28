"""Healing and the preparation ladder: every form has the volume of the part."""

from __future__ import annotations

import math

import pytest
from OCP.BRepAlgoAPI import BRepAlgoAPI_Fuse
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt
from OCP.ShapeFix import ShapeFix_ShapeTolerance

from moldgen.errors import PartError
from moldgen.kernel import prepare
from moldgen.kernel.heal import heal
from moldgen.kernel.measure import is_valid, volume
from moldgen.kernel.prepare import preparations
from moldgen.kernel.topology import compound_of, faces_of, only_solid


def two_blocks():
    """Two blocks side by side, fused: four of the faces are cut in two although their planes agree."""
    left = BRepPrimAPI_MakeBox(10, 10, 10).Solid()
    right = BRepPrimAPI_MakeBox(gp_Pnt(10, 0, 0), 10, 10, 10).Solid()
    return only_solid(BRepAlgoAPI_Fuse(left, right).Shape())


def test_a_sound_solid_is_left_alone():
    block = BRepPrimAPI_MakeBox(10, 20, 30).Solid()
    healed = heal(block)
    assert healed.solid.IsSame(block)
    assert (healed.volume_mm3, healed.notes) == (pytest.approx(6000), ())


def test_short_edges_and_loose_tolerances_are_told():
    notes = heal(BRepPrimAPI_MakeBox(10, 20, 0.008).Solid()).notes
    assert [(n.what, n.count) for n in notes] == [("edges shorter than 0.01 mm, left as they are", 4)]
    block = BRepPrimAPI_MakeBox(10, 20, 30).Solid()
    ShapeFix_ShapeTolerance().SetTolerance(block, 0.03)
    assert "up to 0.03 mm" in heal(block).notes[0].what


def test_faces_that_enclose_nothing_are_refused():
    with pytest.raises(PartError, match="open edges"):
        heal(compound_of(faces_of(BRepPrimAPI_MakeBox(10, 20, 30).Solid())[:3]))


def test_each_preparation_is_valid_and_keeps_the_volume():
    solid = only_solid(
        BRepAlgoAPI_Fuse(
            two_blocks(), BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(5, 5, 5), gp_Dir(0, 0, 1)), 3, 9).Solid()
        ).Shape()
    )
    expected = 2000 + math.pi * 9 * 4
    rungs = list(preparations(solid))
    assert [r.rung for r in rungs] == [
        "faces merged",
        "faces as read",
        "faces cut at half turns",
        "closed faces cut open",
    ]
    for rung in rungs:
        assert volume(rung.solid) == pytest.approx(expected, rel=1e-6)
        assert is_valid(rung.solid)
        assert rung.refused == ()
    # merging joins the cut planes; cutting at half turns makes two faces of the cylinder
    counts = [len(faces_of(r.solid)) for r in rungs]
    assert counts[0] < counts[1] < counts[2]


def test_preparations_are_made_only_when_asked_for(monkeypatch):
    def explode(solid):
        raise AssertionError("computed too early")

    monkeypatch.setattr(prepare, "_RUNGS", (prepare._RUNGS[1], ("later", explode)))
    assert next(iter(preparations(two_blocks()))).rung == "faces as read"


def test_a_rung_that_fails_or_changes_the_volume_is_passed_over_with_its_reason(monkeypatch):
    def throw(solid):
        raise RuntimeError("no luck")

    def lose(solid):
        return BRepPrimAPI_MakeBox(10, 10, 10).Solid()

    monkeypatch.setattr(prepare, "_RUNGS", (("first", throw), ("second", lose), prepare._RUNGS[1]))
    only = next(iter(preparations(two_blocks())))
    assert only.rung == "faces as read"
    assert "no luck" in only.refused[0]
    assert only.refused[1] == "second: volume 1000 instead of 2000 mm^3"
