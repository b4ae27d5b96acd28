"""Issue 4, item 4, on whole parts: snap fits and press fits of the demos, with the sizes that their recipes give."""

from __future__ import annotations

import math
from functools import cache

import pytest
from helpers.command import TESTS

from moldgen.flow.make_tool import build_along
from moldgen.flow.review import review
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.layout.steel_safe import steel_safe_advice
from moldgen.layout.view import PartView
from moldgen.memory import Forgetful
from moldgen.model.steel_safe import Fit, SteelSafe
from moldgen.rules.steel_safe import SNAP_ALLOWANCE
from moldgen.spec.load import load_spec
from moldgen.spec.steel_safe import SteelSafe as Section

pytestmark = pytest.mark.slow


@cache
def advice(name: str) -> tuple[SteelSafe, ...]:
    """The advice for a demo; its own spec marks nothing."""
    stages = Stages(Forgetful(), silent())
    reviewed = review(load_spec(TESTS.parent / "specs" / name / "spec.yaml"), stages)
    built = build_along(reviewed, stages)
    view = PartView(built.halves, reviewed.frame, built.shaped.value.side_layout)
    return steel_safe_advice(view, built.layout, Section(), reviewed.resin, reviewed.frame)[0]


def test_the_hook_of_the_battery_door() -> None:
    """Recipe: the lip stands out 1.4 mm from the end of a stem that tapers by 1 deg on its back."""
    reach, thickness = advice("battery-door")
    assert {a.fit for a in (reach, thickness)} == {Fit.SNAP}
    assert reach.nominal_mm == pytest.approx(1.4, abs=0.03)
    assert reach.formed_by == thickness.formed_by == ("slide 1",)
    for one in (reach, thickness):
        assert one.allowance_mm == SNAP_ALLOWANCE.default
        assert one.steel_last_mm - one.steel_first_mm == pytest.approx(SNAP_ALLOWANCE.default, abs=1e-3)
    # the catch face begins 9 mm under the plane at z = -1.8 and falls by 10 deg; told at the middle of the lip
    assert reach.places[0][2] == pytest.approx(-1.8 - 9.0 - 0.7 * math.tan(math.radians(10.0)), abs=0.01)


def test_the_lip_of_the_strap_buckle() -> None:
    """Recipe: the lip stands 0.8 mm in; its catch face rises from z = 3 to the wall, the lower side begins at 1."""
    reach, thickness = advice("strap-buckle")
    assert reach.nominal_mm == pytest.approx(0.8, abs=0.05)
    assert thickness.formed_by == ("lifter 1",)
    assert 1.0 < thickness.nominal_mm < 2.0
    assert 3.0 < reach.places[0][2] < 3.4


def test_the_bosses_of_the_sensor_lid_are_one_entry_and_the_vents_none() -> None:
    (one,) = advice("sensor-lid")
    assert (one.fit, len(one.places)) == (Fit.PRESS, 4)
    assert one.formed_by == tuple(f"core pin {n}" for n in (1, 2, 3, 4))
    assert one.steel_first_mm - one.steel_last_mm == pytest.approx(2 * one.allowance_mm, abs=1e-3)
