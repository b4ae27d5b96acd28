"""What touches without being joined: closed or joined with a note, or refused with its place."""

from __future__ import annotations

import pytest
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakePolygon, BRepBuilderAPI_Sewing
from OCP.gp import gp_Pnt
from OCP.TopAbs import TopAbs_SHELL

from moldgen.errors import PartError
from moldgen.kernel import heal_touch
from moldgen.kernel.body import Body
from moldgen.kernel.heal import heal
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.step_read import read_step
from moldgen.kernel.topology import compound_of, explore, faces_of, only_solid
from tests.kernel_io.test_step_read import block, raw_solid, shell_of, write_raw


def polygon(*corners):
    maker = BRepBuilderAPI_MakePolygon()
    for corner in corners:
        maker.Add(gp_Pnt(*corner))
    maker.Close()
    return BRepBuilderAPI_MakeFace(maker.Wire(), True).Face()


def slit_block(width: float):
    """A block 20 x 10 x 10 with a slit half through it at half height, `width` wide at its mouth, to a point."""
    low, high = 5 - width / 2, 5 + width / 2
    faces = [
        polygon((0, 0, 0), (0, 10, 0), (20, 10, 0), (20, 0, 0)),
        polygon((0, 0, 10), (20, 0, 10), (20, 10, 10), (0, 10, 10)),
        polygon((20, 0, 0), (20, 10, 0), (20, 10, 10), (20, 0, 10)),
        polygon((0, 0, 0), (0, 0, low), (0, 10, low), (0, 10, 0)),
        polygon((0, 0, high), (0, 0, 10), (0, 10, 10), (0, 10, high)),
        polygon((0, 0, low), (10, 0, 5), (10, 10, 5), (0, 10, low)),
        polygon((0, 0, high), (0, 10, high), (10, 10, 5), (10, 0, 5)),
        polygon((0, 0, 0), (20, 0, 0), (20, 0, 10), (0, 0, 10), (0, 0, high), (10, 0, 5), (0, 0, low)),
        polygon((0, 10, 0), (0, 10, low), (10, 10, 5), (0, 10, high), (0, 10, 10), (20, 10, 10), (20, 10, 0)),
    ]
    sewing = BRepBuilderAPI_Sewing(1e-7)
    for face in faces:
        sewing.Add(face)
    sewing.Perform()
    return raw_solid(*explore(sewing.SewedShape(), TopAbs_SHELL))


def test_a_slit_of_no_width_is_closed_and_told_with_its_place():
    healed = heal(slit_block(0.0))
    assert healed.volume_mm3 == pytest.approx(2000)
    assert len(faces_of(healed.solid)) == 6
    assert [(n.what, n.count) for n in healed.notes] == [("slits of no width closed, at 5.000, 5.000, 5.000", 1)]
    assert healed.notes[0].volume_change_mm3 == pytest.approx(0.0, abs=1e-9)
    assert mesh_solid(Body(healed.solid).mesh).volume() == pytest.approx(2000)


@pytest.mark.parametrize("width", [0.001, 0.02, 0.2])
def test_a_slit_with_a_width_is_kept(width):
    healed = heal(slit_block(width))
    assert healed.volume_mm3 == pytest.approx(2000 - 50 * width, rel=1e-9)
    assert len(faces_of(healed.solid)) == 9


def test_a_slit_that_cannot_be_closed_is_refused_with_its_place(monkeypatch):
    monkeypatch.setattr(heal_touch, "_volume_of", lambda solid: block())  # a kernel that returns another body
    with pytest.raises(PartError, match="1 slits of no width") as caught:
        heal(slit_block(0.0))
    assert caught.value.where == "5.000, 5.000, 5.000"


def test_a_slit_inside_that_the_reader_leaves_as_a_sheet_is_left_out_and_told(tmp_path):
    inner = faces_of(block(4, 4, 4, at=(3, 3, 5)))[0]
    slit = raw_solid(shell_of(faces_of(block(10, 10, 10))), shell_of([inner, inner.Reversed()]))
    read = read_step(write_raw(slit, tmp_path / "part.step"))
    assert read.volume_mm3 == pytest.approx(1000)
    assert "loose surfaces beside the solid, left out" in read.healed[0].what


def test_a_solid_that_touches_itself_along_an_edge_is_refused_with_the_place():
    # a slab 20 x 20 x 10 less two diagonal quarters of its upper half: the other two quarters meet in an edge
    slab = BRepAlgoAPI_Cut(block(20, 20, 10), block(10, 10, 5, at=(0, 0, 5))).Shape()
    with pytest.raises(PartError, match="touches itself along 1 edges") as caught:
        heal(only_solid(BRepAlgoAPI_Cut(slab, block(10, 10, 5, at=(10, 10, 5))).Shape()))
    assert caught.value.where == "10.000, 10.000, 7.500"


def lumps(tmp_path, *solids, assembly: int = 0):
    """A file of one product with several solids (assembly 0), or of a product for each (1)."""
    shape = raw_solid(*(shell_of(faces_of(s)) for s in solids)) if assembly == 0 else compound_of(solids)
    return write_raw(shape, tmp_path / "part.step", assembly=assembly)


@pytest.mark.parametrize(
    ("other", "volume", "faces"),
    [
        (lambda: block(10, 10, 10, at=(10, 0, 0)), 2000.0, 6),
        (lambda: block(10, 5, 5, at=(10, 2, 2)), 1250.0, 11),
    ],
    ids=["whole faces", "part of a face"],
)
def test_bodies_of_one_product_that_touch_face_to_face_are_joined_and_told(tmp_path, other, volume, faces):
    read = read_step(lumps(tmp_path, block(10, 10, 10), other()))
    assert read.volume_mm3 == pytest.approx(volume)
    assert len(faces_of(read.solid)) == faces
    assert [(n.what, n.count) for n in read.healed] == [("bodies of one product that touch face to face joined", 2)]
    assert mesh_solid(Body(read.solid).mesh).volume() == pytest.approx(volume)


def test_one_of_them_can_still_be_chosen(tmp_path):
    read = read_step(lumps(tmp_path, block(10, 10, 10), block(10, 5, 5, at=(10, 2, 2))), 2)
    assert read.volume_mm3 == pytest.approx(250)


@pytest.mark.parametrize(
    ("at", "words"),
    [
        ((10, 10, 0), r"1 and 2 touch at 10.000, 10.000, "),
        ((10, 10, 10), r"1 and 2 touch at 10.000, 10.000, 10.000"),
        ((30, 0, 0), r"no common face joins all of them: 1 \(no name\)"),
        ((9, 0, 0), r"they overlap by 100 mm\^3"),
    ],
    ids=["an edge", "a vertex", "apart", "overlap"],
)
def test_bodies_that_no_face_joins_are_refused_with_how_they_lie(tmp_path, at, words):
    with pytest.raises(PartError, match="the file holds 2 solids, and .*" + words):
        read_step(lumps(tmp_path, block(10, 10, 10), block(10, 10, 10, at=at)))


def test_products_of_an_assembly_are_never_joined(tmp_path):
    path = lumps(tmp_path, block(10, 10, 10), block(10, 10, 10, at=(10, 0, 0)), assembly=1)
    with pytest.raises(PartError, match="the file holds 2 solids: "):
        read_step(path)
