"""What a run may remember for the next one: bytes by a key that names all they were made from.

Whoever can use it takes a `Memory` as an argument; where nothing is to be remembered, `Forgetful` is passed. A key is a
hash of contents, never of times or places, so that what is recalled is what would be computed.
"""

from __future__ import annotations

from typing import Protocol


class Memory(Protocol):
    """A place for bytes that outlives the run. It may lose anything at any time, and never returns damaged bytes."""

    def recall(self, key: str) -> bytes | None:
        """Return what was kept under `key`, None if nothing was, or if it is lost."""

    def keep(self, key: str, data: bytes) -> None:
        """Keep `data` under `key`, if that can be done: a full disk is no error here."""


class Forgetful:
    """Keeps nothing."""

    def recall(self, key: str) -> bytes | None:  # noqa: ARG002
        """Return None."""
        return None

    def keep(self, key: str, data: bytes) -> None:
        """Let it go."""
