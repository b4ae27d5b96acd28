"""The tool opens: the space that each moving body passes through holds nothing of any other, to the last step.

The way of every pair of bodies that move differently is in one of these proofs; `moldgen.proof.motion` sweeps it.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from moldgen.model.proof import Proof, Verdict
from moldgen.model.tool import Motion
from moldgen.proof.bodies import ProofBody
from moldgen.proof.motion import MovingTool
from moldgen.tolerances import OPEN_OVERLAP

CAVITY_OPENS = "the cavity half opens"
PART_LEAVES = "the part leaves the core"
EJECTORS_MOVE = "the ejectors move through their stroke"
SIDES_MOVE = "the side actions move"

FIXED = frozenset(str(m) for m in Motion)
"""The groups of every mold; any other is a side action."""


def side_groups(bodies: Sequence[ProofBody]) -> list[str]:
    """Return the names of the side actions among some bodies, in order."""
    return list(dict.fromkeys(b.motion for b in bodies if b.motion not in FIXED))


def prove_cavity_half(tool: MovingTool) -> Proof:
    """The cavity half leaves part, ejectors and core half without touching them, until it is clear of them."""
    why = _missing(tool, Motion.CAVITY_HALF, None)
    return not_run(CAVITY_OPENS, why) if why else _judged(CAVITY_OPENS, tool)


def prove_part(tool: MovingTool) -> Proof:
    """The part leaves the core half and the ejectors along the pull until it is clear of them."""
    why = _missing(tool, Motion.PART, Motion.CORE_HALF)
    return not_run(PART_LEAVES, why) if why else _judged(PART_LEAVES, tool)


def prove_ejection(tool: MovingTool, stroke: float) -> Proof:
    """The ejectors move by the stroke [mm] that is claimed, and do not touch the core half."""
    if not stroke > 0.0:
        return not_run(EJECTORS_MOVE, f"a stroke of {stroke:g} mm ejects nothing")
    why = _missing(tool, Motion.EJECTOR, Motion.CORE_HALF)
    if why:
        return not_run(EJECTORS_MOVE, why)
    moved = float(tool.travel(Motion.EJECTOR)[2])
    if not abs(moved - stroke) < OPEN_OVERLAP:
        told = f"the steps of the opening lift the ejectors by {moved:g} mm, not by the stroke of {stroke:g} mm"
        return Proof(EJECTORS_MOVE, Verdict.FAILED, abs(moved - stroke), OPEN_OVERLAP, "mm", told)
    return _judged(EJECTORS_MOVE, tool)


def prove_side_actions(tool: MovingTool) -> Proof:
    """Every side action moves, and on its way touches no steel, no other side action, and not the part."""
    still = [name for name in side_groups(tool.bodies) if not tool.moves(name)]
    if still or not side_groups(tool.bodies):
        return not_run(SIDES_MOVE, f"no step moves {', '.join(still) or 'a side action'}")
    return _judged(SIDES_MOVE, tool)


def not_run(name: str, why: str) -> Proof:
    """Return what a question about an overlap reads that could not be asked."""
    return Proof(name, Verdict.NOT_RUN, None, OPEN_OVERLAP, "mm", why)


def _missing(tool: MovingTool, mover: str, other: str | None) -> str:
    """Return why the way of a group past another (None: any) cannot be asked for, or nothing."""
    others = [b for b in tool.bodies if b.motion != mover and other in (None, b.motion)]
    if not tool.group(mover) or not others:
        return f"the tool has nothing that {'stands still' if tool.group(mover) else 'moves'} in this step"
    return "" if np.any(tool.travel(mover)) else f"no step of the opening moves the {mover}"


def _judged(name: str, tool: MovingTool) -> Proof:
    pairs = [pair for pair in combinations(tool.bodies, 2) if _proof_of(*pair) == name]
    met = tool.worst(pairs)
    verdict = Verdict.PASSED if met.depth_mm < OPEN_OVERLAP else Verdict.FAILED
    return Proof(name, verdict, met.depth_mm, OPEN_OVERLAP, "mm", met.told)


def _proof_of(one: ProofBody, other: ProofBody) -> str:
    """Return the one proof in which the way of a pair is."""
    groups = {one.motion, other.motion}
    if groups - FIXED:
        return SIDES_MOVE
    if Motion.CAVITY_HALF in groups:
        return CAVITY_OPENS
    return PART_LEAVES if Motion.PART in groups else EJECTORS_MOVE
