"""The tables that a build shows: components, the force balance of the ejectors, the core pins, steel-safe advice."""

from __future__ import annotations

from collections.abc import Sequence

from moldgen.flow.job import Table
from moldgen.flow.words import point_text, told_note
from moldgen.model.layout import Layout
from moldgen.model.steel_safe import SteelSafe
from moldgen.model.tool import Tool


def build_tables(tool: Tool, layout: Layout, steel_safe: Sequence[SteelSafe] = ()) -> tuple[Table, ...]:
    """Return the tables of a built tool; those without rows are left out."""
    tables = (_components(tool), _ejectors(layout), _core_pins(layout), _steel_safe(steel_safe))
    return tuple(t for t in tables if t.rows)


def _components(tool: Tool) -> Table:
    rows = tuple((c.name, len(c.positions), c.material, told_note(c.note)) for c in tool.components)
    return Table("components", ("name", "quantity", "material", "note"), rows)


def _ejectors(layout: Layout) -> Table:
    rows = tuple(
        (
            p.name,
            point_text((p.x, p.y)),
            p.diameter,
            round(p.force_n, 1),
            round(p.pressure_mpa, 2),
            round(p.buckling_n),
            p.chosen_by.value,
        )
        for p in layout.ejector_pins
    )
    title = f"ejection: {layout.ejection_force_n:.0f} N needed, stroke {layout.stroke_mm:g} mm"
    columns = ("pin", "at x, y (mold)", "d [mm]", "force [N]", "on the part [MPa]", "buckles at [N]", "chosen")
    return Table(title, columns, rows)


def _core_pins(layout: Layout) -> Table:
    rows = tuple(
        (p.name, point_text((p.x, p.y)), p.diameter, round(p.slenderness, 2), "blind" if p.blind else "through")
        for p in layout.core_pins
    )
    return Table("core pins", ("pin", "at x, y (mold)", "d [mm]", "length / d", "hole"), rows)


def _steel_safe(advice: Sequence[SteelSafe]) -> Table:
    rows = tuple(
        (
            a.fit.value,
            f"{a.feature}, {a.dimension}",
            _places(a),
            round(a.nominal_mm, 3),
            ", ".join(a.formed_by),
            a.allowance_mm,
            round(a.steel_first_mm, 3),
            round(a.steel_last_mm, 3),
            "larger" if a.steel_first_mm > a.steel_last_mm else "smaller",
        )
        for a in advice
    )
    title = (
        "steel-safe: where to leave steel on until the first shots are measured (advice; the files have it cut to size)"
    )
    columns = ("for", "dimension", "at (part)", "drawn [mm]", "formed by", "leave a face [mm]", "steel first [mm]",
               "steel last [mm]", "starts")  # fmt: skip
    return Table(title, columns, rows)


def _places(advice: SteelSafe) -> str:
    more = len(advice.places) - 1
    return point_text(advice.places[0]) + (f" and {more} more" if more else "")
