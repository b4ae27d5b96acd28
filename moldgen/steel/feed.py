"""The feed: gate, runner and sprue as solids to be taken out of the halves.

Runner and edge gate lie in one half. The runner has a round bottom and drafted flanks, as a ball-nosed taper cutter
leaves it, and holds a full round of the laid-out diameter: nearly the flow of a full round runner, but only one half is
milled and nothing has to match (common practice). No puller, no cold slug well and no sprue bush are laid out.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from moldgen.errors import PartError
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.channel import Profile, channel, joined, slot
from moldgen.kernel.turned import turned_solid
from moldgen.model.halves import Halves
from moldgen.model.layout import GateKind, GateLayout
from moldgen.model.tool import Hole, Motion
from moldgen.steel.ground import Ground

FLANK = 10.0
"""deg: draft of a runner's flanks (common practice: 5 to 15)."""

NARROWEST = 1.0
"""mm: least diameter of a sprue at the nozzle that still is a channel; the layout asks for much more."""

OVERRUN = 1.0
"""mm: a tool runs past the block by this."""

INTO = 0.1
"""mm: how far a gate's tool reaches past the deepest place of the part's surface across the gate."""

STEP_BACK = 0.5
"""mm: where the surface across a gate's mouth falls back by more at once, what lies behind is not the wall it feeds."""

FAR = 5.0
"""mm: a surface further than this from the gate is another one."""

PLACES = 7
"""Rays across and up an edge gate, each."""


@dataclass(frozen=True)
class Feed:
    """The channel as solids, before the halves limit it.

    in_cavity, in_core : what to take out of each half, None for nothing
    motion : with what the solidified feed moves when the mold opens
    """

    in_cavity: Any
    in_core: Any
    motion: Motion
    holes: tuple[Hole, ...]
    note: str
    notes: Notes


@dataclass(frozen=True)
class _Task:
    halves: Halves
    gate: GateLayout
    ground: Ground
    seam: float


def make_feed(halves: Halves, gate: GateLayout, ground: Ground, seam: float = 0.0) -> Feed:
    """Return the feed of the one gate; the seams of round solids look to `seam` [deg] from +x.

    Raises
    ------
    PartError : it leaves the block, closes, or does not reach the part
    KernelError : its pieces do not join
    """
    makers = {GateKind.EDGE: _edge, GateKind.PIN: _pin, GateKind.SPRUE: _direct}
    return makers[gate.kind](_Task(halves, gate, ground, seam))


def _edge(task: _Task) -> Feed:
    gate = task.gate
    at, inward = np.array(gate.at), np.array([gate.inward[0], gate.inward[1], 0.0])
    inward = inward / np.linalg.norm(inward)
    profile = Profile(gate.runner_diameter, FLANK, gate.runner_diameter, bool(gate.in_cavity))
    near = at - (gate.land + profile.half_width) * inward
    far = at - (gate.land + gate.runner_length) * inward
    reach, notes = _reach(gate, task.ground, near, inward)
    sign = 1.0 if gate.in_cavity else -1.0
    heights = sorted((at[2] - sign * profile.skirt, at[2] + sign * gate.depth))
    back = near if gate.runner_length > profile.half_width + OVERRUN else far
    land = slot(back, at + reach * inward, gate.width, (heights[0], heights[1]))
    # the foot of the sprue hides the runner's end where it is wider and in the same half
    hidden = gate.in_cavity and gate.sprue_foot_diameter >= 2 * profile.half_width
    pieces = [land] if back is far else [land, *channel(far, near, profile, round_start=not hidden)]
    sprue, hole = _sprue(task, (float(far[0]), float(far[1])), float(at[2]))
    half = "cavity" if gate.in_cavity else "core"
    if gate.in_cavity:
        in_cavity, in_core = joined([*pieces, sprue], "join the feed"), None
    else:
        in_cavity, in_core = sprue, joined(pieces, "join gate and runner") if len(pieces) > 1 else land
    choice = f"in the {half} half, {gate.runner_diameter:g} mm deep, round bottom, flanks {FLANK:g} deg"
    why = "holds a full round of that diameter, but only one half is milled (common practice)"
    notes += Notes(decisions=(Decision("runner", choice, why),), findings=(_NO_PULLER,))
    note = f"edge gate {gate.width:g} x {gate.depth:g} mm, land {gate.land:g} mm, {choice}"
    return Feed(in_cavity, in_core, Motion.PART, (hole,), note, notes)


def _direct(task: _Task) -> Feed:
    gate = task.gate
    x, y, z = gate.at
    foot, notes = _foot(gate, task.ground, gate.diameter)
    sprue, hole = _sprue(task, (x, y), z, foot)
    note = f"sprue gate, {gate.diameter:g} mm at the part"
    return Feed(sprue, None, Motion.PART, (hole,), note, notes)


def _pin(task: _Task) -> Feed:
    gate = task.gate
    x, y, z = gate.at
    foot, notes = _foot(gate, task.ground, gate.diameter)
    radius, high = gate.diameter / 2, float(task.halves.high[2])
    slope, start = math.tan(math.radians(gate.sprue_taper_deg)), z + gate.land
    if start >= high:
        raise PartError(
            f"a land of {gate.land:g} mm leaves no room for the channel of the pin gate: {high - z:.2f} mm of steel",
            where="gate",
            remedy="a shorter land, or a higher cavity block",
        )
    top = radius + (high - start) * slope
    outline = [(radius, foot), (radius, start), (top + OVERRUN * slope, high + OVERRUN)]
    holes = (
        Hole("cavity", "gate", x, y, z, start, gate.diameter),
        Hole("cavity", "sprue", x, y, start, high, 2 * top, f"tapered, {gate.sprue_taper_deg:g} deg per side"),
    )
    decision = Decision(
        "feed of the pin gate",
        "stays with the cavity half when the mold opens",
        "its channel widens away from the part, so it breaks off at the gate and leaves on the other side of the "
        "cavity plate: a third plate or a hot nozzle, not laid out",
    )
    note = f"pin gate {gate.diameter:g} mm, land {gate.land:g} mm"
    notes += Notes(decisions=(decision,))
    return Feed(turned_solid((x, y), outline, task.seam), None, Motion.CAVITY_HALF, holes, note, notes)


def _sprue(task: _Task, axis: tuple[float, float], level: float, foot: float | None = None) -> tuple[Any, Hole]:
    """Return the cone that is narrowest at the top of the block; `foot` is where its tool ends below `level` [mm]."""
    gate, halves = task.gate, task.halves
    high, slope = float(halves.high[2]), math.tan(math.radians(gate.sprue_taper_deg))
    diameter = gate.sprue_foot_diameter if gate.kind is GateKind.EDGE else gate.diameter
    top = diameter / 2 - (high - level) * slope
    if 2 * top < NARROWEST:
        raise PartError(
            f"a sprue of {diameter:g} mm with {gate.sprue_taper_deg:g} deg per side is {2 * top:.2f} mm wide after "
            f"{high - level:.1f} mm, {NARROWEST:g} mm are needed",
            where="gate",
            remedy="a larger foot (gate.diameter), or a lower cavity block",
        )
    inside = min(axis[0] - halves.low[0], halves.high[0] - axis[0], axis[1] - halves.low[1], halves.high[1] - axis[1])
    if inside <= diameter / 2:
        raise PartError(
            f"the sprue at x {axis[0]:.2f}, y {axis[1]:.2f} is {inside:.2f} mm from the side of the block",
            where="gate",
            remedy="a larger block, or another place for the gate",
        )
    low = level - gate.runner_diameter if foot is None else foot
    outline = [(diameter / 2 + (level - low) * slope, low), (top - OVERRUN * slope, high + OVERRUN)]
    hole = Hole(
        "cavity",
        "sprue",
        axis[0],
        axis[1],
        level,
        high,
        diameter,
        f"tapered to {2 * top:.2f} mm, {gate.sprue_taper_deg:g} deg per side",
    )
    return turned_solid(axis, outline, task.seam), hole


def _reach(gate: GateLayout, ground: Ground, near: np.ndarray, inward: np.ndarray) -> tuple[float, Notes]:
    """Return how far past `gate.at` the slot must go to open into the part over its whole mouth [mm]."""
    sign = 1.0 if gate.in_cavity else -1.0
    side = np.cross(inward, (0.0, 0.0, 1.0))
    share = (np.arange(PLACES) + 0.5) / PLACES
    across, up = np.meshgrid((share - 0.5) * gate.width, sign * share * gate.depth)
    origins = near + across.reshape(-1, 1) * side + up.reshape(-1, 1) * np.array([0.0, 0.0, 1.0])
    start = float(np.dot(np.array(gate.at) - near, inward))
    behind = ground.ahead(origins, inward) - start
    back, part = _wall(behind)
    return back + INTO, _open_mouth(gate, part, "edge gate")


def _foot(gate: GateLayout, ground: Ground, diameter: float) -> tuple[float, Notes]:
    """Return the height where the tool of a gate from above ends: below the part's surface under its whole mouth."""
    x, y, z = gate.at
    back, share = _wall(z - ground.over_circle(x, y, diameter / 2 * 0.98))
    return z - back - INTO, _open_mouth(gate, share, f"{gate.kind.value} gate")


def _wall(behind: np.ndarray) -> tuple[float, float]:
    """Return how far behind the gate its wall goes back [mm], and the share of the mouth that lies on it.

    behind : distance from the gate to the surface at places across the mouth, inf where there is none, (k,) [mm]
    """
    found = np.sort(behind[np.isfinite(behind)])
    found = found[np.abs(found) < FAR]
    if len(found) == 0:
        return 0.0, 0.0
    steps = np.flatnonzero(np.diff(found) > STEP_BACK)
    # the wall is the group of places nearest to the gate itself
    group = min(np.split(found, steps + 1), key=lambda g: float(np.abs(g).min()))
    return float(group.max()), len(group) / len(behind)


def _open_mouth(gate: GateLayout, share: float, name: str) -> Notes:
    place = "x {:.2f}, y {:.2f}, z {:.2f}".format(*gate.at)
    if share == 0.0:
        raise PartError(
            f"the {name} does not reach the part",
            where=f"gate at {place}",
            remedy="give gate.at on the part's surface, or leave it to moldgen",
        )
    if share > 0.99:
        return Notes()
    finding = Finding(
        "gate.partly_off",
        Severity.WARNING,
        f"only {100 * share:.0f} % of the mouth of the {name} opens into the part",
        where=f"gate at {place} in the mold",
        value=round(share, 3),
        limit=1.0,
        remedy="a smaller gate, or another place",
    )
    return Notes((finding,))


_NO_PULLER = Finding(
    "feed.no_puller",
    Severity.NOTE,
    "nothing holds the sprue on the core half yet: the part must pull it out of the cavity block",
    where="sprue",
    remedy="let the toolmaker add a puller and a cold slug well under the sprue",
)
