"""Parts list and hole table: RFC 4180, units in the column names, the same text every time."""

from __future__ import annotations

import csv
import io

from moldgen.model.tool import Component, Hole, Motion, Role, Tool
from moldgen.output.tables import holes_csv, parts_list_csv

CAVITY = Component("cavity", Role.CAVITY, None, "1.2311", Motion.CAVITY_HALF, note='ground, 0.8 "Ra"')
PIN = Component(
    "ejector pin 3", Role.EJECTOR_PIN, None, "1.2344", Motion.EJECTOR, ((0.0, 0.0, 0.0), (10.0, 0.0, 0.0)), "two\nlines"
)
HOLES = (
    Hole("ejector pin 3", "none", 0.0, 0.0, 0.0, 1.0, 1.0),
    Hole("cavity", "pin bore", 10.0, -0.00000001, -20.0, -1.25, 3.0, "H7"),
    Hole("cavity", "pin bore", 2.54, 1 / 3, -20.0, -1.25, 3.0, "H7"),
)
TOOL = Tool((CAVITY, PIN), HOLES)


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline="")))


def test_parts_list_has_a_row_for_each_definition_with_its_quantity():
    found = rows(parts_list_csv(TOOL, {"cavity": "step/cavity.step"}))
    assert [(r["item"], r["name"], r["role"], r["quantity"], r["file"]) for r in found] == [
        ("1", "cavity", "cavity", "1", "step/cavity.step"),
        ("2", "ejector pin 3", "ejector_pin", "2", ""),
    ]


def test_quotes_commas_and_line_breaks_survive():
    # RFC 4180 sections 2.5 to 2.7: fields with these are quoted, quotes doubled; 2.1: lines end in CRLF
    text = parts_list_csv(TOOL)
    assert '"ground, 0.8 ""Ra"""\r\n' in text
    assert [r["note"] for r in rows(text)] == ['ground, 0.8 "Ra"', "two\nlines"]


def test_holes_are_sorted_by_component_and_place_and_rounded():
    found = rows(holes_csv(TOOL))
    assert [(r["component"], r["x_mm"], r["y_mm"], r["depth_mm"]) for r in found] == [
        ("cavity", "2.54", "0.3333", "18.75"),
        ("cavity", "10", "0", "18.75"),
        ("ejector pin 3", "0", "0", "1"),
    ]


def test_every_length_column_names_its_unit():
    header = holes_csv(TOOL).splitlines()[0].split(",")
    lengths = [name for name, value in rows(holes_csv(TOOL))[0].items() if value.replace(".", "").lstrip("-").isdigit()]
    assert lengths == [name for name in header if name.endswith("_mm")]


def test_the_order_in_which_holes_were_made_does_not_matter():
    assert holes_csv(Tool((CAVITY, PIN), HOLES[::-1])) == holes_csv(TOOL)


def test_an_empty_tool_gives_headers_only():
    assert holes_csv(Tool(())).count("\r\n") == 1
    assert parts_list_csv(Tool(())).count("\r\n") == 1
