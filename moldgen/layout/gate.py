"""The one gate: its kind, its place, and the feed to it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.layout.edge_sites import EdgeSites, Need, find_edge_sites
from moldgen.layout.flow_paths import FlowPaths, find_flow_paths
from moldgen.layout.gate_size import GateSize, Melt, check_flow, melt_of, size_edge, size_pin, size_sprue
from moldgen.layout.top_sites import TopSites, find_top_sites
from moldgen.layout.view import PartView, plan_area
from moldgen.model.layout import Chooser, GateKind, GateLayout
from moldgen.model.part import Vector
from moldgen.rules.practice import SPRUE_TAPER
from moldgen.spec.sections import Gate

ROUND: Final = 0.95
"""Share of the circle's area for its circumference from which an outline counts as round."""

DEEP: Final = 0.5
"""Height over diameter from which a round part is gated in its middle."""

MOST_WEIGHED: Final = 40
"""Places whose flow lengths are compared."""

FAR: Final = 2.0
"""mm: a gate this far from the place asked for is reported."""

OBLIQUE: Final = 0.05
"""Cost of a runner that runs at 45 deg to the sides of the block, as a share of the flow length."""

ASIDE: Final = 0.3
"""Cost of a place beside the part's middle lines, by its distance over the size in plan: flow lengths are only good
to a few percent, and a gate on a middle line is easier to make and to balance."""

CENTRAL: Final = 0.05
"""Distance from the middle, as a share of the plan's size, within which a place is central."""


@dataclass(frozen=True)
class _Task:
    view: PartView
    section: Gate
    resin: Resin
    melt: Melt
    at: np.ndarray | None
    no_gate: frozenset[int]

    @property
    def chooser(self) -> Chooser:
        """Who decides the place."""
        return Chooser.MOLDGEN if self.at is None else Chooser.GIVEN


@dataclass(frozen=True)
class _Found:
    """A gate with the cost of its place and the rules it breaks."""

    gate: GateLayout
    notes: Notes
    broken: tuple[str, ...]
    end: tuple[float, float, float]


def place_gate(
    view: PartView, section: Gate, resin: Resin, at: Vector | None = None, no_gate: frozenset[int] = frozenset()
) -> tuple[GateLayout, Notes]:
    """Return the gate.

    Parameters
    ----------
    section : `gate` of the spec; its `at` is not read
    at : the place asked for, in the mold frame [mm]
    no_gate : numbers of the faces that the gate must stay off

    The place is the one with the shortest longest flow, thick walls preferred (the melt should flow from thick to
    thin). Without a kind: an edge gate on the outer parting line; from above, in the middle, for round parts deeper
    than half their diameter, or where no edge place is free; then a sprue where the wall bears its foot, else a pin
    gate. Where no place keeps all rules, the one that breaks the fewest is returned, with a failure.
    """
    melt, notes = melt_of(view, resin)
    task = _Task(view, section, resin, melt, None if at is None else np.asarray(at, float), no_gate)
    paths = find_flow_paths(view)
    kind, why = _kind(task)
    found = _edge(task, paths) if kind is GateKind.EDGE else _top(task, paths, kind)
    refused: tuple[str, ...] = ()
    if section.kind == "auto" and found.broken:
        other = _top(task, paths, None) if kind is GateKind.EDGE else _edge(task, paths)
        if len(other.broken) < len(found.broken):
            refused = (f"{found.gate.kind.value}: {'; '.join(found.broken)}",)
            found, why = other, "the usual kind has no free place"
    gate = found.gate
    decision = Decision("gate", f"{gate.kind.value} gate at {_text(view.place(gate.at))}", why, "", refused)
    notes += found.notes + check_flow(view, resin, gate.flow_length, found.end) + Notes(decisions=(decision,))
    return gate, notes + Notes(_judged(task, found))


def _kind(task: _Task) -> tuple[GateKind | None, str]:
    """Return the kind to try first, None for one from above, and why."""
    if task.section.kind != "auto":
        return GateKind(task.section.kind), "given in the spec"
    view = task.view
    if task.at is not None:
        line = view.outline
        if float(np.linalg.norm(line - task.at, axis=1).min()) > FAR and _nearest_is_up(view, task.at):
            return None, "the place asked for lies on the upper surface"
        return GateKind.EDGE, "the place asked for lies at the parting line"
    low, high = view.body.box
    loop = view.outline
    area = plan_area(loop)
    around = float(np.linalg.norm((loop - np.roll(loop, 1, axis=0))[:, :2], axis=1).sum())
    size = float((high - low)[:2].max())
    if (
        4 * math.pi * area / around**2 >= ROUND
        and float((high - low)[2]) >= DEEP * size
        and _middle_is_free(task, size)
    ):
        return None, "round and deep: from above in the middle the melt reaches the rim everywhere at once"
    return GateKind.EDGE, "usual kind: at the parting line, cut off easily"


def _nearest_is_up(view: PartView, at: np.ndarray) -> bool:
    face, _ = view.body.nearest_face(at)
    own = view.mesh.face == face
    return bool(np.average(view.normals[own, 2], weights=view.body.triangle_areas[own]) > 0.5)


def _middle_is_free(task: _Task, size: float) -> bool:
    offset = CENTRAL * size * np.array([[0.0, 0.0], [1, 0], [-1, 0], [0, 1], [0, -1]])
    sites = find_top_sites(task.view, task.view.middle + offset, 2.0, task.no_gate)
    return bool((sites.troubles == 0).any())


def _edge(task: _Task, paths: FlowPaths) -> _Found:
    view = task.view
    height = float(view.high[2] - view.level)
    size, _ = size_edge(task.section, task.resin, task.melt, view.wall, height)
    sites = find_edge_sites(view, _need(task, size))
    choice, end, flow = _best_edge(task, paths, sites)
    size, notes = size_edge(task.section, task.resin, task.melt, float(sites.wall[choice]), height)
    x, y, _ = (float(v) for v in sites.places[choice])
    gate = GateLayout(
        kind=GateKind.EDGE,
        at=(x, y, view.level),
        inward=(float(sites.inward[choice, 0]), float(sites.inward[choice, 1]), 0.0),
        width=size.width,
        depth=size.depth,
        land=size.land,
        diameter=0.0,
        runner_diameter=size.runner,
        runner_length=float(sites.runner[choice]),
        sprue_foot_diameter=size.foot,
        sprue_taper_deg=SPRUE_TAPER.default,
        flow_length=flow,
        chosen_by=task.chooser,
        in_cavity=bool(sites.above[choice] or sites.troubles[choice] > 0),
    )
    return _Found(gate, notes, tuple(text for text, broken in sites.reasons if broken[choice]), end)


def _need(task: _Task, size: GateSize) -> Need:
    return Need(size.width, size.depth, size.land, size.runner, size.foot, task.no_gate)


def _best_edge(task: _Task, paths: FlowPaths, sites: EdgeSites) -> tuple[int, tuple[float, float, float], float]:
    if task.at is not None:
        distance = np.linalg.norm(sites.places - task.at, axis=1)
        near = distance <= max(FAR, float(distance.min()) + FAR)
        pool = np.flatnonzero(near & (sites.troubles == sites.troubles[near].min()))
        choice = int(pool[np.argmin(distance[pool])])
        return choice, *_flow_from(paths, sites.places[choice])
    pool = np.flatnonzero(sites.troubles == sites.troubles.min())
    off = np.abs(sites.places[pool][:, :2] - task.view.middle).min(axis=1)
    pool = np.union1d(pool[:: math.ceil(len(pool) / MOST_WEIGHED)], pool[off < 1e-6])
    flow, _ = paths.longest(sites.places[pool])
    slant = 1.0 - np.abs(sites.inward[pool]).max(axis=1)
    off = np.abs(sites.places[pool][:, :2] - task.view.middle).min(axis=1) / _size(task.view)
    cost = flow * _thin(task, sites.wall[pool]) * (1.0 + OBLIQUE * slant / (1.0 - math.sqrt(0.5)) + ASIDE * off)
    best = int(np.argmin(np.round(cost, 6)))
    return int(pool[best]), *_flow_from(paths, sites.places[pool[best]])


def _top(task: _Task, paths: FlowPaths, kind: GateKind | None) -> _Found:
    view = task.view
    pin, _ = size_pin(task.section, task.resin, task.melt, view.wall)
    height = float(view.high[2] - view.body.box[1][2])
    sprue, _ = size_sprue(task.section, task.resin, task.melt, view.wall, height)
    if kind is None:
        kind = GateKind.SPRUE if sprue.foot <= 2.0 * view.wall else GateKind.PIN
    diameter = pin.diameter if kind is GateKind.PIN else sprue.diameter
    if task.at is not None:
        sites = find_top_sites(view, task.at[None, :2], diameter, task.no_gate)
        choice = 0
    else:
        up = ~view.core_side[paths.triangle] & (view.normals[paths.triangle, 2] > 0.9)
        sites = find_top_sites(view, np.vstack([view.middle[None], paths.surface[up][:, :2]]), diameter, task.no_gate)
        choice = _best_top(task, paths, sites)
    end, flow = _flow_from(paths, sites.places[choice])
    spot = tuple(float(v) for v in sites.places[choice])
    wall, height = float(sites.wall[choice]), float(view.high[2]) - spot[2]
    if kind is GateKind.PIN:
        size, notes = size_pin(task.section, task.resin, task.melt, wall)
    else:
        size, notes = size_sprue(task.section, task.resin, task.melt, wall, height)
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
    broken = tuple(text for text, broken in sites.reasons if broken[choice])
    return _Found(gate, notes, broken, end)


def _best_top(task: _Task, paths: FlowPaths, sites: TopSites) -> int:
    pool = np.flatnonzero(sites.troubles == sites.troubles.min())
    middle = np.linalg.norm(sites.places[pool][:, :2] - task.view.middle, axis=1)
    # near the middle the flow is shortest on most parts: half of the places come from there, half from everywhere
    pool = pool[np.argsort(middle, kind="stable")]
    some = np.unique(
        np.r_[
            np.arange(min(MOST_WEIGHED // 2, len(pool))), np.linspace(0, len(pool) - 1, MOST_WEIGHED // 2).astype(int)
        ]
    )
    pool = pool[some]
    flow, _ = paths.longest(sites.places[pool])
    off = np.linalg.norm(sites.places[pool][:, :2] - task.view.middle, axis=1) / _size(task.view)
    cost = flow * _thin(task, sites.wall[pool]) * (1.0 + 3 * ASIDE * off)
    return int(pool[np.argmin(np.round(cost, 6))])


def _size(view: PartView) -> float:
    low, high = view.body.box
    return float((high - low)[:2].max())


def _thin(task: _Task, wall: np.ndarray) -> np.ndarray:
    """Return what a gate into a wall costs against one into the usual wall: the melt should flow from thick to thin."""
    return np.asarray(np.sqrt(np.clip(task.view.wall / np.maximum(wall, 1e-3), 0.5, 4.0)))


def _flow_from(paths: FlowPaths, place: np.ndarray) -> tuple[tuple[float, float, float], float]:
    """Return the farthest place of the part and the flow length to it [mm]."""
    flow, end = paths.longest(place[None], through=8)
    x, y, z = (float(v) for v in paths.surface[end[0]])
    return (x, y, z), float(flow[0])


def _judged(task: _Task, found: _Found) -> tuple[Finding, ...]:
    gate, findings = found.gate, []
    place = task.view.place(gate.at)
    if found.broken:
        findings.append(
            Finding(
                "gate.bad_place",
                Severity.FAILURE,
                f"no place keeps all rules for this {gate.kind.value} gate: " + "; ".join(found.broken)
                if task.at is None
                else f"the {gate.kind.value} gate at the place asked for: " + "; ".join(found.broken),
                at=place,
                remedy="another kind of gate, another place, or a larger block",
            )
        )
    if task.at is not None:
        off = float(np.linalg.norm(np.asarray(gate.at) - task.at))
        if off > FAR:
            findings.append(
                Finding(
                    "gate.moved",
                    Severity.CAUTION,
                    f"the gate is {off:.1f} mm from the place asked for",
                    at=place,
                    value=round(off, 2),
                    limit=FAR,
                    unit="mm",
                    remedy="give a point on the parting line (edge) or on the upper surface (pin, sprue)",
                )
            )
    return tuple(findings)


def _text(place: Vector) -> str:
    return ", ".join(f"{v:g}" for v in place)
