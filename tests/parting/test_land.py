"""The land around a parting line: its width and lean by closed forms, and each reason for which there is none."""

import math

import numpy as np
import pytest
from helpers import solids
from helpers.molding import mold

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.build import backward
from moldgen.kernel.land import level_land, level_lid
from moldgen.kernel.land_plan import self_crossing
from moldgen.kernel.loops import boundary_loops
from moldgen.kernel.measure import area, is_valid
from moldgen.kernel.mesh import surface_mesh, tessellate
from moldgen.kernel.patches import loop_points
from moldgen.kernel.polygon import signed_area
from moldgen.kernel.shut_off import least_angle

CORNERS = np.array([-60.0, -60.0, -40.0]), np.array([60.0, 60.0, 40.0])


def ccw(loop):
    return loop if signed_area(loop_points(loop, 8)[:, :2]) > 0 else [backward(e) for e in reversed(loop)]


def rim_of(solid):
    """The outer boundary of the face that looks up most steeply."""
    body = Body(solid)
    lift = [float(body.mesh.normals[body.mesh.face == f][:, 2].mean()) for f in range(len(body.faces))]
    (loop,) = boundary_loops(body, np.arange(len(body.faces)) == int(np.argmax(lift)))
    return ccw(loop)


def gable(width=20.0, rise=5.0):
    """A prism under one slope: its upper rim rises along x from 0 to `rise`."""
    return solids.extruded([(0, 0, -9), (40, 0, -9), (40, 0, rise), (0, 0, 0)], (0, width, 0))


def distance_to_line(points, loop):
    line = loop_points(loop, 200)[:, :2]
    return np.linalg.norm(points[:, None] - line[None], axis=2).min(axis=1)


@pytest.mark.parametrize("width", [5.0, 8.0])
def test_land_and_wall_are_as_wide_and_as_steep_as_asked(width):
    loop = rim_of(gable())
    land = level_land(loop, 0.0, CORNERS, width, 15.0)
    assert land.run == pytest.approx(5.0 * math.tan(math.radians(15.0)))
    assert all(is_valid(f) for f in land.faces)
    for face in land.faces:
        tessellate(face)
    mesh = surface_mesh(list(land.faces))
    flat = np.abs(mesh.vertices[:, 2]) < 1e-9
    away = distance_to_line(mesh.vertices[:, :2], loop)
    assert (away[~flat] < math.sqrt(2) * width + 1e-6).all()  # mitred at right angles, nothing further is off the plane
    # at the high end the land is a level band 20 mm long between two mitres
    high = [f for f in land.faces if np.ptp(surface_mesh([f]).vertices[:, 2]) < 1e-9 and area(f) < 1000.0]
    assert area(high[0]) == pytest.approx(width * (20.0 + width))
    # the wall is steepest below the high end
    assert least_angle(land.faces).deg == pytest.approx(15.0, abs=1.0)


def test_the_whole_plan_is_covered_once():
    loop = rim_of(gable())
    land = level_land(loop, 0.0, CORNERS, 8.0, 15.0)
    for face in land.faces:
        tessellate(face)
    corners = surface_mesh(list(land.faces)).corners[:, :, :2]
    one, two = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    shadow = 0.5 * np.abs(one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]).sum()
    assert shadow == pytest.approx(120.0 * 120.0 - 40.0 * 20.0, rel=1e-9)


def test_a_lid_closes_a_slanted_hole_and_leans():
    loop = [backward(e) for e in reversed(rim_of(gable()))]
    faces = level_lid(loop, 2.5, 1.0, 15.0)
    assert all(is_valid(f) for f in faces)
    assert least_angle(faces).deg == pytest.approx(15.0, abs=1.0)
    with pytest.raises(KernelError, match=r"folds|meets itself|doubles back"):
        level_lid(loop, 2.5, 12.0, 15.0)  # the hole is 20 mm wide


def test_a_block_too_small_for_the_land_is_named_with_its_room():
    small = np.array([-9.0, -9.0, -40.0]), np.array([49.0, 29.0, 40.0])
    with pytest.raises(KernelError, match=r"8 mm wide, its wall and 2 mm of flat plane take 11\.3 mm.* has 9\.0 mm"):
        level_land(rim_of(gable()), 0.0, small, 8.0, 15.0)


def test_a_slot_too_narrow_for_a_land_of_full_width_is_bridged():
    # the slot is 3 mm wide: the lands of its sides would lie over each other
    sheet = solids.extruded([(0, 0, -3), (40, 0, 2), (40, 0, 5), (0, 0, 0)], (0, 20, 0))
    slotted = solids.cut(sheet, solids.box((15, -1, -10), (18, 12, 9)))
    made = mold(slotted, margin=20.0).parted
    assert made.check.proved
    assert made.sheet.outer.land_mm == 8.0


@pytest.mark.parametrize(
    ("points", "crosses"),
    [
        ([(0, 0), (10, 0), (10, 10), (0, 10)], False),
        ([(0, 0), (10, 10), (10, 0), (0, 10)], True),
        ([(0, 0), (10, 0), (5, 0), (5, 5)], False),  # along itself, but not across
    ],
)
def test_a_polygon_that_crosses_itself_is_found(points, crosses):
    assert (self_crossing(np.array(points, float)) is not None) == crosses


def test_a_crossing_far_along_a_long_line_is_found():
    turn = np.linspace(0.0, 2.0 * np.pi, 2000, endpoint=False)
    ring = np.column_stack([np.cos(turn), np.sin(turn)]) * 50.0
    assert self_crossing(ring) is None
    ring[[1500, 1501]] = ring[[1501, 1500]]
    assert np.linalg.norm(self_crossing(ring) - ring[1500]) < 1.0


@pytest.mark.parametrize("degrees", [0.0, 3.0, 30.0, 90.0])
def test_the_angle_of_a_face_is_the_one_to_the_pull(degrees):
    slab = solids.extruded([(0, 0, 0), (10, 0, 0), (10, 10, 0), (0, 10, 0)], (0, 0, 1))
    turned = Body(solids.turned(slab, 90.0 - degrees, about=(1, 0, 0)))
    steepness = [least_angle([f]).deg for f in turned.faces]
    assert steepness.count(pytest.approx(degrees, abs=1e-4)) >= 2
    assert least_angle(turned.faces).deg == pytest.approx(min(steepness))
    upright = sum(a for a, s in zip(turned.face_areas, steepness, strict=True) if s < 1.0)
    assert least_angle(turned.faces).upright_mm2 == pytest.approx(upright)
