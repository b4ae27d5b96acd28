"""What `compare` shows on the terminal: the headline and the tables, none wider than a terminal of 120 columns."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

from moldgen.flow.job import Cell, Table
from moldgen.model.revision import Comparison, Fate
from moldgen.output import compare_words as words

MOST_ROWS = 30
"""Rows of a table on the terminal; the page and the JSON have them all."""

WIDTH = 118
"""Characters of a row of a table, beside the two before it."""

_ZEROS = re.compile(r"(?<=\d)\.0+\b|(?<=\.\d)0+\b|(?<=\.\d\d)0+\b")
"""Zeros at the end of decimals: causes are long, and a shift of 2.000, 0.000, 0.000 mm reads as well as 2, 0, 0 mm."""

LEAST = 14
"""Characters that every column may take."""


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
    rows = [
        (
            change.fate.value,
            words.component_name(change),
            _volume(change.weld_mm3),
            _volume(change.cut_mm3),
            change.note,
        )
        for change in words.changed(comparison)
    ]
    unchanged = sum(c.fate is Fate.UNCHANGED for c in comparison.components)
    title = f"components, {unchanged} unchanged ones left out" if unchanged else "components"
    return _table(title, ("fate", "component", "to weld [mm3]", "to cut [mm3]", "note"), rows)


def _steel(comparison: Comparison) -> Table:
    pieces = [
        piece for change in words.by_fate(comparison, Fate.WELD, Fate.CUT) for piece in words.pieces_in_order(change)
    ]
    rows = [
        (
            piece.component,
            words.piece_label(piece),
            _round(piece.volume_mm3) if piece.exact else words.piece_volume(piece),
            _round(piece.depth_mm),
            words.place(piece.at),
            _ZEROS.sub("", piece.cause),
        )
        for piece in pieces
    ]
    columns = ("component", "piece", "volume [mm3]", "depth [mm]", "at x, y, z (mold)", "cause")
    return _table("steel to weld and to cut", columns, rows)


def _items(comparison: Comparison) -> Table:
    rows = [
        (
            item.name if item.kind in item.name else f"{item.kind} {item.name}",
            words.place(item.was_at),
            words.place(item.now_at),
            words.item_move(item),
            item.was if item.was == item.now else f"{item.was or 'none'} -> {item.now or 'none'}",
        )
        for item in comparison.items
    ]
    columns = ("what", "was at x, y, z (mold)", "is at x, y, z (mold)", "moved [mm]", "size")
    return _table("pins, gate and block that changed", columns, rows)


def _numbers(comparison: Comparison) -> Table:
    rows = [
        (
            f"{n.name} [{n.unit}]" if n.unit not in ("", "1") else n.name,
            None if n.was is None else _round(n.was, words.digits_apart(n)),
            None if n.now is None else _round(n.now, words.digits_apart(n)),
            words.change_words(n),
            n.cause,
        )
        for n in comparison.numbers
    ]
    return _table("numbers that changed", ("number", "was", "is", "change", "cause"), rows)


def _part(comparison: Comparison) -> Table:
    rows = [
        (
            c.kind.value,
            c.feature,
            words.place(c.at),
            words.place(c.shift, 3),
            f"{c.was or 'none'} -> {c.now or 'none'}" if c.was or c.now else "",
        )
        for c in comparison.part
    ]
    return _table("the part", ("change", "feature", "at x, y, z (part)", "moved by [mm]", "size"), rows)


def _table(title: str, columns: tuple[str, ...], rows: Sequence[tuple[Cell, ...]]) -> Table:
    """Return a table of at most `MOST_ROWS` rows, and one that counts the others, that fits the terminal."""
    shown = list(rows)
    if len(rows) > MOST_ROWS:
        rest = f"and {len(rows) - MOST_ROWS + 1} more"
        shown = [*rows[: MOST_ROWS - 1], (rest, *[None] * (len(columns) - 1))]
    return Table(title, columns, tuple(_fitted(columns, shown)))


def _fitted(columns: tuple[str, ...], rows: Sequence[tuple[Cell, ...]]) -> Iterator[tuple[Cell, ...]]:
    """Yield the rows with the longest texts cut short, column by column, until a row fits `WIDTH`."""
    flat = [tuple(" ".join(c.split()) if isinstance(c, str) else c for c in row) for row in rows]
    widths = [max(len(str(c)) for c in column) for column in zip(columns, *flat, strict=True)]
    while sum(widths) + 2 * (len(widths) - 1) > WIDTH and max(widths) > LEAST:
        widths[widths.index(max(widths))] -= 1
    for row in flat:
        yield tuple(_clip(c, most) if isinstance(c, str) else c for c, most in zip(row, widths, strict=True))


def _volume(value: float) -> float | None:
    return _round(value) if value > 0.0 else None


def _round(value: float, digits: int = words.FEW) -> float:
    """Return four digits: what a person compares."""
    return float(f"{value:.{digits}g}")


def _clip(text: str, most: int) -> str:
    """Return text cut short in its middle: causes and names differ at their ends."""
    if len(text) <= most:
        return text
    head = (most - 3) // 2
    return f"{text[:head].rstrip()}...{text[len(text) - (most - 3 - head) :].lstrip()}"
