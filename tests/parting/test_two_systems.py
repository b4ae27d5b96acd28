"""One shell as different CAD systems would write it has one parting line, to 0.01 mm."""

from __future__ import annotations

import math

import numpy as np
import pytest
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import BRepBuilderAPI_NurbsConvert, BRepBuilderAPI_Sewing, BRepBuilderAPI_Transform
from OCP.BRepFilletAPI import BRepFilletAPI_MakeFillet
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox, BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf
from OCP.ShapeUpgrade import ShapeUpgrade_ShapeDivideAngle, ShapeUpgrade_ShapeDivideArea, ShapeUpgrade_ShapeDivideClosed

from moldgen.kernel.patches import loop_points
from moldgen.kernel.step_read import read_step
from moldgen.kernel.topology import compound_of, edge_points, edges_of, faces_of, only_solid
from tests.helpers.molding import mold
from tests.kernel_io.test_step_read import raw_solid, write_raw

SAME_LINE = 0.01
"""mm: what issue 3 asks for."""


def tub():
    """A box 60 x 40 x 25 with rounded corners and top, hollow from below, with a hole of radius 5 in its roof."""
    box = BRepPrimAPI_MakeBox(60, 40, 25).Solid()
    fillet = BRepFilletAPI_MakeFillet(box)
    for edge in edges_of(box):
        ends = edge_points(edge, 2)
        if not np.allclose(ends[:, 2], 0.0):
            fillet.Add(6.0 if ends[0, 2] != ends[1, 2] else 4.0, edge)
    inside = BRepPrimAPI_MakeBox(gp_Pnt(8, 8, -1), 44, 24, 21).Solid()
    drill = BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(30, 20, 10), gp_Dir(0, 0, 1)), 5, 20).Solid()
    return only_solid(BRepAlgoAPI_Cut(BRepAlgoAPI_Cut(fillet.Shape(), inside).Shape(), drill).Shape())


def _result(divider):
    divider.Perform()
    return divider.Result()


def _small_patches(solid):
    divider = ShapeUpgrade_ShapeDivideArea(solid)
    divider.MaxArea = 300.0
    return _result(divider)


def _turned(solid):
    """The same outside half a turn on: seams and first edges lie on the other side."""
    turn = gp_Trsf()
    turn.SetRotation(gp_Ax1(gp_Pnt(30, 20, 0), gp_Dir(0, 0, 1)), math.pi)
    return BRepBuilderAPI_Transform(solid, turn, True).Shape()


def _half_splines(solid):
    """Every second face as a spline, the others as they were: what two programs left of one part."""
    faces = faces_of(solid)
    return _sewn([BRepBuilderAPI_NurbsConvert(f).Shape() if i % 2 else f for i, f in enumerate(faces)])


def _sewn(faces):
    sewing = BRepBuilderAPI_Sewing(1e-6)
    sewing.Add(compound_of(faces))
    sewing.Perform()
    return raw_solid(sewing.SewedShape())


WRITINGS = [
    pytest.param(lambda s: _result(ShapeUpgrade_ShapeDivideAngle(math.pi / 4, s)), "MM", 43, id="arcs of 45 deg"),
    pytest.param(lambda s: _result(ShapeUpgrade_ShapeDivideClosed(s)), "MM", 25, id="closed faces cut open"),
    pytest.param(_small_patches, "MM", 81, id="small patches"),
    pytest.param(lambda s: s, "INCH", 24, id="inches"),
    pytest.param(_turned, "MM", 24, id="other seams"),
    pytest.param(lambda s: BRepBuilderAPI_NurbsConvert(s).Shape(), "MM", 24, id="all splines"),
    pytest.param(_half_splines, "MM", 24, id="every second face a spline"),
]


POINTS_OF_AN_EDGE = 400
"""A rim may be one circle of radius 5: its chords sag by 0.0002 mm then."""


def parting_lines(solid) -> list[np.ndarray]:
    """Return the outline and the rim of the hole as closed polylines, the longer one first."""
    loops = mold(solid).parted.loops
    closed = [np.vstack([p, p[:1]]) for p in (loop_points(loop, POINTS_OF_AN_EDGE) for loop in loops)]
    return sorted(closed, key=lambda p: -float(np.linalg.norm(np.diff(p, axis=0), axis=1).sum()))


def to_line(points: np.ndarray, line: np.ndarray) -> float:
    """Return the largest distance of points from a polyline [mm]."""
    start, along = line[:-1], np.diff(line, axis=0)
    length = np.maximum((along**2).sum(axis=1), 1e-18)
    offset = points[:, None] - start
    t = np.clip((offset * along).sum(axis=2) / length, 0.0, 1.0)
    return float(np.linalg.norm(offset - t[..., None] * along, axis=2).min(axis=1).max())


@pytest.fixture(scope="module")
def reference(tmp_path_factory):
    path = write_raw(tub(), tmp_path_factory.mktemp("reference") / "tub.step")
    return parting_lines(read_step(path).solid)


def test_the_measure_sees_a_line_that_is_off(reference):
    assert to_line(reference[0] + (0.0, 0.0, 0.02), reference[0]) == pytest.approx(0.02)


@pytest.mark.parametrize(("rewritten", "unit", "faces"), WRITINGS)
def test_the_parting_line_is_the_same(tmp_path, reference, rewritten, unit, faces):
    solid = read_step(write_raw(rewritten(tub()), tmp_path / "tub.step", unit=unit)).solid
    assert len(faces_of(solid)) == faces
    lines = parting_lines(solid)
    assert len(lines) == len(reference) == 2
    for line, other in zip(lines, reference, strict=True):
        assert max(to_line(line, other), to_line(other, line)) <= SAME_LINE
