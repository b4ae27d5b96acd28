"""From the part's own coordinates to the mold's: shrink about a fixed point, then the pull turned to +z."""

from __future__ import annotations

import numpy as np

from moldgen.catalog import resin as resin_named
from moldgen.finding import Decision, Finding, Notes, Severity
from moldgen.model.part import Box, MoldFrame, Vector
from moldgen.quantity import Provenance, Quantity
from moldgen.rules.shrink import shrink_factor_first_order, shrink_factor_iso294_4
from moldgen.spec.pull import Shrink

AXES = "xyz"


def mold_frame(direction: Vector, shrink: Shrink, resin: str, box: Box) -> tuple[MoldFrame, Notes]:
    """Return how a part point becomes a mold point.

    direction : unit pull in part coordinates; box : bounding box of the part [mm]
    """
    percent, decision = _percent(shrink, resin)
    rule = shrink_factor_iso294_4 if shrink.convention == "mold" else shrink_factor_first_order
    factors = tuple(rule(s) for s in percent)
    uniform = len(set(percent)) == 1
    ways = ["all axes"] if uniform else list(AXES)
    lines = tuple(rule.line(f"size of the mold along {way}", s) for way, s in zip(ways, percent, strict=False))
    provenance = Provenance.GIVEN if shrink.percent else Provenance.UNVERIFIED
    given = tuple(
        Quantity(f"shrinkage along {way}", s, "%", decision.why, provenance, symbol="S", drives="shrink factor")
        for way, s in zip(ways, percent, strict=False)
    )
    frame = MoldFrame(factors, _fixed_point(shrink, box), rotation_to_z(direction))  # type: ignore[arg-type]
    findings = () if uniform else (_not_uniform(percent),)
    return frame, Notes(findings, (decision,), (*given, *lines))


def rotation_to_z(direction: Vector) -> tuple[Vector, Vector, Vector]:
    """Return the rotation (rows) that turns a unit vector to +z by the shortest way; downward ones turn about x first.

    Axis directions give exact quarter and half turns, so that a part drawn square stays square to the last digit.
    """
    d = np.asarray(direction, dtype=float)
    d = d / np.linalg.norm(d)
    half_turn = np.diag([1.0, -1.0, -1.0]) if d[2] < -0.5 else np.eye(3)  # near -z the shortest way is ill-conditioned
    d = half_turn @ d
    turn = np.array([[0.0, 0.0, -d[0]], [0.0, 0.0, -d[1]], [d[0], d[1], 0.0]])  # cross product with d x z
    matrix = (np.eye(3) + turn + turn @ turn / (1.0 + d[2])) @ half_turn
    matrix = np.where(np.abs(matrix - np.round(matrix)) < 1e-15, np.round(matrix), matrix) + 0.0
    rows = tuple(tuple(float(v) for v in row) for row in matrix)
    return rows  # type: ignore[return-value]


def _percent(shrink: Shrink, resin: str) -> tuple[Vector, Decision]:
    if shrink.percent is not None:
        return shrink.percent, Decision("shrink", _listed(shrink.percent), "given in the spec")
    data = resin_named(resin)
    mean = 0.25 * (data.shrink_along.low + data.shrink_along.high + data.shrink_across.low + data.shrink_across.high)
    why = (
        f"mean of the catalog ranges of {resin}: {data.shrink_along.low:g} to {data.shrink_along.high:g} % along and "
        f"{data.shrink_across.low:g} to {data.shrink_across.high:g} % across the flow (from memory, unverified)"
    )
    percent = (mean, mean, mean)
    return percent, Decision("shrink", _listed(percent), why)


def _fixed_point(shrink: Shrink, box: Box) -> Vector:
    if shrink.fixed_point == "origin":
        return (0.0, 0.0, 0.0)
    if isinstance(shrink.fixed_point, str):
        (x0, y0, z0), (x1, y1, z1) = box
        return ((x0 + x1) / 2, (y0 + y1) / 2, (z0 + z1) / 2)
    return shrink.fixed_point


def _listed(percent: Vector) -> str:
    if len(set(percent)) == 1:
        return f"{percent[0]:g} %"
    return ", ".join(f"{axis} {s:g} %" for axis, s in zip(AXES, percent, strict=True))


def _not_uniform(percent: Vector) -> Finding:
    return Finding(
        code="shrink.not_uniform",
        severity=Severity.CAUTION,
        message=f"shrink differs by axis ({_listed(percent)}): round faces of the part become elliptic and spline "
        "faces in the steel, not cylinders",
        where="shrink",
        remedy="give one shrink for all axes if the difference does not matter",
    )
