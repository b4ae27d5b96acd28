"""Equal pins share a definition, tips lie in the core's surface, and what cannot be cut is refused by name."""

import math
from dataclasses import replace

import numpy as np
import pytest
from OCP.BRepTools import BRepTools

from moldgen.errors import KernelError, PartError
from moldgen.kernel.cells import Cells, take_out
from moldgen.kernel.measure import volume_adaptive
from moldgen.kernel.topology import vertex_point, vertices_of
from moldgen.model.layout import GateKind
from moldgen.model.tool import Motion, Role
from moldgen.steel import bores, cutting
from moldgen.steel.make import make_tool

from . import tools


def with_pins(*pins, **part):
    return tools.tool(replace(tools.PLAIN, ejector_pins=pins), **{"holes": False, **part})


def test_equal_pins_share_one_definition():
    made, _, _ = tools.tool()
    (ejectors,), (core_pins,) = made.by_role(Role.EJECTOR_PIN), made.by_role(Role.CORE_PIN)
    assert (ejectors.name, core_pins.name) == ("ejector pin", "core pin")
    assert [p[:2] for p in ejectors.positions] == [pytest.approx(at) for at in tools.RING]
    assert {p[2] for p in ejectors.positions} == {-85.0}
    assert [p[:2] for p in core_pins.positions] == [pytest.approx(at) for at in tools.HOLES]
    assert (ejectors.motion, core_pins.motion) == (Motion.EJECTOR, Motion.CORE_HALF)


def test_pins_that_differ_have_definitions_and_names_of_their_own():
    made, _, _ = with_pins(tools.ejector(1, 12, 0), tools.ejector(2, -12, 0, diameter=5.0), tools.ejector(3, 0, 12))
    assert [(c.name, len(c.positions)) for c in made.by_role(Role.EJECTOR_PIN)] == [
        ("ejector pin 1", 2),
        ("ejector pin 2", 1),
    ]


def test_tips_on_a_slope_differ_by_their_turn_and_must_not_turn():
    made, _, notes = with_pins(*(tools.ejector(i, *at) for i, at in enumerate(tools.RING, 1)), dome=2.0)
    assert len(made.by_role(Role.EJECTOR_PIN)) == 4
    (finding,) = [f for f in notes.findings if f.code == "pin.shaped_tip"]
    assert "ejector pin 4" in finding.message
    _, _, level = tools.tool()
    assert "pin.shaped_tip" not in {f.code for f in level.findings}


def test_a_tip_on_a_slope_fills_its_bore_up_to_the_cone():
    # the core's end is a cone with its point at z = 20 on the axis: its height falls by 2 over the radius of the cup
    made, bored, _ = with_pins(tools.ejector(1, 10.0, 0.0), dome=2.0)
    (pin,) = made.by_role(Role.EJECTOR_PIN)
    fall = 2.0 / (tools.INNER - tools.slope(tools.FLOOR - 2.0))
    x, y, z = pin.positions[0]
    points = np.array([vertex_point(v) for v in vertices_of(pin.solid)]) + np.array((x, y, z))
    tip = points[points[:, 2] > 0]
    assert len(tip)
    assert tip[:, 2] == pytest.approx(tools.FLOOR - fall * np.hypot(tip[:, 0], tip[:, 1]), abs=1e-7)
    # no room between tip and bore: below the fit the pin is shank and head, the bore is its wider part
    (fit,) = [h for h in made.holes if h.purpose == "ejector pin 1, fit"]
    low = fit.z_from_mm
    shank = math.pi / 4 * (16.0 * (low + 82.0) + 64.0 * 3.0)
    wider = math.pi / 4 * 4.5**2 * (low + 40.0)
    (removed,) = [r for r in bored.removed if r.purpose == "ejector pin 1"]
    assert volume_adaptive(pin.solid) - shank == pytest.approx(removed.volume_mm3 - wider, rel=1e-7)


def test_a_shank_ground_to_the_core_takes_the_cores_own_radius():
    taper = (2.1 - 2.0) / (tools.ROOF - tools.FLOOR + 2.0)
    exact = 2 * (2.1 - taper)
    pins = tuple(tools.core_pin(i, *at, diameter=exact + 0.004) for i, at in enumerate(tools.HOLES, 1))
    made, _, _ = tools.tool(replace(tools.LAYOUT, core_pins=pins))
    fits = [h.diameter_mm for h in made.holes if h.purpose.startswith("core pin") and h.fit]
    assert fits == pytest.approx([exact, exact], abs=1e-9)


def test_the_table_of_holes_lists_every_bore_from_the_tip_down():
    made, _, _ = tools.tool()
    rows = [(h.component, h.purpose, h.z_from_mm, h.z_to_mm, h.diameter_mm, h.fit) for h in made.holes]
    assert rows[:3] == [
        ("core", "core pin 1, fit", 8.0, pytest.approx(20.0), 5.0, "H7"),  # the tip stands 2 mm out of the core
        ("core", "core pin 1, clearance bore", -37.0, 8.0, 5.5, ""),
        ("core", "core pin 1, head seat", -40.0, -37.0, 10.5, ""),
    ]
    assert len(rows) == 2 * 3 + 4 * 2 + 1
    component, purpose, low, high, diameter, fit = rows[-1]
    assert (component, purpose, low, high, diameter) == ("cavity", "sprue", 0.0, 45.0, 6.0)
    assert "1 deg per side" in fit


def test_components_carry_names_and_materials():
    made, _, _ = tools.tool()
    assert [(c.name, c.material) for c in made.components] == [
        ("part", "ABS"),
        ("cavity", "1.2311"),
        ("core", "1.2311"),
        ("core pin", "1.2344"),
        ("ejector pin", "1.2344"),
        ("sprue", "ABS"),
    ]


def brep(solid, path):
    BRepTools.Write_s(solid, str(path))
    return path.read_bytes()


def test_two_runs_make_the_same_tool(tmp_path):
    one, other = (make_tool(tools.halves(), tools.LAYOUT, tools.MATERIALS) for _ in range(2))
    assert (one[0].holes, one[1], one[2]) == (other[0].holes, other[1], other[2])
    for a, b in zip(one[0].components[1:], other[0].components[1:], strict=True):
        assert brep(a.solid, tmp_path / "a") == brep(b.solid, tmp_path / "b"), a.name


REFUSED = {
    "bores that meet": (
        replace(tools.PLAIN, ejector_pins=(tools.ejector(1, 12, 0), tools.ejector(2, 12, 4.2))),
        "ejector pin 1 and ejector pin 2 meet",
    ),
    "a pin at the side of the block": (
        replace(tools.PLAIN, ejector_pins=(tools.ejector(1, 43.5, 0, tip=0.0),)),
        "leaves the block",
    ),
    "a gate off the part": (
        replace(tools.PLAIN, gate=replace(tools.edge_gate(), at=(32.0, 0.0, 0.0))),
        "does not reach the part",
    ),
    "a sprue off the block": (
        replace(tools.PLAIN, gate=replace(tools.edge_gate(), runner_length=25.0)),
        "from the side of the block",
    ),
    "a sprue that closes": (replace(tools.PLAIN, gate=tools.top_gate(GateKind.SPRUE, 1.5)), "1 mm are needed"),
    "a land as high as the block": (
        replace(tools.PLAIN, gate=tools.top_gate(GateKind.PIN, 1.0, land=30.0)),
        "leaves no room",
    ),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_does_not_fit_is_refused_with_its_name_and_a_remedy(name):
    layout, words = REFUSED[name]
    with pytest.raises(PartError) as caught:
        make_tool(tools.halves(holes=False), layout, tools.MATERIALS)
    assert words in str(caught.value)
    assert caught.value.remedy


def test_a_pin_half_over_a_wall_gets_a_fit_below_the_whole_wall():
    # the pin's face reaches over the rim of the cup at z = 0: its fit must start below that, not below the floor
    made, _, _ = with_pins(replace(tools.ejector(1, 17.0, 0), fit_length=12.0))
    (fit,) = [h for h in made.holes if h.fit == "H7"]
    assert fit.z_from_mm == pytest.approx(-12.0, abs=1e-3)


@pytest.mark.parametrize(("x", "opens"), [(14.0, False), (15.55, True), (17.0, True)])
def test_a_bore_that_opens_into_the_surface_beside_it_is_refused(monkeypatch, x, opens):
    # as if the rays had missed the wall: a short fit beside it, then the wider bore cuts through the core's side
    monkeypatch.setattr(bores, "_fit_low", lambda surface, *_: float(surface.max()) - 4.0)
    monkeypatch.setattr(cutting, "ROUGH", 1.0)
    monkeypatch.setattr(bores, "_bore_of", at_least(bores._bore_of))
    layout = replace(tools.PLAIN, ejector_pins=(tools.ejector(1, x, 0.0),))
    if not opens:
        make_tool(tools.halves(holes=False), layout, tools.MATERIALS)
        return
    with pytest.raises(PartError) as caught:
        make_tool(tools.halves(holes=False), layout, tools.MATERIALS)
    assert caught.value.where.startswith("ejector pin 1 at x")
    assert "surface of the core" in caught.value.what


def at_least(make):
    def made(pin, role, shank, steps, below, heights):
        return make(pin, role, shank, steps, below, np.maximum(heights, below.fit_low + 1.0))

    return made


def test_a_mouth_partly_off_the_part_is_reported():
    gate = replace(tools.top_gate(GateKind.SPRUE, 6.0), at=(18.0, 0.0, tools.ROOF))
    _, _, notes = tools.tool(replace(tools.PLAIN, gate=gate), holes=False)
    (finding,) = [f for f in notes.findings if f.code == "gate.partly_off"]
    assert 0.3 < finding.value < 1.0


def failing(rule):
    def take(solid, wanted, name):
        if rule(wanted):
            raise KernelError("planted")
        return take_out(solid, wanted, name)

    return take


def test_when_all_at_once_fails_pins_are_bored_one_by_one(monkeypatch):
    whole, bored, _ = tools.tool()
    monkeypatch.setattr(cutting, "take_out", failing(lambda wanted: len(wanted) > 1))
    made, again, notes = make_tool(tools.halves(), tools.LAYOUT, tools.MATERIALS)
    assert [r.volume_mm3 for r in again.removed] == pytest.approx([r.volume_mm3 for r in bored.removed], rel=1e-9)
    ours, theirs = made.only(Role.CORE).solid, whole.only(Role.CORE).solid
    assert volume_adaptive(ours) == pytest.approx(volume_adaptive(theirs), rel=1e-9)
    (decision,) = [d for d in notes.decisions if d.topic == "boring"]
    assert "planted" in decision.refused[0]


def test_a_pin_that_cannot_be_cut_is_named(monkeypatch):
    def is_third(wanted):
        low = min(vertex_point(v)[1] for v in vertices_of(wanted[0]))
        return len(wanted) > 1 or (low < -5.0 and vertex_point(vertices_of(wanted[0])[0])[0] < -5.0)

    monkeypatch.setattr(cutting, "take_out", failing(is_third))
    with pytest.raises(KernelError) as caught:
        make_tool(tools.halves(), tools.LAYOUT, tools.MATERIALS)
    assert caught.value.where == "ejector pin 3"
    assert "planted" in caught.value.what


def test_an_intersection_that_the_kernel_loses_is_noticed(monkeypatch):
    def nothing_cut(solid, wanted, name):
        done = take_out(solid, wanted, name)
        return Cells((solid,), done.plugs)

    def whole_tool(solid, wanted, name):
        done = take_out(solid, wanted, name)
        return Cells(done.rest, ((wanted[0],), *done.plugs[1:]))

    for fault, words in ((nothing_cut, "lost or doubled"), (whole_tool, "by rays")):
        monkeypatch.setattr(cutting, "take_out", fault)
        with pytest.raises(KernelError, match=words):
            make_tool(tools.halves(), tools.LAYOUT, tools.MATERIALS)
