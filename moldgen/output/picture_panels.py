"""What the sheets share: panels at one scale, a body with its edges, the legend of the roles."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from moldgen.output import palette
from moldgen.output.palette import Ink, Rgb
from moldgen.output.picture_canvas import Canvas, Panel
from moldgen.output.picture_frame import Mark
from moldgen.output.picture_geometry import Rect, View, outline, shade
from moldgen.output.scene import Points, SceneBody, Vector

EDGE_WIDTH = 1.1
"""Width of drawn edges [px]."""

Place = tuple[Rect, View]
"""Where on the sheet, and seen from where."""


def make_panels(
    canvas: Canvas, places: Sequence[Place], contents: Sequence[Sequence[Points]], fill: float
) -> list[Panel]:
    """Return one panel for each place, all at the one scale [px/mm] at which every content fits."""
    scale = common_scale(places, contents, fill)
    made = []
    for (rect, view), content in zip(places, contents, strict=True):
        low, high = flat_bounds(view, content)
        made.append(canvas.panel(rect, view, (low + high) / 2.0, scale))
    return made


def common_scale(places: Sequence[Place], contents: Sequence[Sequence[Points]], fill: float) -> float:
    """Return the largest scale [px/mm] at which every content fits into the share `fill` of its place."""
    scales = []
    for (rect, view), content in zip(places, contents, strict=True):
        low, high = flat_bounds(view, content)
        size = np.maximum(high - low, 1e-6)
        scales.append(fill * min((rect[2] - rect[0]) / size[0], (rect[3] - rect[1]) / size[1]))
    return float(min(scales))


def flat_bounds(view: View, content: Sequence[Points]) -> tuple[Points, Points]:
    """Return the lower left and the upper right corner, (2,) each [mm], of what `content` shows in `view`."""
    flat = view.flat(np.concatenate([*content, np.zeros((0, 3))]))
    return (flat.min(axis=0), flat.max(axis=0)) if len(flat) else (np.zeros(2), np.ones(2))


def halves(rect: Rect, share: float, stacked: bool = False) -> tuple[Rect, Rect]:
    """Return `rect` in two, side by side or the first above the second; `share` is that of the first."""
    x0, y0, x1, y1 = rect
    if stacked:
        split = y1 - share * (y1 - y0)
        return (x0, split, x1, y1), (x0, y0, x1, split)
    split = x0 + share * (x1 - x0)
    return (x0, y0, split, y1), (split, y0, x1, y1)


def show_body(
    panel: Panel,
    body: SceneBody,
    *,
    colour: Rgb | np.ndarray | None = None,
    opacity: float = 1.0,
    share: float = 0.0,
    offset: Vector = (0.0, 0.0, 0.0),
) -> None:
    """Show one body with its edges; `share` mixes its colour with white."""
    shift = np.array(offset)
    mesh = shade(body)
    paint = palette.tint(palette.role_ink(body.role).colour, share) if colour is None else colour
    panel.surface(mesh.points + shift, mesh.triangles, paint, normals=mesh.normals, opacity=opacity)
    edge = palette.tint(palette.EDGE, 0.5 * share)
    panel.lines([e + shift for e in body.feature_edges], edge, EDGE_WIDTH)
    panel.lines(outline(body, panel.view) + shift, edge, EDGE_WIDTH)


def role_marks(bodies: Sequence[SceneBody], *, counted: bool = True) -> list[Mark]:
    """Return the legend of the roles that `bodies` have, in the palette's order; `counted` adds the number of each."""
    counts: dict[Ink, int] = {}
    for body in bodies:
        ink = palette.role_ink(body.role)
        counts[ink] = counts.get(ink, 0) + 1
    order = [*palette.ROLES.values(), palette.OTHER]
    return [Mark(ink.colour, ink.describe(counts[ink] if counted else 1)) for ink in order if ink in counts]
