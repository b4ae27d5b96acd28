"""Issue 3: 0 wrong "proved". Tools judged again from tool.step by code that shares nothing with moldgen's proofs."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import cadquery as cq
import numpy as np
import pytest
from helpers.command import moldgen
from helpers.outputs import manifest
from helpers.small_specs import NOTCHED, spec
from manifold3d import Manifold, OpType
from second_opinion.judge import Opinion, judge
from second_opinion.reading import Placed, Product, read_tool
from second_opinion.solids import Way, arrays, loose, shrunk, sweep_overlap, thickest, trailing_prisms
from second_opinion.writing import write_tool

from moldgen.flow.prove import prove_folder
from moldgen.flow.tell import silent

pytestmark = pytest.mark.slow

RELEASE = "parting: {undercuts: release}\n"


@pytest.fixture(scope="module")
def notched(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The tool of a block with a notch in its side: one slide."""
    start = tmp_path_factory.mktemp("notched")
    done = moldgen(
        "build", spec(start, NOTCHED, RELEASE), "--no-pictures", "--quiet", "--output", start / "tool", folder=start
    )
    assert done.returncode == 0, done.stdout + done.stderr
    return start / "tool"


@pytest.fixture
def both(notched: Path, tmp_path: Path) -> Callable[[Callable[[Path], object]], tuple[list[str], Opinion]]:
    """Change a copy of the tool, and return the proofs of moldgen that fail and the second opinion."""

    def ask(change: Callable[[Path], object]) -> tuple[list[str], Opinion]:
        folder = tmp_path / "tool"
        shutil.copytree(notched, folder)
        change(folder)
        proofs = prove_folder(folder, silent()).proofs
        assert proofs
        return [p.name for p in proofs if not p.passed], judge(folder)

    return ask


def steps(change: Callable[[list[dict[str, Any]]], object]) -> Callable[[Path], None]:
    """Return a change of the steps in the manifest."""

    def apply(folder: Path) -> None:
        record = manifest(folder)
        change(record["claims"]["steps"])
        (folder / "manifest.json").write_text(json.dumps(record), encoding="utf-8")

    return apply


def slide_goes(scale: float = 1.0, turn: bool = False) -> Callable[[Path], None]:
    """Return a change that makes the slide go another way: farther or less far, or a quarter turn aside."""

    def change(all_steps: list[dict[str, Any]]) -> None:
        for step in all_steps:
            for move in step["moves"]:
                if move[0] == "slide 1":
                    x, y, z = (scale * v for v in move[1])
                    move[1] = [-y, x, z] if turn else [x, y, z]

    return steps(change)


def cavity_drifts(all_steps: list[dict[str, Any]]) -> None:
    """Let the cavity half open askew."""
    for step in all_steps:
        for move in step["moves"]:
            if move[0] == "cavity half":
                move[1][1] += 0.2 * move[1][2]


def component(name: str, change: Callable[[Placed], Placed]) -> Callable[[Path], None]:
    """Return a change of one component of tool.step."""

    def apply(folder: Path) -> None:
        placed = read_tool(folder / "tool.step")
        assert name in [body.name for body in placed]
        write_tool(folder / "tool.step", [change(b) if b.name == name else b for b in placed])

    return apply


def shifted(x: float, y: float, z: float) -> Callable[[Placed], Placed]:
    """Return a change that moves a component."""
    return lambda body: replace(body, at=body.at + np.array([[0, 0, 0, x], [0, 0, 0, y], [0, 0, 0, z]]))


def longer_nose(body: Placed) -> Placed:
    """Give the slide a nose that reaches 0.4 mm deeper than the notch (x = 11.9 mm, y from -3 to 7, z from 6 to 10)."""
    slide = cq.Workplane(cq.Shape.cast(body.product.shape))
    nose = cq.Workplane().box(2.4, 8.0, 2.0).translate((12.7, 2.0, 8.04))
    return replace(body, product=Product(body.product.name, slide.union(nose).val().wrapped))


def test_a_tool_with_a_slide_is_right_to_both(both) -> None:
    """Its file is read and written again, so what the faults below show is the fault, not the writing."""
    failed, second = both(component("slide 1", lambda body: body))
    assert failed == []
    assert second.wrong() == []
    assert second.passed
    assert len(second.motion) > 20
    (held,) = second.needed
    assert held.depth == pytest.approx(1.5, abs=0.3)  # 2V/A of the notch above the slide, 3.1 x 10 x 6 mm: 2.1 at most


@pytest.mark.parametrize(
    ("change", "words"),
    [
        pytest.param(slide_goes(0.3), "slide 1 past part", id="slide travels too little"),
        pytest.param(slide_goes(0.0), "slide 1 past part", id="slide left in place"),
        pytest.param(slide_goes(turn=True), "slide 1 past part", id="slide goes aside"),
        pytest.param(steps(cavity_drifts), "part past cavity half", id="cavity half opens askew"),
        pytest.param(component("slide 1", shifted(-0.1, 0, 0)), "slide 1 at rest", id="slide set in too far"),
        pytest.param(component("slide 1", longer_nose), "slide 1 at rest", id="slide too long"),
    ],
)
def test_a_planted_fault_is_wrong_to_both(both, change: Callable[[Path], None], words: str) -> None:
    failed, second = both(change)
    assert failed, "moldgen did not find it"
    assert not second.passed
    assert any(words in line for line in second.wrong()), second.wrong()


@pytest.mark.sweep
def test_a_straight_demo_is_right_to_both(demo) -> None:
    built = demo("thumb-knob")
    assert built.done.returncode == 0, built.done.stderr
    second = judge(built.folder)
    assert second.wrong() == []
    assert second.passed
    assert second.needed == []


def test_a_missing_component_and_steps_that_move_nothing_are_told(notched: Path, tmp_path: Path) -> None:
    folder = tmp_path / "tool"
    shutil.copytree(notched, folder)
    placed = read_tool(folder / "tool.step")
    write_tool(folder / "tool.step", [b for b in placed if b.name != "slide 1"])
    steps(lambda all_steps: all_steps[0]["moves"].append(["slide 7", [1.0, 0.0, 0.0]]))(folder)
    second = judge(folder)
    assert not second.passed
    assert "slide 1: 0 in tool.step, 1 in the manifest" in second.faults
    assert "the steps move slide 7, which is nothing" in second.faults


@pytest.mark.parametrize("way", [(10.0, 0.0, 0.0), (3.0, 4.0, 7.0), (0.0, 0.0, 2.0)])
def test_the_sweep_is_both_ends_and_the_prisms_over_all_triangles(way: tuple[float, float, float]) -> None:
    """The definition of a swept mesh, against the trailing triangles and where it ends.

    Prisms, not `Manifold.hull_points`: its hulls of needles are short of the prism by up to 7e-5 of the whole here.
    """
    body = Manifold.sphere(5.0, 32) - Manifold.cylinder(20.0, 2.0, 2.0, 24).translate((0.0, 0.0, -10.0))
    line = Way(np.array(way))
    turned = line.turned(body)
    up = np.array([0.0, 0.0, line.length])
    ends = [turned, turned.translate(tuple(up))]
    points, triangles = arrays(turned)
    corners = points[triangles]
    shadow = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])[:, 2]
    corners[shadow > 0.0] = corners[shadow > 0.0][:, ::-1]
    every = [loose(np.concatenate([c, c + up])[None]) for c in corners[np.abs(shadow) > 1e-12]]
    prisms = trailing_prisms(turned, line.length, np.full(3, -100.0), np.full(3, 100.0))
    assert 0 < len(prisms) < len(every)
    swept = Manifold.batch_boolean([ends[1], *(loose(p[None]) for p in prisms)], OpType.Add)
    assert swept.volume() == pytest.approx(Manifold.batch_boolean([*every, *ends], OpType.Add).volume(), rel=1e-9)


@pytest.mark.parametrize("thickness", [0.03, 0.1])
def test_nothing_is_jumped_over_however_fast_it_is_passed(thickness: float) -> None:
    block, sheet = Manifold.cube((4, 4, 4)), Manifold.cube((thickness, 10, 10)).translate((50, -3, -3))
    depth, points = sweep_overlap(block, np.array([100.0, 0.0, 0.0]), [sheet])
    assert depth == pytest.approx(1 / (1 / thickness + 2 / 4))  # 2V/A of thickness x 4 x 4 mm
    assert ((points > [50, 0, 0]) & (points < [50 + thickness, 4, 4])).all(axis=1).any()
    assert sweep_overlap(block, np.array([45.9, 0.0, 0.0]), [sheet])[0] == 0.0
    assert sweep_overlap(block, np.array([100.0, 0.0, 100.0]), [sheet])[0] == 0.0


def test_shrinking_moves_every_plane_by_as_much() -> None:
    box = shrunk(Manifold.cube((4, 5, 6)), 0.015)
    assert np.round(box.bounding_box(), 4).tolist() == [0.015, 0.015, 0.015, 3.985, 4.985, 5.985]
    ball = Manifold.sphere(5.0, 64)
    assert shrunk(ball, 0.1).volume() == pytest.approx(ball.volume() * (4.9 / 5.0) ** 3, rel=1e-3)
    assert thickest(ball ^ shrunk(Manifold.cube((9, 9, 9)).translate((5.01, 0, 0))))[0] == 0.0
