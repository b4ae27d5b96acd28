"""Laws that hold whatever the numbers: limits, symmetry, direction, and inverses."""

from __future__ import annotations

import math

import pytest

from moldgen.rules.cavity_floor import (
    cavity_floor_rectangular,
    cavity_floor_thickness_rectangular,
    plate_coefficient_levy,
)
from moldgen.rules.cavity_wall import (
    cavity_side_wall,
    cavity_side_wall_beam,
    cavity_side_wall_cantilever,
    cavity_side_wall_thickness,
    round_cavity_growth_lame,
)
from moldgen.rules.cooling_time import (
    cooling_time_cylinder_center,
    cooling_time_plate_center,
    cooling_time_plate_mean,
)
from moldgen.rules.core_pin import (
    core_pin_deflection_cantilever,
    core_pin_deflection_fixed,
    core_pin_deflection_propped,
    core_pin_deflection_simple,
)
from moldgen.rules.ejection import (
    contact_pressure_shrink_fit,
    draft_factor_menges,
    ejection_force_cup_menges,
    ejection_force_friction,
    ejection_force_sleeve_menges,
)
from moldgen.rules.filling import (
    round_rabinowitsch_factor,
    slot_pressure_drop_power_law,
    slot_rabinowitsch_factor,
    tube_diameter_kazmer,
    tube_pressure_drop_power_law,
)
from moldgen.rules.gate import edge_gate_width_min, round_gate_diameter_min
from moldgen.rules.pins import euler_buckling_force, euler_pin_diameter
from moldgen.rules.shrink import mold_dimension_iso294_4, shrink_factor_iso294_4, shrinkage_iso294_4
from moldgen.rules.side_action import angled_pin_length_pye
from reference.every_rule import all_rules, ordinary_input

RULES = all_rules()

RISES = {
    "mold_dimension_iso294_4": ("part", "shrink"),
    "cooling_time_plate_center": ("wall", "melt"),
    "ejection_force_sleeve_menges": ("friction", "modulus", "strain", "wall", "length"),
    "ejection_force_cup_menges": ("poisson", "length"),
    "draft_factor_menges": ("friction",),
    "vacuum_force": ("area",),
    "pin_push_pressure": ("force",),
    "euler_buckling_force": ("diameter", "modulus"),
    "core_pin_deflection_cantilever": ("pressure", "length", "bore"),
    "cavity_side_wall": ("pressure",),
    "cavity_side_wall_thickness": ("pressure",),
    "edge_gate_depth_pye": ("factor", "wall"),
    "pin_gate_diameter_pye": ("wall", "surface_area"),
    "clamp_force_simple": ("pressure", "projected_area", "margin"),
    "draft_required": ("minimum", "texture_depth", "slope"),
    "ejection_stroke_pye": ("depth",),
    "flow_length_limit": ("wall", "flow_ratio"),
}
FALLS = {
    "cooling_time_plate_center": ("diffusivity", "eject"),
    "ejection_force_sleeve_menges": ("draft",),
    "pin_push_pressure": ("pins", "diameter"),
    "punch_shear_stress": ("pins", "diameter", "wall"),
    "euler_buckling_force": ("length", "end_factor"),
    "core_pin_deflection_cantilever": ("modulus", "start"),
    "cavity_side_wall": ("thickness", "modulus"),
    "cavity_side_wall_thickness": ("limit",),
    "round_cavity_growth_lame": ("outer", "modulus"),
    "round_shear_rate": ("diameter",),
    "slot_shear_rate": ("width", "depth"),
}


def pairs(table: dict[str, tuple[str, ...]]) -> list[tuple[str, str]]:
    return [(name, argument) for name, arguments in table.items() for argument in arguments]


@pytest.mark.parametrize(("name", "argument"), pairs(RISES))
def test_rises(name: str, argument: str) -> None:
    rule, given = RULES[name], ordinary_input(RULES[name])
    assert rule(**{**given, argument: given[argument] * 1.1}) > rule(**given)


@pytest.mark.parametrize(("name", "argument"), pairs(FALLS))
def test_falls(name: str, argument: str) -> None:
    rule, given = RULES[name], ordinary_input(RULES[name])
    more = given[argument] + 1 if argument == "pins" else given[argument] * 1.1
    assert rule(**{**given, argument: more}) < rule(**given)


@pytest.mark.parametrize("shrink", [0.0, 0.3, 2.0, 60.0])
def test_shrink_there_and_back(shrink: float) -> None:
    """S of ISO 294-4 is recovered from the two dimensions; no shrinkage is factor one."""
    assert shrinkage_iso294_4(mold_dimension_iso294_4(80.0, shrink), 80.0) == pytest.approx(shrink, abs=1e-12)
    assert shrink_factor_iso294_4(0.0) == 1.0


def test_shrink_of_a_hundred_percent_is_impossible() -> None:
    with pytest.raises(ValueError, match="shrink must be below 100 %"):
        mold_dimension_iso294_4(10.0, 100.0)


def test_anisotropic_shrink_of_a_filled_resin() -> None:
    """0.4, 1.1 and 1.1 % give a volume factor of 1.0265."""
    factors = [shrink_factor_iso294_4(s) for s in (0.4, 1.1, 1.1)]
    assert math.prod(factors) == pytest.approx(1.0265, abs=5e-5)


def test_newtonian_limits_of_the_power_law() -> None:
    """At index 1: 12 eta L Q / (W H^3) in a slot, 8 eta L Q / (pi R^4) in a tube, and no Rabinowitsch correction."""
    flow, eta, length = 20e3, 200.0, 100.0
    slot = slot_pressure_drop_power_law(flow, 50.0, 2.0, length, eta, 1.0)
    tube = tube_pressure_drop_power_law(flow, 6.0, length, eta, 1.0)
    assert slot == pytest.approx(1e-6 * 12 * eta * length * flow / (50.0 * 2.0**3), rel=1e-12)
    assert tube == pytest.approx(1e-6 * 8 * eta * length * flow / (math.pi * 3.0**4), rel=1e-12)
    assert slot_rabinowitsch_factor(1.0) == round_rabinowitsch_factor(1.0) == 1.0


@pytest.mark.parametrize("index", [0.2, 0.5, 1.0])
def test_tube_diameter_inverts_the_pressure_drop(index: float) -> None:
    drop = tube_pressure_drop_power_law(2e4, 4.5, 70.0, 4e3, index)
    assert tube_diameter_kazmer(2e4, drop, 70.0, 4e3, index) == pytest.approx(4.5, rel=1e-12)


def test_gate_sizes_just_keep_the_shear_limit() -> None:
    diameter = round_gate_diameter_min(7e3, 4e4)
    width = edge_gate_width_min(7e3, 0.8, 4e4)
    assert RULES["round_shear_rate"](7e3, diameter) == pytest.approx(4e4, rel=1e-12)
    assert RULES["slot_shear_rate"](7e3, width, 0.8) == pytest.approx(4e4, rel=1e-12)


def test_a_runner_of_144_percent_of_the_wall_cools_like_it() -> None:
    """At (melt - mold) / (eject - mold) = 5 a cylinder of 1.44 wall and a plate need the same time at the center."""
    plate = cooling_time_plate_center(2.0, 0.09, 240.0, 40.0, 80.0)
    assert cooling_time_cylinder_center(2.88, 0.09, 240.0, 40.0, 80.0) == pytest.approx(plate, rel=0.01)


def test_cooling_time_goes_with_the_square_of_the_wall() -> None:
    thin, thick = (cooling_time_plate_mean(wall, 0.09, 240.0, 40.0, 80.0) for wall in (1.5, 3.0))
    assert thick == pytest.approx(4 * thin, rel=1e-12)


def test_temperatures_in_the_wrong_order_are_impossible() -> None:
    with pytest.raises(ValueError, match="melt > eject > mold is needed, got 200, 100 and 120 degC"):
        cooling_time_plate_center(2.0, 0.09, 200.0, 120.0, 100.0)


def test_cooling_beyond_the_first_term_is_reported() -> None:
    (finding,) = cooling_time_plate_center.outside(2.0, 0.09, 200.0, 100.0, 190.0)
    assert finding.limit == 2.0
    assert finding.value == pytest.approx(4 / math.pi * 100 / 90)


def test_the_radius_of_a_core_cancels() -> None:
    """Contact pressure times area gives the sleeve's force for any radius (Shen, Chen & Jiang found it so)."""
    sleeve = ejection_force_sleeve_menges(0.35, 900.0, 0.005, 1.8, 30.0, 1.0)
    for radius in (12.0, 35.0, 80.0):
        pressure = contact_pressure_shrink_fit(900.0, 0.005, 1.8, radius)
        assert ejection_force_friction(0.35, pressure, 2 * math.pi * radius * 30.0, 1.0) == pytest.approx(sleeve)


def test_the_cup_is_the_old_closed_form() -> None:
    """Rosato and Glanvill & Denton: St E A mu / (d (d / 2t - d nu / 4t)), St = strain d, is the same formula."""
    d, t, length, nu = 40.0, 2.0, 40.0, 0.39
    old = 0.006 * d * 1000.0 * math.pi * d * length * 0.4 / (d * (d / (2 * t) - d / (4 * t) * nu))
    assert ejection_force_cup_menges(0.4, 1000.0, 0.006, t, length, nu) == pytest.approx(old, rel=1e-12)
    assert ejection_force_cup_menges(0.4, 1e3, 0.006, t, length, 0.0) == ejection_force_sleeve_menges(
        0.4, 1e3, 0.006, t, length
    )


@pytest.mark.parametrize("friction", [0.2, 0.4, 0.8])
def test_a_steep_draft_lets_go_by_itself(friction: float) -> None:
    """No draft is factor one; from tan(draft) = friction on the force is zero, never negative."""
    free = math.degrees(math.atan(friction))
    assert draft_factor_menges(friction, 0.0) == 1.0
    assert draft_factor_menges(friction, free - 0.1) > 0.0
    assert draft_factor_menges(friction, free + 0.1) == 0.0


def test_euler_scales_and_inverts() -> None:
    """Force goes with d^4 / L^2; both ends fixed carries four times both ends free; the diameter rule inverts it."""
    assert euler_buckling_force(6.0, 200.0) == pytest.approx(4 * euler_buckling_force(3.0, 100.0))
    assert euler_buckling_force(3.0, 100.0, 2e5, 0.5) == pytest.approx(4 * euler_buckling_force(3.0, 100.0, 2e5, 1.0))
    force = euler_buckling_force(3.0, 100.0)
    assert euler_pin_diameter(force / 3.0, 100.0) == pytest.approx(3.0, rel=1e-12)


def test_supports_of_a_core_pin_stand_in_the_textbook_ratio() -> None:
    """Cantilever 1, simple 0.104, propped 0.043, fixed 0.021; a load on the tip half alone is 0.854 of the whole."""
    free = core_pin_deflection_cantilever(2.0, 4.0, 40.0)
    ratios = [
        rule(2.0, 4.0, 40.0) / free
        for rule in (core_pin_deflection_simple, core_pin_deflection_propped, core_pin_deflection_fixed)
    ]
    assert ratios == pytest.approx([5 / 48, 8 / 184.6, 1 / 48], rel=1e-12)
    assert core_pin_deflection_cantilever(2.0, 4.0, 40.0, start=20.0) / free == pytest.approx(41 / 48, rel=1e-12)


def test_a_bore_as_wide_as_its_pin_is_impossible() -> None:
    with pytest.raises(ValueError, match="bore must be smaller"):
        core_pin_deflection_simple(2.0, 4.0, 40.0, bore=4.0)
    with pytest.raises(ValueError, match="load must begin on the pin"):
        core_pin_deflection_cantilever(2.0, 4.0, 40.0, start=41.0)


def test_the_load_of_a_cantilever_by_quadrature() -> None:
    """Sum of the tip movements of point loads, w a^2 (3 L - a) / (6 E I) each, by the midpoint rule."""
    pressure, d, length, start, modulus = 1.5, 5.0, 60.0, 15.0, 2e5
    inertia, n = math.pi * d**4 / 64, 4000
    step = (length - start) / n
    at = [start + (i + 0.5) * step for i in range(n)]
    total = sum(pressure * d * step * a**2 * (3 * length - a) / (6 * modulus * inertia) for a in at)
    assert core_pin_deflection_cantilever(pressure, d, length, modulus, 0.0, start) == pytest.approx(total, rel=1e-6)


def test_a_wall_takes_the_better_support() -> None:
    """A long low wall is held by its foot, a short deep one by its corners; never worse than either."""
    assert cavity_side_wall(50, 10, 300, 30) == cavity_side_wall_cantilever(50, 10, 30)
    assert cavity_side_wall(50, 300, 40, 30) == cavity_side_wall_beam(50, 40, 30)


@pytest.mark.parametrize(("depth", "length"), [(2.0, 30.0), (30.0, 100.0), (120.0, 60.0)])
@pytest.mark.parametrize("limit", [0.002, 0.02, 0.2])
def test_wall_thickness_inverts_the_movement(depth: float, length: float, limit: float) -> None:
    thickness = cavity_side_wall_thickness(60.0, depth, length, limit)
    assert cavity_side_wall(60.0, depth, length, thickness) == pytest.approx(limit, rel=1e-9)


def test_an_endless_insert_leaves_the_hole_in_an_endless_plate() -> None:
    """Lame with the outer radius to infinity: p r (1 + nu) / E; 60 MPa on r 25 gives 0.0093 mm."""
    assert round_cavity_growth_lame(60.0, 25.0, 1e7) == pytest.approx(60.0 * 25.0 * 1.3 / 210e3, rel=1e-9)
    with pytest.raises(ValueError, match="larger than its cavity"):
        round_cavity_growth_lame(60.0, 25.0, 25.0)


def test_a_floor_has_no_first_side_and_inverts() -> None:
    turned = cavity_floor_rectangular(50.0, 80.0, 40.0, 20.0)
    assert cavity_floor_rectangular(50.0, 40.0, 80.0, 20.0) == turned
    assert cavity_floor_thickness_rectangular(50.0, 40.0, 80.0, turned) == pytest.approx(20.0, rel=1e-12)


def test_a_very_long_floor_bends_like_a_strip() -> None:
    """Length over width to infinity: 5/384 of a strip, stiffened by 1 - nu^2; no overflow at ten thousand."""
    assert plate_coefficient_levy(1e4) == pytest.approx(12 * 5 / 384 * (1 - 0.09), rel=1e-4)
    with pytest.raises(ValueError, match="1 or more"):
        plate_coefficient_levy(0.5)


@pytest.mark.parametrize("angle", [10.0, 17.0, 25.0])
def test_the_length_of_an_angled_pin_gives_back_its_travel(angle: float) -> None:
    """M = L sin(phi) - c / cos(phi)."""
    length, slope = angled_pin_length_pye(12.0, 0.5, angle), math.radians(angle)
    assert length * math.sin(slope) - 0.5 / math.cos(slope) == pytest.approx(12.0, rel=1e-12)
