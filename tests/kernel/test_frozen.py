"""Objects with kernel shapes survive freezing: what they share, how they are held, and every figure."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from helpers.solids import box, cut
from OCP.TopoDS import TopoDS_Edge, TopoDS_Face, TopoDS_Solid

from moldgen.kernel.body import Body
from moldgen.kernel.frozen import freeze, thaw
from moldgen.kernel.measure import volume
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.topology import edges_of, faces_of, only_solid


@dataclass(frozen=True)
class Pair:
    """Something with shapes in it."""

    solid: Any
    others: tuple[Any, ...]
    figure: np.ndarray


SOLID = only_solid(cut(box((0, 0, 0), (10, 20, 30)), box((2, 2, 2), (8, 18, 31))))


def test_shapes_keep_what_they_share_and_how_they_are_held() -> None:
    face, edge = faces_of(SOLID)[0], edges_of(SOLID)[0]
    kept = thaw(freeze(Pair(SOLID, (face, edge, face.Reversed()), np.arange(3.0))))
    assert isinstance(kept.solid, TopoDS_Solid)
    assert isinstance(kept.others[0], TopoDS_Face)
    assert isinstance(kept.others[1], TopoDS_Edge)
    assert faces_of(kept.solid)[0].IsSame(kept.others[0])
    assert edges_of(kept.solid)[0].IsSame(kept.others[1])
    assert kept.others[2].Orientation() != kept.others[0].Orientation()
    assert kept.figure.tolist() == [0.0, 1.0, 2.0]
    assert volume(kept.solid) == pytest.approx(10 * 20 * 30 - 6 * 16 * 28, rel=1e-12)


def test_a_body_keeps_its_mesh_and_its_numbers() -> None:
    body = Body(SOLID)
    mesh = body.mesh
    kept = thaw(freeze(body))
    assert kept.__dict__["mesh"].vertices.tolist() == mesh.vertices.tolist()
    assert [kept.surface_kind(i) for i in range(len(kept.faces))] == ["plane"] * len(body.faces)
    assert kept.edge_faces.tolist() == body.edge_faces.tolist()
    assert thaw(freeze(Body(SOLID))).__dict__.get("mesh") is None


def test_frozen_again_it_is_the_same() -> None:
    once = thaw(freeze(Body(SOLID)))
    assert freeze(once) == freeze(thaw(freeze(once)))


def test_what_cannot_be_kept_is_refused() -> None:
    with pytest.raises(TypeError):
        freeze((1, mesh_solid(Body(SOLID).mesh)))
