"""`moldgen cache`: what is kept for later runs, where, and how to be rid of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from moldgen.canon import plain
from moldgen.errors import ExitCode, SpecError
from moldgen.flow.job import Table
from moldgen.flow.report import table_lines
from moldgen.flow.store import PLACE, Summary, open_store

MIB = 2**20


@dataclass(frozen=True)
class CacheLook:
    """What the cache holds now; `before` is what it held before it was cleared, None if it was not."""

    now: Summary
    before: Summary | None = None


def look_at_cache(*, clear: bool = False) -> CacheLook:
    """Return what the cache holds, cleared first if so asked.

    Raises
    ------
    SpecError : there is no cache to clear, or the environment names a limit that makes no sense
    """
    store = open_store()
    before = store.summary()
    if not clear:
        return CacheLook(before)
    if before.why_not:
        raise SpecError(f"there is no cache to clear: {before.why_not}", remedy=f"set {PLACE} to the folder to clear")
    store.clear()
    return CacheLook(store.summary(), before)


def cache_lines(look: CacheLook) -> list[str]:
    """Return what the terminal shows."""
    now = look.now
    if now.why_not:
        return [f"cache: none, {now.why_not}"]
    columns, counts = ("", "entries", "notes", "size [MiB]"), []
    if look.before is not None:
        counts.append(("before", look.before.entries, look.before.notes, round(look.before.size_bytes / MIB, 2)))
    counts.append(("now", now.entries, now.notes, round(now.size_bytes / MIB, 2)))
    table = Table(f"cache: {now.folder}, at most {now.limit_bytes / MIB:.6g} MiB", columns, tuple(counts))
    return table_lines(table)


def cache_json(look: CacheLook) -> dict[str, Any]:
    """Return what ``--json`` prints."""
    return {"exit_code": int(ExitCode.OK), **plain(look.now), "cleared": plain(look.before)}
