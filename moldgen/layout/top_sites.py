"""Places on the part's upper surface where a pin gate or a sprue can enter from above."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from moldgen.layout.keep_out import STEEL, weighed
from moldgen.layout.view import PartView
from moldgen.rules.layout_practice import GATE_SLOPE

RING: Final = 16
BESIDE: Final = 0.5
"""mm: level surface wanted round the gate."""

STEP: Final = 0.4
"""mm: a step that the mouth of a gate cannot bridge."""

ROUNDS: Final = 4
"""Times that places are moved away from edges."""


@dataclass(frozen=True)
class TopSites:
    """Places on the cavity's side of the part, (k, 3) [mm]; wall : (k,) under them, along the pull [mm].

    open : (k,) share of the gate's rim that lies on the surface that it feeds, 0 where there is no part
    reasons : what each rule is, with which places break it, (k,) bool
    """

    places: np.ndarray
    wall: np.ndarray
    open: np.ndarray
    reasons: tuple[tuple[str, np.ndarray], ...]

    @property
    def troubles(self) -> np.ndarray:
        """Number of rules that each place breaks, those about side actions counted manifold, (k,)."""
        return weighed(self.reasons)


def find_top_sites(
    view: PartView, plan: np.ndarray, diameter: float, no_gate: frozenset[int], widest: float = 0.0
) -> TopSites:
    """Return what lies under a gate of a diameter [mm] that comes down at plan places (k, 2).

    widest : largest diameter of the sprue over it [mm]
    """
    height, triangle = view.topside(plan)
    turn = 2 * np.pi * np.arange(RING) / RING
    ring = (diameter / 2 + BESIDE) * np.column_stack([np.cos(turn), np.sin(turn)])
    around, met = view.topside((plan[:, None] + ring).reshape(-1, 2))
    around, met = around.reshape(len(plan), -1), met.reshape(len(plan), -1)
    on = triangle >= 0
    slope = np.degrees(np.arccos(np.clip(view.normals[:, 2], -1.0, 1.0)))
    steep = np.where(on, slope[np.maximum(triangle, 0)], 90.0)
    steep = np.maximum(steep, np.where(met >= 0, slope[np.maximum(met, 0)], 90.0).max(axis=1))
    fall = np.abs(np.where(np.isfinite(around), around, -1e9) - np.where(on, height, 0.0)[:, None]).max(axis=1)
    step = fall > np.tan(np.radians(GATE_SLOPE.default)) * (diameter / 2 + BESIDE) + 0.05
    cavity = on & ~view.core_side[np.maximum(triangle, 0)]
    faces = np.where(on, view.mesh.face[np.maximum(triangle, 0)], -1)
    places = np.column_stack([plan, np.where(on, height, view.level)])
    under = places - np.array([0.0, 0.0, 1e-3])
    depth, _ = view.probe.first(under, np.array([0.0, 0.0, -1.0]))
    reasons = (
        ("there is no part under the gate", ~on),
        ("the core half forms the surface", on & ~cavity),
        (f"the surface is steeper than {GATE_SLOPE.default:g} deg", on & (steep > GATE_SLOPE.default)),
        ("a step or an edge lies within the gate", on & step),
        ("the face is marked no_gate", np.isin(faces, sorted(no_gate))),
        *_side_actions(view, places, np.where(on, triangle, -1), max(diameter, widest)),
    )
    depth = np.where(np.isfinite(depth), depth + 1e-3, view.wall)
    rim, _ = view.topside((plan[:, None] + diameter / 2 / (diameter / 2 + BESIDE) * ring).reshape(-1, 2))
    beside = np.abs(rim.reshape(len(plan), -1) - places[:, 2:]) < STEP  # the height beside the part is infinite
    return TopSites(places, np.minimum(depth, _across(view, places, depth)), on * beside.mean(axis=1), reasons)


def _side_actions(
    view: PartView, places: np.ndarray, triangle: np.ndarray, diameter: float
) -> tuple[tuple[str, np.ndarray], ...]:
    """Return the rules about slides and lifters: off the faces that they form, and out of their way."""
    if not view.halves.sides:
        return ()
    way = view.keep_out.upright(places[:, :2], diameter / 2, places[:, 2], float(view.high[2])).steel < STEEL
    return ("a slide or lifter forms the surface", view.aside(places, triangle)), (view.keep_out.why, way)


def centered(view: PartView, plan: np.ndarray, radius: float) -> np.ndarray:
    """Return plan places (k, 2) moved away from steps and edges of the upper surface within a radius [mm]."""
    turn = 2 * np.pi * np.arange(RING) / RING
    way = np.column_stack([np.cos(turn), np.sin(turn)])
    for _ in range(ROUNDS):
        height, _ = view.topside(plan)
        around, _ = view.topside((plan[:, None] + radius * way).reshape(-1, 2))
        on = np.isfinite(height)
        off = np.abs(around.reshape(len(plan), -1) - np.where(on, height, 0.0)[:, None]) > STEP
        away = -(off[:, :, None] * way).sum(axis=1) / RING
        plan = plan + np.where(on[:, None], radius * away, 0.0)
    return plan


def _across(view: PartView, places: np.ndarray, depth: np.ndarray) -> np.ndarray:
    """Return the smallest level extent of the plastic halfway down from each place, (k,) [mm]."""
    middle = places - np.column_stack([np.zeros((len(places), 2)), 0.5 * depth])
    least = np.full(len(places), np.inf)
    for angle in np.pi * np.arange(4) / 4:
        way = np.array([np.cos(angle), np.sin(angle), 0.0])
        least = np.minimum(least, view.probe.first(middle, way)[0] + view.probe.first(middle, -way)[0])
    return least
