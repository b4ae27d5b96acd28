"""What becomes of blocks that are larger or smaller than the old ones while their form stays."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Pnt

from moldgen.errors import KernelError
from moldgen.model.part import UPRIGHT, MoldFrame
from moldgen.model.revision import Comparison, Fate
from moldgen.model.tool import Role
from moldgen.output.compare_words import steel_words, verdict
from moldgen.revision.causes import Causes
from moldgen.revision.placing import Placing
from moldgen.revision.steel import compare_steel
from moldgen.revision.tool_record import SteelPart, ToolRecord
from tests.helpers.comparisons import AS_DRAWN
from tests.kernel_io.test_step_read import write_raw

FRAME = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), UPRIGHT)


@pytest.fixture
def tool_with(tmp_path: Path) -> Any:
    """A tool whose core is a bare block from z = -20 to 0, about the origin in plan; pockets are left out."""

    def tool(length: float) -> ToolRecord:
        low, high = (-length / 2, -20.0, -20.0), (length / 2, 20.0, 20.0)
        file = tmp_path / f"core_{length:g}.step"
        write_raw(BRepPrimAPI_MakeBox(gp_Pnt(*low), gp_Pnt(high[0], high[1], 0.0)).Solid(), file)
        core = SteelPart("core", Role.CORE, "1.2311", ((0.0, 0.0, 0.0),), file)
        return ToolRecord("cap", {"layout": {"ejector_pins": [], "core_pins": []}}, FRAME, (low, high), (core,))

    return tool


@pytest.mark.parametrize(
    ("was", "now", "fate", "words"),
    [
        (80.0, 100.0, Fate.NEW, "the block must grow from 80 x 40 x 40 to 100 x 40 x 40 mm"),
        (100.0, 80.0, Fate.UNCHANGED, "a smaller block would do"),
        (80.0, 80.0, Fate.UNCHANGED, ""),
    ],
)
def test_a_block_that_must_grow_is_new_though_its_form_stays(
    was: float, now: float, fate: Fate, words: str, tool_with: Any
) -> None:
    found, findings = compare_steel(tool_with(was), tool_with(now), Placing(), Causes(FRAME, (), ()))
    assert findings == ()
    (core,) = (c.change for c in found)
    assert core.fate is fate
    assert core.note.startswith(words)
    assert bool(core.note) is bool(words)


def test_what_the_kernel_cannot_compare_is_called_so_and_is_never_steel_safe(
    tool_with: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    def give_up(*_: object) -> None:
        raise KernelError("the kernel did not end within 20 s")

    monkeypatch.setattr("moldgen.revision.steel.solid_difference", give_up)
    found, (finding,) = compare_steel(tool_with(80.0), tool_with(100.0), Placing(), Causes(FRAME, (), ()))
    changes = tuple(c.change for c in found)
    assert [(c.fate, c.note) for c in changes] == [(Fate.NOT_COMPARED, "the kernel did not end within 20 s")]
    assert finding.code == "compare.not_compared"
    compared = Comparison("cap", "cap", AS_DRAWN, (), changes, (), ())
    assert not compared.steel_safe
    assert verdict(compared) == "1 component could not be compared."
    assert steel_words(compared) == "Not known to be steel-safe: not every component could be compared."
