"""What parting, blocks and side actions take of an accepted layout."""

from __future__ import annotations

from dataclasses import dataclass, replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from moldgen.errors import PartError
from moldgen.flow.carry import accepted_block, accepted_level, at_accepted_level, compare_sides, kept_layout
from moldgen.model.accepted import Accepted, AcceptedBlocks, AcceptedGate, AcceptedSide
from moldgen.model.layout import GateKind
from moldgen.model.part import MoldFrame, Pull
from moldgen.model.side_action import SideKind
from moldgen.release.frame import rotation_to_z

UP = (0.0, 0.0, 1.0)
LAYOUT = Accepted(
    name="lid",
    part_sha256="",
    pull=UP,
    fixed_point=(0.0, 0.0, 0.0),
    parting_height=10.0,
    blocks=AcceptedBlocks((5.0, 0.0, 10.0), 100.0, 80.0, 36.0, 46.0),
    gate=AcceptedGate(GateKind.EDGE, (0.0, 0.0, 0.0), 3.0, 1.0, 1.0, 0.0),
    stroke=20.0,
    side_actions=(
        AcceptedSide("slide 1", SideKind.SLIDE, (1.0, 0.0, 0.0)),
        AcceptedSide("slide 2", SideKind.SLIDE, (0.0, 1.0, 0.0)),
        AcceptedSide("lifter 1", SideKind.LIFTER, (-1.0, 0.0, 0.0)),
    ),
)


@dataclass(frozen=True)
class Halved:
    """As much of the parted halves as matters here."""

    level: float
    check: Any
    asked: float | None = None


PROVED, UNPROVED = SimpleNamespace(proved=True, complaint=""), SimpleNamespace(proved=False, complaint="3 holes")


def reviewed(
    accepted: Accepted | None = LAYOUT, pull: Any = UP, height: float | None = None, scale: float = 1.01
) -> Any:
    spec = SimpleNamespace(parting=SimpleNamespace(height=height))
    frame = MoldFrame((scale,) * 3, (0.0, 0.0, 0.0), rotation_to_z(pull))
    return SimpleNamespace(accepted=accepted, pull=Pull(pull, ""), frame=frame, loaded=SimpleNamespace(spec=spec))


def test_the_height_is_a_part_coordinate_along_the_pull() -> None:
    assert accepted_level(reviewed()) == pytest.approx(10.1)
    turned = replace(LAYOUT, pull=(1.0, 0.0, 0.0))
    assert accepted_level(reviewed(turned, (1.0, 0.0, 0.0))) == pytest.approx(10.1)


def test_no_height_without_a_layout_along_this_pull_or_where_the_spec_gives_one() -> None:
    assert accepted_level(reviewed(None)) is None
    assert accepted_level(reviewed(pull=(0.0, 0.0, -1.0))) is None
    assert accepted_level(reviewed(height=3.0)) is None
    assert accepted_block(reviewed(None)) is None
    assert accepted_block(reviewed(pull=(1.0, 0.0, 0.0))) is None


def test_the_block_stands_where_it_stood_with_the_steel_it_had() -> None:
    for scale in (1.01, 1.03):  # another resin: the part in the mold is larger, the steel is not
        block = accepted_block(reviewed(scale=scale))
        assert block is not None
        assert block.low == pytest.approx((5.0 * scale - 50.0, -40.0, 10.0 * scale - 46.0))
        assert block.high == pytest.approx((5.0 * scale + 50.0, 40.0, 10.0 * scale + 36.0))


def parted(free: float, found: float | Exception, check: Any = PROVED) -> tuple[Any, Any, list[float]]:
    """Ask for the accepted height, 10.1, when the part alone parts at `free` and the halves come out at `found`."""
    asked: list[float] = []

    def part_at(level: float) -> Any:
        asked.append(level)
        if isinstance(found, Exception):
            raise found
        return Halved(found, check, level)

    halves, notes = at_accepted_level(reviewed(), Halved(free, PROVED), part_at)  # type: ignore[arg-type]
    return halves, notes, asked


def test_the_same_height_is_not_parted_twice() -> None:
    halves, notes, asked = parted(10.1 + 1e-6, 0.0)
    assert asked == []
    assert halves.level == 10.1 + 1e-6
    assert notes.findings == notes.decisions == ()


def test_the_accepted_height_is_taken_where_it_parts() -> None:
    halves, notes, asked = parted(7.0, 10.1)
    assert asked == [pytest.approx(10.1)]
    assert halves.level == 10.1
    assert halves.asked is None, "the user did not ask for it in the spec"
    assert notes.decisions[0].topic == "parting height"


@pytest.mark.parametrize(
    ("found", "check", "words"),
    [
        (9.0, PROVED, "settles 1.100 mm from it"),
        (PartError("no sheet closes it"), PROVED, "no sheet closes it"),
        (10.1, UNPROVED, "3 holes"),
    ],
)
def test_where_it_does_not_part_the_reason_is_told(found: Any, check: Any, words: str) -> None:
    halves, notes, _ = parted(7.0, found, check)
    assert halves.level == 7.0
    (finding,) = notes.findings
    assert finding.code == "accepted.parting_moved"
    assert words in finding.message
    assert (finding.value, finding.limit) == (7.0, 10.1)


def test_side_actions_are_compared_by_kind_and_direction() -> None:
    def side(name: str, kind: SideKind, way: tuple[float, float, float]) -> Any:
        return SimpleNamespace(name=name, front=SimpleNamespace(kind=kind, axis=way, release=way))

    lean = (float(np.cos(0.1)), float(np.sin(0.1)), 0.0)
    halves: Any = SimpleNamespace(
        sides=(
            side("slide 1", SideKind.SLIDE, (0.0, 1.0, 0.0)),
            side("slide 2", SideKind.SLIDE, lean),
            side("slide 3", SideKind.SLIDE, (-1.0, 0.0, 0.0)),
        )
    )
    (decision,) = compare_sides(reviewed(), halves).decisions
    same, turned, new, gone = decision.choice.split("; ")
    assert same == "slide 1 along +y as accepted (slide 2)"
    assert turned.startswith("slide 2 along 0.995, 0.0998, 0 turned from +x")
    assert new == "slide 3 along -x is new", "a lifter that releases the same way is not a slide"
    assert gone == "lifter 1 along -x is gone"
    assert compare_sides(reviewed(None), halves).decisions == ()


@pytest.mark.parametrize(
    ("pull", "inward", "plan"),
    [
        (UP, (0.6, 0.8, 0.0), (0.6, 0.8)),
        (UP, None, None),
        ((1.0, 0.0, 0.0), (0.0, 0.6, 0.8), None),
        (UP, (0.0, 0.0, 1.0), None),  # edited by hand: along the pull it leads nowhere
    ],
)
def test_the_way_of_the_gate_turns_with_the_part_and_keeps_its_length(pull: Any, inward: Any, plan: Any) -> None:
    gate = replace(LAYOUT.gate, inward=inward)
    now = reviewed(replace(LAYOUT, pull=pull, gate=gate, part_sha256="same"), pull)
    now.part = SimpleNamespace(source_sha256="same")
    kept, _ = kept_layout(now)
    assert kept is not None
    assert kept.gate is not None
    if pull != UP:  # as its end, seen from its start, without the shrink
        end = now.frame.to_mold(inward)
        plan = (end[0] / 1.01, end[1] / 1.01)
        assert end[2] == pytest.approx(0.0)
    assert kept.gate.inward == (None if plan is None else pytest.approx(plan))
