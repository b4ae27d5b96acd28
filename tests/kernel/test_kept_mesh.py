"""The content of a solid as a hash, and meshes as bytes: what proofs remember answers by."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from helpers import solids

from moldgen.kernel.body import Body
from moldgen.kernel.kept_mesh import (
    bare,
    content_sha256,
    fine_mesh,
    mesh_from_bytes,
    mesh_to_bytes,
    place_of,
    placed_mesh,
)
from moldgen.kernel.mesh import SurfaceMesh, tessellate
from moldgen.kernel.place import moved

ARRAYS = ("vertices", "triangles", "face", "normals", "bulge")


def cup(radius: float = 10.0) -> Any:
    return solids.cut(solids.cone(radius, 8, 20), solids.cylinder(4, 30, at=(1, 0, 5)))


def same(one: SurfaceMesh, other: SurfaceMesh) -> bool:
    pairs = [(getattr(one, name), getattr(other, name)) for name in ARRAYS]
    return all(a.dtype == b.dtype and np.array_equal(a, b) for a, b in pairs)


def test_equal_solids_have_one_hash_wherever_they_stand() -> None:
    hashes = {content_sha256(s) for s in (cup(), cup(), moved(cup(), (3.0, 0.0, 1.0)))}
    assert len(hashes) == 1


@pytest.mark.parametrize(
    "other",
    [
        lambda: cup(10.0 + 1e-12),
        lambda: cup().Reversed(),
        lambda: solids.turned(cup(), 1e-7),
        lambda: solids.mirrored(cup()),
    ],
)
def test_the_least_difference_gives_another_hash(other: Any) -> None:
    assert content_sha256(other()) != content_sha256(cup())


def test_a_mesh_that_is_there_already_is_part_of_the_content() -> None:
    meshed = cup()
    tessellate(meshed, 0.5, 0.5)
    assert content_sha256(meshed) != content_sha256(cup())


def test_the_place_is_told_apart_from_the_content() -> None:
    shift = (1.5, -2.0, 1e-9)
    assert place_of(moved(cup(), shift)) == (1, 0, 0, 1.5, 0, 1, 0, -2.0, 0, 0, 1, 1e-9)
    assert place_of(cup()) == (1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0)


def test_a_mesh_survives_as_bytes_to_the_last_digit() -> None:
    mesh = fine_mesh(cup(), 0.02, 0.2)
    assert same(mesh_from_bytes(mesh_to_bytes(mesh)), mesh)
    assert mesh_to_bytes(mesh) == mesh_to_bytes(fine_mesh(cup(), 0.02, 0.2))


def test_a_mesh_put_in_its_place_is_the_mesh_read_there() -> None:
    """Not the mesh made there: flat faces are then triangulated otherwise, because other digits are rounded."""
    there = solids.turned(moved(cup(), (30.0, 5.0, -7.0)), 37.0)
    assert not there.Location().IsIdentity()
    placed = placed_mesh(fine_mesh(bare(there), 0.02, 0.2), there)
    made = Body(there, 0.02, 0.2).mesh
    assert np.array_equal(placed.triangles, made.triangles)
    assert np.abs(placed.vertices - made.vertices).max() < 1e-12
    assert np.abs(placed.normals - made.normals).max() < 1e-12
    assert np.abs(placed.bulge - made.bulge).max() < 1e-12
    assert placed_mesh(made, cup()) is made


def test_a_body_takes_a_mesh_that_was_made_before() -> None:
    mesh = fine_mesh(cup(), 0.02, 0.2)
    body = Body(cup(), 0.02, 0.2)
    body.take_mesh(mesh)
    assert body.mesh is mesh
    assert np.array_equal(body.box[1], mesh.vertices.max(axis=0))
