"""`compare.html`: what changed between two tools, on one page that needs nothing but itself."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from moldgen.model.revision import Comparison, ComponentChange, Fate, SteelPiece
from moldgen.output import compare_html as html
from moldgen.output import compare_words as words
from moldgen.output.compare_html import Markup, element
from moldgen.output.compare_lists import findings_section, item_section, number_section, part_section
from moldgen.output.compare_pictures import DrawnComparison

FILE = "compare.html"

TAGS = {Fate.WELD: "weld", Fate.CUT: "cut", Fate.UNCHANGED: "steel", Fate.MOVED: "steel"}
"""The mark beside the words of a fate; the others have an empty square."""

NO_FILE = Markup('<span class="quiet">none</span>')


def write_compare_page(comparison: Comparison, pictures: DrawnComparison, folder: Path) -> Path:
    """Write the page into `folder` and return its path.

    The page holds its pictures itself, so that it can be sent alone; STEP files are linked where they lie in `folder`.

    Raises
    ------
    OSError : the page cannot be written, or a picture cannot be read
    """
    path = folder / FILE
    path.write_bytes(compare_page(comparison, pictures, folder).encode("utf-8"))
    return path


def compare_page(comparison: Comparison, pictures: DrawnComparison, folder: Path) -> str:
    """Return the page as text; see `write_compare_page`."""
    worked = words.by_fate(comparison, Fate.WELD, Fate.CUT)
    anchors = {id(change): f"component-{number}" for number, change in enumerate(worked, start=1)}
    body = html.lines(
        [
            _head(comparison),
            findings_section(comparison.findings),
            _summary(comparison, anchors),
            _missing(pictures),
            *(_component(change, anchors[id(change)], pictures, folder) for change in worked),
            _others(comparison),
            item_section(comparison.items),
            number_section(comparison.numbers),
            part_section(comparison.part),
        ]
    )
    return html.page(f"{comparison.old} \u2192 {comparison.new}", body)


def _head(comparison: Comparison) -> Markup:
    return html.lines(
        [
            element("h1", f"{comparison.old} \u2192 {comparison.new}"),
            element("p", words.verdict(comparison), class_="verdict"),
            element("p", words.steel_words(comparison)),
            element("div", *(element("p", caution) for caution in words.CAUTIONS), class_="cautions"),
            element("p", f"How the parts were aligned: {words.alignment_words(comparison.alignment)}."),
            element("p", "Places are in mm. Old is the tool that may be cut already.", class_="quiet"),
        ]
    )


def _summary(comparison: Comparison, anchors: dict[int, str]) -> Markup:
    """Return one row for each component that does not stay as it is."""
    changed = words.changed(comparison)
    heading = element("h2", "What becomes of the steel")
    if not changed:
        return html.lines([heading, element("p", "No component changes.")])
    rows = []
    for change in changed:
        name: object = words.component_name(change)
        if id(change) in anchors:
            name = element("a", name, href=f"#{anchors[id(change)]}")
        cut, weld = (words.figure(v) if v else "" for v in (change.cut_mm3, change.weld_mm3))
        rows.append((_fate(change.fate), name, weld, cut, words.material_words(change), change.note))
    columns = ("fate", "component", "to weld [mm\u00b3]", "to cut [mm\u00b3]", "material", "note")
    return html.lines([heading, html.table(columns, rows, numeric=(2, 3))])


def _missing(pictures: DrawnComparison) -> Markup:
    if not pictures.missing:
        return Markup()
    return element("p", f"Pictures are missing: {pictures.missing}.", class_="cautions")


def _component(change: ComponentChange, anchor: str, pictures: DrawnComparison, folder: Path) -> Markup:
    name = words.component_name(change)
    facts = [words.steel_facts(change), _material(change), _count(change), change.note]
    legend = [_tag("weld", "weld or new insert"), _tag("cut", "cut away"), _tag("steel", "steel of the new tool")]
    drawn = pictures.of(change)
    figures = [html.picture(file, _picture_words(change, k)) for k, file in enumerate(drawn)]
    return html.lines(
        [
            element("h3", f"{name}: ", _fate(change.fate), id=anchor),
            element("p", "; ".join(filter(None, facts))),
            *figures,
            element("p", *_spaced(legend), class_="quiet") if figures else Markup(),
            _pieces(words.pieces_in_order(change), folder),
        ]
    )


def _pieces(pieces: Sequence[SteelPiece], folder: Path) -> Markup:
    """Return the table of pieces, in their order."""
    if not pieces:
        return element("p", "No piece of steel is listed.", class_="quiet")
    rows = [
        (
            _tag(p.work.value, words.piece_label(p)),
            words.piece_volume(p),
            words.figure(p.depth_mm),
            element("span", words.place(p.at), class_="place"),
            element("span", words.place(p.at_part), class_="place"),
            p.cause,
            html.file_link(folder, p.file) if p.file else NO_FILE,
        )
        for p in pieces
    ]
    columns = (
        "piece",
        "volume [mm\u00b3]",
        "depth [mm]",
        "in the mold x, y, z",
        "on the part x, y, z",
        "cause",
        "STEP file",
    )
    note = "about: the solid is made of facets, its volume is near only." if not all(p.exact for p in pieces) else ""
    return html.lines(
        [html.table(columns, rows, numeric=(1, 2)), element("p", note, class_="quiet") if note else Markup()]
    )


def _others(comparison: Comparison) -> Markup:
    """Return the lists of components on whose steel nothing is done."""
    titles = {
        Fate.NOT_COMPARED: "Not compared: nothing is known of these",
        Fate.NEW: "New components",
        Fate.GONE: "No longer used",
        Fate.MOVED: "Moved, steel unchanged",
        Fate.UNCHANGED: "Unchanged",
    }
    blocks = []
    for fate, title in titles.items():
        changes = words.by_fate(comparison, fate)
        if changes:
            blocks += [element("h2", f"{title} ({len(changes)})"), _list(changes)]
    return html.lines(blocks)


def _list(changes: Sequence[ComponentChange]) -> Markup:
    if all(c.fate is Fate.UNCHANGED and not c.note for c in changes):
        return element("p", ", ".join(words.component_name(c) for c in changes))
    items = []
    for change in changes:
        moved = change.shift is not None and change.fate is Fate.MOVED and "moved by" not in change.note
        way = f"moved by {words.place(change.shift, 3)} mm" if moved else ""
        facts = ", ".join(filter(None, (way, _material(change), _count(change), change.note)))
        items.append(element("li", words.component_name(change) + (f": {facts}" if facts else "")))
    return element("ul", *items)


def _material(change: ComponentChange) -> str:
    material = words.material_words(change)
    return f"material {material}" if material else ""


def _count(change: ComponentChange) -> str:
    count = words.count_words(change)
    return f"quantity {count}" if count not in ("0", "1") else ""


def _picture_words(change: ComponentChange, sheet: int) -> str:
    which = "whole component with its largest pieces from near" if sheet == 0 else "further pieces from near"
    return f"{change.new}, {which}: {words.steel_facts(change)}"


def _fate(fate: Fate) -> Markup:
    return _tag(TAGS.get(fate, "none"), fate.value)


def _tag(kind: str, label: str) -> Markup:
    return element("span", label, class_=f"tag {kind}")


def _spaced(tags: Sequence[Markup]) -> list[Markup]:
    return [Markup(f"{tag} &ensp; ") for tag in tags]
