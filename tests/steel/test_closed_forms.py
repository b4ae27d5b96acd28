"""What pins, bores and feed take out of the halves, against the formulas for cylinders, cones and balls."""

import math
from dataclasses import replace

import numpy as np
import pytest

from moldgen.kernel.channel import Profile, channel, joined, slot
from moldgen.kernel.measure import bounding_box, is_valid, volume, volume_adaptive
from moldgen.kernel.topology import faces_of
from moldgen.model.layout import GateKind
from moldgen.model.tool import Role
from moldgen.steel.bores import pin_bores
from moldgen.steel.ground import Ground

from . import tools

EXACT = 1e-9


def round_bar(diameter, length):
    return math.pi / 4 * diameter**2 * length


def frustum(r, s, height):
    return math.pi / 3 * height * (r * r + r * s + s * s)


def taken(bored):
    return {r.purpose: r.volume_mm3 for r in bored.removed if r.half == "core"}


def test_an_ejector_pins_bore_is_its_fit_and_its_clearance():
    _, bored, _ = tools.tool()
    expected = round_bar(4.0, 12.0) + round_bar(
        4.5, 48.0
    )  # fit from the tip at 20 down to 8, then to the bottom at -40
    assert taken(bored)["ejector pin 1"] == pytest.approx(expected, rel=EXACT)


def test_a_core_pins_bore_is_head_seat_clearance_fit_and_the_core_in_the_hole():
    _, bored, _ = tools.tool()
    wall = tools.ROOF - tools.FLOOR
    taper = (2.1 - 2.0) / (tools.ROOF - tools.FLOOR + 2.0)  # the hole's tool runs 1 mm past both faces
    in_hole = frustum(2.1 - taper, 2.1 - taper * (1 + wall), wall)
    expected = round_bar(10.5, 3.0) + round_bar(5.5, 45.0) + round_bar(5.0, 12.0) + in_hole
    assert taken(bored)["core pin 1"] == pytest.approx(expected, rel=EXACT)


def test_what_is_taken_out_is_missing_from_the_halves():
    made, bored, _ = tools.tool()
    before = tools.halves()
    for role, half in ((Role.CAVITY, before.cavity), (Role.CORE, before.core)):
        left = volume_adaptive(made.only(role).solid)
        assert volume_adaptive(half) - left == pytest.approx(bored.of(role.value), rel=1e-7)
    assert bored.total_mm3 == bored.of("core") + bored.of("cavity")


def test_pins_have_shank_and_head():
    made, _, _ = tools.tool()
    (pin,) = made.by_role(Role.EJECTOR_PIN)
    assert volume(pin.solid) == pytest.approx(round_bar(4.0, 105.0 - 3.0) + round_bar(8.0, 3.0), rel=EXACT)
    (core_pin,) = made.by_role(Role.CORE_PIN)
    low, high = bounding_box(core_pin.solid)
    assert (low[2], high[2]) == (pytest.approx(0.0, abs=1e-6), pytest.approx(tools.ROOF + 40.0, abs=1e-6))
    assert high[0] - low[0] == pytest.approx(10.0, abs=1e-6)
    assert len(faces_of(core_pin.solid)) == 7  # foot, head, shoulder, shank, ring round the hole, cone, tip


def test_a_shouldered_pin_is_three_bars_in_a_stepped_bore():
    pins = tuple(tools.shouldered(i, *at) for i, at in enumerate(tools.RING, 1))
    made, bored, _ = tools.tool(replace(tools.LAYOUT, ejector_pins=pins))
    (pin,) = made.by_role(Role.EJECTOR_PIN)
    # foot at -85: head of 2 mm, shoulder at -35, tip at 20
    expected = round_bar(4.0, 2.0) + round_bar(2.0, 48.0) + round_bar(1.0, 55.0)
    assert volume(pin.solid) == pytest.approx(expected, rel=EXACT)
    assert len(faces_of(pin.solid)) == 7
    assert "shank 2 mm up to 50.00 mm" in pin.note
    # fit from the tip at 20 down to 10, then a bore that the shank passes, to the bottom at -40
    assert taken(bored)["ejector pin 1"] == pytest.approx(round_bar(1.0, 10.0) + round_bar(2.5, 50.0), rel=EXACT)
    rows = [(h.diameter_mm, h.z_from_mm, h.z_to_mm, h.fit) for h in made.holes if h.purpose.startswith("ejector pin 1")]
    assert rows == [(1.0, pytest.approx(10.0), pytest.approx(20.0), "H7"), (2.5, -40.0, pytest.approx(10.0), "")]


def test_a_shoulder_stays_below_a_fit_that_reaches_deeper():
    """Beside a low wall the fit goes deeper, and the shoulder with it: else it would run into the fit on the way."""
    (near,) = pin_bores(tools.halves(), one_pin(tools.shouldered(1, 16.65, 0.0)), Ground(tools.halves()))
    (free,) = pin_bores(tools.halves(), one_pin(tools.shouldered(1, 12.0, 3.0)), Ground(tools.halves()))
    assert near.below.fit_low < free.below.fit_low
    way = [b.below.fit_low - b.below.shank_top for b in (near, free)]
    assert way[0] == pytest.approx(way[1]) == pytest.approx(45.0)


def one_pin(pin):
    return replace(tools.PLAIN, ejector_pins=(pin,))


def test_a_shouldered_pin_on_a_slope_has_its_shank_under_a_shaped_tip():
    pin = tools.shouldered(1, 9.0, 4.0, tip=tools.FLOOR, drop=2.0)
    made, bored, _ = tools.tool(one_pin(pin), holes=False, dome=3.0)
    (solid,) = made.by_role(Role.EJECTOR_PIN)
    below = round_bar(4.0, 2.0) + round_bar(2.0, 48.0)
    fit_low = next(h.z_from_mm for h in made.holes if h.purpose.startswith("ejector pin 1") and h.fit)
    in_bore = taken(bored)["ejector pin 1"] - round_bar(2.5, fit_low + 40.0)
    assert volume_adaptive(solid.solid) == pytest.approx(below + round_bar(1.0, fit_low + 35.0) + in_bore, rel=1e-6)
    assert is_valid(solid.solid)


def test_a_direct_sprue_is_a_cone_through_the_cavity_block():
    gate = tools.top_gate(GateKind.SPRUE, 6.0)
    made, bored, _ = tools.tool(replace(tools.LAYOUT, gate=gate))
    height = float(tools.HIGH[2]) - tools.ROOF
    expected = frustum(3.0, 3.0 - tools.slope(height), height)
    assert bored.of("cavity") == pytest.approx(expected, rel=EXACT)
    assert volume(made.only(Role.SPRUE).solid) == pytest.approx(expected, rel=EXACT)


def test_a_pin_gate_is_a_land_and_a_cone_that_widens_away_from_the_part():
    made, _, _ = tools.tool(replace(tools.LAYOUT, gate=tools.top_gate(GateKind.PIN, 1.2)))
    height = float(tools.HIGH[2]) - tools.ROOF - 0.75
    expected = round_bar(1.2, 0.75) + frustum(0.6, 0.6 + tools.slope(height), height)
    assert volume(made.only(Role.SPRUE).solid) == pytest.approx(expected, rel=EXACT)


def test_the_feed_is_the_same_whichever_way_the_gate_looks():
    volumes = []
    for angle in (0.0, 0.7, 2.0):
        _, bored, _ = tools.tool(replace(tools.LAYOUT, gate=tools.edge_gate(angle=angle)))
        volumes.append(bored.of("cavity"))
    assert volumes == pytest.approx([volumes[0]] * 3, rel=1e-7)


def pole(profile):
    """Where the ball of the cutter ends and the flank begins: radius and height over the parting surface."""
    slope = math.radians(profile.flank)
    return profile.diameter / 2 * math.cos(slope), profile.diameter / 2 * (1 + math.sin(slope))


@pytest.mark.parametrize("flank", [0.0, 10.0])
def test_a_channel_is_what_a_ball_nosed_taper_cutter_sweeps(flank):
    profile = Profile(5.0, flank, 0.0, True)
    start, end = np.array([1.0, 2.0, 3.0]), np.array([7.0, 10.0, 3.0])
    u, h = pole(profile)
    top = 5.0 - h
    segment = (math.pi / 2 - math.radians(flank)) * 2.5**2 - u * (2.5 - top)
    assert profile.area() == pytest.approx(segment + h * (u + profile.half_width), rel=EXACT)
    cutter = math.pi * top**2 * (3 * 2.5 - top) / 3 + frustum(u, profile.half_width, h)
    made = joined(channel(start, end, profile, round_start=True), "a runner")
    assert volume(made) == pytest.approx(10.0 * profile.area() + cutter, rel=EXACT)
    one_end = joined(channel(start, end, profile, round_start=False), "a runner")
    assert volume(one_end) == pytest.approx(10.0 * profile.area() + cutter / 2, rel=EXACT)


def test_a_channel_in_the_core_half_is_the_mirror_image():
    start, end = np.array([0.0, 0.0, 3.0]), np.array([10.0, 0.0, 3.0])
    up, down = (
        joined(channel(start, end, Profile(4.0, 10.0, 1.0, side), round_start=True), "") for side in (True, False)
    )
    assert volume(up) == pytest.approx(volume(down), rel=EXACT)
    (low, high), (low_down, high_down) = bounding_box(up), bounding_box(down)
    assert [*(low + high)[:2]] == pytest.approx([*(low_down + high_down)[:2]], abs=1e-6)
    assert (low[2], high[2]) == (pytest.approx(2.0), pytest.approx(7.0))
    assert (low_down[2], high_down[2]) == (pytest.approx(-1.0), pytest.approx(4.0))


def test_a_slot_is_a_box_along_its_way():
    made = slot(np.array([1.0, 1.0, 9.0]), np.array([4.0, 5.0, 9.0]), 2.0, (-1.0, 2.0))
    assert volume(made) == pytest.approx(5.0 * 2.0 * 3.0, rel=EXACT)
    low, high = bounding_box(made)
    assert (low[2], high[2]) == (pytest.approx(-1.0), pytest.approx(2.0))
