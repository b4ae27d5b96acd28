"""Pairs of things of two lists, the nearest first."""

from __future__ import annotations

from collections.abc import Iterable


def nearest_pairs(gaps: Iterable[tuple[float, int, int]]) -> list[tuple[int, int]]:
    """Return pairs of numbers by their gaps, the smallest first, of equal ones the lower numbers; each number once.

    gaps : how far a thing of one list is from a thing of the other, and the numbers of both
    """
    found: list[tuple[int, int]] = []
    used_old: set[int] = set()
    used_new: set[int] = set()
    for _, old, new in sorted(gaps):
        if old not in used_old and new not in used_new:
            found.append((old, new))
            used_old.add(old)
            used_new.add(new)
    return found
