"""Planes, cylinders, cones, spheres and tori written as splines are read as those, and nothing else is."""

from __future__ import annotations

import math

import numpy as np
import pytest
from OCP.BRep import BRep_Tool
from OCP.BRepBuilderAPI import BRepBuilderAPI_GTransform, BRepBuilderAPI_MakeFace, BRepBuilderAPI_NurbsConvert
from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakeSphere,
    BRepPrimAPI_MakeTorus,
)
from OCP.Geom import (
    Geom_BSplineSurface,
    Geom_Circle,
    Geom_CylindricalSurface,
    Geom_OffsetSurface,
    Geom_RectangularTrimmedSurface,
    Geom_SurfaceOfLinearExtrusion,
)
from OCP.GeomConvert import GeomConvert
from OCP.gp import gp_Ax2, gp_Ax3, gp_Dir, gp_GTrsf, gp_Mat, gp_Pnt, gp_XYZ

from moldgen.kernel.body import Body
from moldgen.kernel.elementary import is_elementary, parameters_of, points_at
from moldgen.kernel.heal import heal
from moldgen.kernel.heal_fit import elementary_fit
from moldgen.kernel.meshsolid import mesh_solid
from moldgen.kernel.step_read import read_step
from moldgen.kernel.topology import faces_of, only_solid
from moldgen.tolerances import SAME_SURFACE
from tests.kernel_io.test_step_read import block, write_raw

SOLIDS = {
    "block": (block, 6000.0),
    "cylinder": (lambda: BRepPrimAPI_MakeCylinder(5, 20).Solid(), 500 * math.pi),
    "half cylinder": (lambda: BRepPrimAPI_MakeCylinder(5, 20, math.pi).Solid(), 250 * math.pi),
    "cone with its tip": (lambda: BRepPrimAPI_MakeCone(5, 0, 12).Solid(), 100 * math.pi),
    "frustum": (lambda: BRepPrimAPI_MakeCone(6, 3, 12).Solid(), 252 * math.pi),
    "ball": (lambda: BRepPrimAPI_MakeSphere(6).Solid(), 288 * math.pi),
    "wedge of a ball": (lambda: BRepPrimAPI_MakeSphere(6, math.pi / 3).Solid(), 48 * math.pi),
    "cap of a ball": (lambda: BRepPrimAPI_MakeSphere(6, 0.0, math.pi / 2, 2 * math.pi).Solid(), 144 * math.pi),
    "ring": (lambda: BRepPrimAPI_MakeTorus(10, 3).Solid(), 180 * math.pi**2),
    "quarter of a ring": (lambda: BRepPrimAPI_MakeTorus(10, 3, math.pi / 2).Solid(), 45 * math.pi**2),
}


def splines(solid):
    """The same solid with every curve and surface as a rational spline: exact."""
    made = only_solid(BRepBuilderAPI_NurbsConvert(solid).Shape())
    assert not any(is_elementary(BRep_Tool.Surface_s(f)) for f in faces_of(made))
    return made


@pytest.mark.parametrize("name", SOLIDS)
def test_each_kind_of_surface_is_recognized_and_the_volume_is_the_closed_form(tmp_path, name):
    make, expected = SOLIDS[name]
    read = read_step(write_raw(splines(make()), tmp_path / "part.step"))
    assert all(is_elementary(BRep_Tool.Surface_s(f)) for f in faces_of(read.solid))
    assert read.volume_mm3 == pytest.approx(expected, rel=1e-9)
    assert [n.count for n in read.healed] == [len(faces_of(read.solid))]
    assert read.healed[0].what.startswith("splines written as the planes")
    assert read.healed[0].volume_change_mm3 == pytest.approx(0.0, abs=1e-6)
    assert mesh_solid(Body(read.solid, 0.01, 0.05).mesh).volume() == pytest.approx(expected, rel=5e-3)


def test_a_squeezed_cylinder_stays_what_it_is():
    squeeze = gp_GTrsf(gp_Mat(1.0, 0, 0, 0, 0.999, 0, 0, 0, 1.0), gp_XYZ(0, 0, 0))
    oval = BRepBuilderAPI_GTransform(BRepPrimAPI_MakeCylinder(5, 20).Solid(), squeeze, True).Shape()
    healed = heal(only_solid(oval))
    kinds = [is_elementary(BRep_Tool.Surface_s(f)) for f in faces_of(healed.solid)]
    assert sorted(kinds) == [False, True, True]  # 0.005 mm from round: only its ends are plain


def wavy(height: float):
    """A cylinder of radius 5 as a spline of which one pole is lifted."""
    surface = Geom_CylindricalSurface(gp_Ax3(), 5.0)
    spline = GeomConvert.SurfaceToBSplineSurface_s(Geom_RectangularTrimmedSurface(surface, 0.2, 1.4, 0.0, 20.0))
    assert isinstance(spline, Geom_BSplineSurface)
    spline.IncreaseDegree(3, 3)
    for part in np.linspace(0, 20, 6)[1:-1]:
        spline.InsertVKnot(float(part), 1, 1e-9)
    pole = spline.Pole(2, 4)
    spline.SetPole(2, 4, gp_Pnt(pole.X() + height, pole.Y() + height, pole.Z()))
    return BRepBuilderAPI_MakeFace(spline, 1e-7).Face()


@pytest.mark.parametrize(("height", "is_round"), [(0.0, True), (3e-5, True), (5e-4, False), (5e-3, False)])
def test_a_dent_beyond_the_tolerance_is_kept(height, is_round):
    assert (elementary_fit(wavy(height)) is not None) == is_round


def test_the_volume_effect_is_told_with_its_sign():
    small, large = elementary_fit(wavy(1e-5)), elementary_fit(wavy(3e-5))
    assert small is not None
    assert large is not None
    assert large.mean_off_mm == pytest.approx(3 * small.mean_off_mm, rel=1e-3)
    assert -SAME_SURFACE < large.mean_off_mm < 0.0  # the dent pointed outward: the cylinder lies inside it


@pytest.mark.parametrize("trimmed", [False, True])
def test_an_extruded_circle_is_a_cylinder(trimmed):
    circle = Geom_Circle(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1)), 5.0)
    extruded = Geom_SurfaceOfLinearExtrusion(circle, gp_Dir(0, 0, 1))
    if trimmed:
        extruded = Geom_RectangularTrimmedSurface(extruded, 0.4, 2.1, -1.0, 11.0)
    fit = elementary_fit(BRepBuilderAPI_MakeFace(extruded, 0.5, 2.0, 0.0, 10.0, 1e-7).Face())
    assert fit is not None
    assert isinstance(fit.surface, Geom_CylindricalSurface)


def test_an_offset_surface_is_left_alone():
    offset = Geom_OffsetSurface(BRep_Tool.Surface_s(wavy(0.0)), 1.0)
    assert elementary_fit(BRepBuilderAPI_MakeFace(offset, 1e-7).Face()) is None


@pytest.mark.parametrize("name", ["cylinder", "frustum", "ball", "ring"])
def test_parameters_and_points_belong_together(name):
    face = next(f for f in faces_of(SOLIDS[name][0]()))
    surface = BRep_Tool.Surface_s(face)
    uv = np.array([(0.3, 0.2), (1.0, 0.7), (2.5, 0.4)])
    expected = np.array([surface.Value(u, v).Coord() for u, v in uv.tolist()])
    assert points_at(surface, uv) == pytest.approx(expected)
    assert parameters_of(surface, expected) == pytest.approx(uv)
