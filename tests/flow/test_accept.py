"""An accepted layout is kept by the next build: what stays, what follows its feature, what is moved or left, why."""

from __future__ import annotations

import json
import math
import shutil
from dataclasses import dataclass, replace
from pathlib import Path

import pytest
from helpers.small_specs import CUP as SMALL_CUP
from helpers.small_specs import spec

from moldgen.errors import SpecError
from moldgen.finding import Notes
from moldgen.flow.accept import accept_layout, with_layout_accepted
from moldgen.flow.build import build_tool
from moldgen.flow.carry_pull import frame_as_accepted, pulls_as_accepted
from moldgen.flow.job import JobResult, Options
from moldgen.flow.lay_out import lay_out
from moldgen.flow.part_mold import part_mold
from moldgen.flow.review import Reviewed, review
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.memory import Forgetful
from moldgen.model.accepted import Accepted
from moldgen.model.layout import Chooser, Layout
from moldgen.model.part import MoldFrame, Pull
from moldgen.spec.accepted import accepted_file, load_accepted
from moldgen.spec.load import load_spec

EXACT = 2e-9
"""mm: the digits of an accepted layout, as they come out after rounding it and its shift by the shrink."""

CUP = SMALL_CUP.replace("size: [40, 30, 16]", "size: [72, 46, 16]")
"""A cup 72 x 46 mm with room for its pins; the post, with its blind hole, hangs at x = 8, y = 4."""

MOVED = CUP.replace("at: [8, 4]", "at: [6, 4]")
"""The cup with its post 2 mm nearer to the middle, at x = 6: clear of all pins."""

BAR = "      - {feature: block, name: bar, size: [3, 42, 6], on: {plane: xy, offset: 14.2, flip: true}, at: [X, 0]}\n"
"""A rib under the ceiling of the cup."""


@dataclass(frozen=True)
class Laid:
    """A layout on a part, with places in part coordinates by name."""

    reviewed: Reviewed
    layout: Layout
    notes: Notes

    @property
    def pins(self) -> dict[str, tuple[float, ...]]:
        return {p.name: self.part(p.x, p.y, p.tip_z) for p in self.layout.ejector_pins}

    @property
    def cores(self) -> dict[str, tuple[float, ...]]:
        return {p.name: self.part(p.x, p.y, p.base_z) for p in self.layout.core_pins}

    @property
    def gate(self) -> tuple[float, ...]:
        return self.reviewed.frame.to_part(self.layout.gate.at)

    def part(self, x: float, y: float, z: float) -> tuple[float, ...]:
        return self.reviewed.frame.to_part((x, y, z))

    def told(self, code: str) -> list[str]:
        return [f.message for f in self.notes.findings if f.code == code]


@dataclass(frozen=True)
class Cup:
    """The cup with its proved tool in `out` and its layout accepted beside `spec`."""

    folder: Path
    spec: Path
    out: Path
    result: JobResult

    @property
    def accepted(self) -> Accepted:
        found = load_accepted(self.spec)
        assert found is not None
        return found

    def laid(self, text: str = CUP, accepted: Accepted | None = None, *, fresh: bool = False) -> Laid:
        """Lay out a changed cup with the accepted layout."""
        own = replace(load_spec(spec(self.folder, text, name="changed")))
        loaded = replace(own, accepted=None if fresh else accepted or self.accepted)
        stages = Stages(Forgetful(), silent())
        reviewed = review(loaded, stages)
        formed, _ = part_mold(reviewed, stages)
        return Laid(reviewed, *lay_out(reviewed, formed.halves))


@pytest.fixture(scope="module")
def cup(tmp_path_factory: pytest.TempPathFactory) -> Cup:
    folder = tmp_path_factory.mktemp("cup")
    path, out = spec(folder, CUP, name="cup"), folder / "out"
    out.mkdir()
    result = build_tool(load_spec(path), out, Options(pictures=False), Stages(Forgetful(), silent()))
    accept_layout(load_spec(path), out, silent())
    return Cup(folder, path, out, result)


@pytest.fixture(scope="module")
def first(cup: Cup) -> Laid:
    return cup.laid(fresh=True)


def near(one: tuple[float, ...], other: tuple[float, ...]) -> bool:
    return max(abs(a - b) for a, b in zip(one, other, strict=True)) <= EXACT


def test_accepting_the_same_tool_again_gives_the_same_bytes(cup: Cup) -> None:
    before = accepted_file(cup.spec).read_bytes()
    accept_layout(load_spec(cup.spec), cup.out, silent())
    assert accepted_file(cup.spec).read_bytes() == before


def test_the_unchanged_part_gets_the_same_layout_to_the_last_digit(cup: Cup, first: Laid) -> None:
    again = cup.laid()
    assert {p.chosen_by for p in again.layout.ejector_pins} == {Chooser.KEPT}
    for one, other in zip(
        (*first.layout.ejector_pins, *first.layout.core_pins, first.layout.gate),
        (*again.layout.ejector_pins, *again.layout.core_pins, again.layout.gate),
        strict=True,
    ):
        assert replace(other, chosen_by=one.chosen_by) == one
    assert not any(f.code.startswith("accepted.") for f in again.notes.findings)
    highest = max(p.pressure_mpa for p in first.layout.ejector_pins)
    assert cup.accepted.pressure == pytest.approx(highest, abs=1e-3)


def test_a_moved_post_takes_its_core_pin_along_and_nothing_else(cup: Cup, first: Laid) -> None:
    moved = cup.laid(MOVED)
    assert moved.pins.keys() == first.pins.keys()
    assert all(near(moved.pins[name], at) for name, at in first.pins.items())
    assert near(moved.gate, first.gate)
    (name,) = first.cores
    x, y, z = first.cores[name]
    assert near(moved.cores[name], (x - 2.0, y, z))
    assert moved.told("accepted.follows") == [
        "core pin 1 follows the face that it belongs to, which moved by -2, 0, 0 mm"
    ]


def test_without_the_accepted_layout_the_pins_would_have_gone_elsewhere(cup: Cup, first: Laid) -> None:
    fresh = cup.laid(MOVED, fresh=True)
    assert not all(any(near(at, other) for other in fresh.pins.values()) for at in first.pins.values())


def test_a_hole_that_is_gone_takes_its_pin_along(cup: Cup, first: Laid) -> None:
    plain = cup.laid(CUP[: CUP.index("        hole:")])
    assert plain.cores == {}
    (told,) = plain.told("accepted.dropped")
    assert told.startswith("core pin 1 of the accepted layout is not kept: the round core that it was is gone")
    assert all(near(plain.pins[name], at) for name, at in first.pins.items())


def test_a_core_pin_keeps_its_shank_where_the_hole_allows(cup: Cup) -> None:
    assert [p.diameter for p in cup.laid().layout.core_pins] == [5.0]
    wider = cup.laid(CUP.replace("hole: {diameter: 4,", "hole: {diameter: 5.2,"))
    (pin,) = wider.layout.core_pins
    assert pin.diameter > 5.2
    (told,) = wider.told("accepted.resized")
    assert "instead of 5 mm" in told


def test_a_rib_where_a_pin_stood_moves_it_and_says_by_how_much(cup: Cup, first: Laid) -> None:
    x = first.pins["ejector pin 1"][0]
    ribbed = cup.laid(CUP + BAR.replace("X", f"{x - 3.0:.2f}"))  # from 1.5 to 4.5 mm beside the axis of a 6 mm pin
    found = [f for f in ribbed.notes.findings if f.code == "accepted.moved"]
    assert [f.message.partition(" of")[0] for f in found] == ["ejector pin 1"]
    (finding,) = found
    assert finding.value is not None
    assert finding.limit is not None
    assert finding.value < finding.limit
    assert finding.unit == "mm"
    now, then = (one.layout.ejector_pins[0] for one in (ribbed, first))
    assert f"is moved by {math.dist((now.x, now.y), (then.x, then.y)):.2f} mm" in finding.message
    others = [name for name in first.pins if name != "ejector pin 1"]
    assert all(near(ribbed.pins[name], first.pins[name]) for name in others)


def test_a_pin_without_room_nearby_is_left_and_another_is_placed(cup: Cup, first: Laid) -> None:
    x, y, _ = first.pins["ejector pin 1"]
    under = cup.laid(CUP.replace("at: [8, 4]", f"at: [{x:.3f}, {y:.3f}]"))  # the post hangs where the pin stood
    assert any(told.startswith("ejector pin 1 of the") for told in under.told("accepted.dropped"))
    assert "ejector pin 1" not in under.pins, "its name is not given to another pin"
    assert any(p.chosen_by is Chooser.MOLDGEN for p in under.layout.ejector_pins)
    assert all(near(under.pins[name], at) for name, at in first.pins.items() if name != "ejector pin 1")


def test_what_the_spec_gives_comes_before_the_accepted_layout(cup: Cup, first: Laid) -> None:
    given = cup.laid(CUP + "ejection:\n  pins:\n    - {at: [0, -8, 14], diameter: 3}\ngate: {kind: sprue}\n")
    assert [p.chosen_by for p in given.layout.ejector_pins] == [Chooser.GIVEN]
    assert given.layout.gate.kind.value == "sprue"
    topics = {d.topic: d.why for d in given.notes.decisions}
    assert "ejection.pins" in topics["ejector pins kept"]
    assert "sprue" in topics["gate kept"]


def test_given_pins_with_add_stand_beside_those_that_are_kept(cup: Cup, first: Laid) -> None:
    x, y, _ = first.pins["ejector pin 2"]
    both = cup.laid(CUP + f"ejection:\n  add: true\n  pins:\n    - {{at: [{x}, {y}, 14], diameter: 3}}\n")
    names = [p.name for p in both.layout.ejector_pins]
    assert len(names) == len(set(names)), "no two pins share a name"
    (pin,) = [p for p in both.layout.ejector_pins if p.chosen_by is Chooser.GIVEN]
    assert near(both.part(pin.x, pin.y, 0.0)[:2], (x, y))
    assert any("between its head and that of a pin of the spec" in f.message for f in both.notes.findings)


def test_a_gate_on_a_marked_face_is_chosen_anew_with_the_reason(cup: Cup, first: Laid) -> None:
    x, y, z = first.gate
    marked = cup.laid(CUP + f"marks:\n  - {{face: [{x}, {y}, {z + 3}], no_gate: true}}\n")
    (told,) = marked.told("accepted.dropped")
    assert told == "the gate of the accepted layout is not kept: the face is marked no_gate"
    assert marked.layout.gate.chosen_by is Chooser.MOLDGEN
    assert not near(marked.gate, first.gate)


def test_the_gate_keeps_place_and_size_when_the_part_gets_heavier(cup: Cup, first: Laid) -> None:
    heavier = cup.laid(CUP + BAR.replace("X", "-4"))
    assert near(heavier.gate, first.gate)
    gate, then = heavier.layout.gate, first.layout.gate
    assert cup.accepted.gate.inward == pytest.approx(then.inward), "this part is not turned in its mold"
    assert gate.inward == pytest.approx(then.inward, abs=1e-9)
    for name in ("width", "depth", "land", "runner_diameter", "runner_length", "sprue_foot_diameter"):
        assert getattr(gate, name) == pytest.approx(getattr(then, name), abs=1e-8)
    assert gate.chosen_by is Chooser.KEPT


def test_a_thicker_ceiling_moves_no_pin_and_says_nothing(cup: Cup, first: Laid) -> None:
    thicker = cup.laid(CUP.replace("thickness: 2,", "thickness: 2.3,"))
    assert all(near(thicker.pins[name][:2], at[:2]) for name, at in first.pins.items())
    assert thicker.pins["ejector pin 1"][2] == pytest.approx(first.pins["ejector pin 1"][2] - 0.3, abs=1e-3)
    assert thicker.told("accepted.follows") == []
    ends = [p.fit_end for p in cup.accepted.ejector_pins]
    assert None not in ends
    now = [thicker.part(p.x, p.y, p.tip_z - p.fit_length)[2] for p in thicker.layout.ejector_pins]
    assert now[: len(ends)] == pytest.approx(ends, abs=1e-8), "their bores widen where they did"
    assert thicker.layout.ejector_pins[0].fit_length < first.layout.ejector_pins[0].fit_length


def test_of_a_part_scaled_in_plan_legal_pins_stay_and_each_change_is_told(cup: Cup, first: Laid) -> None:
    scaled = {"72, 46, 16": "74, 47.3, 16", "[8, 4]": "[8.22, 4.11]", "diameter: 8": "diameter: 8.22"}
    text = CUP
    for old, new in scaled.items():
        assert old in text
        text = text.replace(old, new)
    laid = cup.laid(text)
    (core,) = laid.cores.values()
    assert near(core[:2], (8.22, 4.11))
    for name, at in first.pins.items():
        told = [f.message for f in laid.notes.findings if f"{name} " in f.message]
        stays = name in laid.pins and near(laid.pins[name][:2], at[:2])
        assert stays or told


def test_an_edited_accepted_layout_is_obeyed(cup: Cup) -> None:
    accepted = cup.accepted
    pin = accepted.ejector_pins[0]
    x, y, z = pin.at
    edited = replace(pin, at=(x + 0.5, y, z), diameter=3.0)
    laid = cup.laid(accepted=replace(accepted, ejector_pins=(edited, *accepted.ejector_pins[1:])))
    assert near(laid.pins[pin.name], (x + 0.5, y, laid.pins[pin.name][2]))
    assert laid.layout.ejector_pins[0].diameter == 3.0


def test_pins_that_do_not_suffice_stay_and_others_are_added(cup: Cup, first: Laid) -> None:
    accepted = cup.accepted
    laid = cup.laid(accepted=replace(accepted, ejector_pins=accepted.ejector_pins[1:2]))
    assert near(laid.pins["ejector pin 2"], first.pins["ejector pin 2"])
    added = [p.name for p in laid.layout.ejector_pins if p.chosen_by is Chooser.MOLDGEN]
    assert added
    assert min(int(name.removeprefix("ejector pin ")) for name in added) == 3, "new pins get new names"


def test_another_pull_keeps_nothing_and_says_so(cup: Cup) -> None:
    accepted = replace(cup.accepted, pull=(0.0, 0.0, -1.0))
    laid = cup.laid("pull: +z\n" + CUP, accepted)
    assert {p.chosen_by for p in laid.layout.ejector_pins} == {Chooser.MOLDGEN}
    (decision,) = [d for d in laid.notes.decisions if d.topic == "accepted layout"]
    assert decision.choice == "nothing is kept"


def test_the_accepted_pull_is_tried_first_though_another_scores_better(cup: Cup) -> None:
    up, down = Pull((0.0, 0.0, 1.0), "best"), Pull((0.0, 0.0, -1.0), "second")
    accepted = replace(cup.accepted, pull=(0.0, 0.0, -1.0))
    pulls = pulls_as_accepted((up, down), accepted)
    assert [p.direction for p in pulls] == [down.direction, up.direction]
    assert "accepted" in pulls[0].how_chosen
    assert pulls_as_accepted((up, down), None) == (up, down)
    assert pulls_as_accepted((up,), replace(accepted, pull=(1.0, 0.0, 0.0)))[0].direction == (1.0, 0.0, 0.0)


def test_the_fixed_point_of_the_shrink_stays_though_the_middle_moves(cup: Cup) -> None:
    turn = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
    frame = MoldFrame((1.005,) * 3, (3.0, 0.0, 8.0), turn)
    accepted = replace(cup.accepted, fixed_point=(0.0, 0.0, 8.0))
    kept, notes = frame_as_accepted(frame, accepted)
    assert kept.fixed_point == (0.0, 0.0, 8.0)
    assert "moved by 3.000 mm" in notes.decisions[0].why
    rounded = replace(accepted, fixed_point=(3.0000004, 0.0, 8.0))
    assert frame_as_accepted(frame, rounded) == (frame, Notes())


# --- what may be accepted --------------------------------------------------------------------------------------------
@pytest.fixture
def copy(cup: Cup, tmp_path: Path) -> Cup:
    shutil.copytree(cup.out, tmp_path / "out")
    return Cup(tmp_path, spec(tmp_path, CUP, name="cup"), tmp_path / "out", cup.result)


def edited(copy: Cup, change: object) -> None:
    path = copy.out / "manifest.json"
    record = json.loads(path.read_text())
    change(record)  # type: ignore[operator]
    path.write_text(json.dumps(record))


def refused(copy: Cup) -> str:
    with pytest.raises(SpecError) as caught:
        accept_layout(load_spec(copy.spec), copy.out, silent())
    assert caught.value.remedy
    assert not accepted_file(copy.spec).exists()
    return caught.value.what


def test_a_tool_that_is_not_proved_is_refused(copy: Cup) -> None:
    edited(copy, lambda record: record["proofs"][1].update(passed=False))
    assert "only a proved tool" in refused(copy)


def test_a_tool_without_proofs_is_refused(copy: Cup) -> None:
    edited(copy, lambda record: record.update(proofs=[]))
    assert "only a proved tool" in refused(copy)


def test_a_tool_of_another_spec_is_refused(copy: Cup) -> None:
    edited(copy, lambda record: record["spec"].update(path="other.yaml"))
    assert "other.yaml" in refused(copy)


def test_a_tool_whose_files_were_edited_is_refused(copy: Cup) -> None:
    with (copy.out / "tool.step").open("ab") as stream:
        stream.write(b" ")
    assert "tool.step" in refused(copy)


def test_a_tool_of_an_earlier_part_is_refused(copy: Cup) -> None:
    copy.spec.write_text(MOVED, encoding="utf-8")
    assert refused(copy) == "the part has changed since this tool was built"


@pytest.mark.parametrize("key", ["layout", "parting", "shrink", "pull", "claims", "part", "files", "proofs"])
def test_a_damaged_manifest_is_told(copy: Cup, key: str) -> None:
    edited(copy, lambda record: record.update({key: {"x": None}}))
    assert any(word in refused(copy) for word in ("damaged", "proved", "changed", "not those that were built"))


def test_a_file_that_is_no_accepted_layout_is_left_alone(copy: Cup) -> None:
    path = accepted_file(copy.spec)
    path.write_text("my: notes\n")
    with pytest.raises(SpecError, match="left alone"):
        accept_layout(load_spec(copy.spec), copy.out, silent())
    assert path.read_text() == "my: notes\n"


def test_an_earlier_accepted_layout_is_replaced_even_a_broken_one(copy: Cup, cup: Cup) -> None:
    path = accepted_file(copy.spec)
    path.write_text("accepted: 1\nbroken: [\n")
    accept_layout(load_spec(copy.spec), copy.out, silent())
    assert path.read_bytes() == accepted_file(cup.spec).read_bytes()
    assert [p.name for p in copy.spec.parent.iterdir() if p.name.startswith(".")] == []


def test_a_build_accepts_only_what_is_proved(copy: Cup) -> None:
    loaded, options = load_spec(copy.spec), Options(accept=True)
    failed = replace(copy.result, output=copy.out, proofs=())
    result = with_layout_accepted(failed, loaded, options, silent())
    assert [f.code for f in result.findings if f.code.startswith("accept.")] == ["accept.not_proved"]
    assert not accepted_file(copy.spec).exists()
    good = with_layout_accepted(replace(copy.result, output=copy.out), loaded, options, silent())
    assert "layout accepted" in good.headline
    assert accepted_file(copy.spec).exists()
