"""One off-screen window on which the pictures are drawn, panel by panel; the only module that imports vtk.

Everything is drawn at twice the final size and averaged, which smooths edges, lines and text alike and costs less on a
software renderer than multi-sampling (measured with Mesa llvmpipe: 0.05 s against 0.2 s a frame). Transparency is two
passes, back faces before front faces, instead of depth peeling.
"""

from __future__ import annotations

import zlib
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import vtkmodules.vtkRenderingFreeType
import vtkmodules.vtkRenderingOpenGL2  # noqa: F401  (both register the classes that draw)
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray, vtk_to_numpy
from vtkmodules.vtkCommonCore import VTK_UNSIGNED_CHAR, vtkPoints, vtkUnsignedCharArray
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData
from vtkmodules.vtkRenderingCore import (
    vtkActor,
    vtkActor2D,
    vtkCoordinate,
    vtkLight,
    vtkPolyDataMapper,
    vtkPolyDataMapper2D,
    vtkRenderer,
    vtkRenderWindow,
    vtkTextActor,
)

from moldgen.output.palette import PAPER, TEXT, Rgb
from moldgen.output.picture_geometry import SIZE, Rect, View
from moldgen.output.scene import Points, Vector

OVERSAMPLE = 2

Pixels = npt.NDArray[np.uint8]

# Key light from above left of the viewer, fill from the right, and a little from below, so that no face goes black;
# set so that the tops of blocks come out in about their legend colour and walls somewhat darker.
LIGHTS: tuple[tuple[Vector, float], ...] = (
    ((-0.45, 0.95, 0.75), 0.78),
    ((0.9, 0.2, 0.7), 0.34),
    ((-0.2, -0.7, 0.8), 0.40),
)
AMBIENT = 0.38
"""Share of the colour that a face shows without any light on it."""


class Canvas:
    """The window. Use `clear`, then panels and marks, then `save`; the window is set up once for all pictures."""

    def __init__(self) -> None:
        self._window = vtkRenderWindow()
        self._window.SetOffScreenRendering(1)
        self._window.SetMultiSamples(0)
        self._window.SetDPI(72)
        self._window.SetNumberOfLayers(4)
        self._window.SetSize(SIZE[0] * OVERSAMPLE, SIZE[1] * OVERSAMPLE)
        self._renderers: list[Any] = []
        self._overlay: Any = None
        self.clear()

    def clear(self) -> None:
        """Begin a new sheet."""
        for renderer in self._renderers:
            renderer.RemoveAllViewProps()
            self._window.RemoveRenderer(renderer)
        self._renderers = []
        self._add_renderer(0, (0, 0, *SIZE)).SetBackground(*_unit(PAPER))
        self._overlay = self._add_renderer(3, (0, 0, *SIZE))

    def draws(self) -> bool:
        """Return whether the window really draws: an empty sheet must come back in the colour of the paper."""
        return bool((self._pixels()[0, 0] == PAPER).all())

    def panel(self, rect: Rect, view: View, middle: Points, px_per_mm: float) -> Panel:
        """Return a panel in `rect` that shows the picture point `middle` (2,) [mm] of `view` in its centre."""
        # Layer 0 paints the paper, 1 holds the bodies, 2 what lies in front of them, 3 the marks and words.
        return Panel(self._add_renderer(1, rect), self._add_renderer(2, rect), rect, view, (middle, px_per_mm))

    def text(
        self,
        at: tuple[float, float],
        words: str,
        size: int = 15,
        *,
        colour: Rgb = TEXT,
        bold: bool = False,
        align: str = "left",
    ) -> None:
        """Write `words` with the middle of their height at `at` [px]; `align` is left, centre or right."""
        actor = vtkTextActor()
        actor.SetTextScaleModeToNone()
        actor.SetInput(words)
        style = actor.GetTextProperty()
        style.SetFontFamilyToArial()
        style.SetFontSize(size * OVERSAMPLE)
        style.SetColor(*_unit(colour))
        style.SetBold(int(bold))
        {"left": style.SetJustificationToLeft, "centre": style.SetJustificationToCentered}.get(
            align, style.SetJustificationToRight
        )()
        style.SetVerticalJustificationToCentered()
        actor.SetPosition(at[0] * OVERSAMPLE, at[1] * OVERSAMPLE)
        self._overlay.AddViewProp(actor)

    def polygon(self, corners: Sequence[tuple[float, float]], colour: Rgb) -> None:
        """Fill the convex polygon `corners` [px]."""
        flat = np.array([(x, y, 0.0) for x, y in corners])
        self._overlay_shape(flat, np.arange(len(corners))[None, :], "SetPolys", colour, 1.0)

    def rectangle(self, rect: Rect, colour: Rgb) -> None:
        """Fill a rectangle [px]."""
        x0, y0, x1, y1 = rect
        self.polygon([(x0, y0), (x1, y0), (x1, y1), (x0, y1)], colour)

    def line(self, points: Sequence[tuple[float, float]], colour: Rgb, width: float = 1.0) -> None:
        """Draw a polyline [px]."""
        flat = np.array([(x, y, 0.0) for x, y in points])
        self._overlay_shape(flat, np.arange(len(points))[None, :], "SetLines", colour, width)

    def disc(self, at: tuple[float, float], radius: float, colour: Rgb) -> None:
        """Fill a disc [px]."""
        turn = np.linspace(0.0, 2.0 * np.pi, 41)[:-1]
        self.polygon([(at[0] + radius * np.cos(t), at[1] + radius * np.sin(t)) for t in turn], colour)

    def ring(self, at: tuple[float, float], outer: float, inner: float, colour: Rgb) -> None:
        """Draw a ring between two radii [px]."""
        turn = np.linspace(0.0, 2.0 * np.pi, 41)[:-1]
        rim = np.stack([np.cos(turn), np.sin(turn), np.zeros(40)], axis=1)
        points = np.concatenate([inner * rim, outer * rim]) + np.array([*at, 0.0])
        here, after = np.arange(40), (np.arange(40) + 1) % 40
        quads = np.stack([here, here + 40, after + 40, after], axis=1)
        self._overlay_shape(points, quads, "SetPolys", colour, 1.0)

    def save(self, path: Path) -> None:
        """Render the sheet and write it to `path` as PNG."""
        path.write_bytes(encode_png(self._pixels()))

    def _pixels(self) -> Pixels:
        self._window.Render()
        width, height = SIZE[0] * OVERSAMPLE, SIZE[1] * OVERSAMPLE
        data = vtkUnsignedCharArray()
        self._window.GetPixelData(0, 0, width - 1, height - 1, 0, data, 0)
        fine = vtk_to_numpy(data).reshape(height, width, 3)[::-1].astype(np.uint16)
        rows = fine[::2] + fine[1::2]
        mean: Pixels = ((rows[:, ::2] + rows[:, 1::2] + 2) >> 2).astype(np.uint8)
        return mean

    def _add_renderer(self, layer: int, rect: Rect) -> Any:
        renderer = vtkRenderer()
        renderer.SetUseOIT(False)
        renderer.SetLayer(layer)
        renderer.SetViewport(rect[0] / SIZE[0], rect[1] / SIZE[1], rect[2] / SIZE[0], rect[3] / SIZE[1])
        renderer.InteractiveOff()
        self._window.AddRenderer(renderer)
        self._renderers.append(renderer)
        return renderer

    def _overlay_shape(self, points: Points, cells: Any, kind: str, colour: Rgb, width: float) -> None:
        mapper = vtkPolyDataMapper2D()
        mapper.SetInputData(_poly_data(points * OVERSAMPLE, cells, kind))
        place = vtkCoordinate()
        place.SetCoordinateSystemToDisplay()
        mapper.SetTransformCoordinate(place)
        actor = vtkActor2D()
        actor.SetMapper(mapper)
        actor.GetProperty().SetColor(*_unit(colour))
        actor.GetProperty().SetLineWidth(width * OVERSAMPLE)
        self._overlay.AddViewProp(actor)


class Panel:
    """A part of the sheet with a view of its own."""

    def __init__(self, renderer: Any, front: Any, rect: Rect, view: View, fit: tuple[Points, float]) -> None:
        self.rect, self.view = rect, view
        self.middle, self.px_per_mm = fit
        self._renderer, self._front = renderer, front
        self._depths: list[float] = []
        self._light()

    def pixel(self, point: Sequence[float] | Points) -> tuple[float, float]:
        """Return where on the sheet [px] the mold point `point` [mm] is seen."""
        flat = self.view.flat(np.asarray(point, dtype=float)[None, :])[0] - self.middle
        x, y = flat * self.px_per_mm
        return ((self.rect[0] + self.rect[2]) / 2.0 + float(x), (self.rect[1] + self.rect[3]) / 2.0 + float(y))

    def surface(
        self,
        points: Points,
        triangles: Any,
        colour: Rgb | Pixels,
        *,
        normals: Points | None = None,
        opacity: float = 1.0,
        front: bool = False,
    ) -> None:
        """Show triangles (or quads), lit if `normals` are given, else in flat colour.

        `colour` is one colour or one for each point (n, 3). With `front` nothing hides it but other things in front.
        """
        self._note_depth(points)
        data = _poly_data(points, triangles, "SetPolys")
        if normals is not None:
            data.GetPointData().SetNormals(numpy_to_vtk(np.ascontiguousarray(normals), deep=1))
        mapper = _mapper(data)
        if opacity < 1.0:
            # Where a translucent face lies on an opaque one, as cavity on part, the opaque one is to be seen.
            mapper.SetResolveCoincidentTopologyToPolygonOffset()
            mapper.SetRelativeCoincidentTopologyPolygonOffsetParameters(1.0, 40.0)
        if isinstance(colour, np.ndarray):
            shades = numpy_to_vtk(np.ascontiguousarray(colour), deep=1, array_type=VTK_UNSIGNED_CHAR)
            data.GetPointData().SetScalars(shades)
        for culled in ("back", "front") if opacity >= 1.0 else ("front", "back"):
            actor = vtkActor()
            actor.SetMapper(mapper)
            style = actor.GetProperty()
            if not isinstance(colour, np.ndarray):
                style.SetColor(*_unit(colour))
            lit = normals is not None
            style.SetLighting(lit)
            style.SetAmbient(AMBIENT if lit else 1.0)
            style.SetDiffuse(1.0 - AMBIENT if lit else 0.0)
            style.SetOpacity(opacity)
            if opacity < 1.0:
                style.SetFrontfaceCulling(culled == "front")
                style.SetBackfaceCulling(culled == "back")
            (self._front if front else self._renderer).AddActor(actor)
            if opacity >= 1.0:
                return

    def lines(
        self,
        lines: Sequence[Points] | Points,
        colour: Rgb,
        width: float,
        *,
        opacity: float = 1.0,
        front: bool = False,
    ) -> None:
        """Show polylines, a sequence of (k, 3) arrays [mm]; `width` [px]. `front` as for `surface`."""
        actor = self._line_actor(lines, colour, width, opacity)
        if actor is not None:
            (self._front if front else self._renderer).AddActor(actor)

    def close(self, cut: float | None = None) -> None:
        """Set up the camera, once everything is in the panel: it stands in front of the nearest point.

        With `cut`, a distance toward the viewer [mm], everything nearer is cut away, except for what is in front.
        """
        near, far = max(self._depths, default=1.0), min(self._depths, default=0.0)
        room = 0.01 * (near - far) + 0.1  # [mm]
        middle = self.middle[0] * self.view.right + self.middle[1] * self.view.up
        for each in (self._renderer, self._front):
            camera = each.GetActiveCamera()
            camera.ParallelProjectionOn()
            camera.SetFocalPoint(*(middle + far * self.view.toward))
            camera.SetPosition(*(middle + (near + 2.0 * room) * self.view.toward))
            camera.SetViewUp(*self.view.up)
            camera.SetParallelScale((self.rect[3] - self.rect[1]) / 2.0 / self.px_per_mm)
            first = near + 2.0 * room - cut if cut is not None and each is self._renderer else room
            camera.SetClippingRange(first, near - far + 3.0 * room)

    def _line_actor(self, lines: Sequence[Points] | Points, colour: Rgb, width: float, opacity: float) -> Any:
        kept = [np.asarray(line, dtype=float) for line in lines if len(line) > 1]
        if not kept:
            return None
        sizes = np.array([len(line) for line in kept])
        # Lines lie on surfaces. In a parallel projection a step toward the viewer changes nothing but what hides what.
        # Half the width keeps a thin line whole and hidden lines hidden; a thick line needs all of its width.
        step = (1.0 if width > 2.0 else 0.5) * width / self.px_per_mm
        points = np.concatenate(kept) + step * self.view.toward
        mapper = _mapper(_poly_data(points, sizes, "SetLines"))
        self._note_depth(points)
        actor = vtkActor()
        actor.SetMapper(mapper)
        style = actor.GetProperty()
        style.SetColor(*_unit(colour))
        style.SetLineWidth(width * OVERSAMPLE)
        style.SetLighting(False)
        style.SetAmbient(1.0)
        style.SetDiffuse(0.0)
        style.SetOpacity(opacity)
        return actor

    def _note_depth(self, points: Points) -> None:
        if len(points):
            depth = points @ self.view.toward
            self._depths += [float(depth.min()), float(depth.max())]

    def _light(self) -> None:
        self._renderer.AutomaticLightCreationOff()
        side = 1.0 if self.view.toward[2] >= 0.0 else -1.0  # from below, the faces turned down matter
        for (x, y, z), strength in LIGHTS:
            light = vtkLight()
            light.SetLightTypeToCameraLight()
            light.SetPosition(x, side * y, z)
            light.SetFocalPoint(0.0, 0.0, 0.0)
            light.SetIntensity(strength)
            self._renderer.AddLight(light)


def encode_png(pixels: Pixels) -> bytes:
    """Return `pixels` (height, width, 3) as the bytes of a PNG file: three chunks, no clock, no software name.

    Format: PNG [published: W3C Recommendation, Portable Network Graphics]; filter type 2 ("up") on every row.
    """
    height, width, _ = pixels.shape
    rows = np.empty((height, 1 + 3 * width), dtype=np.uint8)
    flat = pixels.reshape(height, -1)
    rows[:, 0] = 2
    rows[0, 1:] = flat[0]
    rows[1:, 1:] = flat[1:] - flat[:-1]
    head = width.to_bytes(4, "big") + height.to_bytes(4, "big") + bytes([8, 2, 0, 0, 0])
    chunks = ((b"IHDR", head), (b"IDAT", zlib.compress(rows.tobytes(), 6)), (b"IEND", b""))
    body = b"".join(
        len(data).to_bytes(4, "big") + kind + data + zlib.crc32(kind + data).to_bytes(4, "big") for kind, data in chunks
    )
    return b"\x89PNG\r\n\x1a\n" + body


def _poly_data(points: Points, cells: Any, kind: str) -> Any:
    """Return vtk data: `cells` (m, k) are polygons; (m,) are the lengths of polylines that follow each other."""
    data = vtkPolyData()
    place = vtkPoints()
    place.SetData(numpy_to_vtk(np.ascontiguousarray(points, dtype=np.float64), deep=1))
    data.SetPoints(place)
    cells = np.asarray(cells, dtype=np.int64)
    if cells.ndim == 1:
        offsets, index = np.concatenate([[0], np.cumsum(cells)]), np.arange(len(points))
    else:
        offsets, index = np.arange(len(cells) + 1) * cells.shape[1], cells.reshape(-1)
    array = vtkCellArray()
    array.SetData(
        numpy_to_vtkIdTypeArray(offsets, deep=1), numpy_to_vtkIdTypeArray(np.ascontiguousarray(index), deep=1)
    )
    getattr(data, kind)(array)
    return data


def _mapper(data: Any) -> Any:
    mapper = vtkPolyDataMapper()
    mapper.SetInputData(data)
    return mapper


def _unit(colour: Rgb) -> tuple[float, float, float]:
    return (colour[0] / 255.0, colour[1] / 255.0, colour[2] / 255.0)
