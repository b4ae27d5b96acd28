"""Sizes of gate, runner and sprue, by the rules; sizes of the spec are kept and checked."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Finding, Notes, Severity
from moldgen.layout.kept import KeptFeed
from moldgen.layout.view import PartView
from moldgen.model.accepted import SNAP
from moldgen.quantity import Quantity
from moldgen.rules.filling import fill_time, flow_length_limit, round_shear_rate, slot_shear_rate
from moldgen.rules.gate import (
    edge_gate_depth_pye,
    edge_gate_width_min,
    edge_gate_width_pye,
    pin_gate_diameter_pye,
    round_gate_diameter_min,
    sprue_diameter_menges,
)
from moldgen.rules.layout_practice import GATE_OVER_RUNNER, PIN_GATE_LEAST, SPRUE_ORIFICE
from moldgen.rules.practice import GATE_LAND, SPRUE_TAPER
from moldgen.rules.runner import runner_diameter_pye
from moldgen.rules.sheet import given, measured
from moldgen.spec.sections import Gate

THINNEST, THICKEST = 0.3, 8.0
"""mm: walls outside this range are sized as if they were at its ends."""

CUTTER = 0.5
"""mm: step of runner diameters."""

RUNNER_RANGE = (3.0, 10.0)
"""mm: runner diameters in use (Pye: 2 to 10; below 3 is common practice for the smallest parts only)."""


@dataclass(frozen=True)
class Melt:
    """What flows: volume of the part [mm^3], rate [mm^3/s], mass [g], area that the cavity half forms [mm^2]."""

    volume: float
    rate: float
    mass: float
    area: float


@dataclass(frozen=True)
class GateSize:
    """Sizes of a gate [mm]; those that its kind does not have are 0. foot : of the sprue."""

    width: float
    depth: float
    land: float
    diameter: float
    runner: float
    foot: float


def melt_of(view: PartView, resin: Resin) -> tuple[Melt, Notes]:
    """Return what must flow through the gate, and in which time."""
    p = view.mesh.corners
    volume = float((p[:, 0] * np.cross(p[:, 1], p[:, 2])).sum() / 6.0)
    area = float(view.body.triangle_areas[~view.core_side].sum()) or float(view.body.triangle_areas.sum())
    time = fill_time.line("injection rate", sized(view.wall))
    lines = (
        measured("volume of the part in the mold", volume, "mm^3", "gate, runner"),
        measured("area that the cavity half forms", area, "mm^2", "gate"),
        measured(
            "usual wall of the part", view.wall, "mm", "gate, flow length", how="rays through the wall, median by area"
        ),
        time,
    )
    return Melt(volume, volume / time.value, volume * resin.melt_density / 1000.0, area), Notes(quantities=lines)


def sized(wall: float) -> float:
    """Return a wall thickness within the range that the rules can work with [mm]."""
    return min(max(wall, THINNEST), THICKEST)


def wanted_edge(section: Gate, resin: Resin, melt: Melt, walls: np.ndarray, feed: KeptFeed | None = None) -> np.ndarray:
    """Return width and depth that an edge gate into walls (k,) [mm] wants: by the rules, as far as the runner feeds it.

    (k, 2) [mm]; what the spec gives is kept. feed : of an accepted gate
    """
    runner, _ = _runner(melt, feed)
    values, number = np.unique(np.round(np.clip(walls, THINNEST, THICKEST), 2), return_inverse=True)
    sizes = [_edge_size(section, resin, melt, float(wall), runner)[:2] for wall in values]
    return np.array(sizes).reshape(-1, 2)[number.ravel()]


def _edge_size(
    section: Gate, resin: Resin, melt: Melt, wall: float, runner: float
) -> tuple[float, float, list[Quantity]]:
    depth_line = edge_gate_depth_pye.line("depth of the gate", resin.gate_factor, wall)
    width_line = edge_gate_width_pye.line("width of the gate", resin.gate_factor, melt.area)
    depth = _up(min(depth_line.value, runner)) if section.depth is None else section.depth
    shear_line = edge_gate_width_min.line("width of the gate", melt.rate, depth, resin.shear_limit)
    width = max(width_line.value, shear_line.value, depth)
    width = _up(min(width, GATE_OVER_RUNNER.default * runner)) if section.width is None else section.width
    return width, depth, [depth_line, width_line, shear_line]


def size_edge(
    section: Gate,
    resin: Resin,
    melt: Melt,
    wall: float,
    height: float,
    room: tuple[float, float] | None = None,
    feed: KeptFeed | None = None,
) -> tuple[GateSize, Notes]:
    """Return the sizes of an edge gate.

    Parameters
    ----------
    wall : of the part at the gate [mm]
    height : of the cavity's depth over the parting plane, from the plane to the nozzle [mm]
    room : width and depth of the mouth that the part has room for there [mm]; None for enough
    feed : of an accepted gate: its runner and the foot of its sprue stay where they are wide enough
    """
    runner, more = _runner(melt, feed)
    width, depth, lines = _edge_size(section, resin, melt, sized(wall), runner)
    small: tuple[Finding, ...] = ()
    if room is not None and (width > room[0] + 1e-9 or depth > room[1] + 1e-9):
        wanted = f"{width:g} x {depth:g} mm"
        width, depth = min(width, _down(room[0])), min(depth, _down(room[1]))
        depth = min(depth, width) if section.depth is None else depth
        small = (_smaller(width, depth, wanted),)
    lines += [
        given(f"{k} of the gate", v, "mm", "gate", where=f"gate.{k}")
        for k, v in (("width", section.width), ("depth", section.depth))
        if v is not None
    ]
    shear = slot_shear_rate.line("shear of the melt in the gate", melt.rate, width, depth)
    foot = _sprue_foot(height, runner, feed)
    lines += [GATE_OVER_RUNNER.line("width of the gate"), shear]
    notes = Notes((*small, *_sheared(shear, resin)), quantities=tuple(lines)) + more
    land, more = _land(section)
    return GateSize(width, depth, land, 0.0, runner, foot), notes + more


def _sprue_foot(height: float, runner: float, feed: KeptFeed | None) -> float:
    """Return the foot of a sprue `height` long [mm]; that of an accepted one while its orifice is a usual one."""
    widens = 2 * height * math.tan(math.radians(SPRUE_TAPER.default))
    usual, kept = max(SPRUE_ORIFICE.default + widens, runner), 0.0 if feed is None else feed.foot
    enough = max(SPRUE_ORIFICE.low + widens, runner) - SNAP <= kept <= max(SPRUE_ORIFICE.high + widens, runner) + SNAP
    return kept if enough and abs(kept - usual) > SNAP else usual


def _smaller(width: float, depth: float, wanted: str) -> Finding:
    return Finding(
        "gate.small_mouth",
        Severity.CAUTION,
        f"the gate is {width:g} x {depth:g} mm, by the rules it should be {wanted}: the side of the part has no room "
        "for more",
        where="gate",
        value=depth,
        unit="mm",
        remedy="watch filling and packing, or give the part a flat side for the gate",
    )


def size_pin(section: Gate, resin: Resin, melt: Melt, wall: float, share: float = 1.0) -> tuple[GateSize, Notes]:
    """Return the sizes of a pin gate into a wall [mm]; `share` of what the rules want where there is no room for it."""
    wall = sized(wall)
    by_pye = pin_gate_diameter_pye.line("diameter of the gate", resin.gate_factor, wall, melt.area)
    by_shear = round_gate_diameter_min.line("diameter of the gate", melt.rate, resin.shear_limit)
    usual = max(by_pye.value, by_shear.value)
    diameter = (
        _up(max(share * usual, min(usual, PIN_GATE_LEAST.default))) if section.diameter is None else section.diameter
    )
    shear = round_shear_rate.line("shear of the melt in the gate", melt.rate, diameter)
    land, more = _land(section)
    notes = Notes(_sheared(shear, resin), quantities=(by_pye, by_shear, shear)) + more
    if section.diameter is not None:
        notes += Notes(quantities=(given("diameter of the gate", diameter, "mm", "gate", where="gate.diameter"),))
    return GateSize(0.0, 0.0, land, diameter, 0.0, diameter), notes


def size_sprue(section: Gate, resin: Resin, melt: Melt, wall: float, height: float) -> tuple[GateSize, Notes]:
    """Return the sizes of a direct sprue `height` long [mm] onto a wall [mm]."""
    wall = sized(wall)
    rule = sprue_diameter_menges.line("foot of the sprue", wall)
    least = SPRUE_ORIFICE.default + 2 * height * math.tan(math.radians(SPRUE_TAPER.default))
    foot = _up(max(rule.value, least)) if section.diameter is None else section.diameter
    shear = round_shear_rate.line("shear of the melt in the sprue", melt.rate, foot)
    findings = _sheared(shear, resin)
    if foot > 2.0 * wall + 1e-9:
        findings += (
            Finding(
                "gate.thick_sprue",
                Severity.CAUTION,
                f"a sprue foot of {foot:.2f} mm on a wall of {wall:.2f} mm leaves a sink mark",
                value=round(foot, 3),
                limit=round(2 * wall, 3),
                unit="mm",
                remedy="a pin gate, an edge gate, or a thicker pad at the sprue",
            ),
        )
    lines = (rule, SPRUE_ORIFICE.line("foot of the sprue"), SPRUE_TAPER.line("sprue"), shear)
    return GateSize(0.0, 0.0, 0.0, foot, 0.0, foot), Notes(findings, quantities=lines)


def check_flow(view: PartView, resin: Resin, length: float, end: tuple[float, float, float]) -> Notes:
    """Return the flow length against what the resin can flow, with a finding when it is too long."""
    limit = flow_length_limit.line("place of the gate", resin.flow_ratio, sized(view.wall))
    how = "shortest ways inside the plastic, halfway through the wall"
    lines = (measured("longest flow from the gate", length, "mm", "place of the gate", how=how), limit)
    if length <= limit.value:
        return Notes(quantities=lines)
    finding = Finding(
        "gate.flow_length",
        Severity.WARNING,
        f"the melt must flow {length:.0f} mm, in a wall of {view.wall:.2f} mm it reaches about {limit.value:.0f} mm",
        where="farthest place from the gate",
        at=view.place(end),
        value=round(length, 1),
        limit=round(limit.value, 1),
        unit="mm",
        remedy="a gate nearer to the middle (pin or sprue), a thicker wall, or a resin that flows farther",
    )
    return Notes((finding,), quantities=lines)


def _land(section: Gate) -> tuple[float, Notes]:
    if section.land is None:
        return GATE_LAND.default, Notes(quantities=(GATE_LAND.line("gate"),))
    return section.land, Notes(quantities=(given("land of the gate", section.land, "mm", "gate", where="gate.land"),))


def _runner(melt: Melt, feed: KeptFeed | None = None, length: float = 12.0) -> tuple[float, Notes]:
    """Return the diameter of the runner; that of an accepted one while the rule asks for no more."""
    line = runner_diameter_pye.line("runner", max(melt.mass, 1e-3), length)
    least, most = RUNNER_RANGE
    kept = 0.0 if feed is None else feed.runner
    if min(max(line.value, least), most) - SNAP <= kept <= most + SNAP:
        return kept, Notes(quantities=(line,))
    diameter = math.ceil(line.value / CUTTER - 1e-9) * CUTTER
    return min(max(diameter, least), most), Notes(quantities=(line,))


def _up(value: float) -> float:
    """Round up to a twentieth of a millimeter: what a shop grinds to."""
    return round(math.ceil(value / 0.05 - 1e-9) * 0.05, 2)


def _down(value: float) -> float:
    """Round down to a twentieth of a millimeter; what is smaller than that stays as it is."""
    return round(math.floor(value / 0.05 + 1e-9) * 0.05, 2) or value


def _sheared(shear: Quantity, resin: Resin) -> tuple[Finding, ...]:
    if shear.value <= resin.shear_limit * (1.0 + 1e-6):
        return ()
    return (
        Finding(
            "gate.shear",
            Severity.WARNING,
            f"the melt shears in the gate with {shear.value:.0f} 1/s",
            where="gate",
            value=round(shear.value),
            limit=resin.shear_limit,
            unit="1/s",
            remedy="a larger gate or slower injection",
        ),
    )
