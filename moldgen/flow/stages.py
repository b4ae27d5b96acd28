"""The stages of a build, each kept under a key made of all that it depends on, so that it runs only when that changes.

The key of a stage is a hash of its declared inputs (values of the spec, files by content, earlier stages by their own
keys) and of everything that computes (see `moldgen.flow.versions`): never of times or paths. What a stage makes is
always frozen and thawed, whether it was kept or made just now, so that both ways lead to the same bytes.
"""

from __future__ import annotations

import json
import pickle
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Generic, TypeVar, cast

from moldgen.canon import EXACT, sha256_bytes, sha256_json
from moldgen.errors import PartError
from moldgen.flow.tell import Tell
from moldgen.flow.versions import Versioned
from moldgen.kernel.frozen import freeze, thaw
from moldgen.kernel.rehearse import times_given_up
from moldgen.memory import Memory

T = TypeVar("T")

AS_BEFORE = "as before"
"""What a stage shows that did not run."""

_MADE, _REFUSED = b"made:", b"refused:"


@dataclass(frozen=True)
class StageRun:
    """What became of one stage: `inputs` is the hash of each declared input by its name."""

    name: str
    kept: bool
    inputs: dict[str, str]


class Made(Generic[T]):
    """What a stage made. `key` names it; `value` is thawed when first asked for."""

    def __init__(self, key: str, data: bytes) -> None:
        self.key = key
        self._data = data

    @cached_property
    def value(self) -> T:
        """The result itself."""
        return cast("T", thaw(self._data))

    def __reduce__(self) -> Any:
        raise TypeError("a stage keeps values, not what another stage made")


class Asked(Generic[T]):
    """A stage whose inputs are known: `made` is what it made of them before, None if it must run."""

    def __init__(self, stages: Stages, name: str, inputs: Mapping[str, object], *, lasting: bool = True) -> None:
        hashes = {key: _hash(value) for key, value in inputs.items()}
        self._memory, self._lasting = stages.memory, lasting
        self._key = sha256_json({"stage": name, "inputs": hashes})
        data = self._memory.recall(self._key) if lasting else None
        stages.runs.append(StageRun(stages.numbered(name), data is not None, hashes))
        self._given_up = times_given_up()
        self.made: Made[T] | None = None
        if data is not None:
            with stages.tell.stage(name) as stage:
                stage.detail = AS_BEFORE
            if data.startswith(_REFUSED):
                raise cast("PartError", pickle.loads(data[len(_REFUSED) :]))  # noqa: S301  the store holds only our own
            self.made = Made(self._key, data[len(_MADE) :])

    def keep(self, value: T) -> Made[T]:
        """Return what the stage made, now that it ran."""
        data = freeze(value)
        if self._lasting:
            self._memory.keep(self._key, _MADE + data)
        self.made = Made(self._key if self._lasting else sha256_bytes(data), data)
        return self.made

    def refuse(self, error: PartError) -> None:
        """Remember that the stage refused the part, unless a limit of time had to do with it: that may pass."""
        if self._lasting and times_given_up() == self._given_up:
            self._memory.keep(self._key, _REFUSED + pickle.dumps(error))


class Stages:
    """Runs the stages of one build, or recalls what they made before; `runs` tells which.

    memory : what was kept by the same versions of everything that computes
    """

    def __init__(self, memory: Memory, tell: Tell) -> None:
        self.memory = Versioned(memory)
        self.tell = tell
        self.runs: list[StageRun] = []

    def make(self, name: str, inputs: Mapping[str, object], work: Callable[[], T], *, lasting: bool = True) -> Made[T]:
        """Return what `work` makes of the inputs.

        Parameters
        ----------
        inputs : all that `work` depends on, by names for the reader: plain values, dataclasses, results of stages
        work : a function of nothing but these; it tells its own progress
        lasting : False where the inputs do not say all (the user's own function): then it runs every time, and what it
            made is named by its content

        Raises
        ------
        PartError : `work` refused the part, now or when it ran before
        """
        asked: Asked[T] = self.ask(name, inputs, lasting=lasting)
        if asked.made is not None:
            return asked.made
        try:
            return asked.keep(work())
        except PartError as error:
            asked.refuse(error)
            raise

    def ask(self, name: str, inputs: Mapping[str, object], *, lasting: bool = True) -> Asked[Any]:
        """Return what the stage made of these inputs before, for work that does not fit into one call; see `make`."""
        return Asked(self, name, inputs, lasting=lasting)

    def numbered(self, name: str) -> str:
        """Return the name under which the next run of a stage is told: "part the mold (2)" for the second one."""
        before = sum(run.name == name or run.name.startswith(f"{name} (") for run in self.runs)
        return f"{name} ({before + 1})" if before else name


def _hash(value: object) -> str:
    return value.key if isinstance(value, Made) else sha256_json(value, EXACT)  # the last digit reaches the bytes


def reasons(runs: list[StageRun], before: Mapping[str, Mapping[str, str]] | None) -> dict[str, str]:
    """Return why each stage ran or did not, in order; `before`: the inputs of the last run, by stage."""
    return {run.name: _reason(run, before) for run in runs}


def _reason(run: StageRun, before: Mapping[str, Mapping[str, str]] | None) -> str:
    last = None if before is None else before.get(run.name)
    if run.kept:
        same = last is None or dict(last) == run.inputs
        return "kept: nothing it depends on has changed" if same else "kept: it was made of these inputs before"
    if before is None:
        return "ran: no earlier run of this output is known"
    if last is None:
        return "ran: the last run had no such stage"
    changed = sorted(key for key in {*last, *run.inputs} if last.get(key) != run.inputs.get(key))
    return f"ran: changed: {', '.join(changed)}" if changed else "ran: its result was not kept"


def runs_as_text(runs: list[StageRun]) -> str:
    """Return what a later run needs to tell its reasons."""
    return json.dumps({run.name: run.inputs for run in runs}, sort_keys=True)


def runs_from_text(text: str | None) -> dict[str, dict[str, str]] | None:
    """Return what `runs_as_text` wrote, None for nothing or for something else."""
    try:
        record = json.loads(text or "")
        return {str(name): {str(k): str(v) for k, v in inputs.items()} for name, inputs in record.items()}
    except (ValueError, AttributeError):
        return None
