"""What surrounds every picture: title line, legend, scale bar and the caution."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from moldgen.output import palette
from moldgen.output.palette import Rgb
from moldgen.output.picture_geometry import SIZE, Rect
from moldgen.output.scene import Scene

if TYPE_CHECKING:
    from moldgen.output.picture_canvas import Canvas

CAUTION = "first-pass layout: review before cutting steel"

FIELD: Rect = (262.0, 62.0, 1384.0, 912.0)
"""The part of a sheet that is free for panels [px]: right of the legend, below the title, above the scale bar."""


@dataclass(frozen=True)
class Mark:
    """One row of a legend: a colour, drawn as an area, a line or a dot, and its meaning."""

    colour: Rgb
    words: str
    shape: str = "area"


def draw_frame(canvas: Canvas, scene: Scene, subject: str, marks: Sequence[Mark], px_per_mm: float) -> None:
    """Draw title line, legend, scale bar and caution around the panels."""
    facts = [f"resin {scene.resin}" if scene.resin else "", f"pull {scene.pull}" if scene.pull else ""]
    draw_title(canvas, scene.name, ", ".join(f for f in facts if f), subject)
    draw_legend(canvas, marks)
    draw_scale_bar(canvas, px_per_mm, (24.0, 24.0))
    canvas.text((SIZE[0] - 24.0, 28.0), CAUTION, 14, colour=palette.QUIET_TEXT, align="right")


def draw_title(canvas: Canvas, name: str, facts: str, subject: str) -> None:
    """Draw the lines above the panels: a name with facts below it on the left, what the sheet shows on the right."""
    width, height = SIZE
    canvas.text((24.0, height - 32.0), _short(name, 36), 25, bold=True)
    canvas.text((24.0, height - 63.0), _short(facts, 80), 15, colour=palette.QUIET_TEXT)
    canvas.text((width - 24.0, height - 34.0), _short(subject, 96), 17, align="right")
    canvas.line([(24.0, height - 84.0), (width - 24.0, height - 84.0)], palette.RULE, 1.0)


def draw_legend(canvas: Canvas, marks: Sequence[Mark]) -> None:
    """Draw the legend in the column left of the panels."""
    y = SIZE[1] - 116.0
    for mark in marks:
        _legend_row(canvas, mark, y)
        y -= 30.0


def _legend_row(canvas: Canvas, mark: Mark, y: float) -> None:
    x0, x1 = 24.0, 50.0
    if mark.shape == "area":
        canvas.rectangle((x0, y - 9.0, x1, y + 9.0), palette.EDGE)
        canvas.rectangle((x0 + 1.0, y - 8.0, x1 - 1.0, y + 8.0), mark.colour)
    elif mark.shape == "line":
        canvas.rectangle((x0, y - 2.5, x1, y + 2.5), mark.colour)
    else:
        canvas.ring(((x0 + x1) / 2.0, y), 7.0, 2.5, mark.colour)
    canvas.text((x1 + 10.0, y), mark.words, 15)


def draw_scale_bar(canvas: Canvas, px_per_mm: float, at: tuple[float, float], most_px: float = 200.0) -> None:
    """Draw a bar of a round length (1, 2 or 5 times a power of ten) from `at` [px], at most `most_px` long."""
    length = scale_length(px_per_mm, most_px)
    x0, y = at
    x1 = x0 + length * px_per_mm
    canvas.rectangle((x0, y - 3.0, x1, y + 3.0), palette.TEXT)
    canvas.rectangle(((x0 + x1) / 2.0, y - 2.0, x1 - 1.0, y + 2.0), palette.PAPER)
    for x in (x0, x1):
        canvas.rectangle((x - 0.75, y - 7.0, x + 0.75, y + 7.0), palette.TEXT)
    canvas.text((x1 + 10.0, y), f"{length:g} mm", 15)


def scale_length(px_per_mm: float, most_px: float = 200.0) -> float:
    """Return the largest of 1, 2, 5 times a power of ten [mm] that takes at most `most_px`."""
    room = most_px / px_per_mm
    power = 10.0 ** np.floor(np.log10(room))
    return float(max(step * power for step in (1.0, 2.0, 5.0) if step * power <= room * (1.0 + 1e-9)))


def _short(words: str, limit: int) -> str:
    return words if len(words) <= limit else words[: limit - 3].rstrip() + "..."


def draw_arrow_head(
    canvas: Canvas, tip: tuple[float, float], along: tuple[float, float], colour: Rgb, size: float
) -> None:
    """Fill an arrow head with its point at `tip` [px] that points `along` a unit vector."""
    x, y = tip
    u, v = along
    back = (x - size * u, y - size * v)
    wing = 0.42 * size
    canvas.polygon([(x, y), (back[0] - wing * v, back[1] + wing * u), (back[0] + wing * v, back[1] - wing * u)], colour)
