"""Each feature against the closed form of its volume."""

from __future__ import annotations

from math import cos, pi, radians, sin, sqrt, tan

import pytest

from moldgen.kernel.measure import bounding_box, is_valid, volume
from tests.recipe.making import BASE, BASE_VOLUME, build, feature

CLOSE = 1e-7
T2 = tan(radians(2))


def frustum(a: float, b: float, inset: float, height: float, rounding: float = 0.0) -> float:
    """Volume under a rectangle a x b that shrinks evenly by `inset` a side; corners of radius `rounding` shrink too."""

    def area(t: float) -> float:
        radius = rounding - inset * t if rounding else 0.0
        return (a - 2 * inset * t) * (b - 2 * inset * t) - (4 - pi) * radius**2

    return height / 6 * (area(0) + 4 * area(0.5) + area(1))  # Simpson is exact: the area is quadratic


def cone(d1: float, d2: float, height: float) -> float:
    return pi * height / 12 * (d1 * d1 + d1 * d2 + d2 * d2)


FRESH = {
    "block": (feature("block", size=[40, 30, 10]), 12000.0),
    "block turned": (feature("block", size=[40, 30, 10], angle=30, at=[5, 6, 7]), 12000.0),
    "block rounded": (feature("block", size=[40, 30, 10], radius=5), 10 * (1200 - (4 - pi) * 25)),
    "block drafted": (feature("block", size=[40, 30, 10], draft=2), frustum(40, 30, 10 * T2, 10)),
    "block rounded and drafted": (
        feature("block", size=[40, 30, 10], radius=5, draft=2),
        frustum(40, 30, 10 * T2, 10, 5),
    ),
    "block wider at the top": (
        feature("block", size=[40, 30, 10], radius=5, draft=-2),
        frustum(40, 30, -10 * T2, 10, 5),
    ),
    "cylinder": (feature("cylinder", diameter=20, height=10), pi * 1000),
    "cone": (feature("cylinder", diameter=20, height=10, draft=2), cone(20, 20 - 20 * T2, 10)),
    "sphere": (feature("sphere", diameter=12, at=[1, 2, 3]), pi / 6 * 12**3),
    "torus": (feature("torus", diameter=30, section=6), 2 * pi**2 * 15 * 9),
    "extruded slot": (
        feature("extrude", height=4, profile={"shape": "slot", "length": 20, "width": 6}),
        4 * (14 * 6 + 9 * pi),
    ),
    "extruded hexagon": (
        feature("extrude", height=4, profile={"shape": "polygon", "sides": 6, "diameter": 10, "across": "flats"}),
        4 * sqrt(3) / 2 * 100,
    ),
    "extruded ellipse": (
        feature("extrude", height=4, profile={"shape": "ellipse", "size": [6, 10], "angle": 20}),
        4 * pi * 15,
    ),
    "ring": (
        feature(
            "extrude",
            height=10,
            draft=2,
            profile={"shape": "circle", "diameter": 20, "minus": [{"shape": "circle", "diameter": 10}]},
        ),
        cone(20, 20 - 20 * T2, 10) - cone(10, 10 + 20 * T2, 10),
    ),
    "both sides": (
        feature("extrude", height=10, both=True, on="yz", profile={"shape": "circle", "diameter": 20}),
        pi * 1000,
    ),
    "revolved, by Pappus": (
        feature("revolve", profile={"shape": "rectangle", "size": [4, 6], "at": [12, 3]}),
        2 * pi * 12 * 24,
    ),
    "part of a turn": (
        feature("revolve", angle=90, axis="+x", profile={"shape": "circle", "diameter": 4, "at": [12, 3]}),
        pi / 2 * 12 * 4 * pi,
    ),
    "lofted squares": (
        feature(
            "loft",
            sections=[
                {"height": 0, "profile": {"shape": "rectangle", "size": [20, 20]}},
                {"height": 12, "profile": {"shape": "rectangle", "size": [10, 10]}},
            ],
        ),
        12 / 3 * (400 + 100 + 200),
    ),
}


@pytest.mark.parametrize("case", FRESH)
def test_a_solid_of_its_own(case: str) -> None:
    it, expected = FRESH[case]
    solid = build(it)
    assert is_valid(solid)
    assert volume(solid) == pytest.approx(expected, rel=CLOSE)


PATH = {"shape": "path", "start": [0, 0]}
OUTLINES = {
    "half disc through a point": ([{"arc": [10, 0], "through": [5, 5]}], pi * 25 / 2),
    "half disc through another point": (
        [{"arc": [10, 0], "through": [5 + 5 * cos(1.1), 5 * sin(1.1)]}],
        pi * 25 / 2,
    ),
    "segment by radius": (
        [{"arc": [10, 0], "radius": 10, "side": "right"}],
        100 / 2 * (radians(60) - sin(radians(60))),
    ),
    "tangent arc": (
        [{"line": [10, 0]}, {"arc": [10, 6], "tangent": True}, {"line": [0, 6]}],
        60 + pi * 9 / 2,
    ),
    "tangent arc after an arc": (
        [{"arc": [6, 0], "through": [3, -3]}, {"arc": [12, 0], "tangent": True}, {"line": [12, -9]}, {"line": [0, -9]}],
        108.0,  # the two half discs cancel
    ),
    "rounded corner": ([{"line": [10, 0], "round": 2}, {"line": [10, 8]}, {"line": [0, 8]}], 80 - (4 - pi)),
    "rounded start": (
        [{"line": [10, 0]}, {"line": [10, 8]}, {"line": [0, 8]}],
        80 - (4 - pi) * 9 / 4,
    ),
}


@pytest.mark.parametrize("case", OUTLINES)
def test_outlines_of_lines_and_arcs(case: str) -> None:
    steps, area = OUTLINES[case]
    path = {**PATH, "steps": steps, **({"round": 3} if case == "rounded start" else {})}
    assert volume(build(feature("extrude", height=2, profile=path))) == pytest.approx(2 * area, rel=CLOSE)


def test_a_spline_outline_comes_close_to_the_circle_through_its_points() -> None:
    points = [[10 * cos(radians(a)), 10 * sin(radians(a))] for a in range(0, 360, 15)]
    straight = volume(build(feature("extrude", height=5, profile={"shape": "spline", "points": points})))
    assert straight == pytest.approx(5 * pi * 100, rel=1e-4)
    drafted = volume(build(feature("extrude", height=5, draft=2, profile={"shape": "spline", "points": points})))
    assert drafted == pytest.approx(cone(20, 20 - 10 * T2, 5), rel=1e-4)


def test_a_spline_step_with_tangents_starts_as_told() -> None:
    spline = {"spline": [[5, 3], [10, 0]], "start_tangent": [0, 1], "end_tangent": [0, -1]}
    solid = build(feature("extrude", height=1, profile={**PATH, "steps": [spline]}))
    low, high = bounding_box(solid)
    assert high[1] > 3 - 1e-6
    assert low[1] == pytest.approx(0, abs=1e-6)


ON_TOP = {"on": "top of base"}
CHANGES = {
    "hole": (feature("hole", **ON_TOP, at=[5, 5], diameter=6), -pi * 9 * 10),
    "hole from below": (feature("hole", on="bottom of base", at=[5, 5], diameter=6), -pi * 9 * 10),
    "hole from the side": (feature("hole", on="right of base", at=[0, 5], diameter=4), -pi * 4 * 40),
    "blind hole": (feature("hole", **ON_TOP, at=[5, 5], diameter=6, depth=4), -pi * 9 * 4),
    "hole with a cone": (
        feature("hole", **ON_TOP, at=[0, 0], diameter=6, depth=4, bottom="cone"),
        -pi * 9 * (4 + 3 / tan(radians(59)) / 3),
    ),
    "hole with a ball": (
        feature("hole", **ON_TOP, at=[0, 0], diameter=6, depth=4, bottom="round"),
        -pi * 9 * 4 - 2 / 3 * pi * 27,
    ),
    "drafted hole": (feature("hole", **ON_TOP, at=[0, 0], diameter=6, draft=2), -cone(6, 6 - 20 * T2, 10)),
    "counterbore": (
        feature("hole", **ON_TOP, at=[0, 0], diameter=6, counterbore={"diameter": 10, "depth": 2}),
        -pi * 9 * 8 - pi * 25 * 2,
    ),
    "countersink": (
        feature("hole", **ON_TOP, at=[0, 0], diameter=6, countersink={"diameter": 10, "angle": 90}),
        -pi * 9 * 8 - cone(10, 6, 2),
    ),
    "shell": (feature("shell", thickness=2, open="top of base"), -36.0 * 26 * 8),
    "shell open twice": (feature("shell", thickness=2, open=["top of base", "right of base"]), -38.0 * 26 * 8),
    "boss": (
        feature("boss", **ON_TOP, at=[3, 2], diameter=8, height=10, draft=2, hole={"diameter": 3, "depth": 6}),
        cone(8 + 20 * T2, 8, 10) - pi * 2.25 * 6,
    ),
    "rib": (
        feature("rib", **ON_TOP, start=[-10, -3], end=[10, 7], thickness=2, height=8, draft=1),
        sqrt(500) * 8 * (2 - 8 * tan(radians(1))),
    ),
    "rib with sloped ends": (
        feature("rib", **ON_TOP, start=[-10, 0], end=[10, 0], thickness=2, height=6, draft=2, end_draft=2),
        frustum(20, 2, 6 * T2, 6),
    ),
    "snap hook": (
        feature("snap_hook", **ON_TOP, at=[0, 0], length=10, width=6, thickness=2, lip=1, lip_height=1, lead_angle=45),
        6 * (2 * 12 + 1 + 0.5),
    ),
    "fillet": (feature("fillet", edges="vertical of base", radius=3), -4 * (1 - pi / 4) * 9 * 10),
    "fillet of one edge": (
        feature("fillet", edges={"select": "vertical", "at": [20, 15, 5]}, radius=3),
        -(1 - pi / 4) * 9 * 10,
    ),
    "fillet in a box": (
        feature("fillet", edges={"select": "vertical", "within": [[0, -20, -1], [21, 20, 11]]}, radius=3),
        -2 * (1 - pi / 4) * 9 * 10,
    ),
    "chamfer": (feature("chamfer", edges="vertical of base", distance=3), -4 * 4.5 * 10),
    "draft": (feature("draft", faces="walls of base", angle=2), frustum(40, 30, 10 * T2, 10) - BASE_VOLUME),
    "draft about the top": (
        feature("draft", faces="walls", angle=2, neutral=10),
        frustum(40 + 20 * T2, 30 + 20 * T2, 10 * T2, 10) - BASE_VOLUME,
    ),
    "cut with a ball": (feature("sphere", mode="cut", diameter=10, at=[0, 0, 10]), -2 / 3 * pi * 125),
    "intersected": (feature("cylinder", mode="intersect", diameter=20, height=10), pi * 1000 - BASE_VOLUME),
}


@pytest.mark.parametrize("case", CHANGES)
def test_a_change_of_a_block(case: str) -> None:
    it, expected = CHANGES[case]
    solid = build(BASE, it)
    assert is_valid(solid)
    assert volume(solid) - BASE_VOLUME == pytest.approx(expected, rel=1e-6)


def test_gussets_add_a_wedge_each() -> None:
    boss = feature("boss", on="top of base", at=[0, 0], diameter=6, height=9)
    gussets = {"count": 4, "length": 3, "height": 6, "thickness": 1}
    plain, stiff = build(BASE, boss), build(BASE, {**boss, "gussets": gussets})
    # a straight wedge from the middle of the boss to its tip, less what lies inside the boss
    assert 4 * 0.5 * 3 * 3 < volume(stiff) - volume(plain) < 4 * 0.5 * 3 * 6


def test_a_window_opens_one_wall_and_no_other() -> None:
    shell = feature("shell", "hollow", thickness=2, open="top of base")
    window = feature("window", on="right of base", at=[3, 5], size=[8, 4], radius=1)
    lost = volume(build(BASE, shell)) - volume(build(BASE, shell, window))
    assert lost == pytest.approx(2 * (32 - (4 - pi)), rel=1e-6)


@pytest.mark.parametrize("place", ["left", "right", "front", "back"])
def test_every_side_of_a_box_can_carry_a_window(place: str) -> None:
    shell = feature("shell", "hollow", thickness=2, open="top of base")
    window = feature("window", on=f"{place} of base", at=[0, 5], size=[8, 4])
    assert volume(build(BASE, shell)) - volume(build(BASE, shell, window)) == pytest.approx(64, rel=1e-6)
