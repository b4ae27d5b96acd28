"""Distances to the ways of side actions against closed forms, and whose steel meets the part where."""

import math

import numpy as np
import pytest

from moldgen.layout.keep_out import plan_distance
from moldgen.model.slide import AngledPinLayout, Drive, LifterLayout, SideLayout, SlideBody, SlideLayout
from moldgen.rules.side_practice import LEDGE_WIDTH, LIFTER_CLEARANCE, SLIDE_LAND, SLIDE_SHOULDER

from .shapes import box, plate
from .side_shapes import DOWN, MINUS_Y, X, lifter, on_plan, rectangle, slide, with_sides

WINDOW = slide(X, -6.0, 6.0, 10.0, 18.0, 30.0, 32.0)
"""A slide for a window in the +x wall of the box of 64 x 44 x 42 mm, wall 2: y from -6 to 6, z from 10 to 18."""


def steel(view, x, y, radius, low, high):
    near = view.keep_out.upright(np.array([[x, y]], float), radius, low, high)
    return float(near.steel[0]), near.names[0]


def test_without_side_actions_everything_is_free():
    view = with_sides(box())
    assert steel(view, 0, 0, 5, -50, 50) == (math.inf, "")
    assert not view.formed_aside.any()


@pytest.mark.parametrize(
    ("x", "y", "low", "high", "expected"),
    [
        (20, 0, -30, 40, 30 - 20),
        (20, 10, -30, 40, math.hypot(10, 4)),
        (34, 9, 0, 40, 3.0),
        (100, 30, 5, 15, 30 - 6 - SLIDE_SHOULDER.default - LEDGE_WIDTH.default),
        (20, 0, -30, 10, 32 + SLIDE_LAND.default - 20),
        (20, 0, 23, 40, math.inf),
    ],
)
def test_distance_to_a_slide_and_its_body(x, y, low, high, expected):
    distance, name = steel(with_sides(box(), WINDOW), x, y, 2.0, low, high)
    assert distance == pytest.approx(expected - 2.0)
    assert name == ("" if math.isinf(expected) else "slide 1")


def test_slide_leaves_along_its_axis_whichever_way_that_is():
    side = slide(MINUS_Y, -5.0, 3.0, 10.0, 18.0, 20.0, 22.0)
    view = with_sides(box(), side)
    for u, s, expected in ((3.0 + 4.0, 22.0, 4.0), (-5.0 - 4.0, 22.0, 4.0), (0.0, 21.0, 0.0), (0.0, 10.0, 10.0)):
        x, y = on_plan(MINUS_Y, u, s)
        assert steel(view, x, y, 0.0, 12.0, 14.0)[0] == pytest.approx(expected)


def test_outline_counts_only_at_the_heights_where_it_is():
    stepped = np.array([(-10, 10), (10, 10), (10, 14), (2, 14), (2, 18), (-2, 18), (-2, 14), (-10, 14)], float)
    side = slide(X, -1, 1, 0, 1, 30.0, 32.0)
    front = type(side.front)(**{**vars(side.front), "outline": (stepped,)})
    view = with_sides(box(), type(side)(side.name, front, None))
    assert steel(view, 30.5, 8, 0.0, 14.5, 17.5)[0] == pytest.approx(8 - 2)
    assert steel(view, 30.5, 8, 0.0, 10.5, 17.5)[0] == pytest.approx(0.0)


def test_leaning_lifter_is_followed_down_and_through_its_travel():
    tilt = math.radians(8.0)
    axis = (-math.sin(tilt), 0.0, -math.cos(tilt))
    view = with_sides(box(), lifter(axis, X, rectangle(-3, 3, -2, 2), -20.0, 2.0))
    deep = view.keep_out.zones
    low, high = min(z.low for z in deep), max(z.high for z in deep)
    assert low < float(view.low[2])
    # its middle at height z lies at x = z tan(tilt); square across the axis it is 2 mm thick each way
    for z in (0.0, -20.0):
        middle, half = z * math.tan(tilt), 2.0 / math.cos(tilt)
        right = steel(view, middle + half + 2.0 + LIFTER_CLEARANCE.default + 5.0, 0, 0.0, z - 0.01, z + 0.01)[0]
        left = steel(view, middle - half - 5.0, 0, 0.0, z - 0.01, z + 0.01)[0]
        # stretches of 4 mm are taken as their hulls
        slack = 4.0 * math.sin(tilt) + 2.0 * math.sin(tilt) + 0.3
        assert 5.0 - slack <= right <= 5.0 + 1e-6
        assert 5.0 - slack <= left <= 5.0 + 1e-6
    assert high >= 20.0 * math.cos(tilt)


def test_upright_lifter_is_exact():
    view = with_sides(box(), lifter(DOWN, X, rectangle(-3, 3, -2, 2), -20.0, 2.0))
    layout = LifterLayout("lifter 1", DOWN, X, 0.0, 30.0, 7.0, 3.0, 20.0, 4.0)
    told = with_sides(box(), lifter(DOWN, X, rectangle(-3, 3, -2, 2), -20.0, 2.0), layout=SideLayout((), (layout,)))
    corners = np.vstack([z.plan for z in view.keep_out.zones])
    reach = corners[:, 0].max()
    assert reach == pytest.approx(np.abs(corners[:, 0]).min() + 2.0 + LIFTER_CLEARANCE.default, abs=1e-9)
    assert np.vstack([z.plan for z in told.keep_out.zones])[:, 0].max() == pytest.approx(reach + 7.0 - 3.0)


def test_bodies_and_angled_pins_of_the_layout_take_the_place_of_the_usual_ones():
    body = SlideBody(50.0, 100.0, -20.0, 20.0, -10.0, 40.0, 0.0, 5.0, 8.0, 12.0, 17.0)
    tilt = math.radians(15.0)
    along = (math.sin(tilt), 0.0, -math.cos(tilt))
    pin = AngledPinLayout(
        "angled pin of slide 1", (60.0, 0.0, 82.0), along, 15.0, 10.0, 11.0, 15.0, 6.0, 2.0, 80.0, 40.0, 0.0
    )
    made = SlideLayout("slide 1", ("slide 1",), X, Drive.ANGLED_PIN, "core half", body, 4.0, 0.0, 10.0, (pin,))
    view = with_sides(box(), WINDOW, layout=SideLayout((made,), ()))
    assert steel(view, 70, 30, 0.0, 20, 39)[0] == pytest.approx(30 - 25)
    assert steel(view, 45, 15, 0.0, -9, 9)[0] == pytest.approx(5.0)
    distance, name = steel(view, 60 + 20, 0, 0.0, 81.0, 82.0)
    assert name == "angled pin of slide 1"
    assert 20 - 7.5 / math.cos(tilt) - 0.4 - 6.0 * math.sin(tilt) <= distance <= 20 - 7.5
    middle = pin.at(50.0)[0]
    distance, _ = steel(view, middle, 20.0, 0.0, 49.99, 50.01)
    assert 20 - 5.5 / math.cos(tilt) - 0.3 <= distance <= 20 - 5.5


def test_distance_of_segments_from_polygons_as_by_sampling():
    random = np.random.default_rng(7)
    for _ in range(40):
        angles = np.sort(random.uniform(0, 2 * np.pi, 6))
        plan = np.column_stack([3 * np.cos(angles), 2 * np.sin(angles)])  # points of an ellipse are convex
        start, end = random.uniform(-8, 8, (2, 1, 2))
        share = np.linspace(0, 1, 400)[:, None]
        line = start + share * (end - start)
        rim = np.vstack([a + share[::4] * (b - a) for a, b in zip(plan, np.roll(plan, -1, axis=0), strict=True)])
        apart = np.linalg.norm(line[:, None] - rim, axis=2).min()
        inward = np.roll(plan, -1, axis=0) - plan
        normal = np.column_stack([-inward[:, 1], inward[:, 0]])
        inside = (((line[:, None] - plan) * normal).sum(axis=2) >= 0).all(axis=1).any()
        found = float(plan_distance(start, end, plan)[0])
        assert found == pytest.approx(0.0 if inside else apart, abs=0.06)


def test_who_meets_the_part():
    filled = box()
    real = filled.cut(plate(10, 10, 6).translate((30, 0, 11)))
    over = slide(X, -6.0, 6.0, 10.0, 18.0, 30.0, 32.0)  # the outline goes round the window, 1 mm beyond it
    view = with_sides(filled, over, real=real)
    outward, inward = np.array([1.0, 0, 0]), np.array([-1.0, 0, 0])
    cases = [
        ((32, 0, 14), outward, True),  # the slide passes through the window
        ((30, 0, 14), inward, True),  # there the core shuts off against the slide
        ((32, 0, 10.5), outward, True),  # the slide forms the wall round its window
        ((30, 0, 10.5), inward, False),  # the core forms real plastic, although the outline lies behind it
        ((32, 0, 30), outward, False),
        ((-32, 0, 14), inward, False),
        ((20, 0, 42), np.array([0.0, 0, 1]), False),
    ]
    for place, normal, expected in cases:
        assert bool(view.keep_out.forms(np.array([place], float), normal[None])[0]) is expected, place
