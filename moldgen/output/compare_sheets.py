"""The sheets of a comparison: a component with the steel to cut and to weld, as a whole and from near."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial

import numpy as np

from moldgen.output import palette
from moldgen.output.compare_scene import ComparePicture
from moldgen.output.compare_view import Sight, choose_sight, view_words
from moldgen.output.palette import Ink, Rgb
from moldgen.output.picture_canvas import Canvas, Panel
from moldgen.output.picture_frame import CAUTION, FIELD, Mark, draw_legend, draw_scale_bar, draw_title
from moldgen.output.picture_geometry import SIZE, Rect, outline, shade
from moldgen.output.picture_panels import EDGE_WIDTH, flat_bounds, halves
from moldgen.output.scene import SceneBody

INKS: dict[str, Ink] = {"weld": palette.WELD, "cut": palette.CUT}
"""The colour of each work, in the order of the legend."""

MOST_LABELS = 24
"""Labels on an overall view: so many fit in two columns."""

CLEAR = 0.08
"""If less than this share of the pieces lies open in the best view, the steel is drawn translucent."""

TRANSLUCENT = 0.28
HALO = 1.5
"""px by which pieces are drawn nearer to the viewer, so that steel that coincides with them does not show through."""

LABEL_WIDTH, LABEL_STEP, STRIP = 76.0, 27.0, 34.0
"""px: width of a label, distance of labels in a column, height of the caption over a close-up."""

BELOW_LEGEND = (24.0, 790.0)
"""px: left border of the sheet, and the height that the legend leaves free."""

Draw = Callable[[Canvas], None]


def sheets_of(picture: ComparePicture) -> list[Draw]:
    """Return what draws the sheets of a component: the overall view with the first close-ups, then the others."""
    beside, *further = picture.sheets
    return [partial(_draw_overall, picture, beside), *(partial(_draw_close, picture, labels) for labels in further)]


def _draw_overall(picture: ComparePicture, beside: Sequence[str], canvas: Canvas) -> None:
    sight = choose_sight(picture.steel, picture.pieces)
    rect, column = halves(FIELD, 0.62 if beside else 1.0)
    low, high = flat_bounds(sight.view, [b.vertices for b in (picture.steel, *picture.pieces)])
    size = np.maximum(high - low, 1e-6)
    # beside the legend or, where that shows a flat component larger, below it
    places = [(left, rect[1], rect[2] - 12.0, top) for left, top in ((rect[0], rect[3]), BELOW_LEGEND)]
    rooms = [np.array([x1 - x0 - 2.0 * LABEL_WIDTH - 40.0, y1 - y0 - 60.0]) for x0, y0, x1, y1 in places]
    scale, rect = max((float((room / size).min()), place) for room, place in zip(rooms, places, strict=True))
    panel = canvas.panel(rect, sight.view, (low + high) / 2.0, scale)
    _show(panel, picture, sight)
    panel.close()
    _labels(canvas, panel, picture, sight)
    middle = (rect[0] + rect[2]) / 2.0
    canvas.text((middle, rect[1] + 12.0), f"whole component, {view_words(sight.view)}", 15, align="centre")
    rows = halves(column, 0.5, stacked=True) if len(beside) > 1 else (column,)
    for label, place in zip(beside, rows, strict=False):
        _close_up(canvas, picture, label, place)
    _frame(canvas, picture, "steel to cut and to weld")
    draw_scale_bar(canvas, panel.px_per_mm, (24.0, 24.0))


def _draw_close(picture: ComparePicture, labels: Sequence[str], canvas: Canvas) -> None:
    x0, y0, x1, y1 = FIELD
    wide = 3 if len(labels) > 2 else max(len(labels), 1)
    tall = -(-len(labels) // wide)
    width, height = (x1 - x0) / wide, (y1 - y0) / tall
    for k, label in enumerate(labels):
        row, column = divmod(k, wide)
        left, top = x0 + column * width, y1 - row * height
        _close_up(canvas, picture, label, (left, top - height, left + width, top))
    _frame(canvas, picture, "steel to cut and to weld, from near")


def _close_up(canvas: Canvas, picture: ComparePicture, label: str, place: Rect) -> None:
    """Draw one piece from near in `place`, with its name and size above and a scale of its own."""
    piece = picture.piece(label)
    sight = choose_sight(picture.steel, [piece])
    x0, y0, x1, y1 = (place[0] + 6.0, place[1] + 6.0, place[2] - 6.0, place[3] - 6.0)
    rect = (x0, y0, x1, y1 - STRIP)
    low, high = flat_bounds(sight.view, [piece.vertices])
    size = high - low
    size = size + 2.0 * max(0.3 * float(size.max()), 0.8)  # the steel around it tells where one is
    scale = float(min((rect[2] - rect[0]) / size[0], (rect[3] - rect[1]) / size[1]))
    panel = canvas.panel(rect, sight.view, (low + high) / 2.0, scale)
    _show(panel, picture, sight)
    panel.close()
    canvas.rectangle((x0, y1 - STRIP, x1, y1), palette.PAPER)
    _pill(canvas, (x0 + 4.0 + LABEL_WIDTH / 2.0, y1 - STRIP / 2.0), piece)
    canvas.text((x0 + LABEL_WIDTH + 14.0, y1 - STRIP / 2.0), picture.captions[label], 15)
    canvas.rectangle((x0, y0, x1, y0 + 26.0), palette.PAPER)
    draw_scale_bar(canvas, scale, (x0 + 8.0, y0 + 13.0), 90.0)
    canvas.text((x1 - 8.0, y0 + 13.0), view_words(sight.view), 13, colour=palette.QUIET_TEXT, align="right")
    canvas.line([(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)], palette.RULE, 1.5)


def _show(panel: Panel, picture: ComparePicture, sight: Sight) -> None:
    """Show the steel in grey and the pieces in their colours; where steel hides a piece, its edges shine through."""
    opacity = 1.0 if sight.share >= CLEAR else TRANSLUCENT
    edge = palette.tint(palette.EDGE, 0.45)
    _show_body(panel, picture.steel, palette.STEEL.colour, edge, opacity=opacity)
    solid = opacity == 1.0
    nearer = HALO / panel.px_per_mm * sight.view.toward
    for piece in picture.pieces:
        ink = INKS[piece.role].colour
        _show_body(panel, piece, ink, palette.darken(ink, 0.45), nearer=nearer)
        for lines in (piece.feature_edges, outline(piece, sight.view)) if solid else ():
            panel.lines(lines, ink, 1.6, opacity=0.35, front=True)


def _show_body(
    panel: Panel, body: SceneBody, colour: Rgb, edge: Rgb, *, opacity: float = 1.0, nearer: np.ndarray | float = 0.0
) -> None:
    mesh = shade(body)
    panel.surface(mesh.points + nearer, mesh.triangles, colour, normals=mesh.normals, opacity=opacity)
    panel.lines([e + nearer for e in body.feature_edges], edge, EDGE_WIDTH)
    panel.lines(outline(body, panel.view) + nearer, edge, EDGE_WIDTH)


def _labels(canvas: Canvas, panel: Panel, picture: ComparePicture, sight: Sight) -> None:
    """Write the name of each piece beside the component, on the nearer side, with a line to the piece."""
    order = sorted(range(len(picture.pieces)), key=lambda k: _rank(picture, k))[:MOST_LABELS]
    ends = {k: panel.pixel(sight.anchors[k]) for k in order}
    x0, y0, x1, y1 = panel.rect
    by_x = sorted(order, key=lambda k: (ends[k][0], k))
    left = [k for k in by_x if ends[k][0] < (x0 + x1) / 2.0]
    split = min(max(len(left), len(by_x) - MOST_LABELS // 2), MOST_LABELS // 2)  # neither column overflows
    for column, x in ((by_x[:split], x0 + LABEL_WIDTH / 2.0 + 2.0), (by_x[split:], x1 - LABEL_WIDTH / 2.0 - 2.0)):
        column.sort(key=lambda k: (-ends[k][1], k))
        for k, y in zip(column, spread([ends[k][1] for k in column], y0 + 44.0, y1 - 20.0), strict=True):
            canvas.line([(x, y), ends[k]], palette.TEXT, 1.2)
            canvas.disc(ends[k], 3.2, palette.TEXT)
            _pill(canvas, (x, y), picture.pieces[k])


def _rank(picture: ComparePicture, k: int) -> tuple[int, int]:
    """Return the place of a piece among the labels: those with a close-up first, then by their numbers."""
    name = picture.pieces[k].name
    return (picture.close.index(name) if name in picture.close else len(picture.close), k)


def spread(wanted: Sequence[float], low: float, high: float, step: float = LABEL_STEP) -> list[float]:
    """Return falling places near the falling `wanted` ones, at least `step` apart, in low..high if there is room."""
    places: list[float] = []
    for want in wanted:
        places.append(min(want, high, *([places[-1] - step] if places else [])))
    floor = low
    for k in range(len(places) - 1, -1, -1):
        places[k] = max(places[k], floor)
        floor = places[k] + step
    return places


def _pill(canvas: Canvas, at: tuple[float, float], piece: SceneBody) -> None:
    x, y = at
    canvas.rectangle((x - LABEL_WIDTH / 2.0, y - 11.0, x + LABEL_WIDTH / 2.0, y + 11.0), INKS[piece.role].colour)
    canvas.text(at, piece.name, 15, colour=palette.PAPER, bold=True, align="centre")


def _frame(canvas: Canvas, picture: ComparePicture, subject: str) -> None:
    draw_title(canvas, picture.component, picture.facts, subject)
    roles = [p.role for p in picture.pieces]
    marks = [Mark(ink.colour, text) for role, ink in INKS.items() if role in roles for text in [_legend(role)]]
    draw_legend(canvas, [*marks, Mark(palette.STEEL.colour, palette.STEEL.label)])
    canvas.text((SIZE[0] - 24.0, 28.0), CAUTION, 14, colour=palette.QUIET_TEXT, align="right")


def _legend(role: str) -> str:
    return "weld or new insert" if role == "weld" else "cut away"
