"""What `compare` shows on the terminal: the headline and the tables, none wider than a terminal of 120 columns."""

from __future__ import annotations

from collections.abc import Sequence

from moldgen.flow.job import Cell, Table
from moldgen.model.revision import Comparison, Fate, Work
from moldgen.output import compare_words as words

MOST_ROWS = 30
"""Rows of a table on the terminal; the page and the JSON have them all."""

NAME, CAUSE, SIZE, SHORT = 22, 32, 28, 14
"""Characters of a name, of a cause or note, of a size, and what a name may take more where there is room."""


def compare_headline(comparison: Comparison) -> str:
    """Return what the terminal says first: which tools, what becomes of the components, whether cutting is enough."""
    told = f"{words.verdict(comparison)} {words.steel_words(comparison)}".replace("mm\u00b3", "mm3")
    aligned = words.alignment_words(comparison.alignment)
    return f"{comparison.old} -> {comparison.new}: {told} How the parts were aligned: {aligned}."


def compare_tables(comparison: Comparison) -> tuple[Table, ...]:
    """Return the tables of a comparison; those without rows are left out.

    Long words are cut short, and so are long tables: their last row says how many rows are left out.
    """
    made = (_components(comparison), _steel(comparison), _items(comparison), _numbers(comparison), _part(comparison))
    return tuple(table for table in made if table.rows)


def _components(comparison: Comparison) -> Table:
    changed = words.by_fate(comparison, *(fate for fate in Fate if fate is not Fate.UNCHANGED))
    rows = [
        (
            change.fate.value,
            _clip(words.component_name(change), NAME + SHORT),
            _volume(change.weld_mm3),
            _volume(change.cut_mm3),
            _clip(change.note, CAUSE),
        )
        for change in changed
    ]
    unchanged = sum(c.fate is Fate.UNCHANGED for c in comparison.components)
    title = f"components, {unchanged} unchanged ones left out" if unchanged else "components"
    return _table(title, ("fate", "component", "to weld [mm3]", "to cut [mm3]", "note"), rows)


def _steel(comparison: Comparison) -> Table:
    pieces = [
        piece
        for change in words.by_fate(comparison, Fate.WELD, Fate.CUT)
        for piece in sorted(change.pieces, key=lambda p: (p.work is not Work.WELD, p.number))
    ]
    names = [_clip(piece.component, NAME) for piece in pieces]
    room = CAUSE + NAME - max(map(len, names), default=0)  # short names leave room for causes
    rows = [
        (
            name,
            words.piece_label(piece),
            _round(piece.volume_mm3) if piece.exact else words.piece_volume(piece),
            _round(piece.depth_mm),
            words.place(piece.at),
            _clip(piece.cause, room),
        )
        for name, piece in zip(names, pieces, strict=True)
    ]
    columns = ("component", "piece", "volume [mm3]", "depth [mm]", "at x, y, z (mold)", "cause")
    return _table("steel to weld and to cut", columns, rows)


def _items(comparison: Comparison) -> Table:
    rows = [
        (
            _clip(item.name if item.name.startswith(item.kind) else f"{item.kind} {item.name}", NAME),
            words.place(item.was_at),
            words.place(item.now_at),
            words.item_move(item),
            _clip(item.was if item.was == item.now else f"{item.was or 'none'} -> {item.now or 'none'}", SIZE),
        )
        for item in comparison.items
    ]
    columns = ("what", "was at x, y, z (mold)", "is at x, y, z (mold)", "moved [mm]", "size")
    return _table("pins, gates, lines and plates that changed", columns, rows)


def _numbers(comparison: Comparison) -> Table:
    rows = [
        (
            _clip(f"{n.name} [{n.unit}]" if n.unit not in ("", "1") else n.name, NAME + SHORT),
            None if n.was is None else _round(n.was),
            None if n.now is None else _round(n.now),
            words.change_words(n),
            _clip(n.cause, CAUSE),
        )
        for n in comparison.numbers
    ]
    return _table("numbers that changed", ("number", "was", "is", "change", "cause"), rows)


def _part(comparison: Comparison) -> Table:
    rows = [
        (
            c.kind.value,
            _clip(c.feature, NAME),
            words.place(c.at),
            words.place(c.shift, 3),
            _clip(f"{c.was or 'none'} -> {c.now or 'none'}" if c.was or c.now else "", NAME),
        )
        for c in comparison.part
    ]
    return _table("the part", ("change", "feature", "at x, y, z (part)", "moved by [mm]", "size"), rows)


def _table(title: str, columns: tuple[str, ...], rows: Sequence[tuple[Cell, ...]]) -> Table:
    """Return a table of at most `MOST_ROWS` rows, and one that counts the others."""
    shown = list(rows)
    if len(rows) > MOST_ROWS:
        rest = f"and {len(rows) - MOST_ROWS + 1} more"
        shown = [*rows[: MOST_ROWS - 1], (rest, *[None] * (len(columns) - 1))]
    return Table(title, columns, tuple(shown))


def _volume(value: float) -> float | None:
    return _round(value) if value > 0.0 else None


def _round(value: float) -> float:
    """Return four digits: what a person compares."""
    return float(f"{value:.4g}")


def _clip(long: str, most: int) -> str:
    """Return text on one line, cut short at `most` characters."""
    flat = " ".join(long.split())
    return flat if len(flat) <= most else flat[: most - 3].rstrip() + "..."
