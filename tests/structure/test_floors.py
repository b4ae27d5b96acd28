"""The house (DEVELOPERS.md): a module imports only from lower floors, or from its own folder; there are no cycles."""

from __future__ import annotations

import subprocess
import sys

import pytest
from helpers.command import environment
from helpers.source import FLOORS, imported, modules, room

KERNEL_LIBRARIES = {"cadquery", "OCP", "manifold3d", "trimesh", "embreex"}
TERMINAL_LIBRARIES = {"click", "rich"}
TALKERS = {"moldgen.cli", "moldgen.flow.progress", "moldgen.flow.batch_progress"}


@pytest.mark.parametrize("module", modules())
def test_every_module_has_a_floor_and_imports_only_downhill(module: str) -> None:
    assert room(module) in FLOORS, f"give moldgen/{room(module)} a floor in tests/helpers/source.py"
    for other in sorted(name for name in imported(module) if name.partition(".")[0] == "moldgen"):
        if other == "moldgen" or room(other) == room(module):
            continue
        ours, its = FLOORS[room(module)], FLOORS[room(other)]
        assert its < ours or its == ours == 0, f"{module} (floor {ours}) imports {other} (floor {its})"


@pytest.mark.parametrize("module", [m for m in modules() if room(m) == "kernel"])
def test_the_kernel_knows_only_words_and_models_of_ours(module: str) -> None:
    others = {name for name in imported(module) if name.startswith("moldgen.") and room(name) != "kernel"}
    assert {name for name in others if FLOORS[room(name)] > 1} == set()


@pytest.mark.parametrize("module", [m for m in modules() if room(m) != "kernel"])
def test_only_the_kernel_folder_imports_the_kernel(module: str) -> None:
    assert {name.partition(".")[0] for name in imported(module)} & KERNEL_LIBRARIES == set()


@pytest.mark.parametrize("module", [m for m in modules() if m not in TALKERS])
def test_only_the_command_line_and_the_progress_talk_to_the_terminal(module: str) -> None:
    assert {name.partition(".")[0] for name in imported(module)} & TERMINAL_LIBRARIES == set()


def test_there_are_no_import_cycles() -> None:
    done: set[str] = set()

    def visit(module: str, path: tuple[str, ...]) -> None:
        assert module not in path, "cycle: " + " -> ".join((*path[path.index(module) :], module))
        if module not in done:
            for other in sorted(imported(module, at_run_time=True) & modules().keys()):
                visit(other, (*path, module))
            done.add(module)

    for module in modules():
        visit(module, ())


def test_below_the_kernel_nothing_loads_it() -> None:
    light = sorted(m for m in modules() if FLOORS[room(m)] < FLOORS["kernel"])
    code = f"import importlib, sys; [importlib.import_module(m) for m in {light}]; print(sorted(sys.modules))"
    command = [sys.executable, "-c", code]
    done = subprocess.run(command, env=environment(), capture_output=True, text=True, check=True)
    assert not KERNEL_LIBRARIES & {name.partition(".")[0] for name in done.stdout.split("'")}
