"""Silhouettes and isoclines against analytic curves: every point has the slope asked for, and lies where it must."""

import math

import numpy as np
import pytest
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve
from OCP.BRepAlgoAPI import BRepAlgoAPI_Common
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakeFace, BRepBuilderAPI_NurbsConvert
from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakePrism,
    BRepPrimAPI_MakeRevol,
    BRepPrimAPI_MakeSphere,
    BRepPrimAPI_MakeTorus,
)
from OCP.GCPnts import GCPnts_AbscissaPoint
from OCP.GeomAPI import GeomAPI_Interpolate
from OCP.gp import gp_Ax1, gp_Ax2, gp_Dir, gp_Pnt, gp_Vec
from OCP.ShapeAnalysis import ShapeAnalysis_Surface
from OCP.TColgp import TColgp_HArray1OfPnt

from moldgen.kernel.silhouette import silhouette_edges
from moldgen.kernel.slope import Slope
from moldgen.kernel.topology import edge_points, faces_of

from .shapes import box, cut, tilted

EXACT = 1e-9


def face_of(solid, kind):
    return next(f for f in faces_of(solid) if Slope(f).surface.GetType().name == f"GeomAbs_{kind}")


def slopes(face, edges, count=23):
    """Return n.d at points along the edges, through the nearest parameters on the surface."""
    slope, surface = Slope(face), ShapeAnalysis_Surface(BRep_Tool.Surface_s(face))
    places = [surface.ValueOfUV(gp_Pnt(*p), 1e-9) for e in edges for p in edge_points(e, count)]
    return np.array([slope(q.X(), q.Y()) for q in places])


def length(edges):
    return sum(GCPnts_AbscissaPoint.Length_s(BRepAdaptor_Curve(e)) for e in edges)


def spline(points):
    array = TColgp_HArray1OfPnt(1, len(points))
    for i, p in enumerate(points, start=1):
        array.SetValue(i, gp_Pnt(*p))
    through = GeomAPI_Interpolate(array, False, 1e-9)
    through.Perform()
    return BRepBuilderAPI_MakeEdge(through.Curve()).Edge()


UP = gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1))
LYING = gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0))
SLANT = gp_Ax2(gp_Pnt(4, -1, 2), gp_Dir(0.3, 0.4, 0.5))


@pytest.mark.parametrize("axes", [LYING, SLANT], ids=["lying", "slant"])
@pytest.mark.parametrize("sine", [0.0, 0.1])
def test_cylinder_has_two_rulings(axes, sine):
    face = face_of(BRepPrimAPI_MakeCylinder(axes, 5, 30).Solid(), "Cylinder")
    edges = silhouette_edges(face, sine)
    assert len(edges) == 2
    assert length(edges) == pytest.approx(60.0, abs=1e-6)
    assert np.abs(slopes(face, edges) - sine).max() < EXACT
    assert all(BRepAdaptor_Curve(e).GetType().name == "GeomAbs_Line" for e in edges)


def test_upright_cylinder_and_plane_have_none():
    solid = BRepPrimAPI_MakeCylinder(UP, 5, 30).Solid()
    assert all(silhouette_edges(f) == [] for f in faces_of(solid))


def test_bore_has_its_isocline_on_the_other_side():
    # the normal of a bore points to its axis, so n.d = 0.1 lies below the axis
    block = cut(box((0, -10, -10), (30, 10, 10)), BRepPrimAPI_MakeCylinder(LYING, 5, 30).Solid())
    face = face_of(block, "Cylinder")
    edges = silhouette_edges(face, 0.1)
    assert len(edges) == 2
    assert [edge_points(e, 2)[0, 2] for e in edges] == pytest.approx([-0.5, -0.5], abs=1e-9)


@pytest.mark.parametrize("lean", [90.0, 70.0])
@pytest.mark.parametrize("sine", [0.0, -0.05])
def test_cone_has_two_rulings(lean, sine):
    cone = tilted(BRepPrimAPI_MakeCone(UP, 6, 2, 12).Solid(), lean, (1, 0, 0))
    face = face_of(cone, "Cone")
    edges = silhouette_edges(face, sine)
    assert len(edges) == 2
    assert length(edges) == pytest.approx(2 * math.hypot(12, 4), abs=1e-6)
    assert np.abs(slopes(face, edges) - sine).max() < EXACT


def test_cone_steeper_than_its_lean_has_none():
    cone = tilted(BRepPrimAPI_MakeCone(UP, 6, 2, 12).Solid(), 10.0, (1, 0, 0))
    assert silhouette_edges(face_of(cone, "Cone")) == []


def test_pointed_cone_keeps_its_rulings():
    cone = tilted(BRepPrimAPI_MakeCone(UP, 5, 0, 10).Solid(), 90.0, (1, 0, 0))
    edges = silhouette_edges(face_of(cone, "Cone"))
    assert length(edges) == pytest.approx(2 * math.hypot(10, 5), rel=1e-3)


@pytest.mark.parametrize("sine", [0.0, 0.3, -0.3])
def test_sphere_has_one_circle(sine):
    face = face_of(tilted(BRepPrimAPI_MakeSphere(8).Solid(), 50.0), "Sphere")
    edges = silhouette_edges(face, sine)
    assert length(edges) == pytest.approx(2 * math.pi * 8 * math.sqrt(1 - sine**2), rel=1e-6)
    assert np.abs(slopes(face, edges) - sine).max() < EXACT


@pytest.mark.parametrize("sine", [0.0, 0.2])
def test_upright_torus_has_inner_and_outer_circle(sine):
    face = face_of(BRepPrimAPI_MakeTorus(UP, 20, 5).Solid(), "Torus")
    edges = silhouette_edges(face, sine)
    reach = 5 * math.sqrt(1 - sine**2)
    assert length(edges) == pytest.approx(2 * math.pi * (20 + reach + 20 - reach), rel=1e-6)
    assert np.abs(slopes(face, edges) - sine).max() < EXACT


def test_torus_on_edge_has_top_and_bottom_circles_and_two_sections():
    face = face_of(BRepPrimAPI_MakeTorus(LYING, 20, 5).Solid(), "Torus")
    edges = silhouette_edges(face)
    assert np.abs(slopes(face, edges)).max() < EXACT
    assert length(edges) == pytest.approx(2 * 2 * math.pi * 20 + 2 * 2 * math.pi * 5, rel=1e-6)


def test_tilted_torus_follows_the_analytic_curve():
    # n.d = 0 on a torus with axis a: tan v = -(e_r(u).z) / a.z, a curve that never meets itself
    face = face_of(tilted(BRepPrimAPI_MakeTorus(UP, 20, 5).Solid(), 35.0, (1, 0, 0)), "Torus")
    edges = silhouette_edges(face)
    position = Slope(face).surface.Torus().Position()
    a, b, c = position.XDirection().Z(), position.YDirection().Z(), position.Direction().Z()
    worst = 0.0
    for edge in edges:
        for point in edge_points(edge, 40):
            q = ShapeAnalysis_Surface(BRep_Tool.Surface_s(face)).ValueOfUV(gp_Pnt(*point), 1e-9)
            along = a * math.cos(q.X()) + b * math.sin(q.X())
            exact = math.atan2(-along, c)
            gap = (q.Y() - exact + math.pi / 2) % math.pi - math.pi / 2
            worst = max(worst, abs(gap) * 5)
    assert worst < 1e-3
    u = np.linspace(0, 2 * math.pi, 20001)
    v = np.arctan2(-(a * np.cos(u) + b * np.sin(u)), c)
    exact_length = 0.0
    for w in (v, v + math.pi):
        ring = 20 + 5 * np.cos(w)
        local = np.stack([ring * np.cos(u), ring * np.sin(u), 5 * np.sin(w)], axis=1)
        exact_length += np.linalg.norm(np.diff(local, axis=0), axis=1).sum()
    assert length(edges) == pytest.approx(exact_length, rel=1e-4)


def test_extrusion_of_a_wave_has_a_ruling_at_each_turn():
    x = np.linspace(0, 30, 40)
    wave = spline([(0, t, 3 * math.sin(t / 2)) for t in x])
    face = faces_of(BRepPrimAPI_MakePrism(wave, gp_Vec(12, 0, 0)).Shape())[0]
    (upright,) = faces_of(tilted(face, 90.0, (1, 0, 0)))  # the wave runs along the pull: each crest is a silhouette
    edges = silhouette_edges(upright)
    assert len(edges) == 5  # crests at pi, 3 pi, ... 9 pi, the last below 30
    assert np.abs(slopes(upright, edges)).max() < EXACT
    assert length(edges) == pytest.approx(5 * 12, abs=1e-4)


def test_revolution_about_the_pull_has_level_circles():
    profile = spline([(10 + 2 * math.sin(t), 0, 2 * t) for t in np.linspace(0.2, 6.0, 30)])
    face = faces_of(BRepPrimAPI_MakeRevol(profile, gp_Ax1(gp_Pnt(0, 0, 0), gp_Dir(0, 0, 1))).Shape())[0]
    edges = silhouette_edges(face)
    assert np.abs(slopes(face, edges)).max() < EXACT
    # the radius is greatest at t = pi / 2 and least at 3 pi / 2
    assert length(edges) == pytest.approx(2 * math.pi * (12 + 8), rel=1e-3)
    assert all(np.ptp(edge_points(e, 9)[:, 2]) < 1e-9 for e in edges)


def test_spline_sphere_has_the_same_circle_as_the_sphere():
    solid = tilted(BRepBuilderAPI_NurbsConvert(BRepPrimAPI_MakeSphere(8).Solid()).Shape(), 50.0)
    (face,) = faces_of(solid)
    edges = silhouette_edges(face)
    assert np.abs(slopes(face, edges)).max() < 1e-4
    assert length(edges) == pytest.approx(16 * math.pi, rel=1e-4)


def test_curve_reaches_a_trimmed_boundary():
    # a round patch of a spline cylinder: the silhouette runs from rim to rim although the mesh stops inside
    lying = BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(0, 0, 0), gp_Dir(1, 0, 0), gp_Dir(0, -1, 1)), 5, 30).Solid()
    drill = BRepPrimAPI_MakeCylinder(gp_Ax2(gp_Pnt(15, 0, 0), gp_Dir(0, 1, 0)), 3, 20).Solid()
    both = BRepAlgoAPI_Common(BRepBuilderAPI_NurbsConvert(lying).Shape(), drill).Shape()
    lens = face_of(both, "BSplineSurface")
    edges = silhouette_edges(lens)
    assert length(edges) == pytest.approx(6.0, abs=1e-3)
    assert np.abs(slopes(lens, edges)).max() < 1e-6


def test_pieces_outside_the_face_are_left_out():
    # half a lying cylinder, its lower side: only the rims where it was cut are level, no silhouette lies inside
    half = cut(BRepPrimAPI_MakeCylinder(LYING, 5, 30).Solid(), box((-1, -6, -1), (31, 6, 6)))
    assert silhouette_edges(face_of(half, "Cylinder")) == []


def test_flat_face_made_by_hand_has_none():
    plane = Slope(faces_of(box((0, 0, 0), (1, 1, 1)))[0]).surface.Plane()
    assert silhouette_edges(BRepBuilderAPI_MakeFace(plane, 0, 1, 0, 1).Face()) == []
