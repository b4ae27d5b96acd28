"""The JSON Schema and the starter say what the loader does."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator
from ruamel.yaml import YAML

from moldgen.errors import SpecError
from moldgen.spec.describe import json_schema, starter
from moldgen.spec.load import load_spec
from moldgen.spec.schema import Spec

SPECS = sorted((Path(__file__).parents[2] / "specs").glob("**/*.yaml"))
HEAD = {"part": {"file": "lid.step"}, "resin": "ABS"}


@pytest.fixture(scope="module")
def validator():
    """Return a validator of the schema, itself checked against its dialect."""
    schema = json_schema()
    Draft202012Validator.check_schema(schema)
    return Draft202012Validator(schema)


def test_every_key_is_described(validator):
    for owner in (validator.schema, *validator.schema["$defs"].values()):
        for key, prop in owner.get("properties", {}).items():
            assert prop.get("description"), f"{owner.get('title')}.{key}"


def test_every_number_says_its_unit(validator):
    own = {m.annotation.__name__ for m in Spec.model_fields.values() if hasattr(m.annotation, "model_fields")}
    checked = 0
    for name, owner in validator.schema["$defs"].items():
        for key, prop in owner["properties"].items():
            if name.rpartition("__")[2] in own and any(f.get("type") == "number" for f in prop.get("anyOf", ())):
                assert re.search(r"\[(mm|deg|%)\]", prop["description"]), f"{name}.{key}"
                checked += 1
    assert checked > 15


def test_defaults_are_said_as_the_user_would_write_them(validator):
    gate = next(d for n, d in validator.schema["$defs"].items() if n.endswith("Gate"))["properties"]
    assert gate["kind"]["default"] == gate["at"]["default"] == gate["width"]["default"] == "auto"


@pytest.mark.parametrize(
    "more",
    [
        {},
        {"pull": "+z"},
        {"pull": [0, 0, 1]},
        {"pull": "face at 1, 2, 3"},
        {"pull": {"direction": "auto", "search": "axes"}},
        {"shrink": "0.5 %"},
        {"shrink": {"x": 1, "y": "1 %", "z": 1, "fixed_point": [0, 0, "1 in"]}},
        {"gate": {"kind": "pin", "at": [1, "2 in", 3], "diameter": "auto"}},
        {"ejection": {"pins": [{"at": [0, 0, 0], "diameter": "1/8 in"}]}},
        {"blocks": {"material": 1.2311}},
    ],
)
def test_the_schema_accepts_what_the_loader_accepts(validator, more):
    validator.validate(HEAD | more)
    Spec.model_validate(HEAD | {k: _text(v) for k, v in more.items()})


def _text(value):
    """Return numbers that stand for names as text, as the loader reads them."""
    return {"material": "1.2311"} if value == {"material": 1.2311} else value


@pytest.mark.parametrize(
    "more",
    [
        {"gaet": {}},
        {"gate": {"kind": "egde"}},
        {"gate": {"land": -1}},
        {"gate": {"land": None}},
        {"pull": "up"},
        {"pull": [0, 0]},
        {"draft": {"minimum": 60}},
        {"shrink": 100},
        {"marks": {"face": [0, 0, 0]}},
        {"runner": {}},
    ],
)
def test_the_schema_refuses_what_the_loader_refuses(validator, more):
    assert not validator.is_valid(HEAD | more)


@pytest.mark.parametrize("path", SPECS, ids=lambda p: p.parent.name)
def test_the_specs_of_the_project_satisfy_the_schema(validator, path):
    validator.validate(YAML(typ="safe", pure=True).load(path.read_text()))
    assert load_spec(path).spec.name


def _write(folder, text):
    path = folder / "start.yaml"
    path.write_text(text)
    return load_spec(path)


@pytest.mark.parametrize(
    ("file", "name"),
    [
        ("lid.step", "lid"),
        ("a b/c d.stp", "c d"),
        ("#1: {x}.step", "#1: {x}"),
        ("12.step", "12"),
        ("no", "no"),
        ("ä'\".step", ""),
    ],
)
def test_the_starter_loads_whatever_the_file_is_called(tmp_path, file, name):
    loaded = _write(tmp_path, starter(file, name, "pom", facts=["one solid,\n12 x 8 x 3 mm"]))
    assert loaded.part_file == tmp_path / file
    assert loaded.spec.resin == "POM"
    assert loaded.findings == ()
    least = Spec.model_validate({"name": loaded.spec.name, "part": {"file": file}, "resin": "POM"})
    assert loaded.spec == least, "a starter decides nothing by itself"


def test_the_starter_shows_every_section_and_key():
    text = starter("lid.step", "lid")
    hidden = {"x", "y", "z", "recipe", "function"}  # told in the comment of their neighbour
    for key, info in Spec.model_fields.items():
        assert re.search(rf"^(# )?{key}:", text, re.MULTILINE), key
        for inner in set(getattr(info.annotation, "model_fields", {})) - hidden:
            assert re.search(rf"^#? +(# )?{inner}: ", text, re.MULTILINE), f"{key}.{inner}"
    assert max(map(len, text.splitlines())) <= 120


def test_the_starter_loads_with_every_section_put_to_use(tmp_path):
    text = starter("lid.step", "lid", solid="upper lid")
    used = re.sub(r"^# ( *[a-z_]+:| {8,}#)", r"\1", text, flags=re.MULTILINE)
    spec = _write(tmp_path, used).spec
    assert used.count("\n# ") < 8, "only prose is left commented out"
    assert spec.part.solid == "upper lid"
    assert spec.marks[0].no_gate
    changed = {k for k in Spec.model_fields if getattr(spec, k) != Spec.model_fields[k].default}
    assert changed == {"name", "part", "resin", "blocks", "marks", "output"}, "the others show their defaults"


@pytest.mark.parametrize(
    ("file", "resin"), [("a\nb.step", "ABS"), ("", "ABS"), ("\udc80.step", "ABS"), ("a.step", "bakelit")]
)
def test_the_starter_refuses_what_it_cannot_write(file, resin):
    with pytest.raises(SpecError):
        starter(file, "lid", resin)
