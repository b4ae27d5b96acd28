"""Round faces along the pull and rays to a mesh, against closed forms."""

import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.kernel.body import Body
from moldgen.kernel.probe import Probe
from moldgen.kernel.round_faces import hollow_round_faces
from moldgen.kernel.topology import only_solid

from .shapes import plate


def body_of(shape):
    return Body(only_solid(shape.val().wrapped))


def test_bore_and_countersink_are_found_and_the_post_is_not():
    shape = plate(60, 40, 10).union(cq.Workplane().center(-20, 0).circle(4).extrude(20))
    shape = shape.faces("<Z").workplane().center(10, 5).cskHole(4.0, 8.0, 90.0)
    found = {f.face: f for f in hollow_round_faces(body_of(shape))}
    cone = [f for f in found.values() if abs(f.radius_low - f.radius_high) > 1e-9]
    bore = [f for f in found.values() if abs(f.radius_low - f.radius_high) <= 1e-9]
    assert len(cone) == len(bore) == 1
    assert (cone[0].radius_low, cone[0].radius_high) == pytest.approx((4.0, 2.0))
    assert (cone[0].z_low, cone[0].z_high) == pytest.approx((0.0, 2.0))
    assert bore[0].radius_low == pytest.approx(2.0)
    assert bore[0].turn == pytest.approx(2 * math.pi, rel=0.01)


def test_bore_across_the_pull_is_not_found():
    assert hollow_round_faces(body_of(plate(60, 40, 20).faces(">X").workplane().hole(6))) == []


def test_half_a_bore_covers_half_a_turn():
    shape = plate(40, 40, 10).cut(cq.Workplane().center(20, 0).circle(5).extrude(10))
    (face,) = hollow_round_faces(body_of(shape))
    assert face.turn == pytest.approx(math.pi, rel=0.01)


def test_distances_are_exact():
    probe = Probe(body_of(plate(60, 40, 10)).mesh)
    origins = np.array([[1.0, 2.0, -5.0], [100.0, 0.0, 5.0], [0.0, 0.0, 5.0]])
    distance, triangle = probe.first(origins, np.array([0.0, 0.0, 1.0]))
    assert distance == pytest.approx([5.0, math.inf, 5.0])
    assert (triangle >= 0).tolist() == [True, False, True]


def test_free_ways_stop_at_the_end():
    probe = Probe(body_of(plate(60, 40, 10)).mesh)
    starts = np.array([[0.0, 0.0, 5.0], [0.0, 0.0, 5.0]])
    ends = np.array([[20.0, 10.0, 5.0], [40.0, 0.0, 5.0]])
    assert probe.free(starts, ends).tolist() == [True, False]
