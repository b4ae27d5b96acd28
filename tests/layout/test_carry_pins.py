"""Accepted ejector pins that passed a rule when they were accepted get no more pins unless they pass it by more."""

from __future__ import annotations

import pytest

from moldgen.catalog import resin
from moldgen.layout.ejection import GivenPin
from moldgen.layout.kept import Kept, KeptItem
from moldgen.layout.plan import Wishes, plan_layout
from moldgen.spec.sections import Ejection

from .shapes import box, view_of

ABS = resin("ABS")


@pytest.mark.parametrize(
    ("share", "added"),
    [(1.0, False), (1.2, False), (0.9, True), (0.0, True)],  # of the pressure now; 0: an older file
)
def test_pins_are_added_only_where_they_press_harder_than_it_was_accepted(share: float, added: bool) -> None:
    """Two thin pins alone press too hard on the part, evenly about its middle."""
    thin = [KeptItem(f"ejector pin {n + 1}", (x, 0.0, 20.0), 1.5) for n, x in enumerate((-25.0, 25.0))]
    view = view_of(box(60.0, 40.0, 2.0, 20.0))
    only = Ejection.model_validate({"pins": [{"at": list(i.at), "diameter": 1.5} for i in thin]})
    alone, _ = plan_layout(view, ABS, Wishes(pins=tuple(GivenPin(i.at, 1.5) for i in thin), ejection=only))
    pressure = max(p.pressure_mpa for p in alone.ejector_pins)
    assert len(alone.ejector_pins) == 2
    assert pressure > ABS.push_pressure
    layout, notes = plan_layout(view, ABS, Wishes(kept=Kept(tuple(thin), pressure=share * pressure)))
    assert (len(layout.ejector_pins) > 2) is added
    (why,) = [d.why for d in notes.decisions if d.topic == "ejector pins kept"]
    assert ("no pin is added" in why) is not added
    assert any(f.code == "ejector_pin.pressure" for f in notes.findings) or added, "the rule is still told"
