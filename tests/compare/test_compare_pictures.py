"""The pictures of a comparison: from where steel is seen, and what must be on them."""

from __future__ import annotations

import dataclasses
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from helpers.comparisons import core, piece
from helpers.mesh_bodies import box
from helpers.png import pixels

from moldgen.model.revision import Work
from moldgen.output import palette
from moldgen.output.compare_pictures import MOST_DRAWN, DrawnComparison, draw_comparison
from moldgen.output.compare_scene import (
    MOST_CLOSE,
    ComparePicture,
    compare_picture,
    read_pictures,
    write_pictures,
)
from moldgen.output.compare_view import choose_sight
from moldgen.output.scene import Indices, Points, SceneBody

LOW, HIGH = (-30.0, -20.0, -20.0), (30.0, 20.0, 0.0)


@dataclasses.dataclass(frozen=True)
class PlainFacets:
    """A mesh that knows no faces: each triangle is a face of its own."""

    vertices: Points
    triangles: Indices

    @property
    def face(self) -> Indices:
        """Return one face for each triangle."""
        return np.arange(len(self.triangles))


def facets(low, high) -> PlainFacets:
    body = box("", "", low, high)
    return PlainFacets(body.vertices, body.triangles)


def made(*works: Work) -> ComparePicture:
    """A block; on its top a plate to cut at x < 0, in its top a bar to weld at x > 0, as `works` says."""
    pieces = [piece("core", work, 1, 100.0) for work in works]
    meshes = {
        Work.CUT: facets((-20.0, -8.0, 0.0), (-8.0, 8.0, 3.0)),
        Work.WELD: facets((8.0, -8.0, -4.0), (20.0, 8.0, 0.0)),
    }
    return compare_picture(core(*pieces), facets(LOW, HIGH), [meshes[w] for w in works])


def seen(picture: np.ndarray, work: Work) -> int:
    """Pixels in the hue of a work, in the middle of the whole view: no label, no legend, no close-up is there."""
    field = picture[150:880, 360:850].astype(int)
    red_over_blue = field[..., 0] - field[..., 2]
    return int((red_over_blue > 80).sum() if work is Work.CUT else (red_over_blue < -80).sum())


@pytest.fixture(scope="module")
def drawn(tmp_path_factory: pytest.TempPathFactory) -> DrawnComparison:
    pictures = (made(Work.CUT, Work.WELD), made(Work.WELD), made(Work.CUT))
    result = draw_comparison(pictures, tmp_path_factory.mktemp("pictures"))
    if "cannot draw" in result.missing or "is missing" in result.missing:
        pytest.skip(result.missing)
    return result


def test_pictures_show_both_works_in_their_colours(drawn: DrawnComparison) -> None:
    assert drawn.missing == ""
    both, weld, cut = (pixels(component.files[0]) for component in drawn.components)
    assert both.shape == (1000, 1400, 3)
    # each piece is a plate of 12 x 16 mm on a block of 60 x 40 mm that takes some 450 px
    assert min(seen(both, Work.CUT), seen(both, Work.WELD)) > 3000
    assert seen(cut, Work.CUT) > 3000
    assert seen(cut, Work.WELD) == 0
    assert seen(weld, Work.CUT) == 0
    assert seen(weld, Work.WELD) > 3000  # though the block's top lies in one plane with it


def test_legend_names_only_what_is_there(drawn: DrawnComparison) -> None:
    for component, works in zip(drawn.components, ("both", "weld", "cut"), strict=True):
        legend = pixels(component.files[0])[95:420, 20:56]
        for word, ink in (("cut", palette.CUT), ("weld", palette.WELD)):
            swatch = (legend == np.array(ink.colour)).all(axis=2).sum()
            assert (swatch >= 300) == (works in ("both", word)), (works, word)
        assert (legend == np.array(palette.STEEL.colour)).all(axis=2).sum() >= 300


def test_close_ups_stand_beside_the_whole(drawn: DrawnComparison) -> None:
    beside = pixels(drawn.components[0].files[0])[130:900, 970:1370].astype(int)
    upper, lower = beside[:350], beside[430:]
    assert (upper[..., 0] - upper[..., 2] < -80).sum() > 5000  # weld first
    assert (lower[..., 0] - lower[..., 2] > 80).sum() > 5000


def test_same_pictures_twice(drawn: DrawnComparison, tmp_path: Path) -> None:
    again = draw_comparison((made(Work.CUT, Work.WELD),), tmp_path)
    assert again.components[0].files[0].read_bytes() == drawn.components[0].files[0].read_bytes()


@pytest.mark.parametrize(
    ("low", "high", "axis", "sign"),
    [
        ((-5, -5, -1), (5, 5, 0), 2, 1),
        ((-5, -5, -20), (5, 5, -19), 2, -1),
        ((29, -5, -12), (30, 5, -8), 0, 1),
        ((-30, -5, -12), (-29, 5, -8), 0, -1),
        ((-5, 19, -12), (5, 20, -8), 1, 1),
    ],
)
def test_steel_is_seen_from_the_side_that_it_faces(low, high, axis: int, sign: int) -> None:
    sight = choose_sight(box("core", "core", LOW, HIGH), [box("weld 1", "weld", low, high)])
    assert sign * sight.view.toward[axis] > 0.3
    assert sight.share > 0.1
    face = HIGH[axis] if sign > 0 else LOW[axis]
    assert sight.anchors[0][axis] == pytest.approx(face)  # the label points at what one sees


def test_what_lies_in_a_deep_slot_is_seen_through_its_opening() -> None:
    """The slot is 4 mm wide and 18 mm deep: a view that leans across it sees a wall instead of the floor."""
    walls = [box("", "", (-30, -20, -20), (30, -2, 0)), box("", "", (-30, 2, -20), (30, 20, 0))]
    floor = box("", "", (-30, -2, -20), (30, 2, -18))
    bodies = [*walls, floor]
    starts = np.cumsum([0, *(len(b.vertices) for b in bodies)])
    triangles = np.concatenate([b.triangles + s for b, s in zip(bodies, starts, strict=False)])
    steel = SceneBody("", "", np.concatenate([b.vertices for b in bodies]), triangles, (), np.arange(len(triangles)))
    sight = choose_sight(steel, [box("weld 1", "weld", (-4, -2, -19), (4, 2, -18))])
    _, y, z = sight.view.toward
    assert z > 0.3
    assert abs(y) / z < 4.0 / 18.0  # else a wall hides all of it
    assert sight.share > 0.1


def test_steel_deep_inside_is_drawn_in_translucent_steel(tmp_path: Path) -> None:
    change = core(piece("core", Work.WELD, 1, 100.0))
    inside = compare_picture(change, facets(LOW, HIGH), [facets((-10.0, -8.0, -14.0), (10.0, 8.0, -6.0))])
    assert choose_sight(inside.steel, inside.pieces).share == 0.0
    result = draw_comparison([inside], tmp_path)
    if result.missing:
        pytest.skip(result.missing)
    assert seen(pixels(result.components[0].files[0]), Work.WELD) > 3000


def test_close_ups_begin_with_the_largest_of_each_work_and_end_somewhere() -> None:
    cuts = [piece("core", Work.CUT, k + 1, 100.0 - k) for k in range(20)]
    small, weld = piece("core", Work.CUT, 21, 0.5), piece("core", Work.WELD, 1, 3.0)
    meshes = [facets((k, 0.0, 0.0), (k + 1.0, 1.0, 1.0)) for k in range(22)]
    picture = compare_picture(core(*cuts, small, weld), facets(LOW, HIGH), meshes)
    assert picture.close == ("weld 1", *(f"cut {k}" for k in range(1, MOST_CLOSE)))
    assert picture.sheets == (picture.close[:2], picture.close[2:])
    twins = [piece("core", Work.CUT, 1, 5.0), piece("core", Work.CUT, 2, 5.0 + 1e-9)]  # the noise of the kernel
    assert compare_picture(core(*twins), facets(LOW, HIGH), meshes[:2]).close == ("cut 1", "cut 2")
    few = compare_picture(core(cuts[0], small), facets(LOW, HIGH), meshes[:2])
    assert few.close == ("cut 1",)  # cut 21 is small against it
    whole = compare_picture(core(cuts[0]), facets(LOW, HIGH), [facets(LOW, HIGH)])
    assert whole.close == ()


def test_empty_mesh_is_left_out_and_a_missing_one_refused() -> None:
    change = core(piece("core", Work.CUT, 1, 1.0), piece("core", Work.CUT, 2, 1.0))
    nothing = PlainFacets(np.zeros((0, 3)), np.zeros((0, 3), dtype=np.int64))
    picture = compare_picture(change, facets(LOW, HIGH), [facets((0.0, 0.0, 0.0), (1.0, 1.0, 1.0)), nothing])
    assert [p.name for p in picture.pieces] == ["cut 1"]
    with pytest.raises(ValueError, match="shorter"):
        compare_picture(change, facets(LOW, HIGH), [nothing])


def test_pictures_survive_the_trip_to_the_painter(tmp_path: Path) -> None:
    pictures = (made(Work.CUT, Work.WELD), made(Work.CUT))
    write_pictures(pictures, tmp_path / "scene")
    for ours, theirs in zip(pictures, read_pictures(tmp_path / "scene"), strict=True):
        assert (ours.key, ours.component, ours.facts, ours.captions, ours.close) == (
            theirs.key,
            theirs.component,
            theirs.facts,
            theirs.captions,
            theirs.close,
        )
        for a, b in zip((ours.steel, *ours.pieces), (theirs.steel, *theirs.pieces), strict=True):
            assert (a.name, a.role) == (b.name, b.role)
            np.testing.assert_array_equal(a.vertices, b.vertices)
            np.testing.assert_array_equal(a.triangles, b.triangles)


def test_machine_that_cannot_draw_gives_no_picture_and_says_why(tmp_path: Path) -> None:
    crash = [sys.executable, "-c", "import os, signal; os.kill(os.getpid(), signal.SIGSEGV)"]
    result = draw_comparison([made(Work.CUT)], tmp_path, command=crash)
    assert result.of(core(piece("core", Work.CUT, 1, 100.0))) == ()
    assert "component_1_sheet_1.png" in result.missing
    assert "cannot draw off screen" in result.missing


def test_too_many_components_are_told(tmp_path: Path) -> None:
    nobody = [sys.executable, "-c", "pass"]
    welded = dataclasses.replace(made(Work.WELD), key="last")
    result = draw_comparison([made(Work.CUT)] * (MOST_DRAWN + 2) + [welded], tmp_path, command=nobody)
    assert result.components[0].key == "last"  # what must be welded is not the one left out
    assert f"only {MOST_DRAWN} of {MOST_DRAWN + 3}" in result.missing
    assert draw_comparison([], tmp_path / "none") == DrawnComparison()
    assert not (tmp_path / "none").exists()


def test_starting_pictures_imports_neither_vtk_nor_the_kernel() -> None:
    code = (
        "import sys, moldgen.output.compare_pictures, moldgen.output.compare_page;"
        "print(sorted({m.partition('.')[0] for m in sys.modules} & {'vtkmodules', 'OCP', 'scipy'}))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
