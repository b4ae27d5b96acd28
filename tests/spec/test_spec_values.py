"""What the loaded spec holds: numbers in mm, deg and percent, None for auto, defaults where nothing is written."""

from __future__ import annotations

import hashlib
import math
import pickle
from pathlib import Path

import pytest
from pydantic import ValidationError

from moldgen.spec.load import load_spec
from moldgen.spec.pull import FaceNormal

HEAD = "part: {file: lid.step}\nresin: ABS\n"


@pytest.fixture
def load(tmp_path):
    """Return the loaded spec of a text appended to the least spec."""

    def read(text: str = "", head: str = HEAD, **options):
        path = tmp_path / "rain lid.yaml"
        path.write_text(head + text)
        return load_spec(path, **options)

    return read


def test_the_least_spec_is_all_auto(load):
    spec = load().spec
    assert spec.name == "rain lid"
    assert spec.pull.direction is None
    assert spec.shrink.percent is None
    assert spec.shrink.convention == "mold"
    assert spec.gate.kind == "auto"
    assert spec.gate.at is None
    assert spec.ejection.pins is None
    assert spec.ejection.add is True
    assert spec.blocks.material == "1.2311"


def test_units_are_converted_everywhere(load):
    spec = load(
        "gate: {kind: edge, width: 1/8 in, depth: 40 thou, at: [1 in, 2, -3 mm]}\n"
        "draft: {minimum: 30 arcmin, texture_depth: 25 um}\n"
        "blocks: {length: 8 in, width: 20 cm, wall: 1e1}\n"
        "parting: {height: -0.5 in}\n"
        "shrink: 0.006 in/in\n"
    ).spec
    assert spec.gate.width == pytest.approx(3.175)
    assert spec.gate.depth == pytest.approx(1.016)
    assert spec.gate.at == (25.4, 2.0, -3.0)
    assert spec.draft.minimum == pytest.approx(0.5)
    assert spec.draft.texture_depth == pytest.approx(0.025)
    assert (spec.blocks.length, spec.blocks.width, spec.blocks.wall) == (203.2, 200.0, 10.0)
    assert spec.parting.height == -12.7
    assert spec.shrink.percent == pytest.approx((0.6, 0.6, 0.6))


@pytest.mark.parametrize(
    ("written", "direction"),
    [
        ("auto", None),
        ("+z", (0, 0, 1)),
        ('"-x"', (-1, 0, 0)),
        ("Y", (0, 1, 0)),
        ("[0, 0, -5]", (0, 0, -1)),
        ("[3, 0, 4]", (0.6, 0, 0.8)),
        ("[1e-200, 0, 0]", (1, 0, 0)),
        ("face at 1, 2 mm, 0.5 in", FaceNormal((1.0, 2.0, 12.7))),
        ("{direction: +y, search: axes}", (0, 1, 0)),
        ("{search: axes}", None),
    ],
)
def test_pull(load, written, direction):
    found = load(f"pull: {written}\n").spec.pull.direction
    if isinstance(direction, tuple):
        assert found == pytest.approx(direction, abs=1e-15)
        assert math.hypot(*found) == pytest.approx(1.0)
    else:
        assert found == direction


@pytest.mark.parametrize(
    ("written", "percent", "fixed"),
    [
        ("auto", None, "origin"),
        ("0.5 %", (0.5, 0.5, 0.5), "origin"),
        ("0", (0, 0, 0), "origin"),
        ("{x: 1, y: 2 %, z: 0.4}", (1, 2, 0.4), "origin"),
        ("{all: 1, fixed_point: center}", (1, 1, 1), "centre"),
        ("{fixed_point: [1, 2, 1 in]}", None, (1, 2, 25.4)),
    ],
)
def test_shrink(load, written, percent, fixed):
    shrink = load(f"shrink: {written}\n").spec.shrink
    assert shrink.percent == percent
    assert shrink.fixed_point == fixed


def test_a_shrink_that_looks_like_a_slip_is_a_finding_not_an_error(load):
    assert load("shrink: 19.9\n").findings == ()
    (large,) = load("shrink: 21 %\n").findings
    assert (large.code, large.value, large.limit) == ("shrink.large", 21.0, 20.0)
    assert large.where.endswith("rain lid.yaml:3:9")
    (small,) = load("shrink: 0.005\n").findings
    assert small.code == "shrink.small"
    assert '"0.005 mm/mm"' in small.remedy


def test_names_keep_the_text_they_were_written_with(load):
    spec = load("name: 0042\nblocks: {material: 1.2343, core_material: h13}\n").spec
    assert spec.name == "0042"
    assert spec.blocks.material == "1.2343"
    assert spec.blocks.core_material == "1.2344", "the catalog's own name of H13"
    assert load(head="part: {file: a.step}\nresin: pa 66 gf30\n").spec.resin == "PA66-GF30"


def test_given_pins_are_all_pins_unless_add_is_true(load):
    pins = "pins: [{at: [1, 2, 3], diameter: 3}, {at: [4, 5, 6]}]"
    given = load(f"ejection: {{{pins}}}\n").spec.ejection
    assert given.add is False
    assert [p.diameter for p in given.pins] == [3.0, None]
    assert load(f"ejection: {{{pins}, add: true}}\n").spec.ejection.add is True
    assert load("ejection: {pins: []}\n").spec.ejection.pins == ()


def test_an_empty_section_means_its_defaults(load):
    assert load("gate:\nmarks:\n# nothing\n").spec == load().spec


def test_solid_by_number_or_name(load):
    assert load(head="part: {file: a.step, solid: 2}\nresin: PP\n").spec.part.solid == 2
    assert load(head="part: {file: a.step, solid: '2'}\nresin: PP\n").spec.part.solid == "2"


def test_recipe_in_the_spec(load):
    head = "part:\n  recipe:\n    parameters: {wall: 0.1 in}\n    features:\n"
    head += "      - {feature: block, name: base, size: [40, 30.5, wall * 2]}\nresin: PP\n"
    loaded = load(head=head)
    assert loaded.part_file is None
    (block,) = loaded.spec.part.recipe.resolve().features
    assert block.values["size"] == pytest.approx((40.0, 30.5, 5.08))
    assert loaded.locate(("part", "recipe", "features", 0, "size")).endswith(":5:38")


def test_aliases_share_a_value(load):
    spec = load("core_pins: {at: [&p [1, 2, 3]]}\ngate: {at: *p}\n").spec
    assert spec.gate.at == spec.core_pins.at[0] == (1.0, 2.0, 3.0)


def test_locate_points_at_keys_as_the_user_named_the_file(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("specs").mkdir()
    Path("specs/lid.yaml").write_text(HEAD + "gate:\n  at: [1, 2, 3]\nmarks:\n- face: [0, 0, 0]\n  no_gate: true\n")
    loaded = load_spec("specs/lid.yaml")
    assert loaded.locate(("gate", "at")) == "specs/lid.yaml:4:3"
    assert loaded.locate("gate.at") == "specs/lid.yaml:4:3"
    assert loaded.locate(("marks", 0, "face")) == loaded.locate("marks.0.face") == "specs/lid.yaml:6:3"
    assert loaded.locate("gate.land") == "specs/lid.yaml:3:1", "an unwritten key is located at its section"
    assert loaded.locate("draft") == "specs/lid.yaml:1:1"
    assert loaded.part_file == Path("specs/lid.step")
    assert loaded.sha256 == hashlib.sha256(Path("specs/lid.yaml").read_bytes()).hexdigest()


def test_code_is_allowed_only_by_the_caller(load):
    loaded = load(head="part: {function: 'parts/lid.py:make'}\nresin: PP\n", allow_code=True)
    assert loaded.part_file == loaded.folder / "parts/lid.py"


def test_the_loaded_spec_is_frozen_and_travels_between_processes(load):
    loaded = load("pull: face at 1, 2, 3\ngate: {at: [1, 2, 3]}\n")
    with pytest.raises(ValidationError, match="frozen"):
        loaded.spec.gate.kind = "pin"
    again = pickle.loads(pickle.dumps(loaded))
    assert again.spec == loaded.spec
    assert again.locate("gate.at") == loaded.locate("gate.at")


def test_a_byte_order_mark_is_no_part_of_the_text(tmp_path):
    path = tmp_path / "lid.yaml"
    path.write_bytes(b"\xef\xbb\xbf" + HEAD.encode() + "name: Gehäuse\r\n".encode())
    assert load_spec(path).spec.name == "Gehäuse"
