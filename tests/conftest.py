"""Fixtures for every area."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

CHECKOUT = Path(__file__).resolve().parents[1]

os.environ["MOLDGEN_CACHE"] = "off"  # tests see what is computed now; those of the cache name a folder of their own


@pytest.fixture(scope="session")
def real_parts() -> Path:
    """A folder of real STEP parts, no part of the project: MOLDGEN_PARTS, else shared/parts beside the checkout."""
    folder = Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts")
    if not any(folder.glob("*.step")):
        pytest.skip(f"no real parts: set MOLDGEN_PARTS to a folder of STEP files (looked in {folder.name})")
    return folder


@pytest.fixture(scope="session")
def shared_cache(tmp_path_factory: pytest.TempPathFactory) -> str:
    """A cache of this test run, for builds whose stages others need too; several processes of a run share it."""
    folder = tmp_path_factory.getbasetemp()
    folder = folder.parent if "PYTEST_XDIST_WORKER" in os.environ else folder
    return str(folder / "cache")


def pytest_collection_modifyitems(config: pytest.Config, items: list[pytest.Item]) -> None:
    """Leave out the long sweeps unless the marker is asked for: whatever else ``-m`` says, they are not meant."""
    if "sweep" in config.option.markexpr:
        return
    long = [item for item in items if item.get_closest_marker("sweep")]
    if long:
        config.hook.pytest_deselected(items=long)
        items[:] = [item for item in items if not item.get_closest_marker("sweep")]
