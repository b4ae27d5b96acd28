"""Geometry of the pictures on plain arrays: shading normals, outlines, views, and the cut of a mesh with a plane."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from moldgen.output.scene import Indices, Points, SceneBody, Vector

Rect = tuple[float, float, float, float]
"""Left, bottom, right, top [px], origin at the bottom left."""

SIZE = (1400, 1000)
"""Width and height of a picture [px]."""


SHARP = np.cos(np.radians(20.0))
"""Edges between faces whose facets turn by less are smooth, and not drawn."""


@dataclass(frozen=True)
class Shaded:
    """A mesh whose vertices are split along face borders, so that each face is shaded smoothly by itself.

    `points`, `normals` (n, 3); `triangles` (m, 3); `face_of_point` (n,).
    """

    points: Points
    normals: Points
    triangles: Indices
    face_of_point: Indices


@dataclass(frozen=True)
class View:
    """A parallel projection: `toward` points to the viewer, `right` and `up` span the picture (all unit vectors)."""

    toward: Points
    right: Points
    up: Points

    def flat(self, points: Points) -> Points:
        """Return picture coordinates (n, 2) [mm] of `points` (n, 3)."""
        return np.stack([points @ self.right, points @ self.up], axis=1)


def look_from(direction: Vector, up: Vector = (0.0, 0.0, 1.0)) -> View:
    """Return the view of a viewer who stands in `direction`, with `up` pointing up in the picture."""
    toward = np.array(direction) / np.linalg.norm(direction)
    right = np.cross(up, toward)
    right /= np.linalg.norm(right)
    return View(toward, right, np.cross(toward, right))


def shade(body: SceneBody) -> Shaded:
    """Return `body` for shading: a normal is the mean of the triangles around a point of one face.

    Triangles are weighted by their angle at the point, so that it does not matter which way a strip of a wall was split
    [published: Thuermer and Wuethrich, Computing vertex normals from polygonal facets, J. Graphics Tools 3(1), 1998].
    """
    _, welded = body.welded
    corner_vertex = body.triangles.reshape(-1)
    corner_face = np.repeat(body.face_id, 3)
    span = len(body.vertices) + 1
    keys, first, corner = np.unique(corner_face * span + welded[corner_vertex], return_index=True, return_inverse=True)
    corner = corner.reshape(-1)
    flat = _unit(area_normals(body.vertices, body.triangles))
    weighted = (flat[:, None, :] * _corner_angles(body.vertices, body.triangles)[:, :, None]).reshape(-1, 3)
    normals = _unit(np.stack([np.bincount(corner, weighted[:, k], len(keys)) for k in range(3)], axis=1))
    return Shaded(body.vertices[corner_vertex[first]], normals, corner.reshape(-1, 3), corner_face[first])


def _corner_angles(points: Points, triangles: Indices) -> Points:
    """Return the angle (m, 3) of each triangle at each of its corners [rad]."""
    corners = points[triangles]
    ahead = _unit(np.roll(corners, -1, axis=1) - corners)
    behind = _unit(np.roll(corners, 1, axis=1) - corners)
    return np.asarray(np.arccos(np.clip((ahead * behind).sum(axis=-1), -1.0, 1.0)))


def _unit(vectors: Points) -> Points:
    """Return `vectors` (..., 3) at length one; a zero vector stays zero."""
    length = np.linalg.norm(vectors, axis=-1, keepdims=True)
    return np.asarray(np.divide(vectors, length, out=np.zeros_like(vectors), where=length > 0.0))


def outline(body: SceneBody, view: View) -> Points:
    """Return the segments (k, 2, 3) where the smooth surface of `body` turns away from the viewer.

    Feature edges alone leave a cylinder without its sides; these segments close it.
    """
    points, welded = body.welded
    triangles = welded[body.triangles]
    faces_viewer = area_normals(points, triangles) @ view.toward > 0.0
    edges = np.sort(triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2), axis=1)
    owner = np.repeat(np.arange(len(triangles)), 3)
    order = np.lexsort((owner, edges[:, 1], edges[:, 0]))
    edges, owner = edges[order], owner[order]
    pair = np.flatnonzero((edges[1:] == edges[:-1]).all(axis=1))
    turns = faces_viewer[owner[pair]] != faces_viewer[owner[pair + 1]]
    smooth = body.face_id[owner[pair]] == body.face_id[owner[pair + 1]]
    segments: Points = points[edges[pair[turns & smooth]]]
    return segments


def sharp_edges(points: Points, triangles: Indices, face: Indices) -> tuple[Points, ...]:
    """Return the edges between different faces that meet at an angle, each a segment (2, 3) [mm].

    points : (n, 3), shared by triangles that touch; triangles : (m, 3); face : (m,) what each triangle belongs to
    """
    normal = area_normals(points, triangles)
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    ends = np.sort(np.vstack([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]]), axis=1)
    owner = np.tile(np.arange(len(triangles)), 3)
    order = np.lexsort((ends[:, 1], ends[:, 0]))
    ends, owner = ends[order], owner[order]
    pair = np.flatnonzero((np.diff(ends, axis=0) == 0).all(axis=1))
    a, b = owner[pair], owner[pair + 1]
    sharp = (face[a] != face[b]) & ((normal[a] * normal[b]).sum(axis=1) < SHARP)
    return tuple(points[ends[pair[sharp]]])


def is_hidden(point: Vector, bodies: Sequence[SceneBody], view: View) -> bool:
    """Return whether any of `bodies` stands between `point` and the viewer; 0.2 mm count as lying on the surface."""
    for body in bodies:
        a, b, c = (body.vertices[body.triangles[:, k]] - np.array(point) for k in range(3))
        # Barycentric weights of the line of sight: the signed areas of the three corners seen from it.
        pa, pb, pc = view.flat(a), view.flat(b), view.flat(c)
        weights = np.stack([_cross(pb, pc), _cross(pc, pa), _cross(pa, pb)], axis=1)
        total = weights.sum(axis=1)
        inside = ((weights >= 0.0).all(axis=1) | (weights <= 0.0).all(axis=1)) & (np.abs(total) > 1e-12)
        depths = np.stack([corner @ view.toward for corner in (a, b, c)], axis=1)
        if (np.einsum("ij,ij->i", weights[inside], depths[inside]) / total[inside] > 0.2).any():
            return True
    return False


def _cross(p: Points, q: Points) -> Points:
    return np.asarray(p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0])


def area_normals(points: Points, triangles: Indices) -> Points:
    """Return the normal of each triangle, as long as twice its area, (m, 3) [mm^2]."""
    a, b, c = (points[triangles[:, k]] for k in range(3))
    return np.cross(b - a, c - a)


def cut_mesh(body: SceneBody, axis: int, at: float) -> Points:
    """Return the segments (k, 2, 3) where the plane `axis` = `at` [mm] cuts the mesh of `body`.

    The plane is moved to the middle of the nearest gap between vertices, at most by a few hundredths of a millimetre,
    because a plane through vertices or along a flat face has no clean cut.
    """
    depth = body.vertices[:, axis]
    height = depth - _clear_of(depth, at)
    corner_height = height[body.triangles]
    above = corner_height > 0.0
    mixed = above.any(axis=1) & ~above.all(axis=1)
    triangles, corner_height, above = body.triangles[mixed], corner_height[mixed], above[mixed]
    lone_above = above.sum(axis=1) == 1
    lone = np.argmax(above == lone_above[:, None], axis=1)
    rows = np.arange(len(triangles))
    ends = []
    for step in (1, 2):
        other = (lone + step) % 3
        start, stop = corner_height[rows, lone], corner_height[rows, other]
        share = (start / (start - stop))[:, None]
        p, q = body.vertices[triangles[rows, lone]], body.vertices[triangles[rows, other]]
        ends.append(p + share * (q - p))
    return np.stack(ends, axis=1) if len(triangles) else np.zeros((0, 2, 3))


def _clear_of(depth: Points, at: float) -> float:
    """Return a place near `at` that keeps clear of all values of `depth`."""
    reach = 0.02  # [mm], finer than anything a picture shows
    near = np.unique(depth[np.abs(depth - at) < reach])
    stops = np.concatenate([[at - reach], near, [at + reach]])
    widths = np.diff(stops)
    middles = (stops[1:] + stops[:-1]) / 2.0
    best = np.lexsort((np.abs(middles - at), -np.round(widths, 9)))[0]
    return float(middles[best])


def hatch(segments: Points, spacing: float, angle: float, phase: float = 0.0) -> Points:
    """Return the parts of parallel lines that lie inside the closed outlines `segments`, even-odd rule.

    Parameters
    ----------
    segments : (k, 2, 2) float [mm], in any order
    spacing : distance between the lines [mm]
    angle : of the lines against the first axis [rad]
    phase : shift of the lines, in spacings

    Returns
    -------
    (n, 2, 2) float [mm]. With spacing one pixel the lines fill the outline: no polygon has to be closed up,
    oriented or freed of holes first, so no outline can defeat it.
    """
    if not len(segments):
        return np.zeros((0, 2, 2))
    along, across = np.array([np.cos(angle), np.sin(angle)]), np.array([-np.sin(angle), np.cos(angle)])
    run, level = segments @ along, segments @ across / spacing - phase
    low, high = level.min(axis=1), level.max(axis=1)
    first, last = np.ceil(low).astype(np.int64), np.ceil(high).astype(np.int64)  # half-open: low <= line < high
    count = np.maximum(last - first, 0)
    which = np.repeat(np.arange(len(segments)), count)
    line = first[which] + np.arange(len(which)) - np.repeat(np.cumsum(count) - count, count)
    rise = level[which, 1] - level[which, 0]
    place = run[which, 0] + (line - level[which, 0]) / rise * (run[which, 1] - run[which, 0])
    order = np.lexsort((place, line))
    line, place = line[order], place[order]
    rank = np.arange(len(line)) - np.searchsorted(line, line)
    total = np.searchsorted(line, line, side="right") - np.searchsorted(line, line)
    opens = np.flatnonzero((rank % 2 == 0) & (rank + 1 < total))
    offset = ((line[opens] + phase) * spacing)[:, None] * across
    return np.stack([place[opens, None] * along + offset, place[opens + 1, None] * along + offset], axis=1)


@dataclass(frozen=True)
class Cut:
    """A vertical section plane, `axis` (0 x, 1 y) = `at` [mm], and what lies on it in words.

    With `beyond` the section is stepped: where the other coordinate is less than `beyond.turn` (more if `above`),
    it follows the plane of `beyond` instead.
    """

    axis: int
    at: float
    through: str
    beyond: Step | None = None


@dataclass(frozen=True)
class Step:
    """The second plane of a stepped section: where it begins [mm], on which side, its place [mm], and through what."""

    turn: float
    above: bool
    at: float
    through: str


NEAR = 0.05
"""A plane closer than this [mm] is said to go through a thing."""

GATE_ROOM = 0.15
"""Share of the part that a stepped section shows beside the gate at least."""

STEP_REACH = 0.22
"""Share of the part's width that a section may step aside: farther off it would show quite another shape."""

Span = tuple[SceneBody, float, float]
"""A body and its lower and upper end along one axis [mm]."""


def choose_cut(part: Sequence[SceneBody], pins: Sequence[SceneBody], gate: Vector | None) -> Cut:
    """Return the section that shows most: through the gate where there is one, else the part's middle or a row of pins.

    Candidates are the planes square to x and y through the gate, the middle of the part and each pin. Each is scored
    by what it cuts: gate 3, core pins 1 each, ejector pins 0.5 each (three of a kind count at most), middle of the part
    0.5, the length of the part along the plane up to 0.4, minus 6 for what it cuts less than half of that length (a
    plane along the rim shows nothing but the rim), and minus 4 for each part of its bounding rectangle beyond a third
    that the part fills: a plane along a rib shows nothing but the rib.
    """
    low, high = _bounds(part or pins)
    middle = (low + high) / 2.0
    size = np.maximum(high - low, 1e-9)
    best: tuple[float, Cut] | None = None
    for axis in (1, 0):
        places = [float(middle[axis])] + ([float(gate[axis])] if gate else [])
        spans: list[Span] = [(b, *_extent(b, axis)) for b in pins]
        places += sorted(round((a + b) / 2.0, 3) for _, a, b in spans)
        for at in places:
            if not low[axis] < at < high[axis]:
                continue
            score, words = _score_cut(axis, at, float(middle[axis]), spans, gate)
            score += 0.4 * float(size[1 - axis] / size[:2].max())
            cut = _cut_plan(part, axis, at)
            reach = float(np.ptp(cut[..., 0])) if len(cut) else 0.0
            score -= 6.0 * max(0.5 - reach / float(size[1 - axis]), 0.0)
            score -= 4.0 * max(_filled(cut) - 0.33, 0.0)
            if best is None or score > best[0] + 1e-9:
                best = (score, Cut(axis, at, words))
    return _stepped(best[1], (low, high), pins, gate) if best else Cut(1, float(middle[1]), "the middle of the part")


def _stepped(cut: Cut, box: tuple[Points, Points], pins: Sequence[SceneBody], gate: Vector | None) -> Cut:
    """Return `cut` with a step to a row of pins, if it goes through the gate and no pin, and there is room."""
    if gate is None or abs(gate[cut.axis] - cut.at) > NEAR or "pin" in cut.through:
        return cut
    along = 1 - cut.axis
    low, high = float(box[0][along]), float(box[1][along])
    above = gate[along] < (low + high) / 2.0  # the pins' side lies away from the gate
    sign = 1.0 if above else -1.0
    room = gate[along] + sign * GATE_ROOM * (high - low)
    best: tuple[float, Cut] | None = None
    free = [b for b in pins if min(sign * v for v in _extent(b, along)) > sign * room]
    reach = STEP_REACH * float(box[1][cut.axis] - box[0][cut.axis])
    places = sorted({round(sum(_extent(b, cut.axis)) / 2.0, 3) for b in free})
    for at in [at for at in places if abs(at - cut.at) <= reach]:
        spans: list[Span] = [(b, *_extent(b, cut.axis)) for b in free]
        score, words = _score_cut(cut.axis, at, np.inf, spans, None)
        hit = [b for b, a, c in spans if abs(at - (a + c) / 2.0) < 0.25 * (c - a)]
        nearest = min(min(sign * v for v in _extent(b, along)) for b in hit)
        turn = sign * (nearest + sign * gate[along]) / 2.0
        turn = room if sign * (turn - room) < 0.0 else turn
        score -= 0.01 * abs(at - cut.at) / (high - low)
        if best is None or score > best[0] + 1e-9:
            best = (score, replace(cut, beyond=Step(turn, above, at, words)))
    return best[1] if best else cut


def _cut_plan(part: Sequence[SceneBody], axis: int, at: float) -> Points:
    """Return the segments (k, 2, 2) where a plane cuts the part: the other coordinate, and z [mm]."""
    return np.concatenate([cut_mesh(b, axis, at)[:, :, [1 - axis, 2]] for b in part] or [np.zeros((0, 2, 2))])


def _filled(segments: Points) -> float:
    """Return how much of its bounding rectangle the cut part fills, 0 to 1."""
    if not len(segments):
        return 0.0
    size = np.ptp(segments.reshape(-1, 2), axis=0)
    if size.min() <= 0.0:
        return 0.0
    spacing = float(size[1]) / 40.0
    lines = hatch(segments, spacing, 0.0, 0.5)
    return float(np.abs(lines[:, 1, 0] - lines[:, 0, 0]).sum() * spacing / size.prod())


def _score_cut(axis: int, at: float, middle: float, spans: Sequence[Span], gate: Vector | None) -> tuple[float, str]:
    score, words = 0.0, []
    if gate is not None and abs(gate[axis] - at) < NEAR:
        score += 3.0
        words.append("the gate")
    if abs(at - middle) < NEAR:
        score += 0.5
        words.append("the middle of the part")
    for role, worth, word in (("core_pin", 1.0, "core pin"), ("ejector_pin", 0.5, "ejector pin")):
        hit = sum(1 for b, a, c in spans if b.role == role and abs(at - (a + c) / 2.0) < 0.25 * (c - a))
        score += worth * min(hit, 3)
        if hit:
            words.append(f"{'an' if word[0] in 'aeio' else 'a'} {word}" if hit == 1 else f"{hit} {word}s")
    return score, " and ".join([", ".join(words[:-1]), words[-1]] if len(words) > 1 else words)


def _extent(body: SceneBody, axis: int) -> tuple[float, float]:
    return float(body.vertices[:, axis].min()), float(body.vertices[:, axis].max())


def _bounds(bodies: Sequence[SceneBody]) -> tuple[Points, Points]:
    points = np.concatenate([b.vertices for b in bodies])
    return points.min(axis=0), points.max(axis=0)
