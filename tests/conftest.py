"""Fixtures for every area."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

CHECKOUT = Path(__file__).resolve().parents[1]


@pytest.fixture(scope="session")
def real_parts() -> Path:
    """A folder of real STEP parts, no part of the project: MOLDGEN_PARTS, else shared/parts beside the checkout."""
    folder = Path(os.environ.get("MOLDGEN_PARTS") or CHECKOUT.parent / "shared" / "parts")
    if not any(folder.glob("*.step")):
        pytest.skip(f"no real parts: set MOLDGEN_PARTS to a folder of STEP files (looked in {folder.name})")
    return folder
