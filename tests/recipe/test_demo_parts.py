"""The demo parts: each builds one clean solid that leaves a straight-pull mold along +z."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from moldgen.kernel.body import Body
from moldgen.kernel.features import build_recipe
from moldgen.kernel.measure import is_valid
from moldgen.kernel.topology import solids_of
from moldgen.kernel.tracer import Tracer
from moldgen.spec.load import load_spec

SPECS = Path(__file__).resolve().parents[2] / "specs"
DEMOS = ("battery-tray", "mast-clip", "rain-funnel", "sensor-lid", "thumb-knob", "vane-hub")

ROUNDED_OVER = {"thumb-knob"}
"""Parts whose walls bulge across the pull: the slope goes through zero at the parting line."""


@pytest.fixture(scope="module", params=DEMOS)
def demo(request: pytest.FixtureRequest) -> tuple[str, Body]:
    recipe = load_spec(SPECS / request.param / "spec.yaml").spec.part.recipe
    assert recipe is not None
    return request.param, Body(build_recipe(recipe.resolve()), 0.02, 0.12)


def test_one_valid_solid_with_no_slivers(demo: tuple[str, Body]) -> None:
    _, body = demo
    assert len(solids_of(body.solid)) == 1
    assert is_valid(body.solid)
    assert len(body.faces) <= 180
    assert body.face_areas.min() > 0.3
    assert body.edge_lengths.min() > 0.25


def test_every_point_sees_up_or_down(demo: tuple[str, Body]) -> None:
    """No undercut: from 0.02 mm above each triangle a ray along +z or -z leaves the part."""
    _, body = demo
    mesh = body.mesh
    normals = np.cross(mesh.corners[:, 1] - mesh.corners[:, 0], mesh.corners[:, 2] - mesh.corners[:, 0])
    normals /= np.maximum(np.linalg.norm(normals, axis=1), 1e-12)[:, None]
    origins = mesh.corners.mean(axis=1) + 0.02 * normals
    tracer = Tracer(mesh)
    trapped = tracer.blocked(origins, (0, 0, 1)) & tracer.blocked(origins, (0, 0, -1))
    assert mesh.areas()[trapped].sum() < 0.01


def test_every_wall_has_at_least_one_degree_of_draft(demo: tuple[str, Body]) -> None:
    name, body = demo
    mesh = body.mesh
    slope = np.degrees(np.arcsin(np.abs(mesh.normals[:, 2]) / np.linalg.norm(mesh.normals, axis=1)))
    steep = slope < 0.98
    if name in ROUNDED_OVER:
        heights = mesh.corners[steep].mean(axis=1)[:, 2]
        middle = (mesh.vertices[:, 2].min() + mesh.vertices[:, 2].max()) / 2
        assert np.abs(heights - middle).max() < 1.0
    else:
        assert mesh.areas()[steep].sum() < 0.05
