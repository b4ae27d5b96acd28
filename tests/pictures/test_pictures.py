"""The pictures folder: what must be on every picture, and what happens on a machine that cannot draw."""

from __future__ import annotations

import dataclasses
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from helpers.mesh_bodies import box, cylinder
from helpers.png import pixels

from moldgen.errors import StageError
from moldgen.output import palette
from moldgen.output.pictures import FILES, PictureResult, render_pictures, start_pictures
from moldgen.output.scene import Scene, read_scene, write_scene

PAPER = np.array(palette.PAPER)


@pytest.fixture(scope="module")
def scene() -> Scene:
    bodies = (
        box("part", "part", (-30, -20, 0), (30, 20, 8), (0, 0, 15)),
        box("cavity", "cavity", (-60, -45, 8), (60, 45, 40), (0, 0, 70)),
        box("core", "core", (-60, -45, -30), (60, 45, 0)),
        cylinder("core pin", "core_pin", (-15.0, 0.0), 3.0, (-30.0, 6.0)),
        cylinder("ejector pin 1", "ejector_pin", (15.0, 0.0), 2.5, (-60.0, 0.0), (0, 0, 15)),
        cylinder("ejector pin 2", "ejector_pin", (20.0, 12.0), 2.5, (-60.0, 0.0), (0, 0, 15)),
    )
    line = np.array([[-30, -20, 8], [30, -20, 8], [30, 20, 8], [-30, 20, 8], [-30, -20, 8]], dtype=float)
    # Faces 0 to 3 are the walls, 4 the bottom, 5 the top.
    return Scene("test lid", "ABS", "+z", bodies, (line,), (30.0, 0.0, 4.0), {0: 1, 1: 1, 2: 1, 3: 1, 4: -1, 5: 1})


@pytest.fixture(scope="module")
def drawn(scene: Scene, tmp_path_factory: pytest.TempPathFactory) -> PictureResult:
    result = render_pictures(scene, tmp_path_factory.mktemp("pictures"))
    if "cannot draw" in result.missing or "is missing" in result.missing:
        pytest.skip(result.missing)
    return result


def share_of(picture: np.ndarray, colour: palette.Rgb) -> float:
    """Share of the pixels that have exactly this colour."""
    return float((picture == np.array(colour)).all(axis=2).mean())


def test_all_pictures_are_written_at_full_size(drawn: PictureResult) -> None:
    assert drawn.missing == ""
    assert [path.name for path in drawn.files] == list(FILES)
    for path in drawn.files:
        assert pixels(path).shape == (1000, 1400, 3)
    assert sorted(p.name for p in drawn.files[0].parent.iterdir()) == sorted(FILES)  # nothing half-written beside them


@pytest.mark.parametrize(
    ("name", "roles"),
    [
        ("closed.png", ("part", "cavity", "core", "core_pin", "ejector_pin")),
        ("open.png", ("part", "cavity", "core", "core_pin", "ejector_pin")),
        ("section.png", ("part", "cavity", "core", "core_pin", "ejector_pin")),
    ],
)
def test_legend_shows_every_role_in_its_own_colour(drawn: PictureResult, name: str, roles: tuple[str, ...]) -> None:
    legend = pixels(drawn.files[FILES.index(name)])[95:420, 20:56]
    for role in roles:
        swatch = (legend == np.array(palette.ROLES[role].colour)).all(axis=2)
        assert swatch.sum() >= 300, role  # 24 x 16 px, less its border
    assert share_of(legend, palette.ROLES["sprue"].colour) == 0.0  # and no role that the scene lacks


def test_section_fills_each_component_with_its_colour(drawn: PictureResult) -> None:
    field = pixels(drawn.files[3])[88:940, 262:]
    for role in ("part", "cavity", "core", "core_pin", "ejector_pin"):
        assert share_of(field, palette.ROLES[role].colour) > 0.002, role
    # Plastic 60 x 8 less the 6 x 6 of the pin, against the core half 120 x 30 less the pins' bores, which are not cut
    # here: pins lie over the block. Hatching takes some of the steel, outlines some of both.
    ratio = share_of(field, palette.ROLES["part"].colour) / share_of(field, palette.ROLES["core"].colour)
    assert 0.10 < ratio < 0.19  # 444 / 3270 = 0.136


def test_part_is_coloured_by_the_half_that_forms_each_face(drawn: PictureResult) -> None:
    picture = pixels(drawn.files[0]).astype(int)
    field = picture[88:940, 320:]
    hue_blue = (field[..., 2] - field[..., 0] > 40) & (field[..., 2] > field[..., 1] + 15)
    hue_mint = (field[..., 1] - field[..., 0] > 40) & (field[..., 1] > field[..., 2] + 10)
    assert hue_blue.mean() > 0.02
    assert hue_mint.mean() > 0.02
    red = np.abs(field - np.array(palette.PARTING_LINE.colour)).max(axis=2) < 12
    assert red.sum() > 1500  # a line 4 px wide round a part some hundreds of px long


def test_every_picture_has_title_scale_bar_and_caution(drawn: PictureResult) -> None:
    for path in drawn.files:
        picture = pixels(path)
        inked = (np.abs(picture.astype(int) - PAPER).max(axis=2) > 100).astype(int)
        assert inked[15:50, 20:400].sum() > 300, path.name
        assert inked[960:990, 20:400].sum() > 150, path.name
        assert inked[955:990, 1000:1390].sum() > 150, path.name


def test_two_runs_give_identical_bytes(scene: Scene, drawn: PictureResult, tmp_path: Path) -> None:
    again = render_pictures(scene, tmp_path)
    for first, second in zip(drawn.files, again.files, strict=True):
        assert first.read_bytes() == second.read_bytes(), first.name


def test_scene_survives_the_trip_to_the_child(scene: Scene, tmp_path: Path) -> None:
    write_scene(scene, tmp_path / "scene.npz")
    read = read_scene(tmp_path / "scene.npz")
    assert (read.name, read.resin, read.pull, read.gate) == (scene.name, scene.resin, scene.pull, scene.gate)
    assert read.face_sides == dict(scene.face_sides)
    for ours, theirs in zip(scene.bodies, read.bodies, strict=True):
        assert (ours.name, ours.role) == (theirs.name, theirs.role)
        assert tuple(ours.offset_open) == tuple(theirs.offset_open)
        np.testing.assert_array_equal(ours.vertices, theirs.vertices)
        np.testing.assert_array_equal(ours.triangles, theirs.triangles)
        for a, b in zip(ours.feature_edges, theirs.feature_edges, strict=True):
            np.testing.assert_array_equal(a, b)


CRASH = [sys.executable, "-c", "import os, signal; os.kill(os.getpid(), signal.SIGSEGV)"]
NO_GL = [
    sys.executable,
    "-c",
    "raise ImportError('libGL.so.1: cannot open shared object file: No such file or directory')",
]
NO_VTK = [sys.executable, "-c", "import vtkmodules_that_is_not_there"]
LATE_CRASH = [sys.executable, "-c", "print('window ready'); print('wrote part.png'); raise SystemExit('out of paint')"]


@pytest.mark.parametrize(
    ("painter", "words"),
    [
        (CRASH, ("cannot draw off screen", "signal 11", "apt install", "libegl1")),
        (NO_GL, ("libGL.so.1", "apt install libgl1")),
        (NO_VTK, ("vtkmodules_that_is_not_there", "pip install vtk")),
    ],
)
def test_machine_that_cannot_draw_gets_advice(scene: Scene, tmp_path: Path, painter: list[str], words) -> None:
    result = render_pictures(scene, tmp_path / "pictures", command=painter)
    assert result.files == ()
    for word in (*FILES, *words):
        assert word in result.missing


def test_painter_that_dies_half_way_keeps_what_it_wrote(scene: Scene, tmp_path: Path) -> None:
    result = render_pictures(scene, tmp_path, command=LATE_CRASH)
    assert [p.name for p in result.files] == ["part.png"]
    assert "not drawn: closed.png, open.png, section.png" in result.missing
    assert "out of paint" in result.missing


def test_hanging_painter_is_stopped(scene: Scene, tmp_path: Path) -> None:
    job = start_pictures(scene, tmp_path, command=[sys.executable, "-c", "import time; time.sleep(600)"])
    result = job.finish(timeout_s=0.5)
    assert result.files == ()
    assert "longer than 0.5 s" in result.missing


def test_scene_without_a_part_is_our_bug(scene: Scene, tmp_path: Path) -> None:
    with pytest.raises(StageError, match="no body with the role 'part'"):
        start_pictures(dataclasses.replace(scene, bodies=scene.bodies[1:]), tmp_path)


def test_starting_pictures_imports_no_vtk() -> None:
    code = "import sys, moldgen.output.pictures; print(any(m.startswith('vtkmodules') for m in sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
