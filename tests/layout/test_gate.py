"""The gate: where it goes, against flow lengths in closed form; sizes against their rules; refusals with reasons."""

import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.flow_paths import find_flow_paths
from moldgen.layout.gate import place_gate
from moldgen.model.layout import GateKind
from moldgen.rules.filling import flow_length_limit, round_shear_rate, slot_shear_rate
from moldgen.rules.gate import edge_gate_depth_pye
from moldgen.spec.sections import Gate

from .shapes import box, channel, cup, faces_at, lid, plate, view_of

ABS = resin("ABS")


def codes(notes):
    return {f.code for f in notes.findings}


@pytest.mark.parametrize(("x", "y"), [(0, 0), (40, 20), (-40, 0)])
def test_flow_over_a_plate_is_the_straight_distance(x, y):
    paths = find_flow_paths(view_of(plate(80, 40, 2)))
    (flow,), _ = paths.longest(np.array([[x, y, 1.0]], float), through=8)
    assert flow == pytest.approx(math.hypot(40 + abs(x), 20 + abs(y)), rel=0.06)


def test_flow_goes_round_a_slot():
    slit = plate(80, 40, 2).cut(cq.Workplane().center(0, -5).rect(1.0, 30.1).extrude(2))
    paths = find_flow_paths(view_of(slit))
    (flow,), _ = paths.longest(np.array([[-40.0, -20.0, 1.0]]), through=8)
    # from corner to corner over the end of the slot
    way = math.hypot(39.5, 30) + math.hypot(39.5, 30)
    assert flow == pytest.approx(way, rel=0.06)


def test_flow_crosses_the_wall_of_a_cup_only_along_it():
    paths = find_flow_paths(view_of(cup()))
    (flow,), _ = paths.longest(np.array([[0.0, 0.0, 41.0]]), through=8)
    assert flow == pytest.approx(21.0 + 41.0, rel=0.06)


def test_edge_gate_of_a_strip_is_in_the_middle_of_its_long_side():
    gate, notes = place_gate(view_of(plate(120, 30, 3)), Gate(), ABS)
    assert gate.kind is GateKind.EDGE
    assert gate.at[0] == pytest.approx(0.0, abs=3.0)
    assert abs(gate.at[1]) == pytest.approx(15.0, abs=1e-6)
    assert gate.inward == pytest.approx((0.0, -np.sign(gate.at[1]), 0.0), abs=1e-6)
    assert gate.flow_length == pytest.approx(math.hypot(60, 30), rel=0.06)
    assert not notes.findings


@pytest.mark.parametrize("shape", [plate(50, 30, 2), box(), channel(), lid()], ids=["plate", "box", "channel", "lid"])
def test_runner_and_sprue_stand_free_inside_the_block(shape):
    view = view_of(shape)
    gate, _ = place_gate(view, Gate(kind="edge"), ABS)
    way = np.array(gate.inward[:2])
    sprue = np.array(gate.at[:2]) - (gate.land + gate.runner_length) * way
    assert np.hypot(*way) == pytest.approx(1.0)
    turn = np.linspace(0, 2 * np.pi, 25)
    rim = sprue + gate.sprue_foot_diameter / 2 * np.column_stack([np.cos(turn), np.sin(turn)])
    assert not np.isfinite(view.underside(rim)[0]).any()
    assert (rim > view.low[:2]).all()
    assert (rim < view.high[:2]).all()


def test_edge_gate_enters_where_the_part_stands_over_the_plane():
    view = view_of(box())
    gate, _ = place_gate(view, Gate(), ABS)
    assert gate.in_cavity
    assert gate.at[2] == pytest.approx(view.level)
    start = np.array(gate.at) - 0.5 * np.array(gate.inward) + [0.0, 0.0, 0.9 * gate.depth]
    distance, _ = view.probe.first(start[None], np.array(gate.inward))
    assert distance[0] == pytest.approx(0.5, abs=0.05)


def test_part_under_the_plane_is_gated_from_the_core_half():
    sunk = plate(50, 30, 3).translate((0, 0, -3))
    view = view_of(sunk, cavity=lambda body: body.face_places[:, 2] > -1e-6)
    gate, _ = place_gate(view, Gate(kind="edge"), ABS)
    assert not gate.in_cavity


def test_round_deep_part_is_gated_in_its_middle():
    gate, notes = place_gate(view_of(cup()), Gate(), ABS)
    assert gate.kind in (GateKind.PIN, GateKind.SPRUE)
    assert gate.at == pytest.approx((0.0, 0.0, 42.0), abs=1e-3)
    assert gate.inward == (0.0, 0.0, -1.0)
    assert "round and deep" in notes.decisions[0].why


@pytest.mark.parametrize("kind", ["edge", "pin", "sprue"])
def test_the_kind_asked_for_is_taken(kind):
    gate, _ = place_gate(view_of(box()), Gate(kind=kind), ABS)
    assert gate.kind == kind
    assert (gate.width > 0, gate.depth > 0) == (kind == "edge", kind == "edge")
    assert (gate.diameter > 0) == (kind != "edge")


def test_edge_gate_is_sized_by_its_rule():
    gate, notes = place_gate(view_of(plate(80, 40, 2)), Gate(), ABS)
    assert gate.depth == pytest.approx(edge_gate_depth_pye(ABS.gate_factor, 2.0), abs=0.05)
    rate = next(q.value for q in notes.quantities if "volume" in q.name) / 1.0  # a wall of 2 mm fills in 1 s
    assert slot_shear_rate(rate, gate.width, gate.depth) <= ABS.shear_limit


def test_pin_gate_keeps_the_shear_limit():
    gate, notes = place_gate(view_of(box()), Gate(kind="pin"), ABS)
    rate = next(q.value for q in notes.quantities if "volume" in q.name)
    assert round_shear_rate(rate, gate.diameter) <= ABS.shear_limit


def test_given_sizes_are_kept_and_their_shear_is_told():
    gate, notes = place_gate(view_of(box()), Gate(kind="edge", width=0.8, depth=0.4, land=1.0), ABS)
    assert (gate.width, gate.depth, gate.land) == (0.8, 0.4, 1.0)
    (finding,) = [f for f in notes.findings if f.code == "gate.shear"]
    assert finding.value > finding.limit


def test_gate_prefers_the_thick_end():
    wedge = (
        cq.Workplane("XZ").polyline([(-40, 0), (40, 0), (40, 4), (-40, 1.5)]).close().extrude(60).translate((0, 30, 0))
    )
    gate, _ = place_gate(view_of(wedge), Gate(kind="edge"), ABS)
    assert gate.at[0] > 0


def test_marked_faces_stay_without_a_gate():
    view = view_of(plate(120, 30, 3))
    long_sides = faces_at(view, lambda x, y, z: abs(abs(y) - 15) < 1e-6)
    gate, _ = place_gate(view, Gate(kind="edge"), ABS, no_gate=long_sides)
    assert abs(gate.at[0]) == pytest.approx(60.0)


def test_a_given_place_is_taken_as_near_as_a_gate_can_be():
    gate, notes = place_gate(view_of(box()), Gate(), ABS, at=(20.0, -22.0, 0.0))
    assert gate.kind is GateKind.EDGE
    assert np.hypot(gate.at[0] - 20.0, gate.at[1] + 22.0) < 1.5
    assert "gate.moved" not in codes(notes)


def test_a_given_place_on_top_makes_a_gate_from_above():
    gate, notes = place_gate(view_of(box()), Gate(), ABS, at=(10.0, 5.0, 42.0))
    assert gate.kind in (GateKind.PIN, GateKind.SPRUE)
    assert gate.at == pytest.approx((10.0, 5.0, 42.0))
    assert "gate.moved" not in codes(notes)


def test_a_place_off_the_part_is_told_with_its_distance():
    _, notes = place_gate(view_of(box()), Gate(kind="edge"), ABS, at=(0.0, -60.0, 0.0))
    (finding,) = [f for f in notes.findings if f.code == "gate.moved"]
    assert finding.value == pytest.approx(38.0, abs=0.5)


def test_a_gate_over_a_hole_fails():
    ring = plate(60, 60, 3).faces(">Z").workplane().hole(20)
    _, notes = place_gate(view_of(ring), Gate(kind="pin"), ABS, at=(0.0, 0.0, 3.0))
    assert "gate.bad_place" in codes(notes)


def test_without_room_for_a_runner_the_gate_comes_from_above():
    gate, notes = place_gate(view_of(box(), pad=12.0), Gate(), ABS)
    assert gate.kind in (GateKind.PIN, GateKind.SPRUE)
    assert "runner" in notes.decisions[-1].refused[0]


def test_an_edge_gate_asked_for_without_room_fails_with_the_reason():
    _, notes = place_gate(view_of(box(), pad=12.0), Gate(kind="edge"), ABS)
    (finding,) = [f for f in notes.findings if f.code == "gate.bad_place"]
    assert "runner" in finding.message


def test_too_long_a_flow_is_told_with_its_limit():
    _, notes = place_gate(view_of(plate(400, 20, 1.0)), Gate(), ABS)
    (finding,) = [f for f in notes.findings if f.code == "gate.flow_length"]
    assert finding.limit == pytest.approx(flow_length_limit(ABS.flow_ratio, 1.0), abs=0.1)
    assert finding.value > finding.limit


def test_two_runs_agree_to_the_last_digit():
    assert place_gate(view_of(lid()), Gate(), ABS)[0] == place_gate(view_of(lid()), Gate(), ABS)[0]
