"""The resin table: complete, in order, and consistent with itself and with physics."""

from __future__ import annotations

import doctest
import importlib
from dataclasses import FrozenInstanceError, fields

import pytest

from moldgen.canon import to_json
from moldgen.catalog import Range, Resin, all_resins, resin, resin_names
from moldgen.errors import SpecError
from moldgen.quantity import Provenance

TWENTY = """
ABS PC PC/ABS PS HIPS PMMA PP PP-GF30 PE-HD PE-LD POM PA6 PA66 PA66-GF30 PBT PBT-GF30 PVC-U TPU PPS-GF40 PET
"""


@pytest.fixture(params=resin_names())
def row(request: pytest.FixtureRequest) -> Resin:
    return resin(request.param)


def test_the_common_resins_are_there() -> None:
    assert set(TWENTY.split()) <= set(resin_names())


def test_temperatures_stand_in_their_order(row: Resin) -> None:
    """Mold below ejection, ejection below no-flow, no-flow below melt."""
    assert row.mold_temperature.high < row.ejection_temperature.high
    assert row.mold_temperature.low < row.ejection_temperature.low
    assert row.ejection_temperature.high < row.no_flow_temperature < row.melt_temperature.low


def test_a_filled_resin_shrinks_less_along_the_flow(row: Resin) -> None:
    """Fibers lie along the flow; amorphous resins shrink alike both ways."""
    if row.filled:
        assert row.shrink_along.mean < row.shrink_across.mean
        assert row.expansion_along <= row.expansion_across
    if row.structure == "amorphous":
        assert row.shrink_along == row.shrink_across


def test_semicrystalline_resins_shrink_more_than_amorphous_ones() -> None:
    crystalline = [r.shrink for r in all_resins() if r.structure == "semicrystalline" and not r.filled]
    amorphous = [r.shrink for r in all_resins() if r.structure == "amorphous"]
    assert min(crystalline) > max(amorphous)


def test_effective_diffusivity_is_that_of_the_melt_for_amorphous_resins(row: Resin) -> None:
    """a = k / (rho cp) within 20 %; latent heat makes it differ for the others, so they are not asked."""
    if row.structure == "amorphous":
        melt = row.conductivity / (row.melt_density * 1e-3 * row.heat_capacity)
        assert row.diffusivity == pytest.approx(melt, rel=0.2)


def test_a_wall_below_the_smallest_is_not_recommended(row: Resin) -> None:
    assert row.wall_min <= row.wall_recommended.low
    assert 0 < row.poisson < 0.5
    assert 0.6 <= row.gate_factor <= 0.9
    assert row.draft_minimum.low >= 0.5


def test_power_law_gives_a_usual_viscosity(row: Resin) -> None:
    """K rate^(n - 1) at 1000 1/s is between that of PA66 (57 Pa s) and of PC (441 Pa s)."""
    assert 55 < row.consistency * 1000.0 ** (row.flow_index - 1.0) < 450


@pytest.mark.parametrize(
    ("name", "viscosity"), [("ABS", 221), ("PP", 74), ("PC", 441), ("PA66-GF30", 150), ("PPS-GF40", 160)]
)
def test_viscosities_that_were_written_down(name: str, viscosity: float) -> None:
    row = resin(name)
    assert row.consistency * 1000.0 ** (row.flow_index - 1.0) == pytest.approx(viscosity, rel=0.01)


def test_every_number_has_unit_source_and_provenance(row: Resin) -> None:
    columns = [f.name for f in fields(row) if isinstance(getattr(row, f.name), (float, Range))]
    assert [fact.column for fact in row.facts] == columns
    for fact in row.facts:
        assert fact.source
        assert fact.meaning
        assert fact.unit
        assert fact.source != "see the row", f"{row.name}: {fact.column} has no source of its own"
        if fact.provenance is Provenance.UNVERIFIED:
            assert "from memory" in fact.source


def test_nothing_in_the_table_claims_to_be_published(row: Resin) -> None:
    """Typical values are never quoted from one page: whoever adds a published one adds its citation here."""
    assert {fact.provenance for fact in row.facts} <= {Provenance.UNVERIFIED, Provenance.COMMON_PRACTICE}


@pytest.mark.parametrize(
    ("written", "name"),
    [
        ("abs", "ABS"),
        (" Pa 66 gf 30 ", "PA66-GF30"),
        ("pa66_gf30", "PA66-GF30"),
        ("HDPE", "PE-HD"),
        ("PE HD", "PE-HD"),
        ("Acetal", "POM"),
        ("PC+ABS", "PC/ABS"),
        ("PA 6.6", "PA66"),
        ("pvc", "PVC-U"),
    ],
)
def test_names_are_found_as_people_write_them(written: str, name: str) -> None:
    assert resin(written) is resin(name)


@pytest.mark.parametrize(("wrong", "near"), [("ABZ", "ABS"), ("PA66GF", "PA66-GF30"), ("polycarbonat", "PC")])
def test_an_unknown_name_is_answered_with_the_nearest(wrong: str, near: str) -> None:
    with pytest.raises(SpecError, match="unknown resin") as caught:
        resin(wrong)
    nearest = caught.value.remedy.partition(";")[0]
    assert near in nearest.removeprefix("nearest: ").split(", ")


@pytest.mark.parametrize("wrong", ["", "  ", "unobtainium", "@!"])
def test_a_name_like_no_other_is_answered_with_all(wrong: str) -> None:
    with pytest.raises(SpecError) as caught:
        resin(wrong)
    assert all(name in caught.value.remedy for name in resin_names())


def test_a_row_cannot_be_changed_and_is_loaded_once() -> None:
    row = resin("ABS")
    assert row is resin("ABS")
    with pytest.raises(FrozenInstanceError):
        row.poisson = 0.5  # type: ignore[misc]


def test_a_line_of_the_sheet_states_mean_and_ends() -> None:
    line = resin("ABS").line("cavity_pressure", "clamp force")
    assert (line.value, line.unit, line.valid_range) == (32.5, "MPa", "25 to 40 MPa")
    assert line.name == "mean cavity pressure, ABS"
    assert line.provenance is Provenance.UNVERIFIED
    single = resin("ABS").line("poisson")
    assert (single.value, single.valid_range) == (0.39, "")
    with pytest.raises(KeyError, match="no column"):
        resin("ABS").line("structure")


def test_a_row_goes_into_the_manifest() -> None:
    text = to_json(resin("PA66"))
    assert '"shrink_along"' in text
    assert '"unverified (from memory)"' in text


@pytest.mark.parametrize("name", ["eyebolts", "fits", "pins", "resins", "sizes", "steels"])
def test_examples_run(name: str) -> None:
    result = doctest.testmod(importlib.import_module(f"moldgen.catalog.{name}"))
    assert result.failed == 0
    assert result.attempted > 0
