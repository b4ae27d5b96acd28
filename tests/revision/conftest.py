"""The tools of the scripted changes: each version is built once, in this process and without pictures."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from moldgen.flow.build import build_tool
from moldgen.flow.job import Options
from moldgen.flow.stages import Stages
from moldgen.flow.tell import silent
from moldgen.kernel.features import build_recipe
from moldgen.memory import Forgetful
from moldgen.spec.load import load_spec
from moldgen.spec.recipe import Recipe
from tests.kernel_io.test_step_read import write_raw
from tests.revision.part_changes import Version


def solid_of(version: Version) -> Any:
    """Return the part as its recipe makes it."""
    return build_recipe(Recipe.model_validate(version.recipe()).resolve())


@pytest.fixture(scope="session")
def tool_of(tmp_path_factory: pytest.TempPathFactory) -> Callable[[Version], Path]:
    """Build the tool of a version when it is first asked for, and return its output folder."""
    made: dict[str, Path] = {}

    def folder_of(version: Version) -> Path:
        name = json.dumps([version.as_spec(version.recipe()), getattr(version.rewritten, "__name__", "")])
        if name not in made:
            folder = tmp_path_factory.mktemp("version")
            part: dict[str, Any] = {"recipe": version.recipe()}
            if version.rewritten is not None:
                part = {"file": write_raw(version.rewritten(solid_of(version)), folder / "part.step").name}
            spec = folder / "cap.yaml"
            spec.write_text(json.dumps(version.as_spec(part)), encoding="utf-8")
            out = folder / "cap"
            out.mkdir()
            result = build_tool(load_spec(spec), out, Options(pictures=False), Stages(Forgetful(), silent()))
            assert [proof.name for proof in result.proofs if not proof.passed] == []
            made[name] = out
        return made[name]

    return folder_of
