"""Answers that an earlier run found for bodies of the very same content, so that they need not be found again.

A key is a hash of the question, of each body's content and place, of how finely it is meshed, and of every number that
enters; the memory that a caller hands over adds the versions of all that computes. So what is recalled is what would be
found, to the last bit, and an answer for one body never stands for another.
"""

from __future__ import annotations

import struct
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from moldgen.canon import sha256_bytes
from moldgen.memory import Memory
from moldgen.tolerances import PROOF_ANGLE, PROOF_DEFLECTION


@dataclass(frozen=True)
class Subject:
    """What a body is, for those who remember answers about it.

    content : hash of the solid without its place; place : rotation and shift [mm], (12,)
    memory : where answers are kept
    """

    memory: Memory
    content: str
    place: tuple[float, ...]


@dataclass(frozen=True)
class Question:
    """A question about some bodies in their order, and the numbers that enter its answer; see `asked`."""

    memory: Memory
    key: str
    size: int

    def recalled(self) -> tuple[float, ...] | None:
        """Return the answer that was found earlier, None if there is none."""
        data = self.memory.recall(self.key)
        if data is None or len(data) != 8 * self.size:
            return None
        return struct.unpack(f">{self.size}d", data)

    def keep(self, answer: Sequence[float]) -> None:
        """Remember an answer."""
        self.memory.keep(self.key, struct.pack(f">{self.size}d", *answer))


def question(name: str, subjects: Sequence[Subject | None], numbers: Sequence[float], size: int) -> Question | None:
    """Return a question whose answer is `size` numbers; None where a body is not known by its content.

    numbers : all that enters besides the bodies and the code
    """
    known = [subject for subject in subjects if subject is not None]
    if not known or len(known) < len(subjects):
        return None
    bodies = [f"{s.content} {_exact(s.place)}" for s in known]
    fineness = _exact((PROOF_DEFLECTION, PROOF_ANGLE))
    text = "\n".join([name, fineness, f"{len(bodies)} bodies", *bodies, _exact(numbers)])
    return Question(known[0].memory, sha256_bytes(text.encode()), size)


def answered(asked: Question | None, find: Callable[[], Sequence[float]]) -> tuple[float, ...]:
    """Return the answer that is remembered, else the one that `find` returns, which is remembered from now on.

    What `find` raises is not remembered.
    """
    known = None if asked is None else asked.recalled()
    if known is not None:
        return known
    found = tuple(find())
    if asked is not None:
        asked.keep(found)
    return found


def mesh_key(subject: Subject) -> str:
    """Return the key of the mesh of a bare solid."""
    return sha256_bytes(f"mesh\n{_exact((PROOF_DEFLECTION, PROOF_ANGLE))}\n{subject.content}".encode())


def _exact(numbers: Sequence[float]) -> str:
    return struct.pack(f">{len(numbers)}d", *numbers).hex()
