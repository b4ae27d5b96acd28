"""All proofs of one tool, in order."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from moldgen.errors import KernelError
from moldgen.kernel.guard import operation
from moldgen.model.proof import Proof, Verdict
from moldgen.proof.bodies import ProofBody
from moldgen.proof.opening import (
    CAVITY_OPENS,
    EJECTORS_MOVE,
    PART_LEAVES,
    not_run,
    prove_cavity_half,
    prove_core_half,
    prove_ejection,
)
from moldgen.proof.rest import APART, FILLED, SOUND, prove_balance, prove_rest, prove_sound
from moldgen.tolerances import BALANCE


@dataclass(frozen=True)
class Claims:
    """What the tool claims about itself besides its solids: volumes [mm^3] and the ejectors' stroke [mm]."""

    block_mm3: float
    bored_mm3: float
    stroke_mm: float


def prove_tool(bodies: Sequence[ProofBody], claims: Claims) -> tuple[Proof, ...]:
    """Return every proof; one that could not run says why and does not count as passed."""
    return (
        _asked(Proof(SOUND, Verdict.NOT_RUN, None, 0.0, "faults"), lambda: prove_sound(bodies)),
        _asked(
            Proof(FILLED, Verdict.NOT_RUN, None, BALANCE, "of the block"),
            lambda: prove_balance(bodies, claims.block_mm3, claims.bored_mm3),
        ),
        _asked(not_run(APART, ""), lambda: prove_rest(bodies)),
        _asked(not_run(CAVITY_OPENS, ""), lambda: prove_cavity_half(bodies)),
        _asked(not_run(PART_LEAVES, ""), lambda: prove_core_half(bodies)),
        _asked(not_run(EJECTORS_MOVE, ""), lambda: prove_ejection(bodies, claims.stroke_mm)),
    )


def _asked(unanswered: Proof, ask: Callable[[], Proof]) -> Proof:
    """Return the answer, or why there is none: a kernel that gives up on one question must not hide the others."""
    try:
        with operation(f"prove that {unanswered.name}"):
            return ask()
    except KernelError as error:
        return replace(unanswered, detail=error.what)
