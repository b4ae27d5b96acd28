"""Made-up comparisons of two tools: the lid of a sensor housing of a garden weather station, whose boss has moved."""

from __future__ import annotations

from moldgen.finding import Finding, Severity
from moldgen.model.revision import (
    Alignment,
    Comparison,
    ComponentChange,
    Fate,
    ItemChange,
    NumberChange,
    PartChange,
    PartChangeKind,
    SteelPiece,
    Work,
)

AS_DRAWN = Alignment(
    ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)),
    (0.0, 0.0, 0.0),
    "as drawn: both parts stand in one place",
    137,
    139,
    0.0,
)
BOX = ((0.0, 0.0, 0.0), (10.0, 10.0, 10.0))
CAUSE = "boss d 6.6 moved"


def piece(component: str, work: Work, number: int, volume: float, *, exact: bool = True, file: str = "") -> SteelPiece:
    """One piece of steel, 2 mm deep, at a place that its number tells."""
    at = (10.0 * number, 5.0, -3.0)
    return SteelPiece(component, work, number, volume, 2.0, at, (9.95 * number, 4.98, -2.99), BOX, exact, file, CAUSE)


def unchanged(name: str = "cavity", role: str = "cavity") -> ComponentChange:
    """A component that stays as it is."""
    return ComponentChange(name, name, role, Fate.UNCHANGED, (), (0.0, 0.0, 0.0), 1, 1, "1.2738", "1.2738")


def core(*pieces: SteelPiece, name: str = "core") -> ComponentChange:
    """A core half on which `pieces` are to be done."""
    fate = Fate.WELD if any(p.work is Work.WELD for p in pieces) else Fate.CUT
    return ComponentChange(name, name, "core", fate, pieces, (0.0, 0.0, 0.0), 1, 1, "1.2738", "1.2738")


def nothing_changed() -> Comparison:
    """Two tools that are the same."""
    same = (unchanged(), unchanged("core", "core"))
    return Comparison("lid-1", "lid-2", AS_DRAWN, (), same, (), ())


def boss_moved() -> Comparison:
    """A boss moved by 2 mm: a crescent to cut, one to weld, its core pin moved, one ejector pin new, one gone."""
    pieces = (
        piece("core", Work.CUT, 1, 33.5, file="steel/core_cut_1.step"),
        piece("core", Work.WELD, 1, 33.25, exact=False, file="steel/core_weld_1.step"),
    )
    gate = piece("gate insert", Work.CUT, 1, 4.0)
    components = (
        unchanged(),
        ComponentChange("gate insert", "gate insert", "insert", Fate.CUT, (gate,), (0.0, 0.0, 0.0), 1, 1),
        core(*pieces),
        ComponentChange("core pin 1", "core pin 1", "core_pin", Fate.MOVED, (), (-2.0, 0.0, 0.0), 2, 2, "1.2344"),
        ComponentChange("", "ejector pin 7", "ejector_pin", Fate.NEW, (), None, 0, 4, "1.2210"),
        ComponentChange("ejector pin 5", "", "ejector_pin", Fate.GONE, (), None, 4, 0, "", "1.2210"),
    )
    box = ((27.0, 17.0, 1.0), (35.0, 24.0, 15.0))
    moved = PartChange(PartChangeKind.MOVED, "boss d 6.6", (12, 13), (12, 13), (31.0, 20.0, 8.0), box, (-2.0, 0.0, 0.0))
    items = (
        ItemChange("ejector pin", "ejector pin 3", (30.0, 18.0, -30.0), (28.0, 18.0, -30.0), "d 3 mm", "d 3 mm"),
        ItemChange("ejector pin", "ejector pin 7", None, (0.0, 5.0, -30.0), "", "d 4 mm"),
        ItemChange("gate", "gate", (43.0, 0.0, 4.0), (43.0, 0.0, 4.0), "0.8 x 2 mm", "0.9 x 2 mm"),
    )
    numbers = (
        NumberChange("clamp force", "kN", 210.0, 214.2, "the rim grew"),
        NumberChange("thinnest wall", "mm", 1.18, None),
    )
    finding = Finding("compare.volume", Severity.WARNING, "volumes do not add up", "core", None, 0.3, 0.1, "mm3")
    return Comparison("lid-1", "lid-2", AS_DRAWN, (moved,), components, items, numbers, (finding,))


def hundreds() -> Comparison:
    """Hundreds of everything, with long names: what a table must hold."""
    components = tuple(
        core(
            piece(f"insert number {k} of the second row of ribs", Work.CUT, 1, 1.0 + k),
            piece(f"insert number {k} of the second row of ribs", Work.WELD, 1, 2.0 + k),
            name=f"insert number {k} of the second row of ribs",
        )
        for k in range(150)
    )
    items = tuple(
        ItemChange("ejector pin", f"ejector pin {k} at the far end of the tool", (-100.0, -100.0, -100.0),
                   (-101.0, -100.0, -100.0), f"d {k} mm, stepped down to d 1 mm", f"d {k + 1} mm", "n" * 90)
        for k in range(300)
    )  # fmt: skip
    numbers = tuple(NumberChange(f"number {k} with a rather long name", "mm", 1.0, 2.0, "c" * 90) for k in range(300))
    part = tuple(
        PartChange(PartChangeKind.RESHAPED, f"face {k} " + "f" * 60, (k,), tuple(range(k)), (-123.0, -123.0, -123.0),
                   BOX, (-123.0, -123.0, -123.0), "w" * 60, "n" * 60)
        for k in range(300)
    )  # fmt: skip
    return Comparison("lid-1", "lid-2", AS_DRAWN, part, components, items, numbers)
