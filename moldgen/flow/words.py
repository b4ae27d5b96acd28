"""Words for what the terminal and the pictures show of a result."""

from __future__ import annotations

import re
from collections.abc import Sequence
from itertools import groupby

AXIS = 1.0 - 1e-9
"""Cosine from which a direction counts as an axis of the part."""

BUILD_AGAIN = "build the tool again, then accept it"
"""Remedy where an output folder and its spec have gone apart."""


def direction_text(direction: Sequence[float]) -> str:
    """Return a direction as a spec would give it: the axis if it is one, else its components.

    >>> direction_text((0.0, 0.0, -1.0)), direction_text((0.6, 0.0, 0.8))
    ('-z', '0.6, 0, 0.8')
    """
    for axis, value in zip("xyz", direction, strict=True):
        if abs(value) > AXIS:
            return ("+" if value > 0 else "-") + axis
    return ", ".join(f"{round(v, 4) + 0.0:g}" for v in direction)


def spec_direction(direction: Sequence[float]) -> str:
    """Return a direction exactly as it can be pasted behind ``pull:``, good to 1e-6.

    >>> spec_direction((0.0, 0.0, -1.0)), spec_direction((0.6, 0.0, 0.8))
    ('-z', '[0.6, 0, 0.8]')
    """
    text = direction_text(direction)
    return text if len(text) == 2 else f"[{', '.join(f'{round(v, 6) + 0.0:.6g}' for v in direction)}]"


def told_note(note: str) -> str:
    """Return the note of a component with the names of its equals shortened to their numbers.

    >>> told_note("tip level; 4 alike: ejector pin 1, ejector pin 2, ejector pin 3, ejector pin 7")
    'tip level; numbers 1 to 3, 7'
    """
    kept, found, names = note.partition(" alike: ")
    numbers = [int(n) for n in re.findall(r" (\d+)(?:,|$)", names)]
    if not found or not numbers:
        return note
    kept = re.sub(r";? ?\d+$", "", kept)
    return "; ".join(filter(None, (kept, f"numbers {_ranges(numbers)}")))


def _ranges(numbers: Sequence[int]) -> str:
    """Return ascending numbers with runs of three and more drawn together."""
    texts = []
    for _, run in groupby(enumerate(numbers), key=lambda pair: pair[1] - pair[0]):
        values = [value for _, value in run]
        texts += [f"{values[0]} to {values[-1]}"] if len(values) > 2 else [str(v) for v in values]
    return ", ".join(texts)


def point_text(point: Sequence[float], digits: int = 2) -> str:
    """Return coordinates with a fixed number of digits, comma between them, no minus before a zero."""
    return ", ".join(f"{round(v, digits) + 0.0:.{digits}f}" for v in point)
