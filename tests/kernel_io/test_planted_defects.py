"""What exporters write wrongly, planted: each is healed, left and listed, or refused, as its closed form says."""

from __future__ import annotations

import math

import numpy as np
import pytest
from OCP.BRep import BRep_Builder, BRep_Tool
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy, BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakeSolid
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Dir, gp_Pln, gp_Pnt, gp_Vec
from OCP.ShapeAnalysis import ShapeAnalysis_ShapeTolerance
from OCP.ShapeFix import ShapeFix_ShapeTolerance
from OCP.ShapeUpgrade import ShapeUpgrade_ShapeDivideAngle

from moldgen.errors import PartError
from moldgen.kernel.body import Body
from moldgen.kernel.heal import heal
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.step_read import read_step
from moldgen.kernel.topology import compound_of, edge_points, edges_of, faces_of, only_solid
from tests.kernel_io.test_step_read import block, raw_solid, shell_of, write_raw


def told(healed) -> list[tuple[str, int, float]]:
    """What was listed: first words, count, effect on the volume."""
    return [(n.what.split(",")[0], n.count, n.volume_change_mm3) for n in healed.notes]


def sound(solid, expected: float) -> None:
    """The mesh of a healed solid is closed and encloses the expected volume."""
    assert mesh_solid(Body(solid).mesh).volume() == pytest.approx(expected, rel=5e-3)


def hollow(inner):
    """A cube of 20 mm with a closed space."""
    outside = shell_of(faces_of(block(20, 20, 20)))
    return BRepBuilderAPI_MakeSolid(outside, shell_of([f.Reversed() for f in faces_of(inner)])).Solid()


def test_a_hollow_part_is_refused_in_the_trades_words_with_the_place_and_size_of_each_space():
    with pytest.raises(PartError) as caught:
        heal(hollow(block(2, 3, 4, at=(8, 8, 8))))
    assert "the part is hollow" in caught.value.what
    assert "24 mm^3 at 9.000, 9.500, 10.000" in caught.value.what
    assert "No core reaches" in caught.value.what
    assert "open it to one side for a core" in caught.value.remedy


def test_a_tiny_space_is_filled_and_its_volume_listed():
    healed = heal(hollow(block(1, 1, 1, at=(8, 8, 8))))  # 1 of 8000 mm^3: under 2e-4 of the part
    assert healed.volume_mm3 == pytest.approx(8000)
    assert told(healed) == [("closed hollow spaces filled", 1, pytest.approx(1.0))]
    sound(healed.solid, 8000)


@pytest.mark.parametrize("copied", [False, True], ids=["the same face", "a copy of it"])
def test_a_face_given_twice_is_kept_once(copied):
    faces = faces_of(block())
    again = BRepBuilderAPI_Copy(faces[0]).Shape() if copied else faces[0]
    healed = heal(raw_solid(shell_of([*faces, again])))
    assert healed.volume_mm3 == pytest.approx(6000)
    assert told(healed)[0] == ("faces given twice", 1, 0.0)
    assert len(faces_of(healed.solid)) == 6
    sound(healed.solid, 6000)


def test_a_face_missing_beside_a_doubled_one_is_still_refused():
    faces = faces_of(block())
    with pytest.raises(PartError, match="4 open edges"):
        heal(raw_solid(shell_of([*faces[1:], faces[1]])))


def test_an_inside_out_shell_is_turned_and_told():
    healed = heal(raw_solid(shell_of([f.Reversed() for f in faces_of(block())])))
    assert healed.volume_mm3 == pytest.approx(6000)
    assert told(healed)[0][0] == "inside-out solid turned"
    sound(healed.solid, 6000)


@pytest.mark.parametrize("width", [0.005, 0.02, 0.08])
def test_a_sliver_face_is_kept_and_its_mesh_stays_closed(width):
    # two cubes of 10 mm side by side, one higher by the width: the step between them is a face that wide
    stepped = only_solid(BRepAlgoAPI_Fuse(block(10, 10, 10), block(10, 10, 10 + width, at=(10, 0, 0))).Shape())
    healed = heal(stepped)
    assert healed.volume_mm3 == pytest.approx(2000 + 100 * width, rel=1e-9)
    assert [n[1] for n in told(healed)] == ([2] if width < 0.01 else [])  # its two short edges are listed
    assert mesh_solid(Body(healed.solid).mesh).volume() == pytest.approx(2000 + 100 * width, rel=1e-9)


def test_edges_of_a_tenth_of_a_micrometer_are_listed_and_the_mesh_stays_closed():
    notched = only_solid(BRepAlgoAPI_Cut(block(10, 10, 10), block(1e-4, 1e-4, 10)).Shape())
    healed = heal(notched)
    assert [(n.what, n.count) for n in healed.notes] == [("edges shorter than 0.01 mm, left as they are", 4)]
    sound(healed.solid, 1000)


@pytest.mark.parametrize("patches", [2, 3])
def test_a_cylinder_in_patches_keeps_its_volume(patches):
    divider = ShapeUpgrade_ShapeDivideAngle(2 * math.pi / patches, BRepPrimAPI_MakeCylinder(5, 20).Solid())
    divider.Perform()
    patched = only_solid(divider.Result())
    assert len(faces_of(patched)) == 2 + patches
    healed = heal(patched)
    assert (healed.volume_mm3, healed.notes) == (pytest.approx(500 * math.pi), ())
    sound(healed.solid, 500 * math.pi)


def stated(solid, tolerance: float):
    """The same solid with a tolerance written everywhere."""
    ShapeFix_ShapeTolerance().SetTolerance(solid, tolerance)
    return solid


def with_true_gap(gap: float):
    """A block of which one edge's curve runs beside both faces, by `gap`."""
    solid = block()
    edge = next(e for e in edges_of(solid) if np.ptp(edge_points(e, 2)[:, 2]) > 29)
    curve, first, last = BRep_Tool.Curve_s(edge, 0.0, 0.0), *BRep_Tool.Range_s(edge)
    moved = curve.Translated(gp_Vec(gap * math.sqrt(0.5), gap * math.sqrt(0.5), 0))
    BRep_Builder().UpdateEdge(edge, moved, BRep_Tool.Tolerance_s(edge))
    BRep_Builder().Range(edge, first, last)
    return solid


def worst_tolerance(solid) -> float:
    return float(ShapeAnalysis_ShapeTolerance().Tolerance(solid, 1))


def test_a_stated_tolerance_of_0_015_is_taken_as_it_is():
    healed = heal(stated(block(), 0.015))
    assert healed.notes == ()
    assert worst_tolerance(healed.solid) == pytest.approx(0.015)


@pytest.mark.parametrize("gap", [0.0, 0.001, 0.015])
def test_a_tolerance_stated_far_above_the_true_gap_is_tightened_and_told(gap):
    healed = heal(stated(with_true_gap(gap), 0.03))
    assert [(n.what, n.volume_change_mm3) for n in healed.notes] == [
        ("tolerances stated as up to 0.03 mm, tightened to the true gaps", 0.0)
    ]
    assert gap <= worst_tolerance(healed.solid) <= max(1.3 * gap, 1e-5)
    sound(healed.solid, 6000)


def test_a_true_gap_of_0_022_keeps_its_tolerance_and_is_told():
    healed = heal(stated(with_true_gap(0.022), 0.03))
    assert 0.022 <= worst_tolerance(healed.solid) <= 0.03
    assert healed.notes[-1].what.startswith("faces, edges or vertices looser than 0.02 mm, up to 0.02")
    assert healed.notes[-1].count == 3  # the edge and its two ends; all else was tightened
    sound(healed.solid, 6000)


def test_a_sheet_beside_the_solid_is_left_out_and_listed_with_its_place(tmp_path):
    sheet = BRepBuilderAPI_MakeFace(gp_Pln(gp_Pnt(50, 0, 7), gp_Dir(0, 0, 1)), 0, 5, 0, 5).Face()
    read = read_step(write_raw(compound_of([block(), sheet]), tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(6000)
    assert [n.count for n in read.healed] == [1]
    assert "beside the solid" in read.healed[0].what
    assert "50.000, 0.000, 7.000" in read.healed[0].what
