"""The edge gate: the best place on the outer parting line whose whole mouth opens into the part."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Final

import numpy as np

from moldgen.layout.edge_sites import EdgeSites, Need, find_edge_sites
from moldgen.layout.gate_size import size_edge, wanted_edge
from moldgen.layout.gate_task import ASIDE, FAR, MOST_WEIGHED, Found, Task
from moldgen.layout.mouth import open_share
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, GateKind, GateLayout
from moldgen.rules.practice import SPRUE_TAPER

OBLIQUE: Final = 0.05
"""Cost of a runner that runs at 45 deg to the sides of the block, as a share of the flow length."""

CRAMPED: Final = 0.25
"""Cost of a small mouth: the flow length counts by this power of what the rules want over what there is."""

WHOLE: Final = 0.999
"""Share of a mouth from which it counts as wholly open."""

CHECKED: Final = 60
"""Best places whose mouths are looked at closely."""

NOT_WHOLE: Final = "the mouth of the gate does not wholly open into the part"


def edge_gate(task: Task) -> Found:
    """Return the best edge gate, with the rules that its place breaks."""
    view = task.view
    need = _need(task)
    sites = find_edge_sites(view, need)
    order = _order(task, sites)
    share = _mouths(task, sites, order[:CHECKED], need.land + need.runner)
    whole = np.flatnonzero((share >= WHOLE) & (sites.troubles[order[:CHECKED]] == sites.troubles[order[0]]))
    first = int(whole[0]) if len(whole) else int(np.argmax(share))
    return _made(task, sites, int(order[first]), float(share[first]))


def edge_gate_near(task: Task, at: np.ndarray, within: float, inward: tuple[float, float] | None = None) -> Found:
    """Return the edge gate nearest to a point on the parting line that keeps all rules, at most `within` away [mm].

    inward : unit vector in plan into the part; None: square to the parting line
    Where no place keeps the rules, the one at the place itself, with the rules that it breaks.
    """
    need = replace(_need(task), inward=inward)
    sites = find_edge_sites(task.view, need, at, within)
    share = _mouths(task, sites, np.arange(len(sites.places)), need.land + need.runner)
    good = np.flatnonzero((share >= WHOLE) & (sites.troubles == 0))
    choice = int(good[0]) if len(good) else 0
    found = _made(task, sites, choice, float(share[choice]))
    return replace(found, gate=replace(found.gate, chosen_by=Chooser.KEPT))


def _made(task: Task, sites: EdgeSites, choice: int, share: float) -> Found:
    view, height = task.view, _depth(task.view)
    room = (float(sites.room[choice, 0]), float(sites.room[choice, 1])) if sites.fullness[choice] > 0.0 else None
    made, notes = size_edge(task.section, task.resin, task.melt, float(sites.wall[choice]), height, room, task.feed)
    end, flow = task.flow_from(sites.places[choice])
    x, y = (float(v) for v in sites.places[choice, :2])
    gate = GateLayout(
        kind=GateKind.EDGE,
        at=(x, y, view.level),
        inward=(float(sites.inward[choice, 0]), float(sites.inward[choice, 1]), 0.0),
        width=made.width,
        depth=made.depth,
        land=made.land,
        diameter=0.0,
        runner_diameter=made.runner,
        runner_length=float(sites.runner[choice]),
        sprue_foot_diameter=made.foot,
        sprue_taper_deg=SPRUE_TAPER.default,
        flow_length=flow,
        chosen_by=task.chooser,
        in_cavity=bool(sites.above[choice]),
    )
    broken = tuple(text for text, broken in sites.reasons if broken[choice])
    if share < WHOLE and not broken:
        broken = (NOT_WHOLE,)
    return Found(gate, notes, broken, share, end)


def _depth(view: PartView) -> float:
    """Return how far the nozzle is over the parting plane [mm]."""
    return float(view.high[2] - view.level)


def _need(task: Task) -> Need:
    """Return what the usual edge gate of the part needs."""
    section, view = task.section, task.view
    usual, _ = size_edge(section, task.resin, task.melt, view.wall, _depth(view), feed=task.feed)

    def wanted(walls: np.ndarray) -> np.ndarray:
        return wanted_edge(section, task.resin, task.melt, walls, task.feed)

    kept = 0.0 if task.feed is None else task.feed.length
    sizes = (usual.width, usual.land, usual.runner, usual.foot)
    return Need(*sizes, wanted, (section.width is not None, section.depth is not None), task.no_gate, kept)


def _order(task: Task, sites: EdgeSites) -> np.ndarray:
    """Return the numbers of the places that are worth a look, best first."""
    if task.at is not None:
        distance = np.linalg.norm(sites.places - task.at, axis=1)
        near = np.flatnonzero(distance <= max(FAR, float(distance.min()) + FAR))
        return np.asarray(near[np.lexsort((distance[near], sites.troubles[near]))])
    least = sites.troubles.min()
    pool = np.flatnonzero(sites.troubles == least)
    off = np.abs(sites.places[pool][:, :2] - task.view.middle).min(axis=1)
    pool = np.union1d(pool[:: math.ceil(len(pool) / MOST_WEIGHED)], pool[off < 1e-6])
    flow, _ = task.paths.longest(sites.places[pool])
    slant = 1.0 - np.abs(sites.inward[pool]).max(axis=1)
    off = np.abs(sites.places[pool][:, :2] - task.view.middle).min(axis=1) / task.size
    cost = flow * task.thin(sites.wall[pool]) * (1.0 + OBLIQUE * slant / (1.0 - math.sqrt(0.5)) + ASIDE * off)
    cost = cost / np.maximum(sites.fullness[pool], 1e-3) ** CRAMPED
    best = pool[np.argsort(np.round(cost, 6), kind="stable")]
    # what was left out of the comparison of flow lengths still may have a better mouth
    others = np.setdiff1d(np.flatnonzero(sites.troubles == least), best)
    return np.asarray(np.r_[best, others[np.argsort(-sites.fullness[others], kind="stable")]])


def _mouths(task: Task, sites: EdgeSites, order: np.ndarray, start: float) -> np.ndarray:
    """Return the share of each mouth that opens into the part, (k,), by rays that set out `start` before it [mm]."""
    size = np.where(sites.fullness[order, None] > 0.0, sites.room[order], sites.wanted[order])
    size = size * np.column_stack([np.ones(len(order)), np.where(sites.above[order], 1.0, -1.0)])
    return open_share(task.view, sites.places[order], sites.inward[order], size, start)
