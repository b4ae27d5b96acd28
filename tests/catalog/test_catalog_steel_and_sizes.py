"""Steels, pins, fits and preferred sizes: order, laws of ISO 286 and ISO 3, and what lies beyond the tables."""

from __future__ import annotations

import math
from itertools import pairwise

import pytest

from moldgen.catalog import (
    Steel,
    all_eyebolts,
    all_steels,
    bore,
    core_pin_blank,
    core_pin_series,
    ejector_pin_down,
    ejector_pin_series,
    ejector_pin_up,
    fit_bands,
    fit_clearance,
    preferred_size_up,
    shouldered_pin_series,
    size_series,
    steel,
    steel_numbers,
)
from moldgen.errors import SpecError


@pytest.fixture(params=steel_numbers())
def metal(request: pytest.FixtureRequest) -> Steel:
    return steel(request.param)


def test_steels_are_steel(metal: Steel) -> None:
    """Modulus and density of the class; no material yields below the contact pressure that it may carry."""
    if metal.kind in ("unalloyed", "prehardened", "hardened"):
        assert metal.modulus.mean == pytest.approx(210e3, rel=0.03)
        assert metal.density == pytest.approx(7.85, rel=0.01)
        assert metal.expansion == pytest.approx(11.9, abs=0.41)
    assert metal.contact_pressure < metal.yield_strength
    assert all(fact.source for fact in metal.facts)


def test_hardened_steel_is_stronger_than_prehardened() -> None:
    strength = {
        kind: [s.yield_strength for s in all_steels() if s.kind == kind] for kind in ("prehardened", "hardened")
    }
    assert min(strength["hardened"]) > max(strength["prehardened"])


@pytest.mark.parametrize(("written", "number"), [("p20", "1.2311"), (" h13", "1.2344"), ("1.2083", "1.2083")])
def test_steels_are_found_by_trade_name(written: str, number: str) -> None:
    assert steel(written).name == number


def test_an_unknown_steel_is_answered_with_the_nearest() -> None:
    with pytest.raises(SpecError, match=r"unknown tool material '1\.2310'") as caught:
        steel("1.2310")
    assert "1.2311" in caught.value.remedy


def test_shouldered_pins_are_thinner_than_straight_ones_and_keep_a_shoulder() -> None:
    series = shouldered_pin_series()
    assert [pin.diameter for pin in series] == [0.8, 1.0, 1.2, 1.5, 2.0, 2.5]
    for pin in series:
        assert 0.5 <= pin.shank - pin.diameter <= 1.5  # about 1 mm (common practice), so that the shoulder bears
        assert pin.head_diameter > pin.shank
        assert len(pin.lengths) == len(pin.shank_lengths)
        assert all(
            0.4 * whole < shank < 0.6 * whole for whole, shank in zip(pin.lengths, pin.shank_lengths, strict=True)
        )
        assert all("unverified" in fact.source for fact in pin.facts)


def test_pins_grow_in_every_dimension() -> None:
    series = ejector_pin_series()
    assert [pin.diameter for pin in series] == [2, 2.5, 3, 4, 5, 6, 8, 10, 12, 14, 16, 20, 25, 32]
    for thin, thick in pairwise(series):
        assert thin.diameter < thick.diameter
        assert thin.head_diameter <= thick.head_diameter
        assert thin.head_height <= thick.head_height
        assert thin.lengths[-1] <= thick.lengths[-1]
    for pin in series:
        assert pin.head_diameter >= pin.diameter + 2.0
        assert list(pin.lengths) == sorted(pin.lengths)


def test_the_next_pin_up_and_down() -> None:
    """Exact sizes are kept; beyond the ends there is none, not the nearest."""
    assert [pin.diameter for pin in (ejector_pin_up(4.0), ejector_pin_up(4.1)) if pin] == [4.0, 5.0]
    assert [pin.diameter for pin in (ejector_pin_down(4.0), ejector_pin_down(3.9)) if pin] == [4.0, 3.0]
    assert ejector_pin_up(32.1) is None
    assert ejector_pin_down(1.9) is None
    blank = core_pin_blank(5.03)
    assert blank is not None
    assert blank in core_pin_series()
    assert blank.diameter == 6.0


def test_lengths_on_the_market() -> None:
    thin = ejector_pin_series()[0]
    assert thin.length_up(100.0) == 100.0
    assert thin.length_up(100.1) == 125.0
    assert thin.length_up(1000.0) is None


def iso286_unit(low: float, high: float) -> float:
    """Standard tolerance unit i of ISO 286 for a band [um]: 0.45 D^(1/3) + 0.001 D, D the geometric mean [mm]."""
    mean = math.sqrt(max(low, 1.0) * high)
    return 0.45 * mean ** (1 / 3) + 0.001 * mean


def test_fits_follow_iso286() -> None:
    """H7/g6 spans IT7 + IT6 = 26 i and H6/g5 IT6 + IT5 = 17 i; g is 2.5 D^0.34 (the standard rounds by 2 um)."""
    for band in fit_bands():
        unit = iso286_unit(band.above, band.up_to)
        assert band.h7_g6.high - band.h7_g6.low == pytest.approx(26 * unit, abs=2.0)
        assert band.h6_g5.high - band.h6_g5.low == pytest.approx(17 * unit, abs=2.0)
        assert band.h7_g6.low == band.h6_g5.low
        assert band.h7_g6.low == pytest.approx(2.5 * math.sqrt(max(band.above, 1.0) * band.up_to) ** 0.34, abs=1.5)


def test_fit_bands_join_without_gap() -> None:
    bands = fit_bands()
    assert bands[0].above == 0
    assert [band.above for band in bands[1:]] == [band.up_to for band in bands[:-1]]


def test_fit_clearance_at_the_ends_of_a_band() -> None:
    """The upper end belongs to the band; outside the table there is none."""
    assert fit_clearance(6.0) == fit_clearance(3.1)
    assert fit_clearance(6.0) != fit_clearance(6.1)
    assert fit_clearance(50.1) is None
    assert fit_clearance(0.0) is None
    with pytest.raises(SpecError, match="unknown fit"):
        fit_clearance(6.0, "H8/f7")


@pytest.mark.parametrize("pin", ["ejector pin", "core pin"])
def test_a_bore_widens_from_fit_to_head(pin: str) -> None:
    how = bore(pin)
    assert how.fit == "H7/g6"
    assert how.relief.low > 0.05 > how.head_play.high / 2
    assert how.counterbore.low >= how.relief.low
    assert how.fit_length.low >= 2.0


@pytest.mark.parametrize("series", ["edge", "thickness"])
def test_preferred_sizes_are_preferred_numbers(series: str) -> None:
    """Each listed size is one of ISO 3's R20 (a few in their usual rounding), rising."""
    sizes = size_series(series).sizes
    assert list(sizes) == sorted(sizes)
    for size in sizes:
        step = 20 * math.log10(size)
        assert step == pytest.approx(round(step), abs=0.15)


@pytest.mark.parametrize("series", ["edge", "thickness"])
def test_a_preferred_size_is_the_smallest_that_holds(series: str) -> None:
    """Never below the value, never more than one step above; a preferred size is its own."""
    sizes = size_series(series).sizes
    for size in sizes:
        assert preferred_size_up(size, series) == size
    for low, high in pairwise(sizes):
        assert preferred_size_up(low + 0.001, series) == high


@pytest.mark.parametrize(
    ("value", "series", "size"),
    [(0.1, "edge", 40), (800.1, "edge", 900), (3000.0, "edge", 3150), (9500, "edge", 10000), (161, "thickness", 200)],
)
def test_sizes_beyond_the_list(value: float, series: str, size: float) -> None:
    """ISO 3 goes on: R20 for edges, R10 for thicknesses; a tiny part gets the smallest block."""
    assert preferred_size_up(value, series) == size


@pytest.mark.parametrize("value", [0.0, -5.0, math.nan, math.inf])
def test_an_impossible_size_is_refused(value: float) -> None:
    with pytest.raises(ValueError, match="positive and finite"):
        preferred_size_up(value)


def test_an_unknown_series_is_refused() -> None:
    with pytest.raises(SpecError, match="unknown series of sizes"):
        preferred_size_up(50.0, "width")


def test_eyebolts_carry_more_along_the_axis() -> None:
    """DIN 580: two strands at 45 deg carry about 0.7 of the axial mass, and masses rise with the thread."""
    for small, large in pairwise(all_eyebolts()):
        assert small.axial < large.axial
    for bolt in all_eyebolts():
        assert bolt.inclined / bolt.axial == pytest.approx(0.71, abs=0.03)
