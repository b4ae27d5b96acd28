"""Parting lines that are hard to part along, and simple shapes in any direction: proved halves, or the exact reason."""

import math
from functools import cache

import cadquery as cq
import numpy as np
import pytest
from helpers import solids
from helpers.molding import mold

from moldgen.errors import PartError
from moldgen.kernel.topology import directed_points, only_solid
from moldgen.model.part import MoldFrame
from moldgen.parting.surface import Rung
from moldgen.parting.told import steel_contacts, told

STILL = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)))
WAVE = [2, 6, 10, 5, 2, 4]


def pulled_along(solid, direction):
    """The solid turned so that a direction of it points along +z."""
    d = np.asarray(direction, float) / np.linalg.norm(direction)
    about = np.cross(d, [0.0, 0.0, 1.0])
    sine = float(np.linalg.norm(about))
    if sine < 1e-12:
        return solid
    return solids.turned(solid, math.degrees(math.atan2(sine, d[2])), tuple(about / sine))


def hollow(lean, tool):
    """A drafted hollow box, open below, without a tool."""
    box = cq.Workplane("XY").rect(50, 40).extrude(20, taper=lean)
    return only_solid(box.cut(cq.Workplane("XY").rect(46, 36).extrude(18, taper=lean)).cut(tool).val().wrapped)


def on_ramp(outline, ramp):
    """A drafted prism whose lower face follows a ramp."""
    body = cq.Workplane("XY").polyline(outline).close().extrude(18, taper=2)
    below = cq.Workplane("XZ").polyline([(-9, -9), *ramp, (70, -9)]).close().extrude(-90).translate((0, -10, 0))
    return only_solid(body.cut(below).val().wrapped)


def wavy_sheet():
    below = solids.shifted(solids.under_curve(WAVE, 80, 42, floor=-20), 0, -1, -2)
    sheet = solids.cut(solids.under_curve(WAVE, 80, 40), below)
    return solids.cut(sheet, solids.cylinder(6, 60, at=(20, 20, -20)), solids.box((50, 10, -20), (60, 30, 30)))


def loft():
    end = cq.Workplane("YZ").ellipse(8, 5).workplane(offset=20).transformed(rotate=(0, 0, 25)).ellipse(11, 6)
    return only_solid(end.workplane(offset=20).circle(5).loft().val().wrapped)


def spiral():
    path = cq.Workplane(obj=cq.Wire.makeHelix(pitch=10, height=8, radius=20))
    return only_solid(cq.Workplane("XZ").center(20, 0).rect(8, 3).sweep(path).val().wrapped)


L_RIM = [(0, 0), (60, 0), (60, 25), (25, 25), (25, 60), (0, 60)]
U_RIM = [(0, 0), (60, 0), (60, 50), (42, 50), (42, 20), (18, 20), (18, 50), (0, 50)]

PARTS = {
    # part: (how to make it, rung of the outer loop, rungs of the shut-offs)
    "inside corner on a ramp": (lambda: on_ramp(L_RIM, [(-9, 0), (15, 0), (35, 6), (70, 6)]), Rung.LAND, []),
    "line that doubles back": (lambda: on_ramp(U_RIM, [(-9, 0), (20, 0), (40, 6), (70, 6)]), Rung.LAND, []),
    "two slots facing each other": (lambda: hollow(2, cq.Workplane("XY").rect(6, 60).extrude(12)), Rung.LAND, []),
    "half bores in the rim": (
        lambda: hollow(2, cq.Workplane("XZ").circle(5).extrude(30, both=True)),
        Rung.LAND,
        [],
    ),
    "wavy sheet with holes": (wavy_sheet, Rung.LAND, [Rung.LID] * 2),
    "tilted ring": (lambda: pulled_along(solids.torus(20, 6), (0.2, 0.1, 1)), Rung.LAND, [Rung.LID]),
    "loft": (loft, Rung.LAND, []),
    "spiral ramp": (spiral, Rung.LAND, []),
}


@cache
def molded(name):
    return mold(PARTS[name][0](), margin=20.0)


@pytest.mark.parametrize("name", PARTS)
def test_a_hard_rim_gives_two_proved_halves(name):
    made = molded(name).parted
    assert made.check.proved, made.check.complaint
    assert made.sheet.outer.rung is PARTS[name][1], made.sheet.outer.refused
    assert [s.rung for s in made.sheet.shut_offs] == PARTS[name][2], [s.refused for s in made.sheet.shut_offs]


@pytest.mark.parametrize("name", ["inside corner on a ramp", "wavy sheet with holes", "tilted ring", "loft"])
def test_a_land_where_nothing_stands_upright_leans_by_its_wall(name):
    contacts = steel_contacts(molded(name).parted, STILL)
    assert contacts[0].name == "parting surface"
    assert contacts[0].land_mm == 8.0
    # 15 deg is the lean of the wall; square to a line that rises as well it may be a little steeper
    assert all(14.0 < c.least_deg < 15.5 for c in contacts)
    assert all(c.upright_mm2 == 0.0 for c in contacts)
    assert told(molded(name).parted, STILL).findings == ()


def test_upright_steps_in_a_rim_are_told_with_their_angle():
    made = molded("two slots facing each other").parted
    (contact,) = steel_contacts(made, STILL)
    assert contact.least_deg < 2.0  # the walls of the slots lean by 2 deg one way, and not at all the other
    assert {f.code for f in told(made, STILL).findings} <= {"parting.no_draft", "parting.steep"}
    assert told(made, STILL).findings


def test_a_line_over_itself_in_projection_is_refused_with_the_place():
    # a screw flight of more than one turn lies over itself
    path = cq.Workplane(obj=cq.Wire.makeHelix(pitch=20, height=24, radius=20))
    flight = only_solid(cq.Workplane("XZ").center(20, 0).rect(8, 3).sweep(path).val().wrapped)
    with pytest.raises(PartError) as caught:
        assert mold(flight, margin=20.0).parted.check.proved
    assert "crosses itself in projection near" in caught.value.what


def test_a_bore_whose_axis_lies_in_the_parting_plane_needs_more_than_two_halves():
    bar = solids.cut(
        solids.cylinder(10, 40, at=(-20, 0, 0), along=(1, 0, 0)),
        solids.cylinder(3, 40, at=(0, -20, 0), along=(0, 1, 0)),
    )
    with pytest.raises(PartError):
        assert mold(bar).parted.check.proved


# --- any direction ----------------------------------------------------------------------------------------------------

SHAPES = {
    "ball": solids.sphere(10),
    "cylinder": solids.cylinder(8, 30),
    "block": solids.box((0, 0, 0), (40, 30, 20)),
    "wedge": solids.extruded([(0, 0, 0), (40, 0, 0), (0, 0, 20)], (0, 25, 0)),
    "cone": solids.cone(15, 6, 25),
    "pointed cone": solids.cone(15, 0.0, 25),
}


def directions(count):
    """Directions spread over the sphere, always the same (golden spiral, its poles left out)."""
    z = 1.0 - 2.0 * (np.arange(count) + 0.5) / count
    turn = np.pi * (1.0 + math.sqrt(5.0)) * (np.arange(count) + 0.5)
    r = np.sqrt(1.0 - z * z)
    return np.column_stack([r * np.cos(turn), r * np.sin(turn), z])


@pytest.mark.parametrize("number", range(4))
@pytest.mark.parametrize("name", SHAPES)
def test_a_convex_shape_parts_in_any_direction(name, number):
    made = mold(pulled_along(SHAPES[name], directions(4)[number]), margin=20.0).parted
    assert made.check.proved, (made.check.complaint, made.refused)
    assert made.sheet.outer.rung in (Rung.PLANE, Rung.LAND)


def test_a_turned_block_has_a_hexagon_for_its_line():
    made = mold(pulled_along(SHAPES["block"], (1, 2, 3)), margin=20.0).parted
    corners = made.loops[made.outer]
    assert len({tuple(np.round(p, 6)) for p in map(_start, corners)}) >= 6
    heights = [_start(e)[2] for e in corners]
    assert max(heights) - min(heights) > 10.0


def _start(edge):
    return directed_points(edge, 2)[0]
