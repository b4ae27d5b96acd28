"""Outputs that many tests look at: each is built once, by the real command line, in a process of its own."""

from __future__ import annotations

import subprocess
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import pytest
from helpers.command import TESTS, moldgen
from helpers.small_specs import CUP, spec

SPECS = TESTS.parent / "specs"


@dataclass(frozen=True)
class Built:
    """One run of the command line and the folder it wrote."""

    done: subprocess.CompletedProcess[str]
    folder: Path


@pytest.fixture(scope="session")
def demo(tmp_path_factory: pytest.TempPathFactory, shared_cache: str) -> Callable[[str], Built]:
    """Build a demo of specs/ when it is first asked for."""

    @cache
    def built(name: str) -> Built:
        start = tmp_path_factory.mktemp(name)
        build = ("build", SPECS / name / "spec.yaml")
        done = moldgen(*build, folder=start, timeout=300, PYTHONHASHSEED="1", MOLDGEN_CACHE=shared_cache)
        return Built(done, start / "out" / name)

    return built


@pytest.fixture(scope="session")
def cup(tmp_path_factory: pytest.TempPathFactory, shared_cache: str) -> Built:
    """A cup with one core pin, built without pictures; tests that change the folder copy it first."""
    start = tmp_path_factory.mktemp("cup")
    build = ("build", spec(start, CUP, "pull: +z\n", name="cup"), "--no-pictures", "--quiet")
    done = moldgen(*build, folder=start, timeout=120, MOLDGEN_CACHE=shared_cache)
    return Built(done, start / "out" / "cup")
