"""Pins and gate of a part with a slide: built and proved; a gate or a pin that is asked for in the way is told."""

from __future__ import annotations

from pathlib import Path

import pytest
from helpers.command import moldgen
from helpers.outputs import findings, manifest, unproved
from helpers.small_specs import NOTCHED, spec

pytestmark = pytest.mark.slow

PLAIN = "shrink: 0\noutput: {pictures: false}\n"


def test_a_notched_block_is_built_and_proved(tmp_path: Path) -> None:
    done = moldgen("build", spec(tmp_path, NOTCHED, PLAIN), "--quiet", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    record = manifest(tmp_path / "out" / "part")
    assert not unproved(record)
    assert any(c["name"] == "slide 1" for c in record["components"])
    # the slide leaves to +x from its notch, y from -3 to 7
    place = record["layout"]["gate"]["at"]
    assert not (place[0] > 14.9 and -5.0 < place[1] < 9.0)


def test_a_gate_that_is_asked_for_before_the_slide_is_told(tmp_path: Path) -> None:
    text = "gate: {kind: edge, at: [15, 2, 0]}\n"
    done = moldgen("build", spec(tmp_path, NOTCHED, PLAIN, text), "--quiet", folder=tmp_path)
    assert done.returncode == 1, done.stderr
    record = manifest(tmp_path / "out" / "part")
    (finding,) = findings(record, "gate.bad_place")
    assert "a slide leaves here" in finding["message"]
