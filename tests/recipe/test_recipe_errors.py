"""Every mistake in a recipe names its parameter or feature and stands at its place; every refusal says what to try."""

from __future__ import annotations

import jsonschema
import pytest

from moldgen.spec.recipe import KINDS, Recipe
from tests.recipe.making import BASE, feature, mistakes, recipe, refusal


def test_all_mistakes_are_reported_at_once_and_in_place() -> None:
    found = mistakes(
        {**BASE, "size": ["length", 20, "wall - 3"]},
        feature("hole", "drain", on="top of bass", at=[0, 0], diameter="3 deg"),
        wall="2 mm",
        length="lenght + 1",
        loop="loop * 2",
        half="1/0",
        pi=3,
    )
    assert "nearest known: 'length'" in found["parameters", "length"]
    assert "loop -> loop" in found["parameters", "loop"]
    assert "divides by zero" in found["parameters", "half"]
    assert "taken" in found["parameters", "pi"]
    assert found["features", 0, "size", 2].startswith("feature 'base', size: 'wall-3' = -1".replace("-3", " - 3"))
    assert "nearest known: 'base'" in found["features", 1, "on"]
    assert "feature 'drain'" in found["features", 1, "diameter"]


PATH = {"shape": "path", "start": [0, 0]}

WRONG = {
    "unknown key": (feature("hole", on="top of base", at=[0, 0], diametre=3), "'diametre'; nearest known: 'diameter'"),
    "missing key": (feature("hole", on="top of base", at=[0, 0]), "key 'diameter' is missing"),
    "inner unknown key": (
        feature("hole", on="top of base", at=[0, 0], diameter=3, counterbore={"diam": 3, "depth": 1, "diameter": 5}),
        "nearest known: 'diameter'",
    ),
    "unknown kind": (feature("hole_through"), "nearest known: 'hole'"),
    "no kind": ({"name": "it"}, "key 'feature' is missing"),
    "zero size": (feature("cylinder", diameter=0, height=3), "0 must be greater than zero"),
    "negative radius": (feature("block", size=[1, 1, 1], radius=-1), "-1 must be zero or more"),
    "count of a half": (feature("pattern", of=["base"], polar={"count": 2.5}), "whole number"),
    "unknown side": (feature("shell", thickness=1, open="upper of base"), "unknown word 'upper'"),
    "unknown feature": (feature("fillet", radius=1, edges="between base and lid"), "no earlier feature 'lid'"),
    "unknown body": (feature("cut", tools=["lid"]), "no body 'lid'"),
    "used twice": (BASE, "is used twice"),
    "bad name": (feature("block", "2 b", size=[1, 1, 1]), "must start with a letter"),
    "two patterns": (feature("pattern", of=["base"], polar={"count": 2}, offsets=[[1, 2, 3]]), "exactly one of"),
    "not repeatable": (feature("pattern", of=["base", "it"], polar={"count": 2}), "no earlier feature 'it'"),
    "bad step": (feature("extrude", height=1, profile={**PATH, "steps": [{"lin": [1, 2]}]}), "'line', 'arc'"),
    "bad arc": (feature("extrude", height=1, profile={**PATH, "steps": [{"arc": [1, 2]}]}), "exactly one of"),
    "bad direction": (feature("revolve", axis="up", profile={"shape": "circle", "diameter": 1}), "direction 'up'"),
}  # fmt: skip


@pytest.mark.parametrize("case", WRONG)
def test_a_wrong_feature_is_named(case: str) -> None:
    wrong, message = WRONG[case]
    found = mistakes(BASE, wrong)
    assert any(message in text for text in found.values()), found
    assert all(place[:2] == ("features", 1) for place in found), found
    if "name" in wrong:
        assert all(f"'{wrong['name']}'" in text for text in found.values())


def test_a_fillet_cannot_be_repeated() -> None:
    found = mistakes(
        BASE, feature("fillet", "f", edges="vertical", radius=1), feature("pattern", "p", of=["f"], polar={"count": 2})
    )
    assert "feature 'p': cannot repeat fillet 'f'" in found["features", 2, "of", 0]


BOX = [BASE, feature("shell", "hollow", thickness=2, open="top of base")]
REFUSED = {
    "fillet too large": ([BASE, feature("fillet", edges="vertical", radius=16)], "12 mm works"),
    "chamfer too large": ([BASE, feature("chamfer", edges="vertical", distance=40)], "does not fit"),
    "wall too thick": ([BASE, feature("shell", thickness=20, open="top of base")], "a wall of 20 mm"),
    "wall thicker than the fillet": (
        [
            feature("block", "b", size=[60, 50, 15], radius=5, draft=-1),
            feature("fillet", "f", edges="bottom of b", radius=1.8),
            feature("shell", thickness=2, open="top of b"),
        ],
        "radius larger than the wall",
    ),
    "hole beside the part": ([BASE, feature("hole", on="top of base", at=[50, 0], diameter=3)], "nothing changes"),
    "hole behind the part": (
        [BASE, feature("hole", on={"plane": "xy", "offset": -5}, at=[0, 0], diameter=3)],
        "behind the entry",
    ),
    "hole closed by draft": (
        [BASE, feature("hole", on="top of base", at=[0, 0], diameter=1, draft=5)],
        "closes a diameter",
    ),
    "narrow counterbore": (
        [BASE, feature("hole", on="top of base", at=[0, 0], diameter=5, counterbore={"diameter": 4, "depth": 1})],
        "must be wider",
    ),
    "hole as wide as its boss": (
        [BASE, feature("boss", on="top of base", at=[0, 0], diameter=5, height=4, hole={"diameter": 5, "depth": 1})],
        "leaves no wall",
    ),
    "rib closed by draft": (
        [BASE, feature("rib", on="top of base", start=[0, 0], end=[9, 0], thickness=1, height=9, draft=5)],
        "draft closes",
    ),
    "rib without length": (
        [BASE, feature("rib", on="top of base", start=[0, 0], end=[0, 0], thickness=1, height=9)],
        "no length",
    ),
    "part in two": ([BASE, feature("block", mode="cut", size=[1, 40, 20])], "falls into 2 pieces"),
    "nothing left": ([BASE, feature("block", mode="cut", size=[50, 50, 50])], "nothing is left"),
    "apart": ([BASE, feature("block", size=[1, 1, 1], at=[50, 0])], "falls into 2 pieces"),
    "inside already": ([BASE, feature("block", size=[1, 1, 1], at=[0, 0, 2])], "nothing changes"),
    "crossed outline": (
        [
            feature(
                "extrude",
                height=1,
                profile={"shape": "path", "start": [0, 0], "steps": [{"line": p} for p in ([5, 5], [5, 0], [0, 5])]},
            )
        ],
        "crosses itself",
    ),
    "outline across its axis": (
        [feature("revolve", profile={"shape": "circle", "diameter": 4, "at": [1, 0]})],
        "crosses the axis by 1 mm",
    ),
    "more than a turn": (
        [feature("revolve", angle=400, profile={"shape": "circle", "diameter": 4, "at": [9, 0]})],
        "more than a full turn",
    ),
    "outline closed by draft": (
        [feature("extrude", height=30, draft=20, profile={"shape": "rectangle", "size": [9, 9]})],
        "draft",
    ),
    "slot too short": ([feature("extrude", height=3, profile={"shape": "slot", "length": 3, "width": 4})], "a circle"),
    "corner radius": ([feature("block", size=[4, 9, 3], radius=2.5)], "corner radius"),
    "loft that falls": (
        [
            feature(
                "loft",
                sections=[{"height": h, "profile": {"shape": "circle", "diameter": 5}} for h in (3, 1)],
            )
        ],
        "must rise",
    ),
    "no wall behind a window": (
        [*BOX, feature("window", on="right of base", at=[40, 5], size=[4, 4])],
        "no wall",
    ),
    "curved face": (
        [feature("cylinder", "c", diameter=9, height=9), feature("hole", on="walls of c", at=[0, 4], diameter=2)],
        "the one there is curved",
    ),
    "first feature cuts": ([feature("block", mode="cut", size=[1, 1, 1])], "no body"),
    "draft on a spline": (
        [
            feature("extrude", "e", height=3, profile={"shape": "spline", "points": [[0, 0], [9, 1], [7, 8]]}),
            feature("draft", faces="walls of e", angle=2),
        ],
        "cannot be sloped",
    ),
}


@pytest.mark.parametrize("case", REFUSED)
def test_a_feature_that_cannot_be_made_is_named_with_a_remedy(case: str) -> None:
    features, message = REFUSED[case]
    error = refusal(*features)
    assert f"feature '{features[-1]['name']}'" in error.what
    assert message in f"{error.what} {error.remedy}"
    assert error.remedy


def test_the_schema_describes_every_key_and_accepts_a_recipe() -> None:
    schema = Recipe.model_json_schema()
    for name, model in KINDS.items():
        for key, field in model.model_fields.items():
            assert key == "feature" or field.description or key in ("on", "at", "open", "edges", "faces", "pull"), (
                name,
                key,
            )
    jsonschema.validate({"parameters": {"wall": "2 mm"}, "features": [{**BASE, "size": [40, "wall * 9", 10]}]}, schema)
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate({"features": [{**BASE, "sise": 3}]}, schema)


def test_a_recipe_survives_its_own_json() -> None:
    one = recipe(BASE, feature("hole", on="top of base", at=["wall", 0], diameter="1 mm"), wall="2 mm")
    again = Recipe.model_validate_json(one.model_dump_json())
    assert again.resolve() == one.resolve()
