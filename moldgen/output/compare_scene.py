"""What the pictures of a comparison show: one component of the new tool with the steel to cut and the steel to weld.

Plain arrays and words: no kernel shape gets this far, and it can travel to the painter as files.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

import numpy as np

from moldgen.model.revision import ComponentChange, SteelPiece, Work
from moldgen.output.compare_words import picture_key, piece_label, piece_size, steel_facts
from moldgen.output.picture_geometry import sharp_edges
from moldgen.output.scene import Indices, Points, Scene, SceneBody, read_scene, write_scene

MOST_CLOSE = 8
"""So many pieces of a component get a close-up (our choice: more than a reader looks at; the table lists all)."""

LARGE = 0.02
"""A piece with less than this share of the largest one's volume gets no close-up (our choice)."""

FILLS = 0.7
"""A piece that reaches over more than this share of its component gets none either: the whole shows it."""

BESIDE, A_SHEET = 2, 6
"""Close-ups beside the view of the whole, and on each further sheet."""


class Facets(Protocol):
    """A triangle mesh, such as `Body.mesh`: vertices (n, 3) [mm], triangles (m, 3), and the face (m,) of each."""

    @property
    def vertices(self) -> Points:
        """Points (n, 3) [mm]."""

    @property
    def triangles(self) -> Indices:
        """Corners (m, 3) of each triangle, counter-clockwise seen from outside."""

    @property
    def face(self) -> Indices:
        """The face (m,) that each triangle belongs to; shading is smooth within a face."""


@dataclass(frozen=True)
class ComparePicture:
    """What is drawn of one component, in the mold frame of the new tool [mm].

    key : tells it from others of the same name, see `picture_key`
    component : its name in the new tool; facts : what changes, in a few words
    steel : the component as it is to be; pieces : role "cut" or "weld", name as in `piece_label`
    captions : for each piece its size in words; close : names of the pieces that get a close-up, the first first
    """

    key: str
    component: str
    facts: str
    steel: SceneBody
    pieces: tuple[SceneBody, ...]
    captions: Mapping[str, str]
    close: tuple[str, ...]

    def piece(self, label: str) -> SceneBody:
        """Return the piece of a name."""
        return next(p for p in self.pieces if p.name == label)

    @property
    def sheets(self) -> tuple[tuple[str, ...], ...]:
        """The close-ups on each sheet; the first sheet shows the whole component too."""
        further = self.close[BESIDE:]
        return (self.close[:BESIDE], *(further[k : k + A_SHEET] for k in range(0, len(further), A_SHEET)))


def compare_picture(change: ComponentChange, steel: Facets, pieces: Sequence[Facets]) -> ComparePicture:
    """Return the picture of one component.

    Parameters
    ----------
    change : the component; its pieces stand in the order of `pieces`
    steel : the component of the new tool, where it stands in the closed mold
    pieces : a mesh for each of `change.pieces`, in the mold frame of the new tool too; an empty one is left out

    Raises
    ------
    ValueError : not one mesh for each piece
    """
    meshes = {p: mesh for p, mesh in zip(change.pieces, pieces, strict=True) if len(mesh.triangles)}
    bodies = tuple(steel_body(piece_label(p), p.work.value, mesh) for p, mesh in meshes.items())
    captions = {piece_label(p): piece_size(p) for p in meshes}
    body = steel_body(change.new, change.role, steel)
    whole = _reach(body)
    close = _close([p for p, drawn in zip(meshes, bodies, strict=True) if _reach(drawn) < FILLS * whole])
    return ComparePicture(picture_key(change), change.new, steel_facts(change), body, bodies, captions, close)


def steel_body(name: str, role: str, mesh: Facets) -> SceneBody:
    """Return a mesh as a body of a scene, with the edges worth drawing."""
    body = SceneBody(name, role, mesh.vertices, mesh.triangles, (), mesh.face)
    points, welded = body.welded  # a mesh boolean may repeat vertices; edges are found where triangles share them
    triangles = welded[mesh.triangles]
    edges = sharp_edges(points, triangles, mesh.face)
    return SceneBody(name, role, points, triangles, edges, mesh.face)


def _reach(body: SceneBody) -> float:
    """Return the diagonal of a body's box [mm]."""
    return float(np.linalg.norm(np.ptp(body.vertices, axis=0)))


def _close(pieces: Sequence[SteelPiece]) -> tuple[str, ...]:
    """Return the pieces that get a close-up: the largest to weld, the largest to cut, then by volume."""
    # equal pieces on both sides of a part differ by the noise of the kernel: six digits, so that it does not sort them
    order = sorted(pieces, key=lambda p: (-float(f"{p.volume_mm3:.6g}"), p.work.value, p.number))
    first = [next((p for p in order if p.work is work), None) for work in (Work.WELD, Work.CUT)]
    lead = [p for p in first if p is not None]
    least = LARGE * max((p.volume_mm3 for p in pieces), default=0.0)
    rest = [p for p in order if p not in lead and p.volume_mm3 >= least]
    return tuple(piece_label(p) for p in [*lead, *rest][:MOST_CLOSE])


def write_pictures(pictures: Sequence[ComparePicture], path: Path) -> None:
    """Write `pictures` for the painter: the words to `path` (JSON), the meshes beside it."""
    words = []
    for number, picture in enumerate(pictures):
        write_scene(Scene(picture.component, "", "", (picture.steel, *picture.pieces)), path.parent / f"{number}.npz")
        captions, close = dict(picture.captions), list(picture.close)
        words.append({"key": picture.key, "facts": picture.facts, "captions": captions, "close": close})
    path.write_text(json.dumps(words), encoding="utf-8")


def read_pictures(path: Path) -> tuple[ComparePicture, ...]:
    """Return what `write_pictures` wrote.

    Raises
    ------
    OSError, ValueError, KeyError : `path` is not such a file
    """
    found = []
    for number, words in enumerate(json.loads(path.read_text(encoding="utf-8"))):
        scene = read_scene(path.parent / f"{number}.npz")
        steel, *pieces = scene.bodies
        key, facts, captions, close = (words[name] for name in ("key", "facts", "captions", "close"))
        found.append(ComparePicture(key, scene.name, facts, steel, tuple(pieces), captions, tuple(close)))
    return tuple(found)
