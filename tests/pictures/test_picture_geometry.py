"""Sections and outlines of the pictures against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from helpers.mesh_bodies import box, cylinder

from moldgen.output.picture_frame import scale_length
from moldgen.output.picture_geometry import choose_cut, cut_mesh, hatch, is_hidden, look_from, outline, shade


def area_of(segments: np.ndarray, spacing: float = 0.01) -> float:
    lines = hatch(segments, spacing, 0.0, 0.5)
    return float(np.linalg.norm(lines[:, 1] - lines[:, 0], axis=1).sum() * spacing)


def test_cut_of_a_box_is_its_rectangle() -> None:
    segments = cut_mesh(box("b", "part", (0, 0, 0), (10, 6, 4)), 1, 2.0)[:, :, [0, 2]]
    assert np.linalg.norm(segments[:, 1] - segments[:, 0], axis=1).sum() == pytest.approx(2 * (10 + 4))
    assert area_of(segments) == pytest.approx(40.0, rel=1e-9)


def test_cut_beside_the_axis_of_a_cylinder_is_its_chord() -> None:
    segments = cut_mesh(cylinder("c", "core_pin", (0.0, 0.0), 5.0, (0.0, 20.0)), 0, 3.0)[:, :, [1, 2]]
    # chord 2 sqrt(25 - 9) = 8; the 48-gon lies inside the circle by at most 5 (1 - cos(pi/48)) = 0.011 mm
    assert area_of(segments) == pytest.approx(8.0 * 20.0, rel=4e-3)


def test_cut_along_a_flat_face_is_still_closed() -> None:
    segments = cut_mesh(box("b", "part", (0, 0, 0), (10, 6, 4)), 1, 0.0)[:, :, [0, 2]]
    assert area_of(segments) in (pytest.approx(0.0), pytest.approx(40.0))


def test_cut_that_misses_is_empty() -> None:
    assert len(cut_mesh(box("b", "part", (0, 0, 0), (10, 6, 4)), 1, 9.0)) == 0


@pytest.mark.parametrize("angle", [0.0, 0.3, np.pi / 4, np.pi / 2, 3 * np.pi / 4])
def test_hatch_leaves_holes_out_at_any_angle(angle: float) -> None:
    def ring(half: float) -> np.ndarray:
        p = np.array([[-half, -half], [half, -half], [half, half], [-half, half]], float)
        return np.stack([p, np.roll(p, -1, axis=0)], axis=1)

    spacing = 0.01
    lines = hatch(np.concatenate([ring(5.0), ring(2.0)]), spacing, angle, 0.5)
    middles = lines.mean(axis=1)
    assert (np.abs(middles).max(axis=1) >= 2.0 - 1e-9).all()
    length = np.linalg.norm(lines[:, 1] - lines[:, 0], axis=1).sum()
    assert length * spacing == pytest.approx(100.0 - 16.0, rel=2e-3)


def test_shading_keeps_box_edges_sharp_and_cylinder_walls_round() -> None:
    flat = shade(box("b", "part", (0, 0, 0), (1, 1, 1)))
    assert np.allclose(np.sort(np.abs(flat.normals), axis=1), [0.0, 0.0, 1.0])
    round_ = shade(cylinder("c", "core_pin", (0.0, 0.0), 5.0, (0.0, 20.0)))
    wall = round_.face_of_point == 0
    radial = round_.points[wall, :2] / 5.0
    assert np.allclose(round_.normals[wall, :2], radial, atol=2e-3)


def test_outline_of_a_cylinder_is_its_two_sides() -> None:
    segments = outline(cylinder("c", "core_pin", (0.0, 0.0), 5.0, (0.0, 20.0)), look_from((0.0, -1.0, 0.0)))
    assert len(segments) == 2
    assert np.allclose(np.abs(segments[:, :, 0]), 5.0, atol=0.05)
    assert len(outline(box("b", "part", (0, 0, 0), (1, 1, 1)), look_from((0.6, -0.8, 0.5)))) == 0


def test_point_is_hidden_only_behind_the_body() -> None:
    body = box("b", "part", (0, 0, 0), (10, 10, 10))
    above = look_from((0.0, -0.5, 1.0))
    assert is_hidden((5.0, 5.0, 0.0), [body], above)
    assert not is_hidden((5.0, 5.0, 10.0), [body], above)
    assert not is_hidden((50.0, 5.0, 0.0), [body], above)


def test_section_goes_through_gate_before_pins_before_middle() -> None:
    part = [
        box("p", "part", (-30, -20, 0), (30, 20, 8)),
    ]
    pin = cylinder("c", "core_pin", (10.0, 7.0), 2.0, (-20.0, 8.0))
    assert choose_cut(part, [], None).through == "the middle of the part"
    assert choose_cut(part, [pin], None).at in (pytest.approx(7.0), pytest.approx(10.0))
    cut = choose_cut(part, [pin], (30.0, 5.0, 4.0))
    assert (cut.axis, cut.at) == (1, 5.0)
    assert "the gate" in cut.through


@pytest.mark.parametrize("px_per_mm", [0.13, 0.9, 3.7, 20.0, 812.0])
def test_scale_bar_has_a_round_length_that_fits(px_per_mm: float) -> None:
    length = scale_length(px_per_mm)
    assert 70.0 <= length * px_per_mm <= 200.0 + 1e-6
    assert f"{length:e}"[0] in "125"
