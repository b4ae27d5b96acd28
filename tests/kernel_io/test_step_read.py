"""Reading STEP: closed forms, units, choice of a solid, assemblies, and every kind of bad file."""

from __future__ import annotations

import math
import os
from pathlib import Path

import pytest
from OCP.BRep import BRep_Builder
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakePolygon,
    BRepBuilderAPI_MakeSolid,
    BRepBuilderAPI_RightCorner,
    BRepBuilderAPI_Transform,
)
from OCP.BRepOffsetAPI import BRepOffsetAPI_MakePipeShell
from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeBox,
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakeSphere,
)
from OCP.gp import gp_Ax1, gp_Dir, gp_Pnt, gp_Trsf, gp_Vec
from OCP.Interface import Interface_Static
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Writer
from OCP.TopAbs import TopAbs_EDGE
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS_Shell, TopoDS_Solid

from moldgen.canon import sha256_bytes
from moldgen.errors import PartError
from moldgen.kernel.measure import area, bounding_box, centroid, is_valid, volume
from moldgen.kernel.quiet import quiet
from moldgen.kernel.step_read import read_step
from moldgen.kernel.step_write import Looks, StepExport
from moldgen.kernel.topology import compound_of, explore, faces_of
from moldgen.model.tool import Component, Motion, Role


def block(x: float = 10, y: float = 20, z: float = 30, at: tuple[float, float, float] = (0, 0, 0)):
    return BRepPrimAPI_MakeBox(gp_Pnt(*at), x, y, z).Solid()


def write_raw(shape, path: Path, *, unit: str = "MM", schema: int = 4, assembly: int = 2) -> Path:
    """Write with the kernel's plain writer: files as other programs make them, not as our own writer does."""
    with quiet():
        STEPControl_Writer()  # the settings exist only once a writer was made
        Interface_Static.SetCVal_s("write.step.unit", unit)
        Interface_Static.SetIVal_s("write.step.schema", schema)
        Interface_Static.SetIVal_s("write.step.assembly", assembly)
        writer = STEPControl_Writer()
        writer.Transfer(shape, STEPControl_AsIs)
        writer.Write(str(path))
        Interface_Static.SetCVal_s("write.step.unit", "MM")
        Interface_Static.SetIVal_s("write.step.schema", 4)
        Interface_Static.SetIVal_s("write.step.assembly", 2)
    return path


def shell_of(faces) -> TopoDS_Shell:
    builder, shell = BRep_Builder(), TopoDS_Shell()
    builder.MakeShell(shell)
    for face in faces:
        builder.Add(shell, face)
    return shell


def raw_solid(*shells) -> TopoDS_Solid:
    builder, solid = BRep_Builder(), TopoDS_Solid()
    builder.MakeSolid(solid)
    for shell in shells:
        builder.Add(solid, shell)
    return solid


# --- closed forms ---------------------------------------------------------------------------------------------------
@pytest.mark.parametrize(
    ("shape", "expected_volume", "expected_area", "expected_centre"),
    [
        (block(), 6000.0, 2200.0, (5.0, 10.0, 15.0)),
        (BRepPrimAPI_MakeCylinder(5, 20).Solid(), math.pi * 500, math.pi * 250, (0, 0, 10)),
        (
            BRepPrimAPI_MakeCone(6, 3, 12).Solid(),
            math.pi * 12 / 3 * (36 + 18 + 9),
            math.pi * (36 + 9 + 9 * math.hypot(12, 3)),
            (0, 0, 12 / 4 * (36 + 2 * 18 + 3 * 9) / (36 + 18 + 9)),
        ),
        (BRepPrimAPI_MakeSphere(7).Solid(), 4 / 3 * math.pi * 343, 4 * math.pi * 49, (0, 0, 0)),
    ],
    ids=["block", "cylinder", "frustum", "sphere"],
)
def test_volume_area_and_centroid_are_the_closed_forms(
    tmp_path, shape, expected_volume, expected_area, expected_centre
):
    read = read_step(write_raw(shape, tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(expected_volume, rel=1e-6)
    assert volume(read.solid) == pytest.approx(expected_volume, rel=1e-6)
    assert area(read.solid) == pytest.approx(expected_area, rel=1e-6)
    assert centroid(read.solid) == pytest.approx(expected_centre, abs=1e-5)
    assert read.healed == ()


@pytest.mark.parametrize(("schema", "name"), [(3, "AP203"), (4, "AP214"), (5, "AP242")])
def test_the_three_schemas_are_read_and_named(tmp_path, schema, name):
    read = read_step(write_raw(block(), tmp_path / "part.step", schema=schema))
    assert (read.schema, read.volume_mm3) == (name, pytest.approx(6000.0))


@pytest.mark.parametrize(
    ("unit", "name"), [("INCH", "inch"), ("M", "metre"), ("CM", "centimetre")], ids=["inch", "metre", "centimetre"]
)
def test_any_length_unit_gives_millimetres(tmp_path, unit, name):
    path = write_raw(block(25.4, 50.8, 76.2), tmp_path / "part.step", unit=unit)
    text = path.read_text()
    assert unit != "INCH" or ("'INCH'" in text and "(1.,2.,3.)" in text)  # the file itself counts in inches
    read = read_step(path)
    assert read.volume_mm3 == pytest.approx(25.4 * 50.8 * 76.2, rel=1e-9)
    assert bounding_box(read.solid)[1] == pytest.approx([25.4, 50.8, 76.2], abs=1e-5)
    assert name in read.unit


def test_the_hash_is_that_of_the_file(tmp_path):
    path = write_raw(block(), tmp_path / "part.step")
    assert read_step(path).sha256 == sha256_bytes(path.read_bytes())


def test_nothing_is_printed(tmp_path, capfd):
    text = write_raw(block(), tmp_path / "part.step").read_text()
    read_step(tmp_path / "part.step")
    (tmp_path / "bad.step").write_text(text.replace("MANIFOLD_SOLID_BREP", "MANIFOLD_SOLID_BRIP"))
    with pytest.raises(PartError):
        read_step(tmp_path / "bad.step")
    assert capfd.readouterr() == ("", "")


# --- one of several -------------------------------------------------------------------------------------------------
@pytest.fixture
def assembly(tmp_path) -> Path:
    """Two products: a lid of 6 mm^3, and a post of 24 mm^3 that stands at two places."""
    lid = Component("lid", Role.PART, block(1, 2, 3), "ABS", Motion.PART)
    post = Component("Post", Role.CORE_PIN, block(2, 3, 4), "", Motion.PART, ((10, 0, 0), (0, 50, 7)))
    StepExport([lid, post], Looks({})).write_assembly(tmp_path / "two.step")
    return tmp_path / "two.step"


def test_several_solids_and_no_choice_are_listed(assembly):
    with pytest.raises(PartError) as caught:
        read_step(assembly)
    assert "3 solids: 1 lid (6 mm^3), 2 Post (24 mm^3), 3 Post (24 mm^3)" in caught.value.what
    assert "solid: 1" in caught.value.remedy


def test_a_solid_is_chosen_by_number_or_name(assembly):
    assert read_step(assembly, 1).volume_mm3 == pytest.approx(6)
    by_name = read_step(assembly, "LID")
    assert (by_name.name, by_name.volume_mm3) == ("lid", pytest.approx(6))
    assert [(s.number, s.name) for s in by_name.solids] == [(1, "lid"), (2, "Post"), (3, "Post")]


def test_positions_in_the_assembly_are_applied(assembly):
    low, high = bounding_box(read_step(assembly, 3).solid)
    assert low == pytest.approx([0, 50, 7], abs=1e-6)
    assert high == pytest.approx([2, 53, 11], abs=1e-6)
    assert read_step(assembly, 3).solid.Location().IsIdentity()


@pytest.mark.parametrize(("choice", "words"), [(4, "no solid 4"), ("base", "no solid 'base'"), ("Post", "2 solids")])
def test_a_choice_that_names_no_single_solid_is_refused_with_the_list(assembly, choice, words):
    with pytest.raises(PartError, match=words) as caught:
        read_step(assembly, choice)
    assert "1 lid (6 mm^3)" in caught.value.what


def test_solids_of_one_product_are_named_by_their_own_entity(tmp_path):
    path = write_raw(compound_of([block(), block(1, 1, 1, at=(50, 0, 0))]), tmp_path / "two.step", assembly=0)
    first, second = path.read_text().split("MANIFOLD_SOLID_BREP(''", 1)
    text = (
        first + "MANIFOLD_SOLID_BREP('shell'" + second.replace("MANIFOLD_SOLID_BREP(''", "MANIFOLD_SOLID_BREP('knob'")
    )
    path.write_text(text)
    assert read_step(path, "knob").volume_mm3 == pytest.approx(1)


def test_a_rotated_occurrence_keeps_its_volume_and_moves(tmp_path):
    turn = gp_Trsf()
    turn.SetRotation(gp_Ax1(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1)), math.pi / 2)
    turn.SetTranslationPart(gp_Vec(100, 0, 0))
    moved = compound_of([block().Located(TopLoc_Location(turn)), block()])
    read = read_step(write_raw(moved, tmp_path / "two.step", assembly=1), 1)
    assert read.volume_mm3 == pytest.approx(6000)
    assert bounding_box(read.solid)[0] == pytest.approx([80, 0, 0], abs=1e-5)


# --- files that are no part -----------------------------------------------------------------------------------------
def refused(path: Path, words: str) -> PartError:
    with pytest.raises(PartError, match=words) as caught:
        read_step(path)
    assert str(path) in caught.value.where
    assert caught.value.remedy
    return caught.value


def test_missing_file(tmp_path):
    refused(tmp_path / "none.step", "no such file")


def test_a_folder(tmp_path):
    refused(tmp_path, "a folder")


@pytest.mark.parametrize("content", [b"", b" \n\n"])
def test_empty_file(tmp_path, content):
    (tmp_path / "part.step").write_bytes(content)
    refused(tmp_path / "part.step", "empty")


@pytest.mark.skipif(os.geteuid() == 0, reason="root may read everything")
def test_unreadable_file(tmp_path):
    path = write_raw(block(), tmp_path / "part.step")
    path.chmod(0)
    refused(path, "cannot be read")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"solid lid\nfacet normal 0 0 1\n", "STL"),
        (b"PK\x03\x04....", "zip"),
        (b"version https://git-lfs.github.com/spec/v1\n", "git lfs pull"),
        (b"\xef\xbb\xbfISO-10303-21;\n", "byte order mark"),
        (bytes(range(256)), "not a STEP file"),
    ],
)
def test_not_step(tmp_path, content, words):
    (tmp_path / "part.step").write_bytes(content)
    refused(tmp_path / "part.step", words)


@pytest.mark.parametrize("share", [0.1, 0.5, 0.99])
def test_truncated(tmp_path, share):
    data = write_raw(block(), tmp_path / "part.step").read_bytes()
    (tmp_path / "part.step").write_bytes(data[: int(share * len(data))])
    refused(tmp_path / "part.step", "cut short")


def test_damaged_inside_though_the_end_is_there(tmp_path):
    data = write_raw(block(), tmp_path / "part.step").read_bytes()
    (tmp_path / "part.step").write_bytes(data[: len(data) // 2] + b"\nENDSEC;\nEND-ISO-10303-21;\n")
    with pytest.raises(PartError):
        read_step(tmp_path / "part.step")


def test_comments_around_the_data_are_fine(tmp_path):
    data = write_raw(block(), tmp_path / "part.step").read_bytes()
    (tmp_path / "part.step").write_bytes(b"/* from the old CAD */\n" + data + b"\n/* end */\n")
    assert read_step(tmp_path / "part.step").volume_mm3 == pytest.approx(6000)


def test_no_solid_and_no_surface(tmp_path):
    edge = explore(block(), TopAbs_EDGE)[0]
    refused(write_raw(edge, tmp_path / "part.step"), "neither solids nor surfaces")


def test_an_open_shell_is_refused_with_its_open_edges(tmp_path):
    # Five sides of a block 10 x 20 x 30: the lid at z = 30 is missing, so its four edges are open.
    sides = [f for f in faces_of(block()) if centroid_z(f) < 29.9]
    error = refused(write_raw(shell_of(sides), tmp_path / "part.step"), "4 open edges")
    for place in ("0.000, 10.000, 30.000", "10.000, 10.000, 30.000", "5.000, 0.000, 30.000", "5.000, 20.000, 30.000"):
        assert place in error.what


def centroid_z(face) -> float:
    low, high = bounding_box(face)
    return float(low[2] + high[2]) / 2


def test_loose_faces_that_close_are_sewn_and_reported(tmp_path):
    # Six faces that share no edge, one of them 0.005 mm off: within the gaps that sewing may close.
    off = gp_Trsf()
    off.SetTranslation(gp_Vec(0, 0, 0.005))
    faces = [
        BRepBuilderAPI_Transform(f, off if centroid_z(f) > 29.9 else gp_Trsf(), True).Shape() for f in faces_of(block())
    ]
    read = read_step(write_raw(compound_of(faces), tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(6000, rel=2e-4)
    assert "sewing" in read.healed[0].what
    assert read.healed[0].count == 6


def test_an_inside_out_solid_is_turned(tmp_path):
    inside_out = raw_solid(shell_of([f.Reversed() for f in faces_of(block())]))
    assert volume(inside_out) == pytest.approx(-6000)
    read = read_step(write_raw(inside_out, tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(6000)


def test_a_hollow_space_is_refused_with_its_place_and_volume(tmp_path):
    outer, inner = block(20, 20, 20), block(2, 3, 4, at=(8, 8, 8))
    hollow = BRepBuilderAPI_MakeSolid(
        shell_of(faces_of(outer)), shell_of([f.Reversed() for f in faces_of(inner)])
    ).Solid()
    error = refused(write_raw(hollow, tmp_path / "part.step"), "of 24 mm")
    assert "9.000, 9.500, 10.000" in error.where


def test_a_negligible_hollow_space_is_filled_and_reported(tmp_path):
    outer, inner = block(20, 20, 20), block(1, 1, 1, at=(8, 8, 8))
    hollow = BRepBuilderAPI_MakeSolid(
        shell_of(faces_of(outer)), shell_of([f.Reversed() for f in faces_of(inner)])
    ).Solid()
    read = read_step(write_raw(hollow, tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(8000)
    assert [(n.count, n.volume_change_mm3) for n in read.healed] == [(1, pytest.approx(1.0))]


@pytest.mark.parametrize("corner", [(50, 0, 0), (5, 5, 10)], ids=["apart", "overlapping"])
def test_a_solid_of_two_bodies_is_refused(tmp_path, corner):
    two = raw_solid(shell_of(faces_of(block())), shell_of(faces_of(block(10, 10, 10, at=corner))))
    refused(write_raw(two, tmp_path / "part.step"), "2 (bodies that are not joined|solids)")


def test_a_solid_that_passes_through_itself_is_refused_with_the_place(tmp_path):
    # A square bar 4 x 4 along a path that crosses itself at 20, 0, 0; the kernel finds nothing wrong with it.
    path = BRepBuilderAPI_MakePolygon()
    for x, y in ((0, 0), (40, 0), (40, 20), (20, 20), (20, -20)):
        path.Add(gp_Pnt(x, y, 0))
    section = BRepBuilderAPI_MakePolygon(gp_Pnt(0, -2, -2), gp_Pnt(0, 2, -2), gp_Pnt(0, 2, 2), gp_Pnt(0, -2, 2), True)
    sweep = BRepOffsetAPI_MakePipeShell(path.Wire())
    sweep.SetTransitionMode(BRepBuilderAPI_RightCorner)
    sweep.Add(section.Wire())
    sweep.Build()
    sweep.MakeSolid()
    assert is_valid(sweep.Shape())
    error = refused(write_raw(sweep.Shape(), tmp_path / "part.step"), "passes through itself")
    x, y, z = (float(v) for v in error.where.rpartition(": ")[2].split(","))
    assert max(abs(x - 20), abs(y), abs(z)) <= 2.01


@pytest.mark.parametrize(("side", "words"), [(0.1, "too small: 0.1 mm.*0.5 mm"), (3000, "too large: 3000 mm.*2500 mm")])
def test_parts_of_a_tenth_of_a_millimetre_and_of_three_metres(tmp_path, side, words):
    refused(write_raw(block(side, side, side), tmp_path / "part.step"), words)


@pytest.mark.parametrize("side", [0.51, 2490])
def test_parts_just_inside_the_limits_are_read(tmp_path, side):
    assert read_step(write_raw(block(side, side, side), tmp_path / "part.step")).volume_mm3 == pytest.approx(side**3)


def test_a_ball_is_measured_by_its_surface_not_its_vertices(tmp_path):
    # A ball of radius 0.3 has both its vertices on the axis, 0.6 mm apart; one of 0.2 is too small.
    assert read_step(write_raw(BRepPrimAPI_MakeSphere(0.3).Solid(), tmp_path / "a.step")).volume_mm3 > 0
    refused(write_raw(BRepPrimAPI_MakeSphere(0.2).Solid(), tmp_path / "b.step"), "too small")


def test_real_parts_are_read(real_parts):
    # One file of each schema, one with references to entities that it does not contain.
    adapter = read_step(real_parts / "adapter_cup.step")
    assert adapter.schema == "AP214"
    arm = read_step(real_parts / "arm_link.step", find_crossings=False)
    assert arm.healed[0].count == 16
    assert "does not contain" in arm.healed[0].what
    assert read_step(real_parts / "cross_gimbal.step").unit == "metre"
