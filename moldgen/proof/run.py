"""All proofs of one tool, in order."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial

from moldgen.errors import KernelError
from moldgen.kernel.beside import Beside
from moldgen.kernel.guard import operation
from moldgen.model.motion import Step, straight_steps
from moldgen.model.proof import Proof, Verdict
from moldgen.proof.bodies import ProofBody
from moldgen.proof.motion import MovingTool
from moldgen.proof.opening import (
    CAVITY_OPENS,
    EJECTORS_MOVE,
    PART_LEAVES,
    SIDES_MOVE,
    not_run,
    prove_cavity_half,
    prove_ejection,
    prove_part,
    prove_side_actions,
    side_groups,
)
from moldgen.proof.rest import (
    APART,
    FILLED,
    SOUND,
    balance_question,
    filling_volume,
    prove_balance,
    prove_rest,
    prove_sound,
)
from moldgen.tolerances import BALANCE


@dataclass(frozen=True)
class Claims:
    """What the tool claims about itself besides its solids: volumes [mm^3], the ejectors' stroke [mm], how it opens.

    Without steps it is a tool of two halves and ejectors, whose steps follow from the stroke.
    """

    block_mm3: float
    bored_mm3: float
    stroke_mm: float
    steps: tuple[Step, ...] = ()


def prove_tool(bodies: Sequence[ProofBody], claims: Claims) -> tuple[Proof, ...]:
    """Return every proof; one that could not run says why and does not count as passed.

    Answers about bodies that a memory was given for are recalled (see `moldgen.proof.bodies.asked_beside`).
    """
    asked = balance_question(bodies, claims.block_mm3, claims.bored_mm3)
    if asked is not None and asked.recalled() is not None:
        return _proved(bodies, claims, None)
    together = Beside(lambda: filling_volume(bodies))
    try:
        return _proved(bodies, claims, together.result)
    finally:
        together.stop()


def _proved(bodies: Sequence[ProofBody], claims: Claims, together: Callable[[], float] | None) -> tuple[Proof, ...]:
    return (
        _asked(Proof(SOUND, Verdict.NOT_RUN, None, 0.0, "faults"), lambda: prove_sound(bodies)),
        _asked(
            Proof(FILLED, Verdict.NOT_RUN, None, BALANCE, "of the block"),
            lambda: prove_balance(bodies, claims.block_mm3, claims.bored_mm3, together),
        ),
        _asked(not_run(APART, ""), lambda: prove_rest(bodies)),
        *_opening_proofs(bodies, claims),
    )


def _opening_proofs(bodies: Sequence[ProofBody], claims: Claims) -> tuple[Proof, ...]:
    asked: list[tuple[str, Callable[[MovingTool], Proof]]] = [
        (CAVITY_OPENS, prove_cavity_half),
        (PART_LEAVES, prove_part),
        (EJECTORS_MOVE, lambda tool: prove_ejection(tool, claims.stroke_mm)),
    ]
    if side_groups(bodies):
        asked.append((SIDES_MOVE, prove_side_actions))
    try:
        with operation("mesh the tool to move it"):
            tool = MovingTool(bodies, claims.steps or straight_steps(claims.stroke_mm, _depth(bodies)))
    except KernelError as error:
        return tuple(not_run(name, error.what) for name, _ in asked)
    return tuple(_asked(not_run(name, ""), partial(ask, tool)) for name, ask in asked)


def _depth(bodies: Sequence[ProofBody]) -> float:
    """Return the height of everything together [mm], 0 for nothing."""
    boxes = [b.body.box for b in bodies]
    return float(max(h[2] for _, h in boxes) - min(low[2] for low, _ in boxes)) if boxes else 0.0


def _asked(unanswered: Proof, ask: Callable[[], Proof]) -> Proof:
    """Return the answer, or why there is none: a kernel that gives up on one question must not hide the others."""
    try:
        with operation(f"prove that {unanswered.name}"):
            return ask()
    except KernelError as error:
        return replace(unanswered, detail=error.what)
