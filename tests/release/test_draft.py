"""Draft per face against the angle that the solid was built with."""

import math

import pytest
from OCP.BRepOffsetAPI import BRepOffsetAPI_DraftAngle
from OCP.BRepPrimAPI import BRepPrimAPI_MakeCone, BRepPrimAPI_MakeCylinder, BRepPrimAPI_MakeSphere
from OCP.gp import gp_Ax2, gp_Dir, gp_Pln, gp_Pnt

from moldgen.kernel.body import Body
from moldgen.kernel.topology import only_solid
from moldgen.release.contact import vertical_contact
from moldgen.release.draft import Half, draft_findings, draft_table
from moldgen.release.kinds import Kind, face_kinds

from .shapes import box, fuse, mirrored, turned

UP = gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1))


def table(solid, required, touched=True):
    body = Body(solid)
    kinds = face_kinds(body)
    return draft_table(body, kinds, required, vertical_contact(body, kinds) if touched else None)


def drafted_box(degrees):
    block = box((0, 0, 0), (30, 20, 10))
    body = Body(block)
    draft = BRepOffsetAPI_DraftAngle(block)
    for face in face_kinds(body).numbers(Kind.VERTICAL):
        base = gp_Pln(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1))
        draft.Add(body.faces[face], gp_Dir(0, 0, 1), math.radians(degrees), base)
    draft.Build()
    return only_solid(draft.Shape())


@pytest.mark.parametrize("degrees", [0.25, 1.0, 3.0])
@pytest.mark.parametrize(
    "move", [lambda s: s, lambda s: turned(s, 21.0), mirrored], ids=["as is", "turned", "mirrored"]
)
def test_drafted_planes_have_their_angle_to_a_millionth(degrees, move):
    rows = [r for r in table(move(drafted_box(degrees)), 2.0) if r.least_deg < 45]
    assert [r.least_deg for r in rows] == pytest.approx([degrees] * 4, abs=1e-6)
    assert [r.most_deg for r in rows] == pytest.approx([degrees] * 4, abs=1e-6)
    assert len(draft_findings(tuple(rows), 2.0)) == (4 if degrees < 2.0 else 0)


def test_required_angle_itself_is_enough():
    assert draft_findings(table(drafted_box(1.0), 1.0), 1.0) == ()


def test_cone_is_exact_although_its_mesh_is_not():
    rows = table(BRepPrimAPI_MakeCone(UP, 10, 9, 40).Solid(), 1.0)
    side = next(r for r in rows if r.surface == "cone")
    exact = math.degrees(math.atan2(1, 40))
    assert (side.least_deg, side.mean_deg, side.most_deg) == pytest.approx((exact, exact, exact), abs=1e-9)
    assert side.half is Half.CAVITY


def test_upright_cylinder_has_none_and_is_named():
    rows = table(BRepPrimAPI_MakeCylinder(UP, 10, 40).Solid(), 1.0)
    (finding,) = draft_findings(rows, 1.0)
    assert (finding.value, finding.limit, finding.unit) == (0.0, 1.0, "deg")
    x, y, z = finding.at
    assert math.hypot(x, y) == pytest.approx(10.0, abs=0.1)
    assert 0 < z < 40
    assert "cylinder" in finding.where


def test_roundings_are_not_walls():
    # a ball turns through every angle, also those below the minimum, but no wall of it is too steep
    rows = table(BRepPrimAPI_MakeSphere(10).Solid(), 2.0)
    assert rows[0].least_deg < 2.0
    assert rows[0].mean_deg > 30.0
    assert draft_findings(rows, 2.0) == ()


def test_contact_decides_the_half_of_vertical_walls():
    solid = fuse(box((0, 0, 0), (30, 30, 2)), box((10, 10, 1), (20, 20, 12)))
    rows = table(solid, 1.0)
    post = [r for r in rows if r.least_deg == 0.0 and r.at[2] > 3]
    rim = [r for r in rows if r.least_deg == 0.0 and r.at[2] < 2]
    assert {r.half for r in post} == {Half.CAVITY}
    assert {r.half for r in rim} == {Half.EITHER}
    assert {r.half for r in table(solid, 1.0, touched=False) if r.least_deg == 0.0} == {Half.EITHER}


def test_nothing_asked_nothing_found():
    assert draft_findings(table(box((0, 0, 0), (1, 2, 3)), 0.0), 0.0) == ()
