"""The lists at the end of `compare.html`: findings, pins, gate and block, numbers, and the part itself."""

from __future__ import annotations

from collections.abc import Sequence

from moldgen.finding import Finding, Severity
from moldgen.model.revision import ItemChange, NumberChange, PartChange
from moldgen.output import compare_html as html
from moldgen.output import compare_words as words
from moldgen.output.compare_html import Markup, element


def findings_section(findings: Sequence[Finding]) -> Markup:
    """Return what the reader must know of the comparison itself, the gravest first; nothing if there is nothing."""
    if not findings:
        return Markup()
    order = {severity: -place for place, severity in enumerate(Severity)}
    items = [
        element("li", element("strong", f"{f.severity.value}: "), f.message, _figure(f), _where(f), _remedy(f))
        for f in sorted(findings, key=lambda f: order[f.severity])
    ]
    return html.lines([element("h2", "To be known first"), element("ul", *items)])


def item_section(items: Sequence[ItemChange]) -> Markup:
    """Return the table of pins, gate and block that changed."""
    rows = [
        (
            item.kind,
            item.name,
            _place(words.place(item.was_at)),
            _place(words.place(item.now_at)),
            words.item_move(item),
            item.was,
            item.now,
            words.item_note(item),
        )
        for item in items
    ]
    columns = ("kind", "name", "was at (mold)", "is at (mold)", "moved [mm]", "was", "is", "note")
    return _section("Pins, gate and block", columns, rows, (4,), "None of them changed.")


def number_section(numbers: Sequence[NumberChange]) -> Markup:
    """Return the table of numbers that changed beyond noise."""
    rows = [
        (
            number.name + words.unit_words(number.unit),
            "" if number.was is None else words.figure(number.was, words.digits_apart(number)),
            "" if number.now is None else words.figure(number.now, words.digits_apart(number)),
            words.change_words(number),
            number.cause,
        )
        for number in numbers
    ]
    columns = ("number", "was", "is", "change", "cause")
    return _section("Numbers that changed", columns, rows, (1, 2, 3), "None changed beyond noise.")


def part_section(changes: Sequence[PartChange]) -> Markup:
    """Return the table of what changed of the part."""
    rows = [
        (
            change.kind.value,
            change.feature,
            _place(words.place(change.at)),
            _place(words.place(change.shift, 3)),
            change.was,
            change.now,
            f"{_faces(change.old_faces)} \u2192 {_faces(change.new_faces)}",
        )
        for change in changes
    ]
    columns = ("change", "feature", "at (part)", "moved by [mm]", "was", "is", "faces old \u2192 new")
    return _section("What changed of the part", columns, rows, (), "The part is the same.")


def _section(
    title: str, columns: Sequence[str], rows: Sequence[Sequence[object]], numeric: Sequence[int], none: str
) -> Markup:
    """Return a table under a heading with its number of rows, or `none` without rows; empty columns are left out."""
    if not rows:
        return html.lines([element("h2", title), element("p", none)])
    kept = [k for k in range(len(columns)) if any(row[k] != "" for row in rows)]
    shown = html.table(
        [columns[k] for k in kept],
        [[row[k] for k in kept] for row in rows],
        [place for place, k in enumerate(kept) if k in numeric],
    )
    return html.lines([element("h2", f"{title} ({len(rows)})"), shown])


def _place(point: str) -> Markup | str:
    return element("span", point, class_="place") if point else ""


def _faces(numbers: Sequence[int]) -> str:
    """Return face numbers, the first few only."""
    if not numbers:
        return "none"
    return ", ".join(map(str, numbers[:4])) + (f" and {len(numbers) - 4} more" if len(numbers) > 4 else "")


def _figure(finding: Finding) -> str:
    if finding.value is None:
        return ""
    unit = "" if finding.unit in ("", "1") else f" {finding.unit}"
    limit = "" if finding.limit is None else f", limit {words.figure(finding.limit)}{unit}"
    return f" ({words.figure(finding.value)}{unit}{limit})"


def _where(finding: Finding) -> str:
    place = ", at ".join(filter(None, (finding.where, words.place(finding.at))))
    return f" [{place}]" if place else ""


def _remedy(finding: Finding) -> Markup | str:
    return element("span", f" Try: {finding.remedy}", class_="quiet") if finding.remedy else ""
