"""The tables that go with the STEP files: parts list and holes, as CSV.

[published: RFC 4180] comma, CRLF, quotes only where needed. Units stand in the column names, lengths in mm.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence

from moldgen.model.tool import Tool

PARTS_LIST_COLUMNS = ("item", "name", "role", "quantity", "material", "moves_with", "file", "note")
HOLES_COLUMNS = ("component", "purpose", "x_mm", "y_mm", "z_from_mm", "z_to_mm", "depth_mm", "diameter_mm", "fit")


def parts_list_csv(tool: Tool, files: dict[str, str] | None = None) -> str:
    """Return the parts list: one row for each definition in the order of the tool, item numbers from 1.

    Parameters
    ----------
    tool : what is exported
    files : component name to the path of its STEP file, relative to the output folder; missing ones stay empty
    """
    rows = [
        (
            number,
            c.name,
            c.role.value,
            len(c.positions),
            c.material,
            str(c.motion),
            (files or {}).get(c.name, ""),
            c.note,
        )
        for number, c in enumerate(tool.components, start=1)
    ]
    return _csv(PARTS_LIST_COLUMNS, rows)


def holes_csv(tool: Tool) -> str:
    """Return the hole table: one row for each bore, by component in the order of the tool, then by place."""
    order = {c.name: i for i, c in enumerate(tool.components)}
    holes = sorted(
        tool.holes, key=lambda h: (order.get(h.component, len(order)), h.component, h.x_mm, h.y_mm, h.z_from_mm)
    )
    rows = [
        (
            h.component,
            h.purpose,
            _number(h.x_mm),
            _number(h.y_mm),
            _number(h.z_from_mm),
            _number(h.z_to_mm),
            _number(abs(h.z_to_mm - h.z_from_mm)),
            _number(h.diameter_mm),
            h.fit,
        )
        for h in holes
    ]
    return _csv(HOLES_COLUMNS, rows)


def _number(value: float) -> str:
    """Return a length to a tenth of a micrometre, never as -0."""
    text = f"{value:.4f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _csv(columns: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow(columns)
    writer.writerows(rows)
    return text.getvalue()
