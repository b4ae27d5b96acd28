"""The mouth of a gate: what the part has room for, and that a gate which moldgen places itself never misses it."""

import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.finding import Severity
from moldgen.layout.gate import place_gate
from moldgen.layout.gate_size import melt_of, size_edge
from moldgen.layout.mouth import ACROSS, STRAIGHT, open_share, room_for_gates
from moldgen.model.layout import GateKind
from moldgen.spec.sections import Gate

from .shapes import box, plate, view_of

ABS = resin("ABS")
ALL = np.ones((1, ACROSS), dtype=bool)


def codes(notes):
    return {f.code for f in notes.findings}


def room(view, at, inward, wanted):
    found, above = room_for_gates(view, np.array([at]), np.array([inward]), np.array([wanted]), ALL)
    return found[0], above[0]


def mouth(view, gate):
    """Return the share of a gate's mouth that opens into the part, by rays that the gate's own search did not send."""
    way, side = np.array(gate.inward), np.cross(gate.inward, (0.0, 0.0, 1.0))
    u, v = (g.ravel() for g in np.meshgrid(np.linspace(-0.49, 0.49, 31), np.linspace(0.02, 0.98, 17)))
    sign = 1.0 if gate.in_cavity else -1.0
    start = np.array(gate.at) - 2.0 * way + (u * gate.width)[:, None] * side
    start[:, 2] += sign * v * gate.depth
    distance, _ = view.probe.first(start, way)
    return float((np.abs(distance - 2.0) < 1.0).mean())


def gear(tooth, gap=2.0, radius=18.0, height=3.0):
    """A disc with straight teeth all round: an edge gate fits nowhere but on the end of a tooth."""
    count = int(2 * math.pi * radius / (tooth + gap))
    body = cq.Workplane().circle(radius - 3.0).extrude(height)
    bar = cq.Workplane().center(radius / 2 + 1.0, 0).rect(radius - 2.0, tooth).extrude(height)
    for number in range(count):
        body = body.union(bar.rotate((0, 0, 0), (0, 0, 1), 360.0 * number / count))
    return body


def flanged():
    """A block of 8 mm on a flange that stands 1 mm over the parting plane."""
    return plate(60, 40, 1.0).union(plate(50, 30, 8.0))


def test_depth_ends_where_the_side_of_the_part_does():
    view = view_of(plate(60, 40, 1.0))
    (width, depth), above = room(view, (0.0, -20.0, 0.0), (0.0, 1.0), (3.0, 2.0))
    assert (width, depth, above) == (3.0, 1.0, True)


def test_a_wall_under_the_plane_is_fed_from_the_core_half():
    view = view_of(plate(60, 40, 4.0).translate((0, 0, -3)), cavity=lambda body: body.face_places[:, 2] > -2.9)
    (_, depth), above = room(view, (0.0, -20.0, 0.0), (0.0, 1.0), (3.0, 2.0))
    assert (depth, above) == (2.0, False)


def test_width_ends_where_the_side_of_the_part_does():
    view = view_of(gear(2.0, 3.0))
    (width, depth), _ = room(view, (18.0, 0.0, 0.0), (-1.0, 0.0), (4.5, 1.0))
    assert 4.5 * 3 / ACROSS - 1e-9 <= width <= 2.0
    assert depth == 1.0


def test_a_cylinder_is_met_as_far_as_its_sagitta_allows():
    view = view_of(cq.Workplane().circle(5).extrude(6))
    (width, _), _ = room(view, (0.0, -5.0, 0.0), (0.0, 1.0), (9.0, 2.0))
    limit = 2 * math.sqrt(5**2 - (5 - STRAIGHT) ** 2)  # the chord with this sagitta
    assert limit - 2 * 9.0 / ACROSS <= width <= limit + 9.0 / ACROSS


def test_the_share_of_a_mouth_is_that_of_its_area():
    view = view_of(plate(60, 40, 1.0))
    share = open_share(view, np.array([[0.0, -20.0, 0.0]]), np.array([[0.0, 1.0]]), np.array([[2.0, 2.0]]), 3.0)
    assert share[0] == pytest.approx(0.5, abs=0.05)


@pytest.mark.parametrize("tooth", [1.2, 2.0, 3.5])
def test_the_whole_mouth_of_a_gate_on_a_tooth_opens_into_it(tooth):
    view = view_of(gear(tooth))
    gate, notes = place_gate(view, Gate(kind="edge"), ABS)
    assert mouth(view, gate) == 1.0
    assert gate.width <= tooth
    assert "gate.bad_place" not in codes(notes)


def test_a_smaller_gate_than_the_rules_want_is_told():
    view = view_of(gear(0.9))
    gate, notes = place_gate(view, Gate(kind="edge"), ABS)
    (finding,) = [f for f in notes.findings if f.code == "gate.small_mouth"]
    assert f"{gate.width:g} x {gate.depth:g} mm" in finding.message
    assert gate.depth <= gate.width
    assert mouth(view, gate) == 1.0


def test_a_gate_is_no_deeper_than_its_runner_nor_twice_as_wide():
    view = view_of(plate(40, 40, 12))
    melt, _ = melt_of(view, ABS)
    size, _ = size_edge(Gate(), ABS, melt, 12.0, 30.0)
    gate, _ = place_gate(view, Gate(kind="edge"), ABS)
    assert size.depth == gate.depth == gate.runner_diameter
    assert gate.width <= 2 * gate.runner_diameter


def test_a_given_size_without_room_fails_and_is_kept():
    view = view_of(flanged())
    gate, notes = place_gate(view, Gate(kind="edge", depth=2.5), ABS)
    (finding,) = [f for f in notes.findings if f.code == "gate.bad_place"]
    assert finding.severity is Severity.FAILURE
    assert "mouth" in finding.message
    assert gate.depth <= 2.5


def test_without_a_side_the_gate_comes_from_above():
    """Two cones on each other: the parting line is a knife edge that no edge gate can enter."""
    lens = cq.Workplane("XZ").polyline([(0, -4), (20, 0), (0, 4)]).close().revolve(360, (0, 0), (0, 1))
    view = view_of(lens)
    gate, notes = place_gate(view, Gate(), ABS)
    assert gate.kind in (GateKind.PIN, GateKind.SPRUE)
    assert gate.at[2] > 3.0
    assert notes.decisions[-1].refused[0].startswith("edge: ")


@pytest.mark.parametrize("kind", ["auto", "pin", "sprue"])
def test_a_gate_from_above_stands_on_a_narrow_part(kind):
    """A square frame of 2 mm: its middle is empty, and no place is wide enough for a sprue."""
    ring = plate(40, 40, 3).cut(plate(36, 36, 3))
    view = view_of(ring)
    gate, notes = place_gate(view, Gate(kind=kind), ABS)
    if gate.kind is not GateKind.EDGE:
        height, _ = view.topside(np.array([gate.at[:2]]))
        assert height[0] == pytest.approx(gate.at[2]) == pytest.approx(3.0)
    assert ("gate.bad_place" in codes(notes)) == (kind == "sprue")


def test_in_cavity_is_a_plain_bool():
    gate, _ = place_gate(view_of(box()), Gate(), ABS)
    assert type(gate.in_cavity) is bool
