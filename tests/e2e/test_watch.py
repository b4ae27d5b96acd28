"""Issue 4, item 5, on real builds: edit, break and mend a spec while it is watched."""

from __future__ import annotations

from pathlib import Path

import pytest
from helpers.outputs import manifest, snapshot
from helpers.small_specs import CUP, spec
from helpers.watching import Watching, gone

pytestmark = pytest.mark.slow

GIVEN = "pull: +z\nejection: {pins: [{at: [-10, -8, 14], diameter: 3}, {at: [-10, 8, 14], diameter: 3}, %s]}\n"
THIRD, MOVED = "{at: [12, -8, 14], diameter: 3}", "{at: [14, -8, 14], diameter: 3}"


def test_a_spec_is_edited_broken_and_mended_while_it_is_watched(tmp_path: Path) -> None:
    path = spec(tmp_path, CUP, GIVEN % THIRD, name="cup")
    own = {"MOLDGEN_CACHE": str(tmp_path / "kept")}
    with Watching(tmp_path, "cup.yaml", "--no-pictures", "--quiet", **own) as watching:
        first = watching.line(120)
        assert "cup: " in first
        assert "components, " in first

        spec(tmp_path, CUP, GIVEN % MOVED, name="cup")
        moved = watching.line(120)
        assert "ejector pin 3 moved by 2.0" in moved  # 2 mm of the part, with its shrink
        assert "core" in moved.partition(" recut")[0]
        assert "unchanged" in moved
        before = snapshot(tmp_path / "out" / "cup")

        path.write_text("resin: ABS\npart: {recipe: {}}\n", encoding="utf-8")
        broken = watching.line(30)
        assert "broken" in broken
        assert "cup.yaml:2:" in broken
        assert snapshot(tmp_path / "out" / "cup") == before, "the old output stays"

        spec(tmp_path, CUP, GIVEN % THIRD, name="cup")
        back = watching.line(120)
        assert "ejector pin 3 moved by -2.0" in back
        x = manifest(tmp_path / "out" / "cup")["layout"]["ejector_pins"][2]["x"]
        assert x == pytest.approx(12.0, rel=0.01)

        left = watching.workers()
        watching.end()
        assert watching.process.returncode == 130
        assert gone(left)
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["cup"]
