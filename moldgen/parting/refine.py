"""Splitting vertical faces so that each half can form its own share of them."""

from __future__ import annotations

from typing import Any

import numpy as np

from moldgen.errors import KernelError
from moldgen.kernel.body import Body
from moldgen.kernel.edge_split import parameter_range, place_on, split_edges
from moldgen.kernel.level_faces import split_vertical_faces
from moldgen.kernel.level_split import level_curves, level_parameters, upright_lines
from moldgen.kernel.patches import loop_points
from moldgen.kernel.rehearse import LIMIT_S, survives
from moldgen.kernel.runoff import extreme_parameters
from moldgen.kernel.split import split_faces
from moldgen.parting.level import LevelSearch
from moldgen.release.kinds import FaceKinds, Kind
from moldgen.tolerances import ON_PLANE, SHORT_EDGE

ABOVE_BELOW = 1e-3
"""mm: a face must reach this far to both sides of the level to be split there."""


def split_at_level(
    body: Body, kinds: FaceKinds, contact: np.ndarray, search: LevelSearch, level: float, *, all_faces: bool
) -> Body:
    """Return the body with its vertical faces split at z = level.

    First only the faces on the outline of the shadow are split, so that the outer line can run level across them. With
    `all_faces` every vertical face is, and those partly blocked both ways also along vertical lines through their
    vertices.
    """
    heights = body.face_heights
    at_outline = set(body.edge_faces[search.on_outline].ravel().tolist())
    vertical = kinds.numbers(Kind.VERTICAL).tolist()
    crossing = [
        f
        for f in vertical
        if (all_faces or f in at_outline)
        and heights[f, 0] < level - ABOVE_BELOW
        and heights[f, 1] > level + ABOVE_BELOW
    ]
    if crossing and not all_faces:
        body, crossing = split_vertical_faces(body, crossing, level)
    tools = level_curves([body.faces[f] for f in crossing], level) if crossing else []
    touched = list(crossing)
    if all_faces:
        for f in vertical:
            partly = (contact[f] > 0.02) & (contact[f] < 0.98)
            if body.face_areas[f] > 1e-2 and partly.any():
                lines = upright_lines(body.faces[f], *heights[f])
                tools += lines
                touched += [f] if lines else []
    if not tools:
        return body
    faces = sorted(set(touched))
    if not survives(lambda: split_faces(body, faces, tools)):
        raise KernelError(f"splitting {len(faces)} faces along {len(tools)} lines did not end within {LIMIT_S:g} s")
    return split_faces(body, faces, tools)


def split_for_line(body: Body, loops: list[list[Any]], outer: int, level: float) -> Body:
    """Return the body with every vertex that the parting line needs, all made in one go.

    The outer loop gets one where it passes through z = level, and where its run-off turns a corner if it is not flat; a
    loop of one closed edge that is not flat gets two.
    """
    places = level_places(body, [body.edge_index.FindIndex(e) - 1 for e in loops[outer]], level)
    if np.abs(loop_points(loops[outer], 8)[:, 2] - level).max() >= ON_PLANE:
        for number, found in extreme_places(body, loops[outer]).items():
            places[number] = _apart(body.edges[number], [*places.get(number, []), *found])
    for number, found in closed_places(body, loops).items():
        places.setdefault(number, found)
    return split_edges(body, places) if places else body


def extreme_places(body: Body, loop: list[Any]) -> dict[int, list[float]]:
    """Return the curve parameters, by edge, of the diagonal extremes of a loop, where its run-off turns a corner."""
    places: dict[int, list[float]] = {}
    for number, parameter in extreme_parameters(loop):
        places.setdefault(body.edge_index.FindIndex(loop[number]) - 1, []).append(parameter)
    return places


def level_places(body: Body, edges: list[int], level: float) -> dict[int, list[float]]:
    """Return the curve parameters, by edge, at which the given edges pass through z = level."""
    places = {number: level_parameters(body.edges[number], level) for number in edges}
    return {number: found for number, found in places.items() if found}


def closed_places(body: Body, loops: list[list[Any]]) -> dict[int, list[float]]:
    """Return two curve parameters on each closed edge that makes a loop of the parting line which is not flat.

    A curtain under one closed edge would close on itself along a seam, and the kernel copies edges there.
    """
    places = {}
    for loop in loops:
        if len(loop) == 1 and np.ptp(loop_points(loop, 8)[:, 2]) > ON_PLANE:
            first, last = parameter_range(loop[0])
            places[body.edge_index.FindIndex(loop[0]) - 1] = [(2 * first + last) / 3, (first + 2 * last) / 3]
    return places


def _apart(edge: Any, parameters: list[float]) -> list[float]:
    """Return the parameters in order, without those whose places fall together with the one before."""
    curve_points = place_on(edge, sorted(parameters))
    kept: list[int] = []
    for k in range(len(curve_points)):
        if not kept or np.linalg.norm(curve_points[k] - curve_points[kept[-1]]) > SHORT_EDGE:
            kept.append(k)
    return [sorted(parameters)[k] for k in kept]
