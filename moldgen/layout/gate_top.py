"""Gates from above: the pin gate and the direct sprue, on the best place of the upper surface."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Final

import numpy as np

from moldgen.layout.gate_size import size_pin, size_sprue
from moldgen.layout.gate_task import ASIDE, MOST_WEIGHED, Found, Task
from moldgen.layout.kept import steps_around
from moldgen.layout.top_sites import BESIDE, TopSites, centered, find_top_sites
from moldgen.model.layout import Chooser, GateKind, GateLayout
from moldgen.rules.practice import SPRUE_TAPER

SMALLER: Final = (1.0, 0.75, 0.5)
"""Shares of the usual diameter of a pin gate that are tried, the largest that finds room is taken."""

NEAR_STEP: Final = 0.5
"""mm: distance of the places tried round one that is asked for (our choice)."""

OPEN: Final = 0.999
"""Share of a mouth from which it counts as wholly open."""

PARTLY: Final = 5.0
"""Cost of a mouth that is not wholly open, by its closed share."""


def usual_top(task: Task) -> GateKind:
    """Return the usual kind from above: a sprue where the wall bears its foot, else a pin gate."""
    height = float(task.view.high[2] - task.view.body.box[1][2])
    sprue, _ = size_sprue(task.section, task.resin, task.melt, task.view.wall, height)
    return GateKind.SPRUE if sprue.foot <= 2.0 * task.view.wall else GateKind.PIN


def top_gate(task: Task, kind: GateKind) -> Found:
    """Return the best gate from above of a kind, with the rules that its place breaks."""
    shares = SMALLER if kind is GateKind.PIN and task.section.diameter is None else SMALLER[:1]
    best = _of_size(task, kind, shares[0])
    for share in shares[1:]:
        if not best.broken:
            break
        found = _of_size(task, kind, share)
        best = found if found.badness < best.badness else best
    return best


def top_gate_near(task: Task, kind: GateKind, at: np.ndarray, within: float) -> Found:
    """Return the gate from above nearest to a place that keeps all rules, at most `within` from it in plan [mm].

    Where none does, the one at the place itself, with the rules that it breaks.
    """
    found = _of_size(task, kind, 1.0, at[:2] + steps_around(NEAR_STEP, within))
    return replace(found, gate=replace(found.gate, chosen_by=Chooser.KEPT))


def _of_size(task: Task, kind: GateKind, share: float, near: np.ndarray | None = None) -> Found:
    """Return the best gate of a size; near : (k, 2) only at the first of these places that keeps all rules."""
    view = task.view
    height = float(view.high[2] - view.body.box[1][2])
    if kind is GateKind.PIN:
        diameter = size_pin(task.section, task.resin, task.melt, view.wall, share)[0].diameter
        # its channel widens upward; from the parting plane it is longer than from any place of the part over it
        widest = diameter + 2 * float(view.high[2] - view.level) * math.tan(math.radians(SPRUE_TAPER.default))
    else:
        diameter = size_sprue(task.section, task.resin, task.melt, view.wall, height)[0].diameter
        widest = diameter
    if near is None:
        sites, choice = _best(task, diameter, widest)
    else:
        sites = find_top_sites(view, near, diameter, task.no_gate, widest)
        choice = int(np.argmin((sites.troubles > 0) | (sites.open < OPEN)))
    spot = tuple(float(v) for v in sites.places[choice])
    wall, height = float(sites.wall[choice]), float(view.high[2]) - spot[2]
    if kind is GateKind.PIN:
        size, notes = size_pin(task.section, task.resin, task.melt, wall, share)
    else:
        size, notes = size_sprue(task.section, task.resin, task.melt, wall, height)
    end, flow = task.flow_from(sites.places[choice])
    gate = GateLayout(
        kind=kind,
        at=(spot[0], spot[1], spot[2]),
        inward=(0.0, 0.0, -1.0),
        width=0.0,
        depth=0.0,
        land=size.land,
        diameter=size.diameter,
        runner_diameter=0.0,
        runner_length=0.0,
        sprue_foot_diameter=size.foot,
        sprue_taper_deg=SPRUE_TAPER.default,
        flow_length=flow,
        chosen_by=task.chooser,
    )
    return Found(gate, notes, _broken(sites, choice), float(sites.open[choice]), end)


def _broken(sites: TopSites, choice: int) -> tuple[str, ...]:
    return tuple(text for text, broken in sites.reasons if broken[choice])


def _best(task: Task, diameter: float, widest: float) -> tuple[TopSites, int]:
    view = task.view
    if task.at is not None:
        return find_top_sites(view, task.at[None, :2], diameter, task.no_gate, widest), 0
    paths = task.paths
    up = ~view.core_side[paths.triangle] & (view.normals[paths.triangle, 2] > 0.9)
    plan = np.vstack([view.middle[None], paths.surface[up][:, :2]])
    sites = find_top_sites(view, plan, diameter, task.no_gate, widest)
    if sites.troubles.min() > 0:
        # narrow or round surfaces: seek the middle of each, and look at every place that is seen from above
        plan = np.vstack([plan, paths.surface[:, :2]])
        plan = centered(view, plan, diameter / 2 + BESIDE)
        sites = find_top_sites(view, plan, diameter, task.no_gate, widest)
    return sites, _cheapest(task, sites)


def _cheapest(task: Task, sites: TopSites) -> int:
    bad = sites.troubles + 100 * (sites.open <= 0.0)
    pool = np.flatnonzero(bad == bad.min())
    middle = np.linalg.norm(sites.places[pool][:, :2] - task.view.middle, axis=1)
    # near the middle the flow is shortest on most parts: half of the places come from there, half from everywhere
    pool = pool[np.lexsort((middle, np.round(-sites.open[pool], 1)))]
    half = MOST_WEIGHED // 2
    few = np.r_[np.arange(min(half, len(pool))), np.linspace(0, len(pool) - 1, half).astype(int)]
    pool = pool[np.unique(few)]
    flow, _ = task.paths.longest(sites.places[pool])
    off = np.linalg.norm(sites.places[pool][:, :2] - task.view.middle, axis=1) / task.size
    cost = flow * task.thin(sites.wall[pool]) * (1.0 + 3 * ASIDE * off) * (1.0 + PARTLY * (1.0 - sites.open[pool]))
    return int(pool[np.argmin(np.round(cost, 6))])
