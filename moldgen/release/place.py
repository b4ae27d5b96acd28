"""Places for people: points of the mold given in the part's own coordinates."""

from __future__ import annotations

import numpy as np

from moldgen.finding import Point
from moldgen.kernel.body import Body
from moldgen.model.part import MoldFrame


def part_point(point: Point | np.ndarray, frame: MoldFrame | None) -> Point:
    """Return a point of the mold frame in part coordinates [mm]; without a frame the two are the same."""
    x, y, z = (float(c) for c in point)
    return frame.to_part((x, y, z)) if frame is not None else (x, y, z)


def face_at(surface: str, at: Point) -> str:
    """Return the words that name a face by a point on it: ``plane face at 1.00, 2.00, 3.00``."""
    x, y, z = (round(c, 2) + 0.0 for c in at)
    return f"{surface} face at {x:.2f}, {y:.2f}, {z:.2f}"


def face_place(body: Body, number: int, frame: MoldFrame | None) -> tuple[Point, str]:
    """Return a point on a face, in part coordinates, and the words that name the face by it."""
    at = part_point(body.face_places[number], frame)
    return at, face_at(body.surface_kind(number), at)
