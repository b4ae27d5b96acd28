"""What `compare` shows on the terminal."""

from __future__ import annotations

import dataclasses

from helpers.comparisons import boss_moved, core, hundreds, nothing_changed, piece

from moldgen.flow.compare_tables import MOST_ROWS, compare_headline, compare_tables
from moldgen.flow.report import table_lines
from moldgen.model.revision import NumberChange, Work

COLUMNS = 120


def test_headline_says_which_tools_and_what_becomes_of_them() -> None:
    headline = compare_headline(boss_moved())
    assert headline.startswith("lid-1 -> lid-2: 1 component is cut, 1 needs welding or a new insert")
    assert "33.25 mm3 of steel is missing" in headline
    assert "137 of 139 faces" in headline
    assert headline.isascii()


def test_tables_list_what_changed_and_nothing_else() -> None:
    tables = {table.title: table for table in compare_tables(boss_moved())}
    components = tables["components, 1 unchanged ones left out"]
    assert components.rows[0] == ("weld or new insert", "core", 33.25, 33.5, "")
    assert "cavity" not in [row[1] for row in components.rows]
    steel = tables["steel to weld and to cut"].rows
    assert [row[:3] for row in steel] == [
        ("core", "weld 1", "about 33.25"),
        ("core", "cut 1", 33.5),
        ("gate insert", "cut 1", 4.0),
    ]
    items = tables["pins, gate and block that changed"].rows
    assert items[0] == ("ejector pin 3", "30.00, 18.00, -30.00", "28.00, 18.00, -30.00", "2.000", "d 3 mm")
    assert items[2][-1] == "0.8 x 2 mm -> 0.9 x 2 mm"
    assert tables["numbers that changed"].rows[0] == ("clamp force [kN]", 210.0, 214.2, "+2.0 %", "the rim grew")
    assert tables["the part"].rows[0][3] == "-2.000, 0.000, 0.000"


def test_long_causes_keep_what_and_how() -> None:
    cause = "boss d 6.6 with hole d 2.9 at -27.64, -20.93, 13.40: moved by 2.000, 0.000, 10.250 mm"
    one = dataclasses.replace(piece("core", Work.CUT, 1, 5.0), cause=cause)
    tables = compare_tables(dataclasses.replace(nothing_changed(), components=(core(one),)))
    table = next(t for t in tables if "weld" in t.title)
    assert table.rows[0][-1].startswith("boss d 6.6 with hole")
    assert table.rows[0][-1].endswith(": moved by 2, 0, 10.25 mm")


def test_equal_tools_have_no_table() -> None:
    assert compare_tables(nothing_changed()) == ()


def test_hundreds_of_changes_fit_the_terminal() -> None:
    tables = compare_tables(hundreds())
    assert len(tables) == 5
    for table in tables:
        assert len(table.rows) == MOST_ROWS
        assert max(map(len, table_lines(table))) <= COLUMNS, table.title
    assert tables[0].rows[-1][0] == f"and {150 - MOST_ROWS + 1} more"


def test_small_changes_are_told_with_as_many_digits_as_tell_them_apart() -> None:
    def row(was: float, now: float) -> tuple[object, ...]:
        one = NumberChange("part volume", "mm^3", was, now, "")
        return compare_tables(dataclasses.replace(nothing_changed(), numbers=(one,)))[0].rows[0][1:4]

    assert row(643.8158, 643.8094) == (643.82, 643.81, "-0.001 %")
    assert row(643.81, 650.39) == (643.8, 650.4, "+1.0 %")
    assert row(90.0, 45.0) == (90.0, 45.0, "-50.0 %")
