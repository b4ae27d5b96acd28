"""Scripted changes of a small part against answers that were worked out beforehand, in closed form."""

from __future__ import annotations

import pytest

from moldgen.kernel.boolean import cut
from moldgen.kernel.measure import volume
from tests.helpers.outputs import manifest
from tests.revision.conftest import solid_of
from tests.revision.part_changes import K3, Change, Steel
from tests.revision.round_changes import ROUND_CHANGES
from tests.revision.wall_changes import WALL_CHANGES, WHOLE_CHANGES

CHANGES = (*ROUND_CHANGES, *WALL_CHANGES, *WHOLE_CHANGES)


def named(changes: tuple[Change, ...]) -> pytest.MarkDecorator:
    return pytest.mark.parametrize("change", changes, ids=[c.name for c in changes])


def test_there_are_twenty_at_least_and_each_has_its_own_name() -> None:
    assert len({c.name for c in CHANGES}) == len(CHANGES) >= 20


@named((*ROUND_CHANGES, *WALL_CHANGES))
def test_the_answers_hold_for_the_parts_themselves(change: Change) -> None:
    """Where plastic comes steel goes, and the other way round: all that the halves and pins lose and gain."""
    old, new = solid_of(change.old), solid_of(change.new)
    more, less = (sum(map(volume, cut(one, [other]))) for one, other in ((new, old), (old, new)))
    goes, missing = (sum(getattr(s, work) for s in change.steel.values()) for work in ("cut", "weld"))
    assert goes - change.aside.cut == pytest.approx(K3 * more, rel=1e-6, abs=1e-6)
    assert missing - change.aside.weld == pytest.approx(K3 * less, rel=1e-6, abs=1e-6)


@named(CHANGES)
def test_the_tools_lose_and_gain_so_much_steel(change: Change, tool_of) -> None:
    """The difference of the volumes in both manifests is steel that is missing less steel that goes."""
    old, new = (volumes(manifest(tool_of(version))) for version in (change.old, change.new))
    assert old.keys() == new.keys()
    for name, was in old.items():
        steel = change.steel.get(name, Steel())
        assert new[name] - was == pytest.approx(steel.weld - steel.cut, abs=NOISE_MM3), name


NOISE_MM3 = 0.005
"""Volumes of blocks of 2e5 mm^3 are told to twelve digits, but faces that are splines are integrated less well."""


def volumes(record) -> dict[str, float]:
    """Return the steel of each component, of all its copies together [mm^3]."""
    return {
        c["name"]: c["volume_mm3"] * len(c["positions"])
        for c in record["components"]
        if c["role"] not in ("part", "sprue", "runner", "gate")
    }
