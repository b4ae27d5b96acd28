"""The whole layout: nothing meets anything else, and core pins yield to ejector pins that would crush the part."""

import itertools
import math

import cadquery as cq
import numpy as np
import pytest

from moldgen.catalog import resin
from moldgen.layout.clearances import core_bores
from moldgen.layout.plan import Wishes, plan_layout
from moldgen.layout.view import PartView
from moldgen.model.part import MoldFrame
from moldgen.rules.layout_practice import STEEL_BETWEEN_BORES, STEEL_TO_EDGE

from .shapes import box, cup, lid, plate, view_of

SHAPES = {
    "cup": cup(),
    "lid": lid(),
    "crowded": lid(holes=((12.0, 8.0), (-12.0, 8.0), (12.0, -8.0), (-12.0, -8.0), (0.0, 0.0))),
    "box with post": box().union(cq.Workplane("XY", origin=(10, 5, 10)).circle(4).extrude(31)),
}


@pytest.mark.parametrize("resin_name", ["ABS", "PP", "PA66-GF30"])
@pytest.mark.parametrize("name", sorted(SHAPES))
def test_steel_is_left_between_everything(name, resin_name):
    view = view_of(SHAPES[name])
    layout, notes = plan_layout(view, resin(resin_name), Wishes())
    assert layout.ejector_pins
    assert "layout.thin_steel" not in {f.code for f in notes.findings}
    bores = core_bores(view, layout.core_pins, layout.ejector_pins)
    for one, other in itertools.combinations(bores, 2):
        if one.name != other.name and min(one.z_high, other.z_high) > max(one.z_low, other.z_low):
            steel = math.hypot(one.x - other.x, one.y - other.y) - one.radius - other.radius
            assert steel >= STEEL_BETWEEN_BORES.default - 1e-6
    for bore in bores:
        place = np.array([bore.x, bore.y])
        assert min((place - view.low[:2]).min(), (view.high[:2] - place).min()) - bore.radius >= STEEL_TO_EDGE.default


def test_core_pins_yield_where_they_crowd_the_ejectors():
    # a small thick part on a core pin: with the pin's head in the way only tiny ejectors would be left
    knob = cq.Workplane().circle(9.5).extrude(16).cut(cq.Workplane().circle(3.0).extrude(12))
    view = view_of(knob, cavity=lambda body: np.hypot(body.face_places[:, 0], body.face_places[:, 1]) > 9.0)
    layout, notes = plan_layout(view, resin("PP"), Wishes())
    pressure = [p.pressure_mpa for p in layout.ejector_pins]
    yielded = any("stay in the block" in d.choice for d in notes.decisions)
    assert pressure
    assert yielded == (layout.core_pins == ())


def test_findings_name_places_of_the_part():
    frame = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), ((0.0, -1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)))
    halves = view_of(cup(at=(50.0, 0.0))).halves
    _, notes = plan_layout(PartView(halves, frame), resin("ABS"), Wishes())
    (vacuum,) = [f for f in notes.findings if f.code == "ejection.vacuum"]
    # the frame turns x of the part to y of the mold: the way back turns it again
    assert vacuum.at[:2] == pytest.approx((0.0, -50.0), abs=0.1)


def test_every_number_has_a_source():
    _, notes = plan_layout(view_of(lid()), resin("ABS"), Wishes())
    assert all(q.source and q.name for q in notes.quantities)
    assert all(f.message and (f.remedy or f.code == "rule.outside_range") for f in notes.findings)


def test_a_bare_plate_gets_three_pins_or_more():
    layout, _ = plan_layout(view_of(plate(50, 30, 3)), resin("PP"), Wishes())
    assert len(layout.ejector_pins) >= 3
    assert layout.ejection_force_n == 0.0
