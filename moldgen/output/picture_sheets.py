"""The pictures: what each shows, and from where."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType

import numpy as np

from moldgen.output import palette
from moldgen.output.picture_canvas import Canvas, Panel
from moldgen.output.picture_frame import FIELD, Mark, draw_arrow_head, draw_frame
from moldgen.output.picture_geometry import View, is_hidden, look_from, shade
from moldgen.output.picture_panels import common_scale, flat_bounds, halves, make_panels, role_marks, show_body
from moldgen.output.picture_section import draw_section, draw_side_section
from moldgen.output.scene import BY_LIFTER, BY_SLIDE, Points, Scene, SceneBody, Vector

FROM_ABOVE: Vector = (0.62, -0.80, 0.56)
FROM_BELOW: Vector = (0.62, -0.80, -0.56)

TRANSLUCENT = MappingProxyType({"core": 0.30, "cavity": 0.16})
"""Roles that let one see through, drawn in this order, and their opacity."""

LIFTED = ("part", "sprue")
"""What is lifted clear of the open core half."""

UNDER_PART = ("core", "core_pin", "ejector_pin", "lifter")
"""What a part that has just been ejected hides from above."""

FAR_OPEN = 0.6
"""Share of the height of the halves from which the cavity half is left out of the half open tool, being far above."""

SIDE_INKS = MappingProxyType(
    {
        1: palette.CAVITY_SIDE,
        -1: palette.CORE_SIDE,
        BY_SLIDE: palette.SLIDE_SIDE,
        BY_LIFTER: palette.LIFTER_SIDE,
        0: palette.NO_SIDE,
    }
)
"""What forms a face of the part, in the order of the legend."""


def draw_part(scene: Scene, canvas: Canvas) -> None:
    """Draw the part from both sides, each face in the colour of the half that forms it."""
    part = scene.of_role("part")
    views = (look_from(FROM_ABOVE), look_from(FROM_BELOW))
    content = [[b.vertices for b in part]] * 2
    beside, stacked = (list(zip(halves(FIELD, 0.5, stack), views, strict=True)) for stack in (False, True))
    places = max((beside, stacked), key=lambda p: common_scale(p, content, 0.8))
    panels = make_panels(canvas, places, content, 0.8)
    captions = ("seen from the cavity half", "seen from the core half")
    for panel, caption in zip(panels, captions, strict=True):
        for body in part:
            sides = np.array([scene.face_sides.get(int(f), 0) for f in body.face_id])
            show_body(panel, body, colour=_side_colours(body, sides))
        for line in scene.parting_lines:
            panel.lines([line], palette.PARTING_LINE.colour, 4.0)
            panel.lines([line], palette.PARTING_LINE.colour, 2.0, opacity=0.22, front=True)
        _caption(canvas, panel, content[0], caption)
        panel.close()
        _mark_gate(canvas, panel, scene)
    _draw_pull(canvas, panels[0])
    sides_used = {scene.face_sides.get(int(f), 0) for b in part for f in np.unique(b.face_id)}
    marks = [Mark(ink.colour, ink.label) for side, ink in SIDE_INKS.items() if side in sides_used]
    if scene.parting_lines:
        marks.append(Mark(palette.PARTING_LINE.colour, palette.PARTING_LINE.label, "line"))
    marks += _gate_marks(scene)
    marks.append(Mark(palette.PULL.colour, palette.PULL.label, "line"))
    what = "which steel forms which face" if scene.side_actions else "which half forms which face"
    draw_frame(canvas, scene, f"plastic part: {what}", marks, panels[0].px_per_mm)


def draw_closed(scene: Scene, canvas: Canvas) -> None:
    """Draw the closed tool; both halves are translucent, so that part, feed and pins show."""
    (panel,) = make_panels(canvas, [(FIELD, look_from(FROM_ABOVE))], [[b.vertices for b in scene.bodies]], 0.90)
    for body in scene.bodies:
        if body.role not in TRANSLUCENT:
            show_body(panel, body)
    for role, opacity in TRANSLUCENT.items():
        for body in scene.of_role(role):
            show_body(panel, body, opacity=opacity)
    panel.close()
    draw_frame(canvas, scene, "tool closed, both halves translucent", role_marks(scene.bodies), panel.px_per_mm)


def draw_open(scene: Scene, canvas: Canvas) -> None:
    """Draw the open tool like a book: core half with the part lifted clear, beside it the cavity half from below.

    Slides and lifters stand where the opening leaves them, on the half that they ride on.
    """
    views = (look_from(FROM_ABOVE), look_from(FROM_BELOW))
    away = {body.offset_open[2] for body in scene.of_role("cavity")}
    left = [b for b in scene.bodies if b.offset_open[2] not in away]
    right = [b for b in scene.bodies if b.offset_open[2] in away]
    lift = _clear_lift(scene, views[0])
    places: list[Sequence[Vector]] = [
        [_raised(b.offset_open, lift if b.role in LIFTED else 0.0) for b in left],
        [_raised(b.offset_open, -b.offset_open[2]) for b in right],
    ]
    shown = [
        [b.vertices + np.array(at) for b, at in zip(bodies, there, strict=True)]
        for bodies, there in zip((left, right), places, strict=True)
    ]
    panels = make_panels(canvas, list(zip(halves(FIELD, 0.55), views, strict=True)), shown, 0.90)
    for panel, bodies, there in zip(panels, (left, right), places, strict=True):
        for body, at in zip(bodies, there, strict=True):
            show_body(panel, body, offset=at)
    captions = (_core_caption(left), "cavity half, seen from below")
    for panel, points, caption in zip(panels, shown, captions, strict=True):
        panel.close()
        _caption(canvas, panel, points, caption)
    draw_frame(canvas, scene, "tool open", role_marks(scene.bodies), panels[0].px_per_mm)


def draw_half_open(scene: Scene, canvas: Canvas) -> None:
    """Draw the tool in the middle of the way of its slides, or of its lifters, both halves translucent."""
    cavity = scene.of_role("cavity")
    height = float(np.ptp(np.concatenate([b.vertices[:, 2] for b in scene.bodies if b.role in TRANSLUCENT])))
    opening = max((b.offset_half[2] for b in cavity), default=0.0)
    above = {b.offset_half[2] for b in cavity} if opening > FAR_OPEN * height else set()
    shown = [b for b in scene.bodies if b.offset_half[2] not in above]
    places = [b.vertices + np.array(b.offset_half) for b in shown]
    (panel,) = make_panels(canvas, [(FIELD, look_from(FROM_ABOVE))], [places], 0.90)
    for body in shown:
        if body.role not in TRANSLUCENT:
            show_body(panel, body, offset=body.offset_half)
    for role, opacity in TRANSLUCENT.items():
        for body in [b for b in shown if b.role == role]:
            show_body(panel, body, opacity=opacity, offset=body.offset_half)
    panel.close()
    draw_frame(canvas, scene, _half_words(opening, bool(above)), role_marks(shown), panel.px_per_mm)


def _half_words(opening: float, without_cavity: bool) -> str:
    if without_cavity:
        return "lifters half way, the cavity half far above is left out"
    if opening <= 0.0:
        return "tool still closed, cylinders have drawn the slides half way"
    return f"tool open by {opening:.0f} mm, slides half way"


def _raised(offset: Vector, by: float) -> Vector:
    return (offset[0], offset[1], offset[2] + by)


def _core_caption(bodies: Sequence[SceneBody]) -> str:
    """Return what the core half of the open tool shows, in words."""
    roles = {b.role for b in bodies}
    out = ["slides out"] * ("slide" in roles) + ["lifters aside"] * ("lifter" in roles)
    return ", ".join(["core half", *out, "ejectors forward", "part lifted clear"])


def _clear_lift(scene: Scene, view: View) -> float:
    """Return how far [mm] the part must rise from its open place until it hides neither pins nor core below it."""
    part = np.concatenate([b.vertices + np.array(b.offset_open) for b in scene.of_role("part")])
    low, high = part[:, :2].min(axis=0), part[:, :2].max(axis=0)
    below = np.concatenate([b.vertices + np.array(b.offset_open) for b in scene.bodies if b.role in UNDER_PART])
    below = below[((below[:, :2] >= low) & (below[:, :2] <= high)).all(axis=1)]
    if not len(below):
        return 0.0
    gap = view.flat(below)[:, 1].max() - view.flat(part)[:, 1].min()
    return max(0.0, float(gap / view.up[2]))


PICTURES: Mapping[str, Callable[[Scene, Canvas], None]] = MappingProxyType(
    {
        "part.png": draw_part,
        "closed.png": draw_closed,
        "open.png": draw_open,
        "section.png": draw_section,
        "half_open.png": draw_half_open,
        "section_side.png": draw_side_section,
    }
)
"""Every picture and how it is drawn."""


def _side_colours(body: SceneBody, sides: np.ndarray) -> np.ndarray:
    """Return the colour (n, 3) of each shaded point by what forms its face."""
    faces = shade(body).face_of_point
    by_face = dict(zip(body.face_id.tolist(), sides.tolist(), strict=True))
    return np.array([SIDE_INKS[by_face[f]].colour for f in faces.tolist()], dtype=np.uint8)


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


def _caption(canvas: Canvas, panel: Panel, content: Sequence[Points], words: str) -> None:
    """Write `words` below what the panel shows."""
    low, _ = flat_bounds(panel.view, content)
    bottom = (panel.rect[1] + panel.rect[3]) / 2.0 + float(low[1] - panel.middle[1]) * panel.px_per_mm
    x = (panel.rect[0] + panel.rect[2]) / 2.0
    canvas.text((x, max(bottom - 30.0, panel.rect[1] + 16.0)), words, 15, align="centre")


def _gate_marks(scene: Scene) -> list[Mark]:
    return [] if scene.gate is None else [Mark(palette.GATE.colour, f"{palette.GATE.label} (thin ring: behind)", "dot")]
