"""The table of the steel-safe advice after a build."""

from __future__ import annotations

from dataclasses import replace

from moldgen.canon import plain
from moldgen.flow.build_tables import build_tables
from moldgen.model.layout import Layout
from moldgen.model.steel_safe import Fit, SteelSafe
from moldgen.model.tool import Tool

HOLE = SteelSafe(
    Fit.PRESS, "round hole", "diameter", ((1.0, 2.0, 3.0), (4.0, 5.0, 6.0)), ("core pin 1", "core pin 2"),
    nominal_mm=2.5, allowance_mm=0.1, faces=2, steel_first_mm=2.714, steel_last_mm=2.514, steel_safe="leave 0.10 mm",
    source="common practice", why="deep round hole in a round boss",
)  # fmt: skip
LIP = replace(HOLE, fit=Fit.SNAP, places=((0.0, 0.0, 0.0),), faces=1, steel_first_mm=1.2, steel_last_mm=1.4)
NO_LAYOUT = Layout((), (), None, 0.0, 0.0)  # type: ignore[arg-type]


def test_each_dimension_is_a_row_that_says_which_way_it_starts() -> None:
    (table,) = build_tables(Tool(()), NO_LAYOUT, (HOLE, LIP))
    assert "advice" in table.title
    rows = [dict(zip(table.columns, row, strict=True)) for row in table.rows]
    assert rows[0]["at (part)"] == "1.00, 2.00, 3.00 and 1 more"
    assert rows[0]["formed by"] == "core pin 1, core pin 2"
    assert [row["starts"] for row in rows] == ["larger", "smaller"]
    assert (rows[0]["steel first [mm]"], rows[0]["steel last [mm]"]) == (2.714, 2.514)


def test_without_advice_there_is_no_table() -> None:
    assert build_tables(Tool(()), NO_LAYOUT) == ()


def test_the_manifest_can_hold_it() -> None:
    assert plain(HOLE)["fit"] == "press fit"
    assert plain(HOLE)["places"][1] == [4.0, 5.0, 6.0]
