"""Find a row by name, tolerant of case and spacing, and help when there is none."""

from __future__ import annotations

from collections.abc import Sequence
from difflib import get_close_matches

from moldgen.catalog.table import R, key_of
from moldgen.errors import SpecError


def find_row(rows: Sequence[R], name: str, what: str) -> R:
    """Return the row whose name or alias is `name`; case, spaces and punctuation do not matter.

    Raises
    ------
    SpecError : no such row; the remedy lists the nearest names and all names
    """
    labels = {key_of(label): row for row in rows for label in (row.name, *row.aliases)}
    found = labels.get(key_of(name))
    if found is not None:
        return found
    near = [labels[k].name for k in get_close_matches(key_of(name), list(labels), n=3, cutoff=0.5)]
    nearest = f"nearest: {', '.join(dict.fromkeys(near))}; " if near else ""
    raise SpecError(f"unknown {what} {name!r}", remedy=f"{nearest}known: {', '.join(row.name for row in rows)}")
