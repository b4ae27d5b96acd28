"""What a face of a part is, in numbers: by them it is found again on another version of the part."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from typing import Any, Final

from moldgen.model.part import Rows, Vector, vector

Spread = tuple[float, float, float, float, float, float]
"""A symmetric matrix: xx, yy, zz, xy, xz, yz."""

DIGITS: Final = 6
"""Decimals of lengths [mm] in a lock file: a thousandth of the tolerance in which faces match."""

AXIS_DIGITS: Final = 9
"""Decimals of directions: over a part of a metre that is the last digit of a length."""


class SurfaceKind(StrEnum):
    """The kinds of surface that have numbers of their own; everything else is free."""

    PLANE = "plane"
    CYLINDER = "cylinder"
    CONE = "cone"
    SPHERE = "sphere"
    TORUS = "torus"
    FREE = "free"


@dataclass(frozen=True)
class FaceSign:
    """Neighbouring faces of one surface, taken as one face: what no CAD system can write otherwise [mm].

    faces : numbers in the part it was read from, in the kernel's order; () when it comes out of a lock file
    area_mm2, center : area and center of area, which may lie beside the face
    spread : mean of the products of coordinates about the center over the face [mm^2]
    axis : plane: outward normal; cylinder and torus: axis, of either sense; cone: axis, towards its wide end; else 0
    at : cylinder, cone: the axis's point nearest to `center`; sphere, torus: the middle; else `center`
    radius : cylinder, sphere; cone: at `at`; torus: of the ring. minor : of a torus's tube. angle_deg : cone, half
    side : 1 when the plastic lies inside the round surface (boss, outer rounding), -1 outside it (hole), 0 plane, free
    perimeter_mm, rim : length of the boundary, seams left out, and the center of that line; without one, `center`
    twins : centers of other faces of the same form in the same part, nearest first, at most `MOST_TWINS`
    """

    kind: SurfaceKind
    area_mm2: float
    center: Vector
    spread: Spread
    axis: Vector = (0.0, 0.0, 0.0)
    at: Vector = (0.0, 0.0, 0.0)
    radius: float = 0.0
    minor: float = 0.0
    angle_deg: float = 0.0
    side: int = 0
    perimeter_mm: float = 0.0
    rim: Vector = (0.0, 0.0, 0.0)
    faces: tuple[int, ...] = ()
    twins: tuple[Vector, ...] = ()

    @property
    def reach_mm(self) -> float:
        """How far the face reaches from its center, roughly: twice the radius of gyration [mm]."""
        return 2.0 * math.sqrt(max(sum(self.spread[:3]), 0.0))

    @property
    def spread_rows(self) -> Rows:
        """The spread as the rows of its matrix [mm^2]."""
        xx, yy, zz, xy, xz, yz = self.spread
        return (xx, xy, xz), (xy, yy, yz), (xz, yz, zz)

    def placed(self, rotation: Rows, translation: Vector) -> FaceSign:
        """Return the same face of the part moved by ``rotation @ point + translation``."""

        def point(p: Vector) -> Vector:
            x, y, z = turned(rotation, p)
            return x + translation[0], y + translation[1], z + translation[2]

        return replace(
            self,
            center=point(self.center),
            at=point(self.at),
            rim=point(self.rim),
            axis=turned(rotation, self.axis),
            spread=_turned_spread(rotation, self.spread_rows),
            twins=tuple(point(t) for t in self.twins),
        )

    def scaled(self, factor: float) -> FaceSign:
        """Return the same face of the part grown by `factor` about the origin."""

        def grown(p: Vector) -> Vector:
            return p[0] * factor, p[1] * factor, p[2] * factor

        return replace(
            self,
            area_mm2=self.area_mm2 * factor**2,
            center=grown(self.center),
            spread=tuple(v * factor**2 for v in self.spread),  # type: ignore[arg-type]
            at=grown(self.at),
            radius=self.radius * factor,
            minor=self.minor * factor,
            perimeter_mm=self.perimeter_mm * factor,
            rim=grown(self.rim),
            twins=tuple(grown(t) for t in self.twins),
        )

    def mirrored(self) -> FaceSign:
        """Return the same face of the part mirrored in the plane x = 0."""

        def other_side(p: Vector) -> Vector:
            return 0.0 - p[0], p[1], p[2]

        xx, yy, zz, xy, xz, yz = self.spread
        return replace(
            self,
            center=other_side(self.center),
            spread=(xx, yy, zz, 0.0 - xy, 0.0 - xz, yz),
            axis=other_side(self.axis),
            at=other_side(self.at),
            rim=other_side(self.rim),
            twins=tuple(other_side(t) for t in self.twins),
        )

    def to_plain(self) -> dict[str, Any]:
        """Return what a text file may hold, rounded to 1e-6 mm; the numbers of faces mean nothing there."""
        return {
            "kind": self.kind.value,
            "area_mm2": _rounded(self.area_mm2),
            "center": [_rounded(v) for v in self.center],
            "spread": [_rounded(v) for v in self.spread],
            "axis": [_rounded(v, AXIS_DIGITS) for v in self.axis],
            "at": [_rounded(v) for v in self.at],
            "radius": _rounded(self.radius),
            "minor": _rounded(self.minor),
            "angle_deg": _rounded(self.angle_deg),
            "side": self.side,
            "perimeter_mm": _rounded(self.perimeter_mm),
            "rim": [_rounded(v) for v in self.rim],
            "twins": [[_rounded(v) for v in t] for t in self.twins],
        }

    @classmethod
    def from_plain(cls, plain: Mapping[str, Any]) -> FaceSign:
        """Return the sign that `to_plain` wrote.

        Raises
        ------
        ValueError : a field is missing or is not what it should be
        """
        try:
            return cls(
                kind=SurfaceKind(plain["kind"]),
                area_mm2=float(plain["area_mm2"]),
                center=vector(plain["center"]),
                spread=_spread(plain["spread"]),
                axis=vector(plain["axis"]),
                at=vector(plain["at"]),
                radius=float(plain["radius"]),
                minor=float(plain["minor"]),
                angle_deg=float(plain["angle_deg"]),
                side=int(plain["side"]),
                perimeter_mm=float(plain["perimeter_mm"]),
                rim=vector(plain["rim"]),
                twins=tuple(vector(t) for t in plain["twins"]),
            )
        except (KeyError, TypeError) as error:
            raise ValueError(f"this is no signature of a face: {error}") from error


MOST_TWINS: Final = 24
"""So many places of equal faces are kept (our choice): enough for a row of bosses, little enough to read."""


def turned(rotation: Rows, way: Vector) -> Vector:
    """Return ``rotation @ way``."""
    x, y, z = (sum(a * b for a, b in zip(row, way, strict=True)) for row in rotation)
    return x, y, z


def _turned_spread(rotation: Rows, spread: Rows) -> Spread:
    half = [turned(rotation, column) for column in spread]
    rows = [turned(rotation, tuple(h[k] for h in half)) for k in range(3)]  # type: ignore[arg-type]
    return rows[0][0], rows[1][1], rows[2][2], rows[0][1], rows[0][2], rows[1][2]


def _rounded(value: float, digits: int = DIGITS) -> float:
    return round(value, digits) + 0.0  # no minus zero


def _spread(values: Sequence[Any]) -> Spread:
    xx, yy, zz, xy, xz, yz = (float(v) for v in values)
    return xx, yy, zz, xy, xz, yz
