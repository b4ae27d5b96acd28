"""The four pictures: what each shows, and from where."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from moldgen.output import palette
from moldgen.output.palette import Ink, Rgb
from moldgen.output.picture_canvas import Canvas, Panel
from moldgen.output.picture_frame import FIELD, Mark, Rect, draw_arrow_head, draw_frame
from moldgen.output.picture_geometry import (
    Cut,
    View,
    choose_cut,
    cut_mesh,
    hatch,
    is_hidden,
    look_from,
    outline,
    shade,
)
from moldgen.output.scene import Points, Scene, SceneBody, Vector

FROM_ABOVE: Vector = (0.62, -0.80, 0.56)
FROM_BELOW: Vector = (0.62, -0.80, -0.56)

EDGE_WIDTH = 1.1
"""Width of drawn edges [px]."""


def draw_part(scene: Scene, canvas: Canvas) -> None:
    """Draw the part from both sides, each face in the colour of the half that forms it."""
    part = scene.of_role("part")
    views = (look_from(FROM_ABOVE), look_from(FROM_BELOW))
    content = [[b.vertices for b in part]] * 2
    beside, stacked = (list(zip(_halves(FIELD, 0.5, stack), views, strict=True)) for stack in (False, True))
    places = max((beside, stacked), key=lambda p: _common_scale(p, content, 0.8))
    panels = _panels(canvas, places, content, 0.8)
    captions = ("seen from the cavity half", "seen from the core half")
    for panel, caption in zip(panels, captions, strict=True):
        for body in part:
            sides = np.array([scene.face_sides.get(int(f), 0) for f in body.face_id])
            _show_body(panel, body, colour=_side_colours(body, sides))
        for line in scene.parting_lines:
            panel.lines([line], palette.PARTING_LINE.colour, 4.0)
            panel.lines([line], palette.PARTING_LINE.colour, 2.0, opacity=0.22, front=True)
        _caption(canvas, panel, caption)
        panel.close()
        _mark_gate(canvas, panel, scene)
    _draw_pull(canvas, panels[0])
    sides_used = {scene.face_sides.get(int(f), 0) for b in part for f in np.unique(b.face_id)}
    marks = [
        Mark(ink.colour, ink.label)
        for side, ink in ((1, palette.CAVITY_SIDE), (-1, palette.CORE_SIDE), (0, palette.NO_SIDE))
        if side in sides_used
    ]
    if scene.parting_lines:
        marks.append(Mark(palette.PARTING_LINE.colour, palette.PARTING_LINE.label, "line"))
    marks += _gate_marks(scene)
    marks.append(Mark(palette.PULL.colour, palette.PULL.label, "line"))
    draw_frame(canvas, scene, "plastic part: which half forms which face", marks, panels[0].px_per_mm)


def draw_closed(scene: Scene, canvas: Canvas) -> None:
    """Draw the closed tool; the cavity half is translucent."""
    (panel,) = _panels(canvas, [(FIELD, look_from(FROM_ABOVE))], [[b.vertices for b in scene.bodies]], 0.90)
    for body in scene.bodies:
        if body.role != "cavity":
            _show_body(panel, body)
    for body in scene.of_role("cavity"):
        _show_body(panel, body, opacity=0.20)
    panel.close()
    draw_frame(canvas, scene, "tool closed, cavity half translucent", _role_marks(scene.bodies), panel.px_per_mm)


def draw_open(scene: Scene, canvas: Canvas) -> None:
    """Draw the open tool, the part half way off its pins, and beside it the cavity half from below."""
    views = (look_from(FROM_ABOVE), look_from(FROM_BELOW))
    left, right = _halves(FIELD, 0.55)
    cavity = scene.of_role("cavity")
    opened = [[b.vertices + np.array(b.offset_open) for b in scene.bodies], [b.vertices for b in cavity]]
    panels = _panels(canvas, list(zip((left, right), views, strict=True)), opened, 0.90)
    for body in scene.bodies:
        _show_body(panels[0], body, offset=body.offset_open)
    for body in cavity:
        _show_body(panels[1], body)
    for panel, caption in zip(panels, ("the open tool", "cavity half, seen from below"), strict=True):
        panel.close()
        _caption(canvas, panel, caption)
    draw_frame(canvas, scene, "tool open, part half way off its pins", _role_marks(scene.bodies), panels[0].px_per_mm)


def draw_section(scene: Scene, canvas: Canvas) -> None:
    """Draw the closed tool cut by a vertical plane, with a small plan that shows where the plane lies."""
    pins = [b for b in scene.bodies if b.role.endswith("_pin")]
    cut = choose_cut(scene.of_role("part"), pins, scene.gate)
    view = look_from((0.0, -1.0, 0.0) if cut.axis == 1 else (1.0, 0.0, 0.0))
    (panel,) = _panels(canvas, [(FIELD, view)], [[b.vertices for b in scene.bodies]], 0.93)
    depth = cut.at * float(view.toward[cut.axis])
    for body in scene.bodies:
        _show_body(panel, body, share=0.45)
    for body in sorted(scene.bodies, key=lambda b: b.role not in ("cavity", "core")):  # small things over blocks
        _fill_cut(panel, body, cut, depth)
    panel.close(cut=depth)
    shown = [b for b in scene.bodies if float((b.vertices @ view.toward).min()) < depth]
    _key_plan(canvas, scene, cut)
    axis = "xy"[cut.axis]
    words = f"section at {axis} = {cut.at:.2f} mm" + (f", through {cut.through}" if cut.through else "")
    draw_frame(canvas, scene, words, _role_marks(shown, counted=False), panel.px_per_mm)


PICTURES: tuple[tuple[str, Callable[[Scene, Canvas], None]], ...] = (
    ("part.png", draw_part),
    ("closed.png", draw_closed),
    ("open.png", draw_open),
    ("section.png", draw_section),
)
"""Every picture and how it is drawn, in order."""


def draw_picture(scene: Scene, canvas: Canvas, draw: Callable[[Scene, Canvas], None], path: Path) -> None:
    """Draw one picture on a cleared `canvas` and write it to `path`."""
    canvas.clear()
    draw(scene, canvas)
    canvas.save(path)


Place = tuple[Rect, View]


def _panels(canvas: Canvas, places: Sequence[Place], contents: Sequence[Sequence[Points]], fill: float) -> list[Panel]:
    """Return one panel for each place, all at the one scale [px/mm] at which every content fits."""
    scale = _common_scale(places, contents, fill)
    panels = []
    for (rect, view), content in zip(places, contents, strict=True):
        low, high = _flat_bounds(view, content)
        panels.append(canvas.panel(rect, view, (low + high) / 2.0, scale))
    return panels


def _common_scale(places: Sequence[Place], contents: Sequence[Sequence[Points]], fill: float) -> float:
    """Return the largest scale [px/mm] at which every content fits into the share `fill` of its place."""
    scales = []
    for (rect, view), content in zip(places, contents, strict=True):
        low, high = _flat_bounds(view, content)
        size = np.maximum(high - low, 1e-6)
        scales.append(fill * min((rect[2] - rect[0]) / size[0], (rect[3] - rect[1]) / size[1]))
    return float(min(scales))


def _flat_bounds(view: View, content: Sequence[Points]) -> tuple[Points, Points]:
    flat = view.flat(np.concatenate([*content, np.zeros((0, 3))]))
    return (flat.min(axis=0), flat.max(axis=0)) if len(flat) else (np.zeros(2), np.ones(2))


def _halves(rect: Rect, share: float, stacked: bool = False) -> tuple[Rect, Rect]:
    """Return `rect` in two, side by side or the first above the second; `share` is that of the first."""
    x0, y0, x1, y1 = rect
    if stacked:
        split = y1 - share * (y1 - y0)
        return (x0, split, x1, y1), (x0, y0, x1, split)
    split = x0 + share * (x1 - x0)
    return (x0, y0, split, y1), (split, y0, x1, y1)


def _show_body(
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


def _side_colours(body: SceneBody, sides: np.ndarray) -> np.ndarray:
    """Return the colour (n, 3) of each shaded point by the half that forms its face."""
    faces = shade(body).face_of_point
    by_face = dict(zip(body.face_id.tolist(), sides.tolist(), strict=True))
    inks = {1: palette.CAVITY_SIDE, -1: palette.CORE_SIDE, 0: palette.NO_SIDE}
    return np.array([inks[by_face[f]].colour for f in faces.tolist()], dtype=np.uint8)


def _fill_cut(panel: Panel, body: SceneBody, cut: Cut, depth: float) -> None:
    """Fill what the plane cuts of one body: blocks are hatched, each half its own way; pins and plastic are plain."""
    segments = cut_mesh(body, cut.axis, cut.at)
    if not len(segments):
        return
    flat = panel.view.flat(segments.reshape(-1, 3)).reshape(-1, 2, 2)
    pixel = 0.5 / panel.px_per_mm
    rows = hatch(flat, pixel, 0.0, 0.5)
    half = np.array([0.0, pixel / 2.0])
    corners = np.stack([rows[:, 0] - half, rows[:, 1] - half, rows[:, 1] + half, rows[:, 0] + half], axis=1)
    colour = palette.role_ink(body.role).colour
    place = _in_space(panel.view, corners.reshape(-1, 2), depth)
    panel.surface(place, np.arange(len(place)).reshape(-1, 4), colour, front=True)
    angle = {"cavity": 0.25 * np.pi, "core": 0.75 * np.pi}.get(body.role)
    if angle is not None:
        strokes = hatch(flat, 11.0 / panel.px_per_mm, angle)
        ink = palette.darken(colour, 0.22)
        panel.lines(_in_space(panel.view, strokes, depth), ink, 0.9, front=True)
    panel.lines(_in_space(panel.view, flat, depth), palette.EDGE, 1.5, front=True)


def _in_space(view: View, flat: Points, depth: float) -> Points:
    """Return picture coordinates (..., 2) as points (..., 3) at `depth` toward the viewer."""
    return flat[..., :1] * view.right + flat[..., 1:] * view.up + depth * view.toward


def _key_plan(canvas: Canvas, scene: Scene, cut: Cut) -> None:
    """Draw a small plan below the legend: core half and part from above, the plane of the section as a line."""
    rect = (24.0, 128.0, 238.0, 338.0)
    shown = [b for b in scene.bodies if b.role in ("core", "part", "core_pin")]
    if not shown:
        return
    view = look_from((0.0, 0.0, 1.0), up=(0.0, 1.0, 0.0))
    (panel,) = _panels(canvas, [(rect, view)], [[b.vertices for b in shown]], 0.78)
    for body in shown:
        _show_body(panel, body)
    panel.close()
    points = np.concatenate([b.vertices for b in shown])
    low, high = points.min(axis=0), points.max(axis=0)
    ends = np.array([low, high])
    ends[:, cut.axis] = cut.at
    first, last = panel.pixel(ends[0]), panel.pixel(ends[1])
    run = np.subtract(last, first) / np.hypot(*np.subtract(last, first))
    first, last = tuple(np.subtract(first, 12 * run)), tuple(np.add(last, 12 * run))
    look = np.array([0.0, 1.0] if cut.axis == 1 else [-1.0, 0.0])
    canvas.line([first, last], palette.TEXT, 2.0)
    for end in (first, last):
        tip = np.add(end, 18 * look)
        canvas.line([end, tuple(tip)], palette.TEXT, 2.0)
        draw_arrow_head(canvas, tuple(tip), tuple(look), palette.TEXT, 9.0)
    canvas.text(((rect[0] + rect[2]) / 2.0, rect[1] - 12.0), "plan: where the section lies", 13, align="centre")


def _mark_gate(canvas: Canvas, panel: Panel, scene: Scene) -> None:
    if scene.gate is None:
        return
    x, y = panel.pixel(scene.gate)
    hidden = is_hidden(scene.gate, scene.of_role("part"), panel.view)
    if not hidden:
        canvas.disc((x, y), 9.0, palette.PAPER)
    canvas.ring((x, y), 7.0, 5.4 if hidden else 2.5, palette.GATE.colour)


def _draw_pull(canvas: Canvas, panel: Panel) -> None:
    """Draw the pull as an arrow at the left border of the panel; in every view it points up."""
    x, middle = panel.rect[0] + 34.0, (panel.rect[1] + panel.rect[3]) / 2.0
    canvas.line([(x, middle - 45.0), (x, middle + 30.0)], palette.PULL.colour, 4.0)
    draw_arrow_head(canvas, (x, middle + 48.0), (0.0, 1.0), palette.PULL.colour, 22.0)
    canvas.text((x, middle - 62.0), "pull", 15, colour=palette.PULL.colour, bold=True, align="centre")


def _caption(canvas: Canvas, panel: Panel, words: str) -> None:
    canvas.text(((panel.rect[0] + panel.rect[2]) / 2.0, panel.rect[1] + 20.0), words, 15, align="centre")


def _gate_marks(scene: Scene) -> list[Mark]:
    return [] if scene.gate is None else [Mark(palette.GATE.colour, f"{palette.GATE.label} (thin ring: behind)", "dot")]


def _role_marks(bodies: Sequence[SceneBody], *, counted: bool = True) -> list[Mark]:
    """Return the legend of the roles that `bodies` have, in the palette's order; `counted` adds the number of each."""
    counts: dict[Ink, int] = {}
    for body in bodies:
        ink = palette.role_ink(body.role)
        counts[ink] = counts.get(ink, 0) + 1
    order = [*palette.ROLES.values(), palette.OTHER]
    return [Mark(ink.colour, ink.describe(counts[ink] if counted else 1)) for ink in order if ink in counts]
