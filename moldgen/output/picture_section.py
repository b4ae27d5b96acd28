"""The section: the closed tool cut by a vertical plane, or by two with a step between them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from types import MappingProxyType

import numpy as np

from moldgen.output import palette
from moldgen.output.picture_canvas import Canvas, Panel
from moldgen.output.picture_frame import FIELD, draw_arrow_head, draw_frame
from moldgen.output.picture_geometry import Cut, Rect, View, choose_cut, cut_mesh, hatch, look_from
from moldgen.output.picture_panels import common_scale, flat_bounds, make_panels, role_marks, show_body
from moldgen.output.scene import Points, Scene, SceneBody

HATCH = MappingProxyType({"cavity": 0.25 * np.pi, "core": 0.75 * np.pi, "slide": 0.0, "lifter": 0.0})
"""Direction of the hatching of what is cut, by role [rad]."""

FILL = 0.93
"""Share of the field that the tool takes."""


def draw_section(scene: Scene, canvas: Canvas) -> None:
    """Draw the closed tool cut by a vertical plane, with a small plan that shows where the plane lies."""
    pins = [b for b in scene.bodies if b.role in ("core_pin", "ejector_pin")]
    cut = choose_cut(scene.of_role("part"), pins, scene.gate)
    _draw_cut(scene, canvas, cut, _words(cut))


def draw_side_section(scene: Scene, canvas: Canvas) -> None:
    """Draw the closed tool cut along the way of its first slide, or lifter, through the angled pin if there is one.

    The tool is turned about the pull so that the steel leaves to the right.
    """
    body = scene.side_actions[0]
    way = np.array(body.offset_open[:2])
    turned = _turned(scene, np.arctan2(way[1], way[0]))
    body = turned.side_actions[0]
    pins = [
        b for b in turned.bodies if b.role in ("angled_pin", "side_core_pin") and b.name.endswith(f" of {body.name}")
    ]
    low, high = (pins or [body])[0].vertices[:, 1].min(), (pins or [body])[0].vertices[:, 1].max()
    through = f", through its {pins[0].role.replace('_', ' ')}" if pins else ""
    turn = round(float(np.degrees(np.arctan2(way[1], way[0]))), 1) + 0.0
    words = f"section along the way of {body.name}{through}; it leaves to the right, {turn:g} deg from x"
    _draw_cut(turned, canvas, Cut(1, float(low + high) / 2.0, body.name), words)


def _turned(scene: Scene, angle: float) -> Scene:
    """Return the scene turned about the pull by minus an angle [rad]."""
    c, s = np.cos(angle), np.sin(angle)
    rows = np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])
    bodies = tuple(
        replace(b, vertices=b.vertices @ rows.T, feature_edges=tuple(e @ rows.T for e in b.feature_edges))
        for b in scene.bodies
    )
    return replace(scene, bodies=bodies)


def _draw_cut(scene: Scene, canvas: Canvas, cut: Cut, words: str) -> None:
    view = look_from((0.0, -1.0, 0.0) if cut.axis == 1 else (1.0, 0.0, 0.0))
    content = [b.vertices for b in scene.bodies]
    scale = common_scale([(FIELD, view)], [content], FILL)
    low, high = flat_bounds(view, content)
    middle = (low + high) / 2.0
    depths = []
    for rect, plane in _strips(cut, float(middle[0]), scale):
        centre = np.array([rect[0] + rect[2] - FIELD[0] - FIELD[2], 0.0]) / 2.0 / scale
        panel = canvas.panel(rect, view, middle + centre, scale)
        depths.append(_show_cut(panel, scene, plane))
    if cut.beyond is not None:
        _draw_step(canvas, _turn_pixel(cut, float(middle[0]), scale))
    shown = [b for b in scene.bodies if float((b.vertices @ view.toward).min()) < max(depths)]
    _key_plan(canvas, scene, cut)
    draw_frame(canvas, scene, words, role_marks(shown, counted=False), scale)


def _strips(cut: Cut, middle: float, scale: float) -> Iterator[tuple[Rect, Cut]]:
    """Yield the parts of the field, from left to right, each with the plane that is drawn in it.

    The picture's right is the other coordinate of the plane, in both views.
    """
    x0, y0, x1, y1 = FIELD
    if cut.beyond is None:
        yield FIELD, cut
        return
    x = _turn_pixel(cut, middle, scale)
    plane = replace(cut, at=cut.beyond.at, beyond=None)
    first, second = (replace(cut, beyond=None), plane) if cut.beyond.above else (plane, replace(cut, beyond=None))
    yield (x0, y0, x, y1), first
    yield (x, y0, x1, y1), second


def _turn_pixel(cut: Cut, middle: float, scale: float) -> float:
    turn = cut.beyond.turn if cut.beyond is not None else middle
    return float(round((FIELD[0] + FIELD[2]) / 2.0 + (turn - middle) * scale))


def _show_cut(panel: Panel, scene: Scene, cut: Cut) -> float:
    """Show everything behind the plane, and what it cuts in front; return how far toward the viewer it lies [mm]."""
    depth = cut.at * float(panel.view.toward[cut.axis])
    for body in scene.bodies:
        show_body(panel, body, share=0.45)
    for body in sorted(scene.bodies, key=lambda b: b.role not in HATCH):  # small things over blocks
        _fill_cut(panel, body, cut, depth)
    panel.close(cut=depth)
    return depth


def _draw_step(canvas: Canvas, x: float) -> None:
    """Draw the line between the two planes of a stepped section: long and short dashes."""
    y, top = FIELD[1] + 6.0, FIELD[3] - 6.0
    while y < top:
        for dash in (14.0, 3.0):
            canvas.line([(x, y), (x, min(y + dash, top))], palette.TEXT, 1.2)
            y += dash + 4.0


def _words(cut: Cut) -> str:
    axis = "xy"[cut.axis]
    if cut.beyond is None:
        return f"section at {axis} = {_place(cut.at)} mm" + (f", through {cut.through}" if cut.through else "")
    first = f"section at {axis} = {_place(cut.at)} mm (the gate)"
    return f"{first}, stepping to {axis} = {_place(cut.beyond.at)} mm ({cut.beyond.through})"


def _place(value: float) -> str:
    return f"{round(value, 2) + 0.0:.2f}"


def _fill_cut(panel: Panel, body: SceneBody, cut: Cut, depth: float) -> None:
    """Fill what the plane cuts of one body: blocks are hatched, each in its own way; pins and plastic are plain."""
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
    angle = HATCH.get(body.role)
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
    (panel,) = make_panels(canvas, [(rect, view)], [[b.vertices for b in shown]], 0.78)
    for body in shown:
        show_body(panel, body)
    panel.close()
    points = np.concatenate([b.vertices for b in shown])
    low, high = points.min(axis=0), points.max(axis=0)
    path = [panel.pixel(point) for point in _plan_path(cut, low, high)]
    run = np.subtract(path[-1], path[0]) * ((1.0, 0.0) if cut.axis == 1 else (0.0, 1.0))
    run = 12.0 * run / np.hypot(*run)
    path = [tuple(np.subtract(path[0], run)), *path[1:-1], tuple(np.add(path[-1], run))]
    look = np.array([0.0, 1.0] if cut.axis == 1 else [-1.0, 0.0])
    canvas.line(path, palette.TEXT, 2.0)
    for end in (path[0], path[-1]):
        tip = np.add(end, 18 * look)
        canvas.line([end, tuple(tip)], palette.TEXT, 2.0)
        draw_arrow_head(canvas, tuple(tip), tuple(look), palette.TEXT, 9.0)
    canvas.text(((rect[0] + rect[2]) / 2.0, rect[1] - 12.0), "plan: where the section lies", 13, align="centre")


def _plan_path(cut: Cut, low: Points, high: Points) -> Points:
    """Return the corners (2 or 4, 3) [mm] of the section seen from above, in the order of rising coordinate."""
    along = 1 - cut.axis
    stations = [(float(low[along]), cut.at), (float(high[along]), cut.at)]
    if cut.beyond is not None:
        first, second = (cut.at, cut.beyond.at) if cut.beyond.above else (cut.beyond.at, cut.at)
        turn = cut.beyond.turn
        stations = [(stations[0][0], first), (turn, first), (turn, second), (stations[1][0], second)]
    points = np.full((len(stations), 3), high[2])
    points[:, along], points[:, cut.axis] = np.array(stations).T
    return points
