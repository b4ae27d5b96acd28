"""Level sections against closed forms: areas, orientation, and the grip of a tight band."""

import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.layout.sections import cut_sections

from .shapes import box, cup, plate, view_of


def sections(shape):
    view = view_of(shape)
    return cut_sections(view, np.ones(len(view.mesh.triangles), dtype=bool))


def test_rings_have_the_areas_of_the_part():
    cut = sections(cup())
    first = cut.areas[cut.loop_layers == 0]
    assert sorted(first) == pytest.approx([-math.pi * 20**2, math.pi * 22**2], rel=3e-3)


def test_every_loop_closes():
    cut = sections(box())
    for loop in range(cut.loops):
        own = cut.loop == loop
        assert (cut.end[own] - cut.start[own]).sum(axis=0) == pytest.approx([0.0, 0.0], abs=1e-9)


ELL = plate(30, 30, 5).cut(cq.Workplane().center(10, 10).rect(20, 20).extrude(5))


@pytest.mark.parametrize(
    ("shape", "grip"),
    [(cup(), 2 * math.pi), (box(), 8.0), (ELL, 8.0)],
    ids=["circle", "rectangle", "L"],
)
def test_grip_is_that_of_the_published_formulas(shape, grip):
    # 2 pi for a sleeve and 8 for a box: Menges' two forms; an inward corner takes back what a sixth corner adds
    cut = sections(shape)
    assert cut.grip == pytest.approx(np.full(cut.loops, grip), rel=2e-3)


def test_inside_agrees_with_the_circle():
    cut = sections(cup())
    points = np.array([[0.0, 0.0], [19.5, 0.0], [21.0, 0.0], [0.0, 23.0]])
    held = cut.inside(points, 0)
    hole, ring = (
        np.flatnonzero((cut.loop_layers == 0) & (cut.areas < 0))[0],
        np.flatnonzero((cut.loop_layers == 0) & (cut.areas > 0))[0],
    )
    assert held[:, hole].tolist() == [True, True, False, False]
    assert held[:, ring].tolist() == [True, True, True, False]
