"""A cup with two through holes, its halves, layouts of pins and gate for it, and the tool as the proofs see it.

The cup stands open side down: floor on top, wall round it, all walls with draft. The core half forms the inside.
"""

from __future__ import annotations

import math
from dataclasses import replace
from functools import cache

import numpy as np
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCone, BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt

from moldgen.kernel.body import Body
from moldgen.kernel.topology import only_solid
from moldgen.model.halves import Halves
from moldgen.model.layout import Chooser, CorePinLayout, EjectorPinLayout, GateKind, GateLayout, Layout
from moldgen.parting.halves import part_halves
from moldgen.proof.bodies import placed_bodies
from moldgen.release.kinds import face_kinds
from moldgen.release.trapped import trapped_volume
from moldgen.steel.bored import Materials
from moldgen.steel.make import make_tool

LOW, HIGH = np.array([-45.0, -45.0, -40.0]), np.array([45.0, 45.0, 45.0])
BLOCK = float(np.prod(HIGH - LOW))
FLOOR, ROOF, INNER, OUTER = 20.0, 22.0, 18.0, 20.0
HOLES = ((8.0, 0.0), (-8.0, 0.0))
MATERIALS = Materials("ABS", "1.2311", "1.2311")


def cone(at, low, high, r_low, r_high):
    axes = gp_Ax2(gp_Pnt(*at, low), gp_Dir(0, 0, 1))
    if r_low == r_high:
        return BRepPrimAPI_MakeCylinder(axes, r_low, high - low).Solid()
    return BRepPrimAPI_MakeCone(axes, r_low, r_high, high - low).Solid()


def without(solid, *tools):
    for tool in tools:
        solid = only_solid(BRepAlgoAPI_Cut(solid, tool).Shape())
    return solid


def slope(height, degrees=1.0):
    return height * math.tan(math.radians(degrees))


@cache
def cup(*, holes=True, dome=0.0):
    """The part; with `dome` its inside ends in a truncated cone this much lower at the edge than in the middle."""
    outer = cone((0, 0), 0.0, ROOF, OUTER, OUTER - slope(ROOF))
    inner = [cone((0, 0), 0.0, FLOOR - dome, INNER, INNER - slope(FLOOR - dome))]
    if dome:
        inner.append(cone((0, 0), FLOOR - dome, FLOOR, INNER - slope(FLOOR - dome), 0.0))
    through = [cone(at, FLOOR - 1.0, ROOF + 1.0, 2.1, 2.0) for at in HOLES] if holes else []
    return without(outer, *inner, *through)


def dish():
    """A disc with draft whose walls all lie in the core half."""
    return cone((0, 0), -6.0, 0.0, OUTER - slope(6.0), OUTER)


@cache
def halves(*, holes=True, dome=0.0, disc=False):
    body = Body(dish() if disc else cup(holes=holes, dome=dome))
    kinds = face_kinds(body)
    trapped = trapped_volume(body, kinds)
    assert not trapped.pieces
    parted = part_halves(body, kinds, trapped.part, (LOW, HIGH))
    assert parted.check.proved, parted.check.complaint
    return Halves(parted.cavity, parted.core, parted.body, parted.sides.cavity, parted.level, LOW, HIGH, ())


def ejector(number, x, y, tip=FLOOR, diameter=4.0, drop=0.0):
    return EjectorPinLayout(
        name=f"ejector pin {number}", x=x, y=y, tip_z=tip, diameter=diameter, fit_length=12.0,
        clearance_diameter=diameter + 0.5, head_diameter=2 * diameter, head_height=3.0, seat_z=-85.0, length=125.0,
        force_n=100.0, pressure_mpa=8.0, buckling_n=5000.0, chosen_by=Chooser.MOLDGEN, tip_drop=drop,
    )  # fmt: skip


def shouldered(number, x, y, tip=FLOOR, drop=0.0, shank=50.0):
    """A tip of 1 mm on a shank of 2 mm; the shoulder stands `shank` over the foot."""
    plain = ejector(number, x, y, tip=tip, diameter=1.0, drop=drop)
    return replace(
        plain, fit_length=10.0, clearance_diameter=2.5, head_diameter=4.0, head_height=2.0, shank_diameter=2.0,
        shank_length=shank,
    )  # fmt: skip


def core_pin(number, x, y, diameter=5.0):
    return CorePinLayout(
        name=f"core pin {number}", x=x, y=y, top_z=ROOF, base_z=FLOOR, diameter=diameter, fit_length=12.0,
        clearance_diameter=diameter + 0.5, head_diameter=10.0, head_height=3.0, slenderness=0.5, blind=False,
        chosen_by=Chooser.MOLDGEN,
    )  # fmt: skip


def edge_gate(*, in_cavity=True, angle=0.0):
    c, s = math.cos(angle), math.sin(angle)
    return GateLayout(
        kind=GateKind.EDGE, at=(OUTER * c, OUTER * s, 0.0), inward=(-c, -s, 0.0), width=2.0, depth=1.0, land=0.75,
        diameter=0.0, runner_diameter=4.0, runner_length=12.0, sprue_foot_diameter=6.0, sprue_taper_deg=1.0,
        flow_length=60.0, chosen_by=Chooser.MOLDGEN, in_cavity=in_cavity,
    )  # fmt: skip


def top_gate(kind, diameter, x=0.0, y=0.0, land=0.75):
    return replace(
        edge_gate(), kind=kind, at=(x, y, ROOF), inward=(0.0, 0.0, -1.0), diameter=diameter, land=land,
        sprue_foot_diameter=diameter,
    )  # fmt: skip


RING = [(12.0 * math.cos(t), 12.0 * math.sin(t)) for t in np.radians([45, 135, 225, 315])]
LAYOUT = Layout(
    core_pins=tuple(core_pin(i, *at) for i, at in enumerate(HOLES, 1)),
    ejector_pins=tuple(ejector(i, *at) for i, at in enumerate(RING, 1)),
    gate=edge_gate(),
    stroke_mm=25.0,
    ejection_force_n=400.0,
)


PLAIN = replace(LAYOUT, core_pins=())
IN_CORE = replace(
    PLAIN,
    gate=edge_gate(in_cavity=False),
    ejector_pins=tuple(ejector(i, *at, tip=-6.0) for i, at in enumerate(RING, 1)),
)


@cache
def tool(layout=LAYOUT, **part):
    return make_tool(halves(**part), layout, MATERIALS)


def bodies(components):
    return placed_bodies([(c.name, c.role, c.motion, c.solid, c.positions) for c in components])
