"""Pieces of a component that stands at several places: one for each copy, each a solid of its own in the STEP file."""

from __future__ import annotations

from pathlib import Path

from OCP.BRepPrimAPI import BRepPrimAPI_MakeCylinder
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt

from moldgen.kernel.measure import bounding_box, volume
from moldgen.kernel.step_read import read_assembly
from moldgen.kernel.step_write import Looks, write_assembly
from moldgen.model.part import UPRIGHT, MoldFrame
from moldgen.model.revision import Fate
from moldgen.model.tool import Component, Motion, Role
from moldgen.revision.causes import Causes
from moldgen.revision.placing import Placing
from moldgen.revision.steel import compare_steel
from moldgen.revision.tool_record import SteelPart, ToolRecord
from tests.kernel_io.test_step_read import write_raw

FRAME = MoldFrame((1.0, 1.0, 1.0), (0.0, 0.0, 0.0), UPRIGHT)
PLACES = ((0.0, 0.0, -60.0), (20.0, 0.0, -60.0), (0.0, 15.0, -60.0))


def pins(folder: Path, length: float) -> ToolRecord:
    """A tool of three equal pins of d 4 mm."""
    file = write_raw(BRepPrimAPI_MakeCylinder(2.0, length).Solid(), folder / f"pin_{length:g}.step")
    pin = SteelPart("ejector pin", Role.EJECTOR_PIN, "1.2344", PLACES, file)
    block = ((-40.0, -40.0, -60.0), (40.0, 40.0, 40.0))
    return ToolRecord("cap", {"layout": {"ejector_pins": [], "core_pins": []}}, FRAME, block, (pin,))


def test_every_copy_of_a_shortened_pin_has_its_piece_in_the_step_file(tmp_path: Path) -> None:
    found, _ = compare_steel(pins(tmp_path, 60.0), pins(tmp_path, 59.5), Placing(), Causes(FRAME, (), ()))
    (shorter,) = found
    assert shorter.change.fate is Fate.CUT
    assert [piece.number for piece in shorter.change.pieces] == [1, 2, 3]
    listed = [
        Component(f"cut {n}", Role.CORE, body.solid, "1.2344", Motion.CORE_HALF)
        for n, body in enumerate(shorter.pieces, start=1)
    ]
    write_assembly(listed, tmp_path / "pieces.step", Looks({}))
    read = read_assembly(tmp_path / "pieces.step")
    assert len(read) == len(PLACES)
    middles = []
    for _, solid in read:
        assert abs(volume(solid) - 3.14159265 * 4.0 * 0.5) < 1e-5
        low, high = bounding_box(solid)
        middles.append(tuple(round(float(v), 3) + 0.0 for v in 0.5 * (low + high)))
    assert sorted(middles) == sorted((x, y, z + 59.75) for x, y, z in PLACES)


def test_an_angled_pin_is_known_by_where_it_was_built(tmp_path: Path) -> None:
    """A slide came in front of the old one, so that its pin is called 2 now; by their files all stand at the origin."""

    def tool(*places: float) -> ToolRecord:
        parts = []
        for number, x in enumerate(places, start=1):
            upright = gp_Ax2(gp_Pnt(x, 0.0, 0.0), gp_Dir(0.2, 0.0, 1.0))
            file = tmp_path / f"pin_{len(places)}_{number}.step"
            write_raw(BRepPrimAPI_MakeCylinder(upright, 4.0, 60.0).Solid(), file)
            name = f"angled pin of slide {number}"
            parts.append(SteelPart(name, Role.ANGLED_PIN, "1.2210", ((0.0, 0.0, 0.0),), file))
        block = ((-90.0, -40.0, -60.0), (90.0, 40.0, 60.0))
        return ToolRecord("cap", {"layout": {"ejector_pins": [], "core_pins": []}}, FRAME, block, tuple(parts))

    found, _ = compare_steel(tool(40.0), tool(-60.0, 40.0), Placing(), Causes(FRAME, (), ()))
    told = {c.change.new: (c.change.fate, c.change.old) for c in found}
    assert told == {
        "angled pin of slide 1": (Fate.NEW, ""),
        "angled pin of slide 2": (Fate.UNCHANGED, "angled pin of slide 1"),
    }
