"""Patterns, mirrors, bodies of their own, planes and choices: laws of volume, symmetry and place."""

from __future__ import annotations

from math import pi

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt, gp_Trsf

from moldgen.kernel.body import Body
from moldgen.kernel.features.shapes import moved
from moldgen.kernel.measure import bounding_box, centroid, volume
from moldgen.kernel.meshsolid import mesh_solid
from tests.recipe.making import BASE, BASE_VOLUME, build, feature, refusal

HOLE = feature("hole", "h", on="top of base", at=[-15, -10], diameter=3)
HOLE_VOLUME = pi * 2.25 * 10


def test_a_linear_grid_repeats_the_volume() -> None:
    rows = [{"direction": "+x", "count": 4, "spacing": 10}, {"direction": "+y", "count": 3, "spacing": 10}]
    solid = build(BASE, HOLE, feature("pattern", of=["h"], linear=rows))
    assert volume(solid) == pytest.approx(BASE_VOLUME - 12 * HOLE_VOLUME, rel=1e-9)


def test_a_polar_pattern_repeats_the_volume_and_keeps_the_centre() -> None:
    solid = build(BASE, {**HOLE, "at": [10, 0]}, feature("pattern", of=["h"], polar={"count": 5}))
    assert volume(solid) == pytest.approx(BASE_VOLUME - 5 * HOLE_VOLUME, rel=1e-9)
    assert centroid(solid) == pytest.approx((0, 0, 5), abs=1e-6)


def test_half_a_circle_includes_both_ends() -> None:
    pattern = feature("pattern", of=["h"], polar={"count": 3, "angle": 180})
    solid = build(BASE, {**HOLE, "at": [10, 0]}, pattern)
    same = build(BASE, *({**HOLE, "name": f"h{i}", "at": at} for i, at in enumerate([[10, 0], [0, 10], [-10, 0]])))
    assert centroid(solid) == pytest.approx(centroid(same), abs=1e-6)


def test_offsets_place_copies_from_the_original() -> None:
    solid = build(BASE, HOLE, feature("pattern", of=["h"], offsets=[[10, 0, 0], [30, 20, 0]]))
    assert volume(solid) == pytest.approx(BASE_VOLUME - 3 * HOLE_VOLUME, rel=1e-9)


def test_a_pattern_of_a_pattern() -> None:
    row = feature("pattern", "row", of=["h"], linear=[{"direction": "+x", "count": 4, "spacing": 10}])
    grid = feature("pattern", "grid", of=["h", "row"], linear=[{"direction": "+y", "count": 3, "spacing": 10}])
    assert volume(build(BASE, HOLE, row, grid)) == pytest.approx(BASE_VOLUME - 12 * HOLE_VOLUME, rel=1e-9)


def test_mirroring_features_makes_the_part_symmetric() -> None:
    hook = feature("snap_hook", "k", on="top of base", at=[12, 5], toward=30, length=8, width=4, thickness=2, lip=1,
                   lip_height=1, side_draft=1)  # fmt: skip
    boss = feature("boss", "b", on="top of base", at=[9, -8], diameter=5, height=6, draft=1,
                   gussets={"count": 3, "length": 2, "height": 4, "thickness": 1, "start": 20})  # fmt: skip
    solid = build(BASE, hook, boss, feature("mirror", of=["k", "b"], plane="yz"))
    reflection = gp_Trsf()
    reflection.SetMirror(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0)))
    one, other = (mesh_solid(Body(s).mesh) for s in (solid, moved(solid, reflection)))
    assert (one - other).volume() + (other - one).volume() < 1e-3 * one.volume()


def test_mirroring_the_body_doubles_it() -> None:
    half = feature("block", "half", size=[20, 30, 10], at=[10, 0])
    solid = build(half, feature("mirror", plane="yz"))
    low, high = bounding_box(solid)
    assert volume(solid) == pytest.approx(12000)
    assert (low[0], high[0]) == pytest.approx((-20, 20))


def test_bodies_are_cut_joined_and_intersected() -> None:
    a = feature("block", "a", size=[10, 10, 10])
    b = feature("block", "b", mode="new", size=[10, 10, 10], at=[5, 0])
    for kind, expected in (("union", 1500), ("cut", 500), ("intersect", 500)):
        assert volume(build(a, b, feature(kind, tools=["b"]))) == pytest.approx(expected)


def test_features_may_work_on_a_body_of_their_own() -> None:
    lid = feature("block", "lid", mode="new", size=[20, 20, 4], at=[0, 0, 10])
    hole = feature("hole", "h", body="lid", on={"plane": "xy", "offset": 14}, at=[0, 0], diameter=6)
    solid = build(BASE, lid, hole, feature("union", tools=["lid"]))
    assert volume(solid) == pytest.approx(BASE_VOLUME + 4 * (400 - 9 * pi))


def test_a_body_that_nobody_uses_is_an_error() -> None:
    error = refusal(BASE, feature("block", "stray", mode="new", size=[1, 1, 1]))
    assert "feature 'stray'" in str(error)


@pytest.mark.parametrize(
    ("on", "toward"),
    [
        ("xy", (0, 0, 1)),
        ("xz", (0, 1, 0)),
        ("yz", (1, 0, 0)),
        ({"plane": "xy", "flip": True}, (0, 0, -1)),
        ({"plane": "xz", "flip": True}, (0, -1, 0)),
        ({"plane": "yz", "offset": 3}, (1, 0, 0)),
    ],
)
def test_planes_keep_part_coordinates_and_grow_as_told(on: object, toward: tuple[int, int, int]) -> None:
    solid = build(feature("block", size=[2, 4, 6], on=on, at=[10, 20]))
    centre = np.array(centroid(solid))
    along = np.abs(np.array(toward)).astype(bool)
    offset = on.get("offset", 0) if isinstance(on, dict) else 0
    assert sorted(centre[~along]) == pytest.approx([10, 20])
    assert centre[along] == pytest.approx(3 * sum(toward) + offset)


@pytest.mark.parametrize("side", ["top", "bottom", "left", "right", "front", "back"])
def test_features_on_a_face_grow_out_of_it(side: str) -> None:
    post = feature("boss", on={"face": f"{side} of base", "origin": "centre"}, at=[0, 0], diameter=3, height=4)
    low, high = bounding_box(build(BASE, post))
    grown = max(np.abs(low - [-20, -15, 0]).max(), np.abs(high - [20, 15, 10]).max())
    assert grown == pytest.approx(4, abs=1e-5)


def test_choices_by_feature_by_bend_and_by_pair_agree() -> None:
    boss = feature("boss", "b", on="top of base", at=[0, 0], diameter=8, height=6)
    root = [
        build(BASE, boss, feature("fillet", edges=edges, radius=1))
        for edges in ("concave", "concave of b", "between b and base", {"at": [4, 0, 10], "select": "round"})
    ]
    assert [volume(s) for s in root] == pytest.approx([volume(root[0])] * 4)
    # a fillet in an inner corner: the square less the quarter disc, turned about the axis (Pappus)
    area = 1 - pi / 4
    centre = 4 + (0.5 - pi / 4 * (1 - 4 / (3 * pi))) / area
    assert volume(root[0]) - volume(build(BASE, boss)) == pytest.approx(2 * pi * centre * area, rel=1e-6)


def test_outer_and_inner_edges_of_a_face() -> None:
    hole = feature("hole", "h", on="top of base", at=[0, 0], diameter=10)
    inner = build(BASE, hole, feature("chamfer", edges="inner top of base", distance=1))
    outer = build(BASE, hole, feature("chamfer", edges="outer top of base", distance=1))
    both = build(BASE, hole, feature("chamfer", edges="top of base", distance=1))
    start = volume(build(BASE, hole))
    assert (start - volume(inner)) + (start - volume(outer)) == pytest.approx(start - volume(both), rel=1e-9)
    assert start - volume(inner) == pytest.approx(2 * pi * (5 + 1 / 3) * 0.5, rel=1e-6)


@settings(max_examples=15, deadline=None)
@given(st.floats(10, 60), st.floats(10, 60), st.floats(5, 20), st.floats(0.8, 2.2))
def test_the_part_follows_its_parameters(length: float, width: float, height: float, wall: float) -> None:
    """Volume law of an open box with a hole in its floor, whatever the parameters."""
    solid = build(
        feature("block", "tub", size=["length", "width", "height"]),
        feature("shell", "hollow", thickness="wall", open="top of tub"),
        feature("hole", "drain", on={"plane": "xy", "offset": "wall"}, at=[0, 0], diameter="min(length, width)/4"),
        length=length,
        width=width,
        height=height,
        wall=wall,
    )
    inside = (length - 2 * wall) * (width - 2 * wall) * (height - wall)
    expected = length * width * height - inside - pi * (min(length, width) / 8) ** 2 * wall
    assert volume(solid) == pytest.approx(expected, rel=1e-6)
