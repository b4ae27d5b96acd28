"""What a comparison of two tools says in words: the verdict, the cautions, places and sizes."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

from moldgen.canon import to_json
from moldgen.model.part import Vector
from moldgen.model.revision import (
    Alignment,
    Comparison,
    ComponentChange,
    Fate,
    ItemChange,
    NumberChange,
    SteelPiece,
    Work,
)

CAUTIONS = (
    "First-pass comparison of two computed tools, not a release to cut steel: qualified people, licensed where the law "
    "asks for it, check every piece against the real tool before steel is cut or welded.",
    "It compares the old tool as its files say. Measure the steel first: what was reworked, polished, textured, coated "
    "or worn since, and hardness, are not in the files. Differences under 0.012 mm are not told (0.024 mm where the "
    "kernel could not cut the solids): they cannot be told from the facets of the meshes that find them.",
    "Welding changes hardness and structure of the steel beside the weld, can crack or warp it, and can show on "
    "polished or textured faces. Whether to weld, with which filler and heat treatment, or to set in a new insert "
    "instead, is for the toolmaker and the steel's supplier to say (common practice).",
)
"""Own words; printed with every comparison."""

SQUARED, CUBED = "\u00b2", "\u00b3"

EQUAL = 1e-6
"""mm: what is less apart lies on each other."""

FEW, MANY = 4, 6
"""Digits of a figure, and those of one that changed by so little that four read the same (our choice)."""

_ONE_MANY = (
    (Fate.CUT, "is cut", "are cut"),
    (Fate.WELD, "needs welding or a new insert", "need welding or a new insert"),
    (Fate.NOT_COMPARED, "could not be compared", "could not be compared"),
    (Fate.NEW, "is new", "are new"),
    (Fate.GONE, "is no longer used", "are no longer used"),
    (Fate.MOVED, "is moved", "are moved"),
    (Fate.UNCHANGED, "stays as it is", "stay as they are"),
)


def verdict(comparison: Comparison) -> str:
    """Return what becomes of the components in one sentence: "3 components are cut, 1 needs welding or ..."."""
    counts = Counter(c.fate for c in comparison.components)
    if not counts:
        return "There is no component to compare."
    if set(counts) == {Fate.UNCHANGED}:
        number = counts[Fate.UNCHANGED]
        return "The only component stays as it is." if number == 1 else f"All {number} components stay as they are."
    parts: list[str] = []
    for fate, one, many in _ONE_MANY:
        number = counts[fate]
        if number:
            noun = "" if parts else " component" if number == 1 else " components"
            parts.append(f"{number}{noun} {one if number == 1 else many}")
    return ", ".join(parts) + "."


def steel_words(comparison: Comparison) -> str:
    """Return in one sentence whether the old steel is enough."""
    fates = {c.fate for c in comparison.components}
    if fates <= {Fate.UNCHANGED, Fate.MOVED, Fate.GONE}:
        return "No steel has to be cut, welded or made new."
    if comparison.steel_safe:
        return f"Steel-safe: cutting {volume(comparison, Work.CUT)} is enough, no steel is missing."
    what = []
    if Fate.WELD in fates:
        what.append(f"{volume(comparison, Work.WELD)} of steel is missing")
    if Fate.NEW in fates:
        what.append("new components have to be made")
    if Fate.NOT_COMPARED in fates:
        what.append("not every component could be compared")
    head = "Not known to be steel-safe" if len(what) == 1 and Fate.NOT_COMPARED in fates else "Not steel-safe"
    return f"{head}: {' and '.join(what)}."


def volume(comparison: Comparison, work: Work) -> str:
    """Return the volume of all pieces of one work, with its unit."""
    pieces = (p for c in comparison.components for p in c.pieces)
    return f"{figure(sum(p.volume_mm3 for p in pieces if p.work is work))} mm\u00b3"


def by_fate(comparison: Comparison, *fates: Fate) -> list[ComponentChange]:
    """Return the components of some fates: in the order of `Fate`, then most steel to weld, most to cut, by name."""
    order = {fate: place for place, fate in enumerate(Fate)}
    chosen = [c for c in comparison.components if c.fate in fates]
    return sorted(chosen, key=lambda c: (order[c.fate], -c.weld_mm3, -c.cut_mm3, c.new or c.old, c.old))


def changed(comparison: Comparison) -> list[ComponentChange]:
    """Return the components that do not stay as they are, as `by_fate` orders them."""
    return by_fate(comparison, *(fate for fate in Fate if fate is not Fate.UNCHANGED))


def pieces_in_order(change: ComponentChange) -> list[SteelPiece]:
    """Return the pieces of a component, those to weld first."""
    return sorted(change.pieces, key=lambda p: (p.work is not Work.WELD, p.number))


def component_name(change: ComponentChange) -> str:
    """Return the name of a component: that of the new tool, and the old one where it was another."""
    if change.old and change.new and change.old != change.new:
        return f"{change.new} (was {change.old})"
    return change.new or change.old


def piece_label(piece: SteelPiece) -> str:
    """Return what a piece is called in pictures and tables, such as "weld 2"."""
    return f"{piece.work.value} {piece.number}"


def picture_key(change: ComponentChange) -> str:
    """Return what tells the pictures of one component from those of another of the same name: its first STEP file."""
    return change.pieces[0].file if change.pieces and change.pieces[0].file else change.new


def piece_volume(piece: SteelPiece) -> str:
    """Return the volume of a piece without unit; "about" says that its solid is made of facets."""
    return figure(piece.volume_mm3) if piece.exact else f"about {figure(piece.volume_mm3)}"


def piece_size(piece: SteelPiece) -> str:
    """Return depth and volume of a piece in words."""
    return f"{figure(piece.depth_mm)} mm deep, {piece_volume(piece)} mm\u00b3"


def steel_facts(change: ComponentChange) -> str:
    """Return how much steel comes and goes, in words: "weld 1 piece, 12.3 mm3; cut 2 pieces, 40 mm3"."""
    texts = []
    for work in (Work.WELD, Work.CUT):
        volumes = [p.volume_mm3 for p in change.pieces if p.work is work]
        if volumes:
            noun = "piece" if len(volumes) == 1 else "pieces"
            texts.append(f"{work.value} {len(volumes)} {noun}, {figure(sum(volumes))} mm\u00b3")
    return "; ".join(texts)


def material_words(change: ComponentChange) -> str:
    """Return the material, and the old one where it was another."""
    if change.was_material and change.material and change.was_material != change.material:
        return f"{change.material} (was {change.was_material})"
    return change.material or change.was_material


def count_words(change: ComponentChange) -> str:
    """Return how many of a component the tool has: "4", or "4, was 6"."""
    if change.old and change.new and change.count_old != change.count_new:
        return f"{change.count_new}, was {change.count_old}"
    return str(change.count_new if change.new else change.count_old)


def alignment_words(alignment: Alignment) -> str:
    """Return how the old part was laid onto the new one, and how well it fits there."""
    fits = f"{alignment.matched} of {alignment.faces} faces"
    told = [alignment.how]
    if fits not in alignment.how:
        told.append(f"{fits} of the old part lie on the new one")
    if alignment.residual_mm >= EQUAL:
        told.append(f"they are up to {figure(alignment.residual_mm)} mm apart")
    return "; ".join(told)


def distance(was: Vector | None, now: Vector | None) -> float | None:
    """Return how far apart two places are [mm], None where there is none."""
    if was is None or now is None:
        return None
    return float(sum((b - a) ** 2 for a, b in zip(was, now, strict=True)) ** 0.5)


def item_move(item: ItemChange) -> str:
    """Return what happened to the place of a pin, gate or block, in a word or with its way [mm]."""
    way = distance(item.was_at, item.now_at)
    if way is not None:
        return f"{way:.3f}" if way > 0.0 else "0"
    return "new" if item.now_at is not None else "gone" if item.was_at is not None else ""


def item_note(item: ItemChange) -> str:
    """Return the note of an item, unless it says no more than `item_move`."""
    move = item_move(item)
    return "" if item.note in (move, f"moved by {move} mm") else item.note


def unit_words(unit: str) -> str:
    """Return a unit in brackets with raised powers, " [mm3]"; "" for none."""
    return "" if unit in ("", "1") else f" [{unit.replace('^2', SQUARED).replace('^3', CUBED)}]"


def change_words(number: NumberChange) -> str:
    """Return by how much a number changed, in percent of what it was: "+2.5 %"."""
    if number.was is None or number.now is None:
        return "new" if number.was is None else "gone"
    if number.was == 0.0:
        return ""
    percent = 100.0 * (number.now - number.was) / abs(number.was)
    return f"{percent:+.1f} %" if abs(percent) >= 0.05 or percent == 0.0 else f"{percent:+.1g} %"


def digits_apart(number: NumberChange) -> int:
    """Return how many digits show that a number changed: four, more where it reads the same before and after."""
    if number.was is None or number.now is None:
        return FEW
    return next((n for n in range(FEW, MANY) if f"{number.was:.{n}g}" != f"{number.now:.{n}g}"), MANY)


def figure(value: float, digits: int = FEW) -> str:
    """Return a number as a person compares it: few digits, no exponent unless it is tiny, never -0."""
    if value == 0.0:
        return "0"
    text = f"{value:.{digits}g}"
    return f"{value:.0f}" if "e+" in text else text


def place(point: Sequence[float] | None, digits: int = 2) -> str:
    """Return coordinates with a fixed number of digits, no minus before a zero; "" for no point."""
    return "" if point is None else ", ".join(f"{round(v, digits) + 0.0:.{digits}f}" for v in point)


def comparison_json(comparison: Comparison) -> str:
    """Return a comparison as JSON text: everything it holds, with the sentences that the page begins with."""
    head = {"verdict": verdict(comparison), "steel": steel_words(comparison), "steel_safe": comparison.steel_safe}
    fields = ("old", "new", "alignment", "components", "items", "numbers", "part", "findings")
    return to_json(head | {name: getattr(comparison, name) for name in fields} | {"cautions": CAUTIONS})
