"""Every mistake is located by line and column and says what to do: design section 2, issue 2 item 2."""

from __future__ import annotations

import pickle

import pytest

from moldgen.errors import SpecError, SpecErrors
from moldgen.spec.load import MAX_BYTES, load_spec

HEAD = "part: {file: lid.step}\nresin: ABS\n"


@pytest.fixture
def mistakes(tmp_path, monkeypatch):
    """Return the mistakes of a spec text as (line:column, text) in their order."""

    def load(text: str | bytes) -> list[tuple[str, str]]:
        monkeypatch.chdir(tmp_path)
        data = text if isinstance(text, bytes) else text.encode()
        (tmp_path / "lid.yaml").write_bytes(data)
        with pytest.raises(SpecError) as caught:
            load_spec("lid.yaml")
        errors = caught.value.errors if isinstance(caught.value, SpecErrors) else [caught.value]
        for error in errors:
            assert error.where == "lid.yaml" or error.where.startswith("lid.yaml:"), "named as the user named it"
            assert error.remedy
        return [(e.where.removeprefix("lid.yaml").removeprefix(":"), f"{e.what} / {e.remedy}") for e in errors]

    return load


def _(text: str, place: str, *said: str):
    return pytest.param(text, place, said, id=said[0].replace(" ", "_")[:40])


KEYS = [
    _(HEAD + "gaet:\n  kind: edge\n", "3:1", "unknown key `gaet`", "`gate`"),
    _(HEAD + "gate:\n  kind: edge\n  widht: 2\n", "5:3", "unknown key `widht` in gate", "`width`"),
    _(HEAD + "gate: {kind: edge, wall: 2}\n", "3:20", "unknown key `wall`", "is a key of blocks", "known keys in gate"),
    _(HEAD + "zzz: 1\n", "3:1", "unknown key `zzz`", "known keys here: blocks,"),
    _(
        HEAD + "ejection:\n  pins:\n    - at: [1, 2, 3]\n      diamter: 3\n",
        "6:7",
        "unknown key `diamter`",
        "`diameter`",
    ),
    _(HEAD + "marks:\n- {face: [0, 0, 1], no_gat: true}\n", "4:21", "`no_gat` in marks[0]", "`no_gate`"),
    _("resin: ABS\n", "1:1", "the key `part` is missing", "STEP file"),
    _("part: {file: a.step}\n", "1:1", "the key `resin` is missing"),
    _(HEAD + "ejection:\n  pins: [{diameter: 2}]\n", "4:10", "`at` is missing in ejection.pins[0]"),
    _(HEAD + "resin: PP\n", "3:1", "the key `resin` is written twice", "lid.yaml:2:1"),
    _(HEAD + "gate:\n  land: 1\n  land: 2\n", "5:3", "the key `land` is written twice", "lid.yaml:4:3"),
    _(HEAD + "1: 2\n", "3:1", "unknown key `1`"),
    _(HEAD + "? [a, b]\n: 1\n", "3:3", "a key must be plain text"),
]

VALUES = [
    _(HEAD + "gate:\n  kind: egde\n", "4:9", '"egde" is not one of auto, edge, pin, sprue', "did you mean edge?"),
    _(HEAD + "gate:\n  kind: edge\n  width: 5 kg\n", "5:10", '"5 kg" is not a length', 'a length such as "0.5 in"'),
    _(HEAD + "gate:\n  land: -1\n", "4:9", "gate.land: -1 mm is out of range: it must be more than 0 mm"),
    _(HEAD + "gate:\n  land: 0\n", "4:9", "0 mm is out of range"),
    _(HEAD + "blocks:\n  length: 11 m\n", "4:11", "11000 mm is out of range: it must be at most 10000 mm"),
    _(HEAD + "gate:\n  land:\n", "4:3", "gate.land: the value is missing"),
    _(HEAD + "gate:\n  land: .inf\n", "4:9", "not a finite number"),
    _(HEAD + "gate:\n  land: .nan\n", "4:9", "not a finite number"),
    _(HEAD + "gate:\n  land: true\n", "4:9", "True is not a length"),
    _(HEAD + "gate:\n  at: [1, 2]\n", "4:7", "gate.at: [1, 2] is not a point", "three numbers"),
    _(HEAD + "gate:\n  at: [1, 2 deg, 3]\n", "4:11", 'gate.at[1]: "2 deg" is not a length'),
    _(HEAD + "gate: {kind: edge, diameter: 2}\n", "3:7", "diameter belongs to a gate of kind pin or sprue"),
    _(HEAD + "gate: {width: 2}\n", "3:7", "width belongs to a gate of kind edge, and kind is auto", "kind: edge"),
    _(HEAD + "gate: edge\n", "3:7", 'gate: "edge" is not a section'),
    _(HEAD + "draft: {minimum: 46}\n", "3:18", "46 deg is out of range: it must be at most 45 deg"),
    _(HEAD + "draft: {minimum: -0.5 deg}\n", "3:18", "it must be at least 0 deg"),
    _(HEAD + "draft: {minimum: 5 %}\n", "3:18", '"5 %" is not an angle', "1.5 deg"),
    _(HEAD + "pull: [0, 0, 0]\n", "3:7", "pull: the pull has length zero"),
    _(HEAD + "pull: up\n", "3:7", '"up" is not a direction', '"+z"'),
    _(HEAD + "pull: face at 1, 2\n", "3:7", "is not a direction", "face at 10, 4, 3"),
    _(HEAD + "pull: {direction: +w}\n", "3:19", '"+w" is not a direction'),
    _(HEAD + "pull: {search: axis}\n", "3:16", '"axis" is not one of axes, full', "did you mean axes?"),
    _(HEAD + "shrink: 100 %\n", "3:9", "shrink: 100 % is out of range", "part / (1 - S)", "50 %"),
    _(HEAD + "shrink: 50\n", "3:9", "it must be less than 50 %"),
    _(HEAD + "shrink: -0.1\n", "3:9", "it must be at least 0 %"),
    _(HEAD + "shrink: {x: 1, y: 2}\n", "3:9", "shrink: 2 of x, y and z are given", "all three"),
    _(HEAD + "shrink: {all: 1, x: 1, y: 1, z: 1}\n", "3:9", "all is given together with x, y or z"),
    _(HEAD + "shrink: {all: 1, fixed_point: middle}\n", "3:31", "middle is not a fixed point", "centre"),
    _(HEAD + "ejection: {pins: auto, add: false}\n", "3:11", "add: false forbids"),
    _(HEAD + "ejection: {pins: [], add: maybe}\n", "3:27", '"maybe" is not true or false'),
    _(HEAD + "core_pins: {at: 5}\n", "3:17", "core_pins.at: 5 is not a list"),
    _(HEAD + "core_pins: {largest: 0}\n", "3:22", "more than 0 mm"),
    _(HEAD + "marks: [{face: [0, 0, 1]}]\n", "3:9", "this mark forbids nothing"),
    _(HEAD + "marks: {face: [0, 0, 1], no_gate: true}\n", "3:8", "marks: a mapping is not a list"),
    _(HEAD + "output: {step: ap203}\n", "3:16", "is not one of ap242, ap214", "did you mean ap"),
    _(HEAD + "name: a/b\n", "3:7", '"a/b" cannot name a folder'),
    _(HEAD + "name: ..\n", "3:7", "cannot name a folder"),
    _(HEAD + "blocks: {material: 1.2312x}\n", "3:20", "unknown tool material '1.2312x'", "1.2312"),
    _("part: {file: a.step}\nresin: ABBS\n", "2:8", "unknown resin 'ABBS'", "nearest: ABS"),
    _("part: {file: a.step}\nresin: [ABS]\n", "2:8", "resin: ['ABS'] is not text"),
    _("part: {file: ''}\nresin: ABS\n", "1:14", "is not a name"),
    _("part: a.step\nresin: ABS\n", "1:7", 'part: "a.step" is not a section'),
    _("part: {}\nresin: ABS\n", "1:7", "one of file, recipe and function; given: none"),
    _("part: {file: a.step, function: 'a.py:f'}\nresin: ABS\n", "1:7", "given: file and function"),
    _("part: {file: a.step, solid: 0}\nresin: ABS\n", "1:29", "there is no solid 0"),
    _("part: {file: a.step, solid: 1.5}\nresin: ABS\n", "1:29", "1.5 is not a solid"),
    _("part: {function: 'a.py'}\nresin: ABS\n", "1:7", "does not name a function"),
    _("part: {function: 'a.py:f'}\nresin: ABS\n", "1:8", "code from a spec does not run", "--allow-code"),
    _(
        "part:\n  recipe:\n    features:\n      - {feature: block, name: b, siz: [1, 2, 3]}\nresin: ABS\n",
        "4:9",
        "feature 'b': key 'size' is missing",
    ),
    _(
        "part:\n  recipe:\n    features:\n      - {feature: block, name: b, size: [1, -2, 3]}\nresin: ABS\n",
        "4:45",
        "feature 'b'",
        "zero",
    ),
]

YAML = [
    _("", "", "the spec is empty", "moldgen new"),
    _("# only a comment\n", "", "the spec is empty"),
    _("- a\n- b\n", "1:1", "not a mapping"),
    _("just words\n", "1:1", "not a mapping"),
    _("part:\n\tfile: a.step\n", "2:1", "a tab indents this line", "spaces"),
    _(HEAD + "gate:\n  kind: edge\n   land: 2\n", "5:8", "a colon is not expected here"),
    _(HEAD + "gate:\n    kind: edge\n  land: 2\n", "5:3", "the indent does not fit"),
    _(HEAD + "gate: {kind: edge\nmarks: []\n", "3:7", "a mapping opens with {"),
    _(HEAD + "gate: {at: [1, 2\nmarks: 1}\n", "3:12", "a list opens with ["),
    _(HEAD + 'name: "lid\n', "3:7", "a quote opens here and is never closed"),
    _(HEAD + "name: @lid\n", "3:7", "must not begin with this character", "quotes"),
    _(HEAD + "---\nname: b\n", "3:1", "a second document begins here"),
    _(HEAD + "name: !!python/object/apply:os.system [echo]\n", "3:7", "is not allowed", "plain data"),
    _(HEAD + "gate: {at: *here}\n", "3:12", "no finished value is named &here"),
    _(HEAD + "gate: &g {at: [*g]}\n", "3:16", "no finished value is named &g"),
    _(HEAD + "name: \x01\n", "3:7", "a character that text cannot hold"),
    _(HEAD + 'name: "\\ud800"\n', "3:7", "half a character"),
    _(HEAD + 'name: "\\U99999999"\n', "", "this is not YAML"),
]


@pytest.mark.parametrize(("text", "place", "said"), KEYS + VALUES + YAML)
def test_the_first_mistake_has_its_place_and_its_remedy(mistakes, text, place, said):
    first_place, words = mistakes(text)[0]
    assert first_place == place
    for part in said:
        assert part in words


def test_several_mistakes_are_reported_at_once_in_the_order_of_the_file(mistakes):
    text = "part: {file: lid.step}\nresin: ABX\ngate:\n  kind: egde\n  widht: 2\n  land: -1\n"
    text += "cooling: {}\nresin: PP\nx: 1\n"
    found = mistakes(text)
    assert [place for place, _ in found] == ["8:1", "2:8", "4:9", "5:3", "6:9", "7:1", "9:1"], "syntax of YAML first"


def test_very_many_mistakes_are_counted(mistakes):
    found = mistakes(HEAD + "".join(f"key{i}: 1\n" for i in range(200)))
    assert len(found) == 31
    assert "and at least 170 more" in found[-1][1]


PLANNED = ["inserts", "cavities", "runner", "cooling", "vents", "base", "press"]


@pytest.mark.parametrize("key", PLANNED)
@pytest.mark.parametrize("value", ["", " 2", " {a: 1}"])
def test_a_section_that_is_not_built_yet_is_refused(mistakes, key, value):
    ((place, words),) = mistakes(f"{HEAD}{key}:{value}\n")
    assert place == "3:1"
    assert "does not build" in words
    assert f"`{key}` would have no effect" in words


@pytest.mark.parametrize(
    ("data", "place", "said"),
    [
        (b"\x89PNG\r\n\x1a\n\x00\x00", "", "binary"),
        ("part: ä".encode("utf-16"), "", "UTF-16"),
        (b"name: caf\xe9\n", "1:10", "0xe9 is not UTF-8"),
        (HEAD.encode() + b"# caf\xe9\n", "3:6", "0xe9 is not UTF-8"),
        (b"ISO-10303-21;\nHEADER;\n", "", "this is a STEP file"),
        (b"#" * (MAX_BYTES + 1), "", "larger than 1,000,000 bytes"),
    ],
)
def test_a_file_that_is_no_text_is_refused(mistakes, data, place, said):
    ((where, words),) = mistakes(data)
    assert where == place
    assert said in words


def test_a_missing_file_names_the_nearest_one(tmp_path):
    (tmp_path / "battery_tray.yaml").write_text(HEAD)
    with pytest.raises(SpecError, match="no such file") as caught:
        load_spec(tmp_path / "batery_tray.yaml")
    assert "battery_tray.yaml" in caught.value.remedy
    with pytest.raises(SpecError, match="no such file") as caught:
        load_spec(tmp_path / "nowhere" / "lid.yaml")
    assert "no folder" in caught.value.remedy


@pytest.mark.parametrize("path", ["", ".", "a\0b", "x" * 5000, "/dev/zero"])
def test_a_path_that_is_no_file_is_refused(path, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(SpecError):
        load_spec(path)


def test_a_file_that_cannot_be_read_is_refused(tmp_path, monkeypatch):
    def deny(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    (tmp_path / "lid.yaml").write_text(HEAD)
    monkeypatch.setattr("pathlib.Path.open", deny)  # a file mode does not stop root
    with pytest.raises(SpecError, match="Permission denied"):
        load_spec(tmp_path / "lid.yaml")


def test_errors_survive_the_trip_between_processes(mistakes, tmp_path):
    mistakes(HEAD + "a: 1\nb: 2\n")
    with pytest.raises(SpecErrors) as caught:
        load_spec(tmp_path / "lid.yaml")
    again = pickle.loads(pickle.dumps(caught.value))
    assert str(again) == str(caught.value)
    assert len(again.errors) == 2
