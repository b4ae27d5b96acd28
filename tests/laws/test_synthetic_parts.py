"""Laws of release and of the halves, on thirty parts along random pulls.

    pytest tests/laws/test_synthetic_parts.py -m sweep

runs what is left out by default, where every fifth part is taken, and of its six pulls the first.
"""

from __future__ import annotations

import zlib
from functools import cache
from typing import Any, NamedTuple

import numpy as np
import pytest
from helpers import solids
from helpers.molding import Molded, block_mm3, mold, unproved
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.gp import gp_Trsf

from moldgen.kernel.body import Body
from moldgen.kernel.measure import volume_adaptive
from moldgen.model.proof import Verdict
from moldgen.release.frame import rotation_to_z
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import face_kinds
from moldgen.release.sweep import contested_sweeps, sweep_faces
from moldgen.release.trapped import trapped_volume
from moldgen.tolerances import BALANCE, MESH_DEFLECTION

from .synthetic import PARTS, STRAIGHT

PULLS = 6
FACTOR = 1.7
WITHOUT_EJECTORS = {"the ejectors move through their stroke": Verdict.NOT_RUN}

SAME_SHARE = 5e-5
"""Relative difference of halves under a motion: the skin that closes a hole in a curved wall is free to bulge, by some
0.05 mm on these parts. What one half gains the other loses: their sum is held against `BALANCE`."""


def some(names: Any, pulls: int = 1) -> list[Any]:
    """Every case, those beyond a quick choice marked as part of the sweep."""
    cases = []
    for place, name in enumerate(names):
        for number in range(pulls):
            quick = place % 5 == 0 and number == 0
            case = (name, number) if pulls > 1 else (name,)
            cases.append(pytest.param(*case, marks=() if quick else pytest.mark.sweep, id=" ".join(map(str, case))))
    return cases


@cache
def part(name: str) -> Any:
    return PARTS[name]()


def pull(name: str, number: int) -> np.ndarray:
    """One of six directions that are spread at random; the same for a part on every run."""
    direction = np.random.default_rng([zlib.crc32(name.encode()), number]).normal(size=3)
    return direction / np.linalg.norm(direction)


def turn(seed: int) -> np.ndarray:
    """A random rotation, (3, 3)."""
    q, r = np.linalg.qr(np.random.default_rng(seed).normal(size=(3, 3)))
    q = q * np.sign(np.diag(r))
    return q if np.linalg.det(q) > 0 else q @ np.diag([1.0, 1.0, -1.0])


def moved(solid: Any, matrix: np.ndarray) -> Any:
    """The solid under a rotation, a reflection or a uniform scaling."""
    move = gp_Trsf()
    scale = float(np.cbrt(np.linalg.det(matrix)))
    if scale < 0.0:  # the kernel takes a reflection as minus one times a rotation
        move.SetScale(solids.gp_Pnt(0, 0, 0), -1.0)
        return moved(BRepBuilderAPI_Transform(solid, move, True).Shape(), -matrix)
    if abs(scale - 1.0) > 1e-9:
        return moved(solids.grown(solid, scale), matrix / scale)
    rows = [value for row in matrix for value in (*map(float, row), 0.0)]
    move.SetValues(*rows)
    return BRepBuilderAPI_Transform(solid, move, True).Shape()


class Found(NamedTuple):
    """The trapped volume along a pull, in how many undercuts, and what the mesh leaves open of it [mm3].

    The mesh lies off curved faces by its sag, which does not scale with the part; and a face is upper, lower or
    vertical by a distance, which does not either. So the volume is known to the sag times the area that is touched.
    """

    mm3: float
    undercuts: int
    play: float


def trapped_mm3(solid: Any, direction: np.ndarray) -> Found:
    """What is trapped along a pull; sheets that are thinner than the noise of the mesh are left out."""
    stood = moved(solid, np.array(rotation_to_z(tuple(float(c) for c in direction))))
    body = Body(stood)
    body, _ = imprint_silhouettes(body, face_kinds(body))
    found = trapped_volume(body, face_kinds(body))
    touched = sum(p.area_mm2 for p in found.pieces)
    curved = any(body.surface_kind(f) != "plane" for f in range(len(body.faces)))
    play = MESH_DEFLECTION * touched if curved else 1e-6 * touched
    return Found(sum(p.volume_mm3 for p in found.pieces), len(found.undercuts), play + found.noise_mm3)


@cache
def trapped_here(name: str, number: int) -> Found:
    return trapped_mm3(part(name), pull(name, number))


def assert_alike(one: Found, other: Found, scale: float = 1.0) -> None:
    """The same volume within what the meshes leave open; `other` belongs to a part that much larger."""
    play = 1e-6 + one.play + other.play / scale**3
    assert other.mm3 / scale**3 == pytest.approx(one.mm3, rel=1e-6, abs=play)


def trapped_by_rays(solid: Any, direction: np.ndarray) -> float:
    """The same volume by an independent way: columns along the pull, between a face that looks up and one above it."""
    mesh = Body(moved(solid, np.array(rotation_to_z(tuple(float(c) for c in direction))))).mesh
    step = np.ptp(mesh.vertices[:, :2], axis=0) / 300
    low = mesh.vertices[:, :2].min(axis=0)
    ends = columns(mesh.corners, low + 0.5 * step + 1e-5, step)
    return float(step.prod()) * ends


def columns(corners: np.ndarray, low: np.ndarray, step: np.ndarray) -> float:
    """Sum over the lines of a grid of the lengths between where a line leaves the plastic and where it enters again."""
    edge1, edge2 = corners[:, 1, :2] - corners[:, 0, :2], corners[:, 2, :2] - corners[:, 0, :2]
    double = edge1[:, 0] * edge2[:, 1] - edge1[:, 1] * edge2[:, 0]
    first = np.ceil((corners[:, :, :2].min(axis=1) - low) / step).astype(int)
    last = np.floor((corners[:, :, :2].max(axis=1) - low) / step).astype(int)
    total, lowest, highest = 0.0, np.full((301, 301), np.inf), np.full((301, 301), -np.inf)
    for k in np.flatnonzero(np.abs(double) > 1e-12):
        i, j = (np.arange(max(first[k, a], 0), min(last[k, a], 300) + 1) for a in range(2))
        at = np.stack(np.meshgrid(i, j, indexing="ij"), axis=-1)
        offset = low + at * step - corners[k, 0, :2]
        u = (offset[..., 0] * edge2[k, 1] - offset[..., 1] * edge2[k, 0]) / double[k]
        v = (edge1[k, 0] * offset[..., 1] - edge1[k, 1] * offset[..., 0]) / double[k]
        inside = (u >= 0) & (v >= 0) & (u + v <= 1)
        z = corners[k, 0, 2] + u * (corners[k, 1, 2] - corners[k, 0, 2]) + v * (corners[k, 2, 2] - corners[k, 0, 2])
        place = (at[..., 0][inside], at[..., 1][inside])
        total -= np.sign(double[k]) * z[inside].sum()  # minus the plastic on the line
        np.minimum.at(lowest, place, z[inside])
        np.maximum.at(highest, place, z[inside])
    met = np.isfinite(lowest)
    return float((highest[met] - lowest[met]).sum() + total)


@pytest.mark.parametrize(("name", "number"), some(PARTS, PULLS))
def test_trapped_volume_is_what_lines_along_the_pull_enclose(name: str, number: int) -> None:
    """Law: trapped is what lies between two faces of the plastic along the pull, counted here on a grid of lines."""
    assert trapped_here(name, number).mm3 == pytest.approx(
        trapped_by_rays(part(name), pull(name, number)), rel=0.02, abs=2.0
    )


@pytest.mark.parametrize(("name", "number"), some(PARTS, PULLS))
def test_turning_part_and_pull_traps_the_same(name: str, number: int) -> None:
    matrix = turn(number)
    there = trapped_mm3(moved(part(name), matrix), matrix @ pull(name, number))
    assert_alike(trapped_here(name, number), there)


@pytest.mark.parametrize(("name", "number"), some(PARTS, PULLS))
def test_a_mirrored_part_traps_the_same(name: str, number: int) -> None:
    mirror = np.diag([-1.0, 1.0, 1.0])
    there = trapped_mm3(moved(part(name), mirror), mirror @ pull(name, number))
    assert_alike(trapped_here(name, number), there)


@pytest.mark.parametrize(("name", "number"), some(PARTS, PULLS))
def test_the_pull_turned_round_traps_the_same(name: str, number: int) -> None:
    there = trapped_mm3(part(name), -pull(name, number))
    assert_alike(trapped_here(name, number), there)


@pytest.mark.parametrize(("name", "number"), some(PARTS, PULLS))
def test_scaling_scales_the_trapped_volume(name: str, number: int) -> None:
    there = trapped_mm3(moved(part(name), FACTOR * np.eye(3)), pull(name, number))
    assert_alike(trapped_here(name, number), there, FACTOR)


def test_a_pull_whose_sheets_coincide_loses_nothing() -> None:
    """The mesh boolean once dropped 137 mm3 of this space, one way round only."""
    here, there = trapped_here("window 3", 1), trapped_mm3(part("window 3"), -pull("window 3", 1))
    assert there.mm3 == pytest.approx(here.mm3, rel=1e-6)


@pytest.mark.parametrize("number", [4, 5])
def test_a_patch_that_touches_itself_is_swept_whole(number: int) -> None:
    """What cannot matter is left out of the sweeps; what is left of a face may then touch itself at a corner."""
    solid = moved(part("window 3"), np.array(rotation_to_z(tuple(float(c) for c in pull("window 3", number)))))
    body = Body(solid)
    kinds = face_kinds(body)
    whole = sweep_faces(body, kinds, True) ^ sweep_faces(body, kinds, False)
    above, below = contested_sweeps(body, kinds)
    assert (above ^ below).volume() == pytest.approx(whole.volume(), rel=1e-9)


# --- halves ---------------------------------------------------------------------------------------------------------


@cache
def molded(name: str) -> Molded:
    return mold(part(name))


def halves(made: Molded) -> tuple[float, float]:
    return volume_adaptive(made.parted.cavity, 1e-8), volume_adaptive(made.parted.core, 1e-8)


@pytest.mark.parametrize("name", [n for n in PARTS if n not in STRAIGHT])
def test_the_others_do_trap_steel(name: str) -> None:
    assert trapped_mm3(part(name), np.array([0.0, 0.0, 1.0])).undercuts > 0


@pytest.mark.parametrize("name", some(STRAIGHT))
def test_halves_balance_and_open(name: str) -> None:
    made = molded(name)
    block = block_mm3(made.corners)
    assert abs(sum(halves(made)) + volume_adaptive(part(name), 1e-8) - block) / block < BALANCE
    left = unproved(made.bodies, made.claims)
    assert {name: p.verdict for name, p in left.items()} in ({}, WITHOUT_EJECTORS)


@pytest.mark.parametrize("name", some(STRAIGHT))
def test_a_part_turned_and_pulled_along_gives_the_same_halves(name: str) -> None:
    """Turned any way, then stood on its pull again: it may stand turned about the pull, in a block of another size."""
    matrix = turn(7)
    back = np.array(rotation_to_z(tuple(float(c) for c in matrix[:, 2])))
    there = mold(moved(moved(part(name), matrix), back))
    assert there.parted.level == pytest.approx(molded(name).parted.level, abs=1e-6)
    areas = [m.parted.body.face_areas[m.parted.sides.cavity].sum() for m in (molded(name), there)]
    assert areas[0] == pytest.approx(areas[1], rel=1e-3)
    block = block_mm3(there.corners)
    assert abs(sum(halves(there)) + volume_adaptive(part(name), 1e-8) - block) / block < BALANCE


@pytest.mark.parametrize("name", some(STRAIGHT))
def test_a_mirrored_part_gives_the_mirrored_halves(name: str) -> None:
    low, high = (corner.copy() for corner in molded(name).corners)
    low[0], high[0] = -high[0], -low[0]
    there = mold(moved(part(name), np.diag([-1.0, 1.0, 1.0])), corners=(low, high))
    assert halves(there) == pytest.approx(halves(molded(name)), rel=SAME_SHARE)
    assert sum(halves(there)) == pytest.approx(sum(halves(molded(name))), rel=BALANCE)


@pytest.mark.parametrize("name", some(STRAIGHT))
def test_a_scaled_part_gives_the_scaled_halves(name: str) -> None:
    low, high = molded(name).corners
    there = mold(moved(part(name), FACTOR * np.eye(3)), corners=(FACTOR * low, FACTOR * high))
    expected = tuple(FACTOR**3 * mm3 for mm3 in halves(molded(name)))
    assert halves(there) == pytest.approx(expected, rel=SAME_SHARE)
    assert sum(halves(there)) == pytest.approx(sum(expected), rel=BALANCE)
