"""The pull search on parts whose pull is known, in any attitude."""

import pytest

from moldgen.kernel.body import Body
from moldgen.release.pull import search_pull

from .shapes import box, cut, cylinder, fuse, tilted, tilted_pull, turned


def tray():
    """Return a tray open at the bottom, with a rib that only its own pull leaves."""
    shell = cut(box((0, 0, 0), (60, 40, 12)), box((2, 2, -1), (58, 38, 10)))
    return fuse(shell, box((29, 2, 1), (31, 38, 11)))


def best(solid, **options):
    return search_pull(Body(solid), **options)[0]


def test_tray_is_pulled_along_z_hollow_side_to_the_core():
    found = best(tray())
    assert found.direction == (0.0, 0.0, 1.0)
    assert found.trapped_mm2 == 0.0
    assert found.unevenness_mm == pytest.approx(0.0, abs=1e-9)
    assert found.depth_mm == pytest.approx(12.0)
    assert found.core_hollow_mm3 == pytest.approx(56 * 36 * 10 - 2 * 36 * 9, rel=0.08)
    assert found.cavity_hollow_mm3 == pytest.approx(0.0, abs=1.0)
    assert "faces the core" in found.why


def test_upside_down_tray_is_pulled_the_other_way():
    assert best(tilted(tray(), 180.0, (1, 0, 0))).direction == (0.0, 0.0, -1.0)


@pytest.mark.parametrize("degrees", [30.0, 77.0])
def test_tray_drawn_askew_is_found_by_its_flats(degrees):
    solid = tilted(tray(), degrees, (1, 0.3, 0.2))
    axis = tilted_pull(degrees, (1, 0.3, 0.2))
    found = best(solid)
    assert found.direction == pytest.approx(axis, abs=1e-6)
    assert found.trapped_mm2 == 0.0
    assert best(solid, axes_only=True).source.startswith("axis")


def test_bored_bar_is_pulled_along_its_bore():
    bar = cut(box((-5, -5, 0), (5, 5, 40)), cylinder(3, -1, 41))
    assert best(bar).direction[2] in (1.0, -1.0)


def test_ranking_is_by_score_and_says_what_the_others_cost():
    ranked = search_pull(Body(tray()))
    assert [c.score for c in ranked] == sorted(c.score for c in ranked)
    assert all("costs" in c.why for c in ranked[1:])
    assert ranked[-1].trapped_share > 0.2


def test_trapped_share_of_a_groove_is_its_share_of_the_surface():
    block = cut(box((0, 0, 0), (30, 20, 10)), box((-1, -1, 4), (31, 5, 7)))
    z = next(c for c in search_pull(Body(block), axes_only=True) if c.source == "axis z")
    surface = 2 * (30 * 20 + 30 * 10 + 20 * 10) + 2 * 30 * 5 - 2 * 5 * 3
    assert z.trapped_mm2 == pytest.approx(2 * 30 * 5 + 30 * 3, rel=0.02)
    assert z.trapped_share == pytest.approx((2 * 30 * 5 + 30 * 3) / surface, rel=0.02)


def test_the_search_turns_with_the_part():
    one, two = best(tray()), best(turned(tray(), 90.0))
    assert two.direction == pytest.approx(one.direction, abs=1e-9)
    assert two.score == pytest.approx(one.score, abs=1e-3)
