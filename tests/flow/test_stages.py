"""Stages: each runs when something it depends on changes, and only then; what is kept makes the same bytes."""

from __future__ import annotations

import re
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest
from helpers.small_specs import CUP, spec

from moldgen.errors import KernelError, PartError, StageError
from moldgen.finding import Finding, Notes, Severity
from moldgen.flow.build import build_tool
from moldgen.flow.job import Options
from moldgen.flow.stages import Stages, reasons, runs_as_text, runs_from_text
from moldgen.flow.store import Store
from moldgen.flow.tell import silent
from moldgen.kernel.rehearse import survives
from moldgen.memory import Forgetful, Memory
from moldgen.spec.declared import is_key, key_values, located, located_notes, narrowed
from moldgen.spec.load import load_spec

GIB = 2**30


class Kept(dict[str, bytes]):
    """A memory in this process."""

    def recall(self, key: str) -> bytes | None:
        """Return what was kept."""
        return self.get(key)

    def keep(self, key: str, data: bytes) -> None:
        """Keep it."""
        self[key] = data


def twice(work: Callable[[], object], one: dict[str, object], other: dict[str, object]) -> Stages:
    """Run a stage with `one` input, then in another run with `other`, and return the second run."""
    memory = Kept()
    Stages(memory, silent()).make("lay out", one, work)
    second = Stages(memory, silent())
    second.make("lay out", other, work)
    return second


def test_a_stage_runs_once_for_the_same_inputs() -> None:
    calls: list[int] = []
    stages = twice(lambda: calls.append(1), {"pin": 3.0, "gate": None}, {"gate": None, "pin": 3.0})
    assert len(calls) == 1
    assert [run.kept for run in stages.runs] == [True]


def test_a_stage_runs_again_when_an_input_changes() -> None:
    calls: list[int] = []
    stages = twice(lambda: calls.append(1), {"pin": 3.0, "gate": 1}, {"pin": 4.0, "gate": 1})
    assert len(calls) == 2
    assert [run.kept for run in stages.runs] == [False]


def test_the_last_digit_of_a_number_counts() -> None:
    calls: list[int] = []
    twice(lambda: calls.append(1), {"pin": 3.0}, {"pin": 3.0000000000000004})
    assert len(calls) == 2


def test_a_stage_runs_again_when_an_earlier_one_made_something_else() -> None:
    memory, calls = Kept(), []
    for size in (1, 2, 1):
        stages = Stages(memory, silent())
        part = stages.make("read", {"size": size}, lambda: "the same")
        stages.make("part", {"part": part}, lambda: calls.append(1))
    assert len(calls) == 2


def test_other_code_keeps_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    memory, calls = Kept(), []
    for program in ("a", "b", "a"):
        monkeypatch.setattr("moldgen.flow.versions.versions", lambda program=program: {"program_sha256": program})
        Stages(memory, silent()).make("read", {"size": 1}, lambda: calls.append(1))
    assert len(calls) == 2


def test_a_refused_part_is_refused_again_without_looking() -> None:
    calls: list[int] = []

    def refuse() -> None:
        calls.append(1)
        raise PartError("an undercut holds the part", where="pull", remedy="another pull")

    memory = Kept()
    for _ in range(2):
        with pytest.raises(PartError) as caught:
            Stages(memory, silent()).make("part", {"size": 1}, refuse)
        assert (caught.value.what, caught.value.remedy) == ("an undercut holds the part", "another pull")
    assert len(calls) == 1


def test_a_part_refused_for_lack_of_time_is_tried_again() -> None:
    calls: list[int] = []

    def refuse() -> None:
        calls.append(1)
        assert not survives(lambda: [None for _ in iter(int, 1)], 1)
        raise PartError("no steel could be made: the kernel did not end within 1 s")

    memory = Kept()
    for _ in range(2):
        with pytest.raises(PartError):
            Stages(memory, silent()).make("part", {"size": 1}, refuse)
    assert len(calls) == 2


def test_a_kernel_that_failed_is_tried_again() -> None:
    calls: list[int] = []

    def fail() -> None:
        calls.append(1)
        raise KernelError("ran out of time")

    memory = Kept()
    for _ in range(2):
        with pytest.raises(KernelError):
            Stages(memory, silent()).make("part", {"size": 1}, fail)
    assert len(calls) == 2


def test_the_users_own_function_runs_every_time() -> None:
    memory, made = Kept(), iter("aab")
    keys = []
    for _ in range(3):
        keys.append(Stages(memory, silent()).make("read", {"file": "f"}, lambda: next(made), lasting=False).key)
    assert keys[0] == keys[1] != keys[2]


def test_reasons_name_the_keys_that_changed() -> None:
    memory = Kept()

    def run(pin: int, gate: str) -> Stages:
        stages = Stages(memory, silent())
        stages.make("read", {"file": 1}, lambda: 1)
        stages.make("lay out", {"ejection.diameter": pin, "gate.kind": gate}, lambda: 1)
        return stages

    first, second, third = run(3, "edge"), run(4, "pin"), run(3, "edge")
    before = runs_from_text(runs_as_text(first.runs))
    assert set(reasons(first.runs, None).values()) == {"ran: no earlier run of this output is known"}
    assert reasons(second.runs, before) == {
        "read": "kept: nothing it depends on has changed",
        "lay out": "ran: changed: ejection.diameter, gate.kind",
    }
    last = runs_from_text(runs_as_text(second.runs))
    assert reasons(third.runs, last)["lay out"] == "kept: it was made of these inputs before"
    assert runs_from_text("no JSON") is None
    assert runs_from_text(None) is None


def test_a_stage_that_runs_twice_is_told_twice() -> None:
    stages = Stages(Forgetful(), silent())
    for number in range(3):
        stages.make("part the mold", {"pull": number}, lambda: 1)
    assert [run.name for run in stages.runs] == ["part the mold", "part the mold (2)", "part the mold (3)"]


def test_a_stage_cannot_read_what_it_has_not_declared(tmp_path: Path) -> None:
    loaded = narrowed(load_spec(spec(tmp_path, CUP)), ("blocks", "ejection.stroke"))
    assert loaded.spec.blocks.material == "1.2311"
    assert loaded.spec.ejection.stroke is None
    with pytest.raises(StageError, match=r"ejection\.diameter"):
        _ = loaded.spec.ejection.diameter
    with pytest.raises(StageError, match="gate"):
        _ = loaded.spec.gate


def test_where_a_key_stands_does_not_count(tmp_path: Path) -> None:
    plain = load_spec(spec(tmp_path, CUP, name="plain"))
    commented = load_spec(spec(tmp_path, "# a comment\n", CUP, name="commented"))
    marks = [narrowed(loaded, ()).locate("resin") for loaded in (plain, commented)]
    assert marks[0] == marks[1]
    assert located(f"see {marks[0]}: ABS", commented) == f"see {commented.locate('resin')}: ABS"
    assert located(marks[0], plain).endswith(":1:1")
    assert key_values(plain.spec, ("blocks", "part")) == key_values(commented.spec, ("blocks", "part"))
    assert key_values(plain.spec, ("blocks.material",)) == {"blocks.material": "1.2311"}


def built(text: str, folder: Path, memory: Memory) -> tuple[dict[str, bytes], Stages]:
    """Build a spec in this process; return the files of the output, and the run."""
    out = folder / "out"
    out.mkdir(parents=True)
    stages = Stages(memory, silent())
    build_tool(load_spec(spec(folder, text)), out, Options(pictures=False), stages)
    return {p.relative_to(out).as_posix(): p.read_bytes() for p in sorted(out.rglob("*")) if p.is_file()}, stages


@pytest.fixture(scope="module")
def filled(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store with the stages of the cup."""
    folder = tmp_path_factory.mktemp("filled")
    (folder / "store").mkdir(mode=0o700)
    built(BASE, folder / "first", Store(folder / "store", GIB))
    return folder / "store"


def rebuilt(text: str, filled: Path, tmp_path: Path) -> tuple[dict[str, bytes], dict[str, bytes], set[str]]:
    """Build `text` with a store that has the cup; return its output, that of a build without, and what ran."""
    store = Store(Path(shutil.copytree(filled, tmp_path / "store")), GIB)
    kept, stages = built(text, tmp_path / "kept", store)
    alone, _ = built(text, tmp_path / "alone", Forgetful())
    return kept, alone, {run.name for run in stages.runs if not run.kept}


BASE = CUP + "shrink: 0.6\n"
"""The cup with a shrink of its own, so that another resin leaves its size."""

LAID_OUT = {
    "lay out pins and gate",
    "cut the steel",
    "look for dimensions to be tuned",
    "export",
    "prove the tool",
}

CHANGES = {
    "comment": ("# looked at\n" + BASE, set()),
    "pin": (BASE + "ejection: {diameter: 3}\n", LAID_OUT),
    "gate": (BASE + "gate: {kind: edge, width: 2.5}\n", LAID_OUT),
    "material": (BASE + "blocks: {core_material: '1.2343'}\n", {"form the halves", *LAID_OUT} - {"prove the tool"}),
    "resin": (BASE.replace("ABS", "PC"), {"review the draft", "form the halves", *LAID_OUT}),
    "draft": (BASE + "draft: {minimum: 1.5 deg}\n", {"review the draft"}),
    "ap": (BASE + "output: {step: ap214}\n", {"export", "prove the tool"}),
    "post": (
        re.sub("at: .8, 4.", "at: [6, 4]", BASE),
        {
            "read the part",
            "choose the pull",
            "prepare the part",
            "review the draft",
            "form the halves",
            "part the mold",
            *LAID_OUT,
        },
    ),
}
"""Changes of the cup, and the stages that must run for each."""


@pytest.mark.slow
@pytest.mark.parametrize("name", CHANGES)
def test_what_is_kept_leads_to_the_same_bytes(name: str, filled: Path, tmp_path: Path) -> None:
    text, must_run = CHANGES[name]
    kept, alone, ran = rebuilt(text, filled, tmp_path)
    assert ran == must_run
    assert sorted(kept) == sorted(alone)
    assert [path for path in kept if kept[path] != alone[path]] == []


def test_a_finding_about_a_key_names_its_place_in_the_file(tmp_path: Path) -> None:
    loaded = load_spec(spec(tmp_path, CUP, "ejection:\n  pins:\n    - {at: [0, 0, 14]}\n"))
    line = CUP.count("\n") + 3

    def where(text: str) -> str:
        notes = Notes((Finding("ejector.off", Severity.NOTE, "off", where=text),))
        return located_notes(notes, loaded).findings[0].where

    assert where("ejection.pins[0]") == f"{loaded.path}:{line}:7 (ejection.pins[0])"
    assert where("ejection.stroke") == "ejection.stroke"  # not written: there is no place to name
    assert where("part") == "part"
    assert where("core pin 1") == "core pin 1"


def test_a_place_in_a_file_is_no_key_of_a_spec() -> None:
    assert [is_key(text) for text in ("blocks", "blocks.length", "ejection.pins[0].at", "marks[1]")] == [True] * 4
    assert [is_key(text) for text in ("part.yaml:2:1", "core pin 1", "", "nothing.here")] == [False] * 4
