"""The search of the pull over the sphere: it turns with the part, finds oblique pulls, and foresees side actions."""

import math

import numpy as np
import pytest
from helpers import solids
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakeEdge,
    BRepBuilderAPI_MakePolygon,
    BRepBuilderAPI_MakeWire,
    BRepBuilderAPI_Transform,
)
from OCP.BRepOffsetAPI import BRepOffsetAPI_ThruSections
from OCP.BRepPrimAPI import BRepPrimAPI_MakeWedge
from OCP.GeomAPI import GeomAPI_PointsToBSpline
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt, gp_Quaternion, gp_Trsf
from OCP.TColgp import TColgp_Array1OfPnt

from moldgen.kernel.body import Body
from moldgen.kernel.tracer import Tracer
from moldgen.release.candidates import part_frame, pull_axes
from moldgen.release.pull import search_pull
from moldgen.release.reach import surface_samples, trapped_points, trapped_room
from moldgen.release.sphere import free_directions

OBLIQUE = (math.sin(math.radians(30.0)), 0.0, math.cos(math.radians(30.0)))


def ring(radius, z, count=0):
    """Return the wire of a polygon, or of a spline circle, about the z axis."""
    around = [2 * math.pi * k / (count or 24) for k in range(count or 25)]
    corners = [gp_Pnt(radius * math.cos(turn), radius * math.sin(turn), z) for turn in around]
    if count:
        polygon = BRepBuilderAPI_MakePolygon()
        for corner in corners:
            polygon.Add(corner)
        polygon.Close()
        return polygon.Wire()
    points = TColgp_Array1OfPnt(1, len(corners))
    for number, corner in enumerate(corners):
        points.SetValue(number + 1, corner)
    return BRepBuilderAPI_MakeWire(BRepBuilderAPI_MakeEdge(GeomAPI_PointsToBSpline(points).Curve()).Edge()).Wire()


def tapered(radius, top, height, count=0):
    """Return a plug that widens upwards, with flat walls or (count 0) one free-form wall."""
    loft = BRepOffsetAPI_ThruSections(True, bool(count))
    loft.AddWire(ring(radius, 0.0, count))
    loft.AddWire(ring(top, height, count))
    loft.Build()
    return loft.Shape()


def wedge(half, top, height):
    """Return a square plug with flat walls that widens upwards."""
    axes = gp_Ax2(gp_Pnt(-top, -top, height), gp_Dir(0, 1, 0), gp_Dir(1, 0, 0))  # its height runs along -z
    low, high = top - half, top + half
    return BRepPrimAPI_MakeWedge(axes, 2 * top, height, 2 * top, low, low, high, high).Shape()


def with_oblique_pocket(plug):
    """Return a block with a hole that only a pull at 30 deg to its sides leaves."""
    plug = solids.shifted(solids.turned(plug, 30.0, (0.0, 1.0, 0.0)), -15.0, 0.0, -10.0)
    return solids.cut(solids.box((-30, -20, 0), (40, 20, 40)), plug)


def tub(windows=0, walls=None):
    """Return a tub, open downwards, with windows in the first so many of its sides."""
    solid = solids.cut(solids.box((-30, -20, 0), (30, 20, 25)), solids.box((-28, -18, -1), (28, 18, 23)))
    holes = [
        solids.box((25, -6, 8), (35, 6, 16)),
        solids.box((-6, 15, 8), (6, 25, 16)),
        solids.box((-35, -6, 8), (-25, 6, 16)),
    ]
    return solids.cut(solid, *holes[:windows])


def cup():
    body = solids.cut(solids.cone(14, 17, 30), solids.shifted(solids.cone(12.5, 15.5, 30), 0, 0, 2))
    return solids.fuse(body, solids.box((16.2, -2, 22), (24, 2, 30)))


def tray():
    return solids.fuse(tub(), solids.box((8, -18, 10), (10, 18, 23.5)))


def tube():
    flange = solids.fuse(solids.cylinder(8, 40), solids.box((-14, -8, 0), (10, 8, 4)))
    return solids.cut(flange, solids.cylinder(6, 60, at=(0, 0, -10)))


def bracket():
    angle = solids.fuse(solids.box((0, 0, 0), (40, 20, 3)), solids.box((0, 0, 0), (3, 20, 15)))
    return solids.cut(angle, solids.cylinder(3, 20, at=(28, 9, -5)), solids.box((15, 4, -1), (21, 13, 5)))


def funnel():
    outer = solids.fuse(solids.cone(20, 6, 25), solids.cylinder(5, 40))
    inner = solids.fuse(
        solids.shifted(solids.cone(18.5, 4.5, 25), 0, 0, -0.01), solids.cylinder(3.5, 60, at=(0, 0, -5))
    )
    return solids.fuse(solids.cut(outer, inner), solids.box((19.3, -3, 0), (26, 3, 2)))


def oblique():
    return with_oblique_pocket(wedge(6.0, 7.0, 70.0))


PARTS = {f.__name__: f for f in (cup, tray, tube, bracket, funnel, oblique)}
PULL = dict.fromkeys(("cup", "tray", "tube", "bracket", "funnel"), (0.0, 0.0, 1.0)) | {"oblique": OBLIQUE}


def spun(solid, quaternion):
    """Return the solid turned about the origin by a quaternion (x, y, z, w), and the rotation matrix."""
    x, y, z, w = (float(c) for c in quaternion / np.linalg.norm(quaternion))
    move = gp_Trsf()
    move.SetRotation(gp_Quaternion(x, y, z, w))
    matrix = np.array([[move.Value(i, j) for j in (1, 2, 3)] for i in (1, 2, 3)])
    return BRepBuilderAPI_Transform(solid, move, True).Shape(), matrix


def angle(one, other, line=False):
    """Return the angle [deg] between two vectors, or between their lines."""
    cosine = float(np.dot(one, other))
    return math.degrees(math.acos(min(1.0, abs(cosine) if line else cosine)))


@pytest.mark.parametrize("name", PARTS)
def test_known_pulls(name):
    found = search_pull(Body(PARTS[name]()))[0]
    assert angle(found.direction, PULL[name], line=True) < 0.5
    assert found.trapped_share < 0.001
    assert found.side_actions == 0
    assert found.unreleased_mm2 == 0.0


@pytest.mark.parametrize("name", PARTS)
def test_the_pull_turns_with_the_part(name):
    """Law: turning the part turns its pull, with its sense, and changes none of its figures."""
    solid = PARTS[name]()
    here = search_pull(Body(solid))[0]
    dice = np.random.default_rng(sorted(PARTS).index(name))
    for quaternion in dice.normal(size=(3, 4)):
        other, matrix = spun(solid, quaternion)
        there = search_pull(Body(other))[0]
        assert angle(there.direction, matrix @ here.direction) < 0.5
        assert there.trapped_share == pytest.approx(here.trapped_share, abs=0.002)
        assert there.side_actions == here.side_actions
        assert there.depth_mm == pytest.approx(here.depth_mm, abs=0.5)


@pytest.mark.parametrize(
    ("plug", "source"),
    [
        (lambda: solids.cylinder(6, 70), "axis of round faces"),
        (lambda: wedge(6, 6, 70), "along flat walls"),
        (lambda: wedge(6, 7, 70), "along flat walls"),
        (lambda: tapered(6, 8, 70), "search"),
    ],
)
def test_the_only_clean_pull_lies_at_30_deg(plug, source):
    found = search_pull(Body(with_oblique_pocket(plug())))[0]
    assert angle(found.direction, OBLIQUE, line=True) < 0.5
    assert found.source == source
    assert found.trapped_share < 0.001


def test_the_search_alone_comes_to_the_middle_of_the_play():
    """Two degrees of taper leave the pull that much play; the search needs no feature of the part to find it."""
    part = Body(with_oblique_pocket(tapered(6, 8, 70)))
    tracer = Tracer(part.mesh)
    rough, fine = (surface_samples(part, tracer, count) for count in (1000, 2500))
    assert all(angle(axis, OBLIQUE, line=True) > 2.0 for _, axis in pull_axes(part_frame(part)))
    axis = free_directions(tracer, rough, fine, part_frame(part))[0]
    assert angle(axis, OBLIQUE, line=True) < 0.5
    assert not trapped_points(tracer, fine, axis).any()


@pytest.mark.parametrize("windows", [0, 1, 2, 3])
def test_a_tub_needs_a_side_action_for_each_side_with_a_window(windows):
    """Three windowed sides cost three slides; lying on its side the tub would need its whole inside as one."""
    found = search_pull(Body(tub(windows)))[0]
    assert found.direction == (0.0, 0.0, 1.0)
    assert found.side_actions == windows
    assert found.unreleased_mm2 == 0.0
    ways = {(1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (-1.0, 0.0, 0.0)}
    assert len(ways & set(found.side_ways)) == windows
    assert found.trapped_mm3 == pytest.approx(windows * 12 * 8 * 2, rel=0.15)


def test_windows_in_one_side_share_a_side_action():
    solid = solids.cut(tub(), *(solids.box((25, y, 8), (35, y + 5, 16)) for y in (-14, -3, 8)))
    assert search_pull(Body(solid))[0].side_actions == 1


def test_a_groove_outside_needs_two_side_actions():
    groove = solids.cut(solids.cylinder(25, 4, at=(0, 0, 10)), solids.cylinder(13, 4, at=(0, 0, 10)))
    solid = solids.cut(solids.cut(solids.cylinder(16, 25), solids.cylinder(11, 30, at=(0, 0, -3))), groove)
    axis = next(c for c in search_pull(Body(solid)) if abs(c.direction[2]) > 0.999)
    assert (axis.side_actions, axis.unreleased_mm2) == (2, 0.0)


def test_a_groove_inside_is_not_released():
    """A ring of 3 x 4 mm inside a bore: three faces of known area that no straight way frees."""
    bored = solids.cut(solids.cylinder(20, 25), solids.cylinder(11, 30, at=(0, 0, -3)))
    solid = solids.cut(bored, solids.cylinder(14, 4, at=(0, 0, 10)))
    axis = next(c for c in search_pull(Body(solid)) if abs(c.direction[2]) > 0.999)
    assert axis.side_actions == 0
    area = 2 * math.pi * 14 * 4 + 2 * math.pi * (14**2 - 11**2)
    assert axis.unreleased_mm2 == pytest.approx(area, rel=0.03)
    assert axis.trapped_mm3 == pytest.approx(math.pi * (14**2 - 11**2) * 4, rel=0.05)
    assert "no straight way" in axis.why


def test_trapped_room_of_a_side_groove_is_its_volume():
    block = solids.cut(solids.box((0, 0, 0), (30, 20, 10)), solids.box((-1, -1, 4), (31, 5, 7)))
    part = Body(block)
    tracer = Tracer(part.mesh)
    room = trapped_room(part, tracer, surface_samples(part, tracer, 12000), np.array([0.0, 0.0, 1.0]))
    assert room == pytest.approx(30 * 5 * 3, rel=0.02)


def test_the_same_part_gives_the_same_ranking():
    one, two = (search_pull(Body(oblique())) for _ in range(2))
    assert one == two


def test_listed_pulls_are_distinct_and_explained():
    ranked = search_pull(Body(tub(2)))
    assert len(ranked) >= 3
    assert [c.score for c in ranked] == sorted(c.score for c in ranked)
    for number, one in enumerate(ranked):
        assert all(angle(one.direction, other.direction, line=True) > 2.9 for other in ranked[:number])
    assert "2 side actions" in ranked[0].why
