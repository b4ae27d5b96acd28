"""Pictures of tools with slides and lifters: where they stand, what they form, and the cut along their way."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest
from helpers.mesh_bodies import box, cylinder
from helpers.png import pixels

from moldgen.kernel.mesh import SurfaceMesh
from moldgen.model.halves import Halves, SideSteel
from moldgen.model.motion import Step
from moldgen.model.side_action import Front, SideKind
from moldgen.output import palette
from moldgen.output.formed_by import formed_by, inside
from moldgen.output.pictures import FILES, SIDE_FILES, render_pictures
from moldgen.output.scene import BY_SLIDE, Scene
from moldgen.output.tool_scene import half_way, open_place

OPENING = (
    Step("the mold opens", (("cavity half", (0.0, 0.0, 2.0)),)),
    Step("angled pins move", (("cavity half", (0.0, 0.0, 20.0)), ("slide 1", (5.0, 0.0, 0.0)))),
    Step("the mold opens", (("cavity half", (0.0, 0.0, 78.0)),)),
    Step("the ejectors push", (("ejector", (0.0, 0.0, 10.0)), ("lifter 1", (-1.0, 0.0, 10.0)))),
)


def test_half_way_is_the_middle_of_the_opening_that_moves_slides() -> None:
    assert half_way(OPENING) == (1.0, 0.5, 0.0, 0.0)


def test_half_way_of_two_slides_that_start_apart() -> None:
    more = Step("the mold opens, angled pins", (("cavity half", (0.0, 0.0, 10.0)), ("slide 2", (0.0, 3.0, 0.0))))
    assert half_way((OPENING[0], more, *OPENING[1:])) == (1.0, 1.0, 0.25, 0.0, 0.0)  # 2 + 15 of 30


def test_half_way_of_cylinders_and_of_lifters() -> None:
    drawn = Step("the cylinder draws", (("slide 1", (30.0, 0.0, 0.0)),))
    assert half_way((drawn, OPENING[0])) == (0.5, 0.0)
    assert half_way((OPENING[0], OPENING[3])) == (1.0, 0.5)
    assert half_way(OPENING[:1]) == (0.0,)


def test_a_slide_on_the_cavity_half_is_drawn_with_it() -> None:
    steps = (Step("the mold opens", (("cavity half", (0.0, 0.0, 100.0)), ("slide 1", (4.0, 0.0, 100.0)))),)
    lift = {"cavity half": 60.0}
    assert open_place(steps, "slide 1", lift) == (4.0, 0.0, 60.0)
    assert open_place(OPENING, "slide 1", lift) == (5.0, 0.0, 0.0)
    assert open_place(OPENING, "lifter 1", lift) == (-1.0, 0.0, 10.0)


def test_inside_leaves_out_holes() -> None:
    square = np.array([[0, 0], [4, 0], [4, 4], [0, 4]], dtype=float)
    hole = np.array([[1, 1], [1, 2], [2, 2], [2, 1]], dtype=float)
    points = np.array([[0.5, 0.5], [1.5, 1.5], [5.0, 1.5], [-1.0, 1.5], [3.0, 1.5]])
    assert inside((square, hole), points).tolist() == [True, False, False, False, True]


def test_a_front_forms_what_it_borders_on_to_a_fraction_of_a_millimetre() -> None:
    body = box("part", "part", (0, 0, 0), (10, 20, 10))
    triangles = body.triangles
    corners = body.vertices[triangles]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    mesh = SurfaceMesh(body.vertices, triangles, body.face_id, normal, np.zeros((len(triangles), 3)))
    # across +x: y to the side, z up; a window of 4 x 4 mm in the side x = 10
    window = np.array([[8, 3], [12, 3], [12, 7], [8, 7]], dtype=float)
    front = Front(SideKind.SLIDE, (1.0, 0.0, 0.0), (1.0, 0.0, 0.0), (window,), 10.0, 30.0, 10.0, 0.0, (), "planted")
    filled = dataclasses.make_dataclass("Filled", ["mesh"])(mesh)
    top = normal[[int(np.argmax(body.face_id == f)) for f in range(6)], 2] > 0
    halves = Halves(None, None, filled, top, 0.0, np.zeros(3), np.ones(3), (), (SideSteel("slide 1", front, None),))
    made, by = formed_by(mesh, halves)
    area = np.linalg.norm(np.cross(*(made.corners[:, k] - made.corners[:, 0] for k in (1, 2))), axis=1) / 2.0
    assert area.sum() == pytest.approx(1000.0)  # nothing lost: 2 (10 x 20 + 10 x 10 + 20 x 10)
    assert area[by == BY_SLIDE].sum() == pytest.approx(16.0, rel=0.1)
    assert area[by == 1].sum() == pytest.approx(200.0)  # the top
    assert (np.abs(made.corners[by == BY_SLIDE][..., 0] - 10.0) < 1e-9).all()


@pytest.fixture(scope="module")
def scene() -> Scene:
    slide = box("slide 1", "slide", (30, -8, -6), (60, 8, 14), (12, 0, 0))
    pin = cylinder("angled pin of slide 1", "angled_pin", (45.0, 0.0), 4.0, (0.0, 40.0), (0, 0, 70))
    bodies = (
        box("part", "part", (-30, -20, 0), (30, 20, 8), (0, 0, 15)),
        box("cavity", "cavity", (-60, -45, 8), (60, 45, 40), (0, 0, 70)),
        box("core", "core", (-60, -45, -30), (60, 45, 0)),
        dataclasses.replace(slide, offset_half=(6.0, 0.0, 0.0)),
        dataclasses.replace(pin, offset_half=(0.0, 0.0, 20.0)),
        box("lifter 1", "lifter", (-20, -3, -30), (-16, 3, 0), (2, 0, 15)),
    )
    return Scene("test door", "ABS", "+z", bodies, (), None, {0: 1, 1: 1, 2: BY_SLIDE, 3: 1, 4: -1, 5: 1})


@pytest.fixture(scope="module")
def drawn(scene: Scene, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    result = render_pictures(scene, tmp_path_factory.mktemp("pictures"))
    if "cannot draw" in result.missing or "is missing" in result.missing:
        pytest.skip(result.missing)
    assert result.missing == ""
    return {path.name: path for path in result.files}


def test_side_actions_get_two_pictures_more(drawn: dict[str, Path]) -> None:
    assert list(drawn) == [*FILES, *SIDE_FILES]


@pytest.mark.parametrize("name", ["closed.png", "open.png", "half_open.png", "section_side.png"])
def test_the_legend_names_slide_lifter_and_angled_pin(drawn: dict[str, Path], name: str) -> None:
    legend = pixels(drawn[name])[95:420, 20:56]
    for role in ("slide", "lifter", "angled_pin"):
        assert (legend == np.array(palette.ROLES[role].colour)).all(axis=2).sum() >= 300, role


def test_the_part_shows_what_a_slide_forms(drawn: dict[str, Path]) -> None:
    legend = pixels(drawn["part.png"])[95:420, 20:56]
    assert (legend == np.array(palette.SLIDE_SIDE.colour)).all(axis=2).sum() >= 300


def test_the_side_section_cuts_slide_and_angled_pin(drawn: dict[str, Path]) -> None:
    field = pixels(drawn["section_side.png"])[88:940, 262:]
    for role in ("slide", "angled_pin", "part"):
        assert (field == np.array(palette.ROLES[role].colour)).all(axis=2).mean() > 0.002, role


@pytest.mark.parametrize("name", ["open.png", "half_open.png"])
def test_a_slide_is_drawn_where_the_opening_leaves_it(
    scene: Scene, drawn: dict[str, Path], name: str, tmp_path: Path
) -> None:
    still = [
        dataclasses.replace(b, offset_open=(0, 0, 0), offset_half=(0, 0, 0)) if b.role == "slide" else b
        for b in scene.bodies
    ]
    planted = render_pictures(dataclasses.replace(scene, bodies=tuple(still)), tmp_path)
    other = next(path for path in planted.files if path.name == name)
    assert (pixels(drawn[name]) != pixels(other)).any(axis=2).sum() > 300
