"""Check values of the closed forms: independent numbers (finite differences, quadrature, pocket calculator)."""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest

from moldgen.rules.cavity_floor import cavity_floor_rectangular
from moldgen.rules.cavity_wall import (
    cavity_side_wall,
    cavity_side_wall_beam,
    cavity_side_wall_cantilever,
    round_cavity_growth_lame,
    round_cavity_hoop_stress_lame,
)
from moldgen.rules.clamp import clamp_force_simple, platen_pressure
from moldgen.rules.cooling_time import (
    cooling_time_cylinder_center,
    cooling_time_cylinder_mean,
    cooling_time_plate_center,
    cooling_time_plate_mean,
)
from moldgen.rules.core_pin import (
    core_pin_deflection_cantilever,
    core_pin_deflection_fixed,
    core_pin_deflection_propped,
    core_pin_deflection_simple,
    core_pin_stress_cantilever,
)
from moldgen.rules.draft import draft_offset, draft_required, roughness_vdi3400, shut_off_height
from moldgen.rules.ejection import (
    draft_factor_menges,
    ejection_force_box_menges,
    ejection_force_cup_menges,
    ejection_force_sleeve_menges,
    vacuum_force,
)
from moldgen.rules.filling import (
    round_shear_rate,
    slot_pressure_drop_power_law,
    slot_shear_rate,
    tube_diameter_kazmer,
    tube_pressure_drop_power_law,
)
from moldgen.rules.gate import pin_gate_diameter_pye, round_gate_diameter_min
from moldgen.rules.pins import euler_buckling_force
from moldgen.rules.pushing import pin_push_pressure, punch_shear_stress
from moldgen.rules.runner import runner_branch_diameter, runner_diameter_pye
from moldgen.rules.shrink import mold_dimension_first_order, mold_dimension_iso294_4, shrinkage_iso294_4, thermal_growth
from moldgen.rules.side_action import (
    angled_pin_delay_pye,
    angled_pin_length_pye,
    angled_pin_opening_pye,
    lifter_travel_angled_face_pye,
    lifter_travel_pye,
)
from moldgen.rules.slide import (
    angled_pin_bending_stress,
    locking_axial_force,
    locking_face_angle,
    locking_normal_force,
    self_locking_angle,
    slide_guided_length,
    slide_melt_force_kazmer,
    slide_travel_practice,
)

ABS = (0.085, 235.0, 60.0, 95.0)
FIT = (0.4, 1000.0, 0.006, 2.0, 40.0)

VALUES: list[tuple[str, float, float]] = [
    # what, ours, value to the digits that the check was written with
    ("shrink 1.8 %, exact", mold_dimension_iso294_4(100, 1.8), 101.8330),
    ("shrink 1.8 %, first order", mold_dimension_first_order(100, 1.8), 101.8000),
    ("shrink 0.5 %, exact", mold_dimension_iso294_4(100, 0.5), 100.5025),
    ("shrink 0.5 %, first order", mold_dimension_first_order(100, 0.5), 100.5000),
    ("shrink back from 60.00 and 59.64", shrinkage_iso294_4(60.0, 59.64), 0.600),
    ("steel 300 mm, 60 K", thermal_growth(300, 11.7e-6, 60), 0.211),
    ("texture 0.03, 1 + 1 deg", draft_required(1.0, 0.03, 1.0), 2.2),
    ("texture 0.03, 1.5 + 1.5 deg", draft_required(1.5, 0.03, 1.5), 3.3),
    ("taper 40 mm, 1 deg", draft_offset(40, 1.0), 0.698),
    ("taper 40 mm, 0.5 deg", draft_offset(40, 0.5), 0.349),
    ("shut-off 3 deg", shut_off_height(0.25, 3.0), 4.77),
    ("shut-off 5 deg", shut_off_height(0.25, 5.0), 2.86),
    ("shut-off 7 deg", shut_off_height(0.25, 7.0), 2.04),
    ("VDI 24", roughness_vdi3400(24), 1.58),
    ("VDI 36", roughness_vdi3400(36), 6.31),
    ("VDI 45", roughness_vdi3400(45), 17.8),
    ("ABS plate, center", cooling_time_plate_center(2.5, *ABS), 13.79),
    ("ABS plate, mean", cooling_time_plate_mean(2.5, *ABS), 10.43),
    ("PP plate, center", cooling_time_plate_center(2.0, 0.065, 230, 40, 90), 9.83),
    ("PP plate, mean", cooling_time_plate_mean(2.0, 0.065, 230, 40, 90), 7.01),
    ("PC plate, center", cooling_time_plate_center(3.0, 0.105, 300, 90, 130), 16.50),
    ("PC plate, mean", cooling_time_plate_mean(3.0, 0.105, 300, 90, 130), 12.58),
    ("ABS runner, center", cooling_time_cylinder_center(6.0, *ABS), 38.09),
    ("ABS runner, mean", cooling_time_cylinder_mean(6.0, *ABS), 22.72),
    ("ABS gate 1 mm freezes", cooling_time_plate_center(1.0, 0.085, 235, 60, 125), 1.47),
    ("ABS slot", slot_pressure_drop_power_law(20e3, 50, 2, 100, 3.93e4, 0.25), 23.13),
    ("ABS tube", tube_pressure_drop_power_law(20e3, 6, 60, 3.93e4, 0.25), 10.02),
    ("PP slot", slot_pressure_drop_power_law(20e3, 50, 2, 100, 4.35e3, 0.41), 7.04),
    ("PP tube", tube_pressure_drop_power_law(20e3, 6, 60, 4.35e3, 0.41), 3.27),
    ("ABS tube back", tube_diameter_kazmer(20e3, 10, 60, 3.93e4, 0.25) / 2, 3.003),
    ("slot 3 x 1, 10 cm^3/s", slot_shear_rate(10e3, 3, 1), 20000),
    ("round 1, 5 cm^3/s", round_shear_rate(5e3, 1), 50930),
    ("smallest round gate", round_gate_diameter_min(5e3, 50e3), 1.006),
    ("pin gate POM", pin_gate_diameter_pye(0.7, 1.5, 4900), 1.48),
    ("runner 20 g, 80 mm", runner_diameter_pye(20, 80), 3.6),
    ("branch 8 to 2", runner_branch_diameter(8, 2), 6.35),
    ("branch 6 to 2", runner_branch_diameter(6, 2), 4.76),
    ("clamp 200 cm^2", clamp_force_simple(35, 20000, 1.0) / 1000, 700),
    ("clamp 200 cm^2, margin", clamp_force_simple(35, 20000) / 1000, 770),
    ("platen 250 x 315", platen_pressure(1e6, 250, 315), 12.7),
    ("open sleeve", ejection_force_sleeve_menges(*FIT), 1206),
    ("closed cup", ejection_force_cup_menges(*FIT, 0.39), 1499),
    ("box", ejection_force_box_menges(*FIT), 1536),
    ("draft factor 0.5 deg", draft_factor_menges(0.4, 0.5), 0.975),
    ("draft factor 1 deg", draft_factor_menges(0.4, 1), 0.950),
    ("draft factor 2 deg", draft_factor_menges(0.4, 2), 0.900),
    ("draft factor 5 deg", draft_factor_menges(0.4, 5), 0.752),
    ("vacuum on 40", vacuum_force(math.pi / 4 * 1600), 127),
    ("face of 4 pins of 4", pin_push_pressure(1206, 4, 4), 24.0),
    ("punch of 4 pins of 4", punch_shear_stress(1206, 4, 4, 2), 12.0),
    ("pin 3 x 120, guided", euler_buckling_force(3, 120), 1112),
    ("pin 3 x 120, fixed", euler_buckling_force(3, 120, 200e3, 0.5), 2180),
    ("pin 3 x 120, free", euler_buckling_force(3, 120, 200e3, 1.0), 545),
    ("pin 4 x 120, guided", euler_buckling_force(4, 120), 3515),
    ("core pin 4 x 40, tip free", core_pin_deflection_cantilever(2, 4, 40), 0.970),
    ("core pin 4 x 40, outer half", core_pin_deflection_cantilever(2, 4, 40, start=20), 0.829),
    ("core pin 4 x 40, simple", core_pin_deflection_simple(2, 4, 40), 0.101),
    ("core pin 4 x 40, propped", core_pin_deflection_propped(2, 4, 40), 0.042),
    ("core pin 4 x 40, fixed", core_pin_deflection_fixed(2, 4, 40), 0.020),
    ("core pin 4 x 40, stress", core_pin_stress_cantilever(2, 4, 40), 1019),
    ("core pin 6 x 30", core_pin_deflection_cantilever(1, 6, 30, 200e3), 0.048),
    ("core pin 6 x 30, propped", core_pin_deflection_propped(1, 6, 30, 200e3), 0.0021),
    ("core pin 10 x 80", core_pin_deflection_cantilever(3, 10, 80), 1.49),
    ("wall, foot", cavity_side_wall_cantilever(50, 30, 35), 0.0067 + 0.0095),
    ("wall, corners", cavity_side_wall_beam(50, 100, 35), 0.0174 + 0.0265),
    ("wall", cavity_side_wall(50, 30, 100, 35), 0.016),
    ("round insert 25/50", round_cavity_growth_lame(60, 25, 50), 0.0140),
    ("round insert 25/40", round_cavity_growth_lame(60, 25, 40), 0.0184),
    ("round insert 25/50, hoop", round_cavity_hoop_stress_lame(60, 25, 50), 100),
    ("round insert 25/40, hoop", round_cavity_hoop_stress_lame(60, 25, 40), 137),
    ("floor 40 x 80", cavity_floor_rectangular(50, 40, 80, 40), 0.0011),
    ("angled pin 15, length", angled_pin_length_pye(12, 0.5, 15), 48.36),
    ("angled pin 18, length", angled_pin_length_pye(12, 0.5, 18), 40.53),
    ("angled pin 20, length", angled_pin_length_pye(12, 0.5, 20), 36.64),
    ("angled pin 25, length", angled_pin_length_pye(12, 0.5, 25), 29.70),
    ("angled pin 15, opening", angled_pin_opening_pye(12, 15), 44.78),
    ("angled pin 18, opening", angled_pin_opening_pye(12, 18), 36.93),
    ("angled pin 20, opening", angled_pin_opening_pye(12, 20), 32.97),
    ("angled pin 25, opening", angled_pin_opening_pye(12, 25), 25.73),
    ("angled pin 15, delay", angled_pin_delay_pye(0.5, 15), 1.93),
    ("angled pin 18, delay", angled_pin_delay_pye(0.5, 18), 1.62),
    ("angled pin 20, delay", angled_pin_delay_pye(0.5, 20), 1.46),
    ("angled pin 25, delay", angled_pin_delay_pye(0.5, 25), 1.18),
    ("angled pin 16 x 30, 500 N", angled_pin_bending_stress(500, 30, 16), 37),
    ("melt on a slide, kN", slide_melt_force_kazmer(40, 2000) / 1000, 80),
    ("locking face 20, opens the mold, kN", locking_axial_force(80e3, 20) / 1000, 29.1),
    ("locking face 22, square to it, kN", locking_normal_force(80e3, 22) / 1000, 86.3),
    ("locking face that holds by friction", self_locking_angle(0.15), 8.5),
    ("locking face for a pin of 20", locking_face_angle(20), 22),
    ("travel for an undercut of 9.5", slide_travel_practice(9.5), 12),
    ("guided length, 30 high", slide_guided_length(30, 12), 45),
    ("guided length, 20 high", slide_guided_length(20, 12), 36),
    ("lifter 60, 5", lifter_travel_pye(60, 5), 5.25),
    ("lifter 60, 8", lifter_travel_pye(60, 8), 8.43),
    ("lifter 60, 12", lifter_travel_pye(60, 12), 12.75),
    ("lifter 60, 10", lifter_travel_pye(60, 10), 10.58),
    ("lifter 60, 10, angled face", lifter_travel_angled_face_pye(60, 10), 10.26),
]


@pytest.mark.parametrize(("what", "ours", "value"), VALUES, ids=[case[0] for case in VALUES])
def test_check_value(what: str, ours: float, value: float) -> None:
    """Agreement to one unit of the last digit that the check value was written with (whole numbers: 0.6)."""
    digits = max(0, len(f"{value:.12g}".partition(".")[2]))
    assert ours == pytest.approx(value, abs=1.01 * 10.0**-digits if digits else 0.6, rel=1e-5), what


def _heat_after(time: float, shape: int, cells: int = 80) -> tuple[float, float]:
    """Return center and mean temperature of ABS after `time` by explicit finite volumes.

    `shape` 0 is a plate of 2.5 mm, 1 a cylinder of 6 mm. Nothing here comes from the series.
    """
    half, diffusivity, melt, mold = (1.25, 3.0)[shape], 0.085, 235.0, 60.0
    dr = half / cells
    faces = [(i * dr) ** shape for i in range(cells + 1)]
    volumes = [((i + 1) ** (shape + 1) - i ** (shape + 1)) * dr ** (shape + 1) / (shape + 1) for i in range(cells)]
    field = [melt] * cells
    steps = math.ceil(time / (0.4 * dr**2 / diffusivity))
    dt = time / steps
    for _ in range(steps):
        flux = [faces[i] * (field[i] - field[i - 1]) / dr if i else 0.0 for i in range(cells)]
        flux.append(faces[cells] * (mold - field[-1]) / (dr / 2))
        field = [t + diffusivity * dt * (flux[i + 1] - flux[i]) / volumes[i] for i, t in enumerate(field)]
    mean = sum(t * v for t, v in zip(field, volumes, strict=True)) / sum(volumes)
    return field[0], mean


@pytest.mark.parametrize(
    ("shape", "rule", "size", "index"),
    [
        (0, cooling_time_plate_center, 2.5, 0),
        (0, cooling_time_plate_mean, 2.5, 1),
        (1, cooling_time_cylinder_center, 6.0, 0),
        (1, cooling_time_cylinder_mean, 6.0, 1),
    ],
    ids=["plate center", "plate mean", "cylinder center", "cylinder mean"],
)
def test_cooling_time_against_finite_volumes(shape: int, rule: Callable[..., float], size: float, index: int) -> None:
    """After the rule's time the conduction equation, solved without the series, is at the ejection temperature 95."""
    assert _heat_after(rule(size, *ABS), shape)[index] == pytest.approx(95.0, abs=0.25)
