"""After imprinting no face looks both ways, and the body is the same body."""

import math

import numpy as np
import pytest
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCylinder, BRepPrimAPI_MakeSphere, BRepPrimAPI_MakeTorus
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt

from moldgen.kernel.body import Body
from moldgen.kernel.measure import is_valid, volume
from moldgen.release.imprint import imprint_silhouettes
from moldgen.release.kinds import Kind, face_kinds
from moldgen.release.trapped import trapped_volume

from .shapes import box, cut, cylinder, fuse, mirrored, tilted, turned

LYING = gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0))


def imprinted(solid):
    body = Body(solid)
    return imprint_silhouettes(body, face_kinds(body))


SOLIDS = {
    "rod": (BRepPrimAPI_MakeCylinder(LYING, 5, 40).Solid(), math.pi * 25 * 40),
    "ball": (BRepPrimAPI_MakeSphere(7).Solid(), 4 / 3 * math.pi * 343),
    "ring": (BRepPrimAPI_MakeTorus(LYING, 20, 5).Solid(), 2 * math.pi**2 * 20 * 25),
    "leaning ring": (tilted(BRepPrimAPI_MakeTorus(20, 5).Solid(), 30.0), 2 * math.pi**2 * 20 * 25),
    "bored block": (
        cut(box((0, -10, -10), (30, 10, 10)), BRepPrimAPI_MakeCylinder(LYING, 4, 30).Solid()),
        30 * 400 - math.pi * 16 * 30,
    ),
}


@pytest.mark.parametrize("name", SOLIDS)
@pytest.mark.parametrize(
    "move", [lambda s: s, lambda s: turned(s, 33.0), mirrored], ids=["as is", "turned", "mirrored"]
)
def test_no_face_looks_both_ways_and_the_volume_stays(name, move):
    solid, exact = SOLIDS[name]
    body, notes = imprinted(move(solid))
    kinds = face_kinds(body)
    assert len(kinds.numbers(Kind.STRADDLING)) == 0
    assert notes.findings == ()
    assert is_valid(body.solid)
    assert volume(body.solid) == pytest.approx(exact, rel=1e-5)


def test_halves_of_a_rod_share_its_surface():
    body, _ = imprinted(SOLIDS["rod"][0])
    kinds = face_kinds(body)
    up, down = (body.face_areas[kinds.kind == k].sum() for k in (Kind.UPPER, Kind.LOWER))
    assert up == pytest.approx(down, rel=1e-6)
    assert up == pytest.approx(math.pi * 5 * 40, rel=1e-2)


def test_faces_without_silhouette_are_kept_as_they_are():
    solid = fuse(box((0, 0, 0), (20, 20, 2)), cylinder(4, 1, 9))
    body = Body(solid)
    same, notes = imprint_silhouettes(body, face_kinds(body))
    assert same is body
    assert notes.decisions == ()


def test_untouched_faces_survive_a_split():
    solid = fuse(box((-20, -20, -9), (60, 20, -4)), BRepPrimAPI_MakeCylinder(LYING, 5, 30).Solid())
    before = Body(solid)
    after, notes = imprint_silhouettes(before, face_kinds(before))
    kept = [f for f in before.faces if after.face_index.FindIndex(f) > 0]
    assert len(after.faces) > len(before.faces)
    assert len(kept) >= 1
    assert "faces split" in notes.decisions[0].choice


def test_trapped_volume_is_the_same_before_and_after():
    solid = fuse(box((-20, -20, -9), (60, 20, -7)), BRepPrimAPI_MakeCylinder(LYING, 8, 30).Solid())
    before = Body(solid)
    after, _ = imprint_silhouettes(before, face_kinds(before))
    one, two = (trapped_volume(b, face_kinds(b)) for b in (before, after))
    # under a rod of radius 8 whose lowest 1 mm is sunk into the plate: two wedges between rod and plate
    half = math.sqrt(64 - 49)
    under_rod = 0.25 * math.pi * 64 - 0.5 * 64 * math.asin(half / 8) - 0.5 * 7 * half
    outside = (8 - half) * 7 - under_rod
    for result in (one, two):
        volumes = sorted(p.volume_mm3 for p in result.undercuts)
        assert volumes == pytest.approx([outside * 30] * 2, rel=0.01)
    assert np.allclose(sum(p.volume_mm3 for p in one.pieces), sum(p.volume_mm3 for p in two.pieces), rtol=5e-3)
