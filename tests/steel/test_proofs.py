"""The tool passes the proofs that are run on what is exported, and a planted fault fails the one that must see it."""

from dataclasses import replace

import pytest
from helpers.molding import straight

from moldgen.kernel.pins import carried
from moldgen.kernel.turned import turned_solid
from moldgen.model.layout import GateKind
from moldgen.model.tool import Motion, Role
from moldgen.proof.opening import prove_cavity_half, prove_ejection, prove_part
from moldgen.proof.rest import prove_balance, prove_rest, prove_sound

from . import tools

SHAPED = replace(tools.PLAIN, ejector_pins=tuple(tools.ejector(i, *at) for i, at in enumerate(tools.RING, 1)))
SMALL = replace(tools.LAYOUT, ejector_pins=tuple(tools.shouldered(i, *at) for i, at in enumerate(tools.RING, 1)))
TOOLS = {
    "edge gate": (tools.LAYOUT, {}),
    "edge gate askew": (replace(tools.LAYOUT, gate=tools.edge_gate(angle=0.7)), {}),
    "gate in the core half": (tools.IN_CORE, {"disc": True}),
    "pin gate": (replace(tools.LAYOUT, gate=tools.top_gate(GateKind.PIN, 1.2)), {}),
    "sprue gate": (replace(tools.LAYOUT, gate=tools.top_gate(GateKind.SPRUE, 6.0)), {}),
    "pins on a slope": (SHAPED, {"holes": False, "dome": 2.0}),
    "shouldered pins": (SMALL, {}),
}


@pytest.mark.parametrize("name", TOOLS)
def test_every_proof_passes(name):
    layout, part = TOOLS[name]
    made, bored, _ = tools.tool(layout, **part)
    bodies = tools.bodies(made.components)
    moving = straight(bodies, layout.stroke_mm)
    proofs = [
        prove_sound(bodies),
        prove_balance(bodies, tools.BLOCK, bored.total_mm3),
        prove_rest(bodies),
        prove_cavity_half(moving),
        prove_part(moving),
        prove_ejection(moving, layout.stroke_mm),
    ]
    assert [(p.name, p.figure, p.detail) for p in proofs if not p.passed] == []


def changed(role, **changes):
    made, bored, _ = tools.tool()
    components = [replace(c, **changes) if c.role is role else c for c in made.components]
    return tools.bodies(components), bored


def test_a_pin_that_is_too_long_overlaps_the_part():
    made, _, _ = tools.tool()
    (pin,) = made.by_role(Role.EJECTOR_PIN)
    bodies, _ = changed(Role.EJECTOR_PIN, positions=tuple((x, y, z + 0.3) for x, y, z in pin.positions))
    proof = prove_rest(bodies)
    assert not proof.passed
    assert "part and ejector pin" in proof.detail


@pytest.mark.parametrize(("role", "half"), [(Role.CORE, "core"), (Role.CAVITY, "cavity")])
def test_a_missing_bore_overlaps_what_should_stand_in_it(role, half):
    bodies, bored = changed(role, solid=getattr(tools.halves(), half))
    proof = prove_rest(bodies)
    assert not proof.passed
    assert proof.detail.startswith(half)
    assert not prove_balance(bodies, tools.BLOCK, bored.total_mm3).passed


def test_a_forgotten_bore_unbalances_the_volumes():
    made, bored, _ = tools.tool()
    least = min(r.volume_mm3 for r in bored.removed)
    assert not prove_balance(tools.bodies(made.components), tools.BLOCK, bored.total_mm3 - least).passed


def test_a_stroke_longer_than_the_room_drives_the_heads_into_the_core():
    made, _, _ = tools.tool()
    bodies = tools.bodies(made.components)
    room = 85.0 - 3.0 - 40.0  # from the heads' shoulders up to the bottom of the core
    assert prove_ejection(straight(bodies, room - 0.1), room - 0.1).passed
    assert not prove_ejection(straight(bodies, room + 1.0), room + 1.0).passed


def test_a_shoulder_that_runs_into_its_fit_is_seen():
    """Shoulder at 0, fit from 10 up, stroke 25: the shank meets the core on the way."""
    long = replace(SMALL, ejector_pins=tuple(replace(p, shank_length=85.0) for p in SMALL.ejector_pins))
    made, _, _ = tools.tool(long)
    assert not prove_ejection(straight(tools.bodies(made.components), long.stroke_mm), long.stroke_mm).passed
    assert prove_ejection(straight(tools.bodies(made.components), 9.0), 9.0).passed


def test_a_sprue_that_widens_upward_holds_the_cavity_half():
    layout = replace(tools.LAYOUT, gate=tools.top_gate(GateKind.PIN, 1.2))
    made, _, _ = tools.tool(layout)
    sprue = made.only(Role.SPRUE)
    assert sprue.motion is Motion.CAVITY_HALF
    stuck = [replace(c, motion=Motion.PART) if c.role is Role.SPRUE else c for c in made.components]
    assert not prove_cavity_half(straight(tools.bodies(stuck))).passed


def test_a_pin_beside_its_bore_is_seen():
    made, _, _ = tools.tool()
    aside = [
        replace(c, solid=carried(c.solid, (0.2, 0.0, 0.0))) if c.role is Role.CORE_PIN else c for c in made.components
    ]
    assert not prove_rest(tools.bodies(aside)).passed


def test_a_thick_pin_in_a_thin_bore_is_seen():
    thick = turned_solid((0.0, 0.0), [(2.1, 0.0), (2.1, 105.0)])
    bodies, _ = changed(Role.EJECTOR_PIN, solid=thick)
    assert not prove_rest(bodies).passed
