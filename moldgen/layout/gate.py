"""The one gate: its kind, its place, and the feed to it."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Final

import numpy as np

from moldgen.catalog import Resin
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.kernel.polygon import signed_area
from moldgen.layout.carry_gate import carry_gate, found_again, yields
from moldgen.layout.flow_paths import find_flow_paths
from moldgen.layout.gate_edge import edge_gate
from moldgen.layout.gate_size import check_flow, melt_of
from moldgen.layout.gate_task import FAR, Found, Task
from moldgen.layout.gate_top import top_gate, usual_top
from moldgen.layout.kept import Kept
from moldgen.layout.top_sites import find_top_sites
from moldgen.layout.view import PartView
from moldgen.model.layout import Chooser, GateKind, GateLayout
from moldgen.model.part import Vector
from moldgen.spec.sections import Gate

ROUND: Final = 0.95
"""Share of the circle's area for its circumference from which an outline counts as round."""

DEEP: Final = 0.5
"""Height over diameter from which a round part is gated in its middle."""

CENTRAL: Final = 0.05
"""Distance from the middle, as a share of the plan's size, within which a place is central."""


def place_gate(
    view: PartView,
    section: Gate,
    resin: Resin,
    at: Vector | None = None,
    no_gate: frozenset[int] = frozenset(),
    kept: Kept | None = None,
) -> tuple[GateLayout, Notes]:
    """Return the gate.

    Parameters
    ----------
    section : `gate` of the spec; its `at` is not read
    at : the place asked for, in the mold frame [mm]
    no_gate : numbers of the faces that the gate must stay off
    kept : an accepted layout: its gate stays where it keeps the rules, unless the spec gives another place or kind

    The place is the one with the shortest longest flow, thick walls preferred (the melt should flow from thick to
    thin), whose whole mouth opens into the part. Without a kind: an edge gate on the outer parting line; from above, in
    the middle, for round parts deeper than half their diameter. Where the first kind has no free place the others are
    tried: a sprue first where the wall bears its foot, else a pin gate. Where no place of any kind keeps all rules, the
    one that breaks the fewest is returned, with a failure.
    """
    melt, notes = melt_of(view, resin)
    place = None if at is None else np.asarray(at, float)
    task = Task(view, section, resin, melt, find_flow_paths(view), place, no_gate)
    found, more = _chosen(task, kept)
    gate = found.gate
    notes += found.notes + check_flow(view, resin, gate.flow_length, found.end) + more
    return gate, notes + Notes(_judged(task, found))


def _chosen(task: Task, kept: Kept | None) -> tuple[Found, Notes]:
    """Return the gate that is kept, else the best that is found."""
    asked = "" if kept is None or kept.gate is None else yields(task, kept.gate)
    if kept is None or kept.gate is None or asked:
        found, notes = _searched(task)
        return found, notes + Notes(decisions=(Decision("gate kept", "no", asked),) if asked else ())
    if kept.same_part:
        found, notes = _searched(task)
        if found_again(found.gate, kept.gate):
            return replace(found, gate=replace(found.gate, chosen_by=Chooser.KEPT)), notes
    stays, more = carry_gate(task, kept.gate)
    if stays is not None:
        return stays, more
    found, notes = _searched(task)
    return found, more + notes


def _searched(task: Task) -> tuple[Found, Notes]:
    """Return the best gate of the kinds that come into question, and why it is the one."""
    kinds, why = _kinds(task)
    found = _of_kind(task, kinds[0])
    refused = []
    for kind in kinds[1:]:
        # a kind that the spec names is left only when its mouth would miss the part
        if not found.broken or (task.section.kind != "auto" and found.open > 0.0):
            break
        other = _of_kind(task, kind)
        worse, better = (found, other) if other.badness < found.badness else (other, found)
        refused.append(f"{worse.gate.kind.value}: {'; '.join(worse.broken)}")
        found = better
        why = "the usual kind has no free place" if found is other else why
    gate = found.gate
    text = f"{gate.kind.value} gate at {_text(task.view.place(gate.at))}"
    return found, Notes(decisions=(Decision("gate", text, why, "", tuple(refused)),))


def _of_kind(task: Task, kind: GateKind) -> Found:
    return edge_gate(task) if kind is GateKind.EDGE else top_gate(task, kind)


def _kinds(task: Task) -> tuple[list[GateKind], str]:
    """Return the kinds in the order tried, and why the first one is the first."""
    first, why = _first_kind(task)
    from_above = usual_top(task)
    other = GateKind.PIN if from_above is GateKind.SPRUE else GateKind.SPRUE
    kinds = [GateKind.EDGE, from_above, other] if first is not None else [from_above, other, GateKind.EDGE]
    if first is not None:
        kinds = [first, *(k for k in kinds if k is not first)]
    if task.at is not None and task.section.kind != "auto":
        kinds = kinds[:1]
    return kinds, why


def _first_kind(task: Task) -> tuple[GateKind | None, str]:
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
    area = signed_area(loop)
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


def _middle_is_free(task: Task, size: float) -> bool:
    offset = CENTRAL * size * np.array([[0.0, 0.0], [1, 0], [-1, 0], [0, 1], [0, -1]])
    sites = find_top_sites(task.view, task.view.middle + offset, 2.0, task.no_gate)
    return bool((sites.troubles == 0).any())


def _judged(task: Task, found: Found) -> tuple[Finding, ...]:
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
