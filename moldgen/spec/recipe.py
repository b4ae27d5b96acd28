"""Parametric recipes in the spec: named parameters, and features in the order in which they are made.

`Recipe` is what the user may write. `Recipe.resolve` works every expression out and returns the plain data that
`moldgen.kernel.features.build_recipe` turns into a solid.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping
from typing import Annotated, Any, Final, Self

from pydantic import BaseModel, Field, ValidationError, ValidatorFunctionWrapHandler, model_validator
from pydantic_core import InitErrorDetails, PydanticCustomError

from moldgen.model.recipe import MAIN_BODY, ResolvedFeature, ResolvedRecipe, Selector
from moldgen.spec import recipe_changes as changes
from moldgen.spec import recipe_features as solids
from moldgen.spec.expression import Dimension, Expression, Value, check_name, evaluate, resolve_parameters
from moldgen.spec.recipe_fields import EDGE_WORDS, FACE_WORDS, Choice, PlaneOn, RecipeModel, _sized, split_words

MOST_FEATURES: Final = 500
MOST_PARAMETERS: Final = 200

Parameter = Annotated[
    Expression, *_sized("number, text with unit, or expression of other parameters", Dimension.NUMBER)
]

Feature = Annotated[
    solids.Block
    | solids.Cylinder
    | solids.Sphere
    | solids.Torus
    | solids.Extrude
    | solids.Revolve
    | solids.Loft
    | solids.Shell
    | solids.Hole
    | solids.Boss
    | solids.Rib
    | solids.Window
    | solids.SnapHook
    | changes.Fillet
    | changes.Chamfer
    | changes.Draft
    | changes.Pattern
    | changes.Mirror
    | changes.Union
    | changes.Cut
    | changes.Intersect,
    Field(discriminator="feature"),
]

KINDS: Final[Mapping[str, type[BaseModel]]] = {
    str(model.model_fields["feature"].annotation.__args__[0]): model  # type: ignore[union-attr]
    for model in Feature.__origin__.__args__  # type: ignore[attr-defined]
}
"""Feature kind -> its model."""

REPEATABLE: Final = frozenset(
    {
        *("block", "cylinder", "sphere", "torus", "extrude", "revolve", "loft"),
        *("hole", "boss", "rib", "window", "snap_hook"),
    }
    | {"pattern", "mirror"}
)
"""Kinds that pattern and mirror can repeat: those that make material or remove it by a shape of their own."""

Location = tuple[int | str, ...]
Mistake = tuple[Location, str]


class Recipe(RecipeModel):
    """A parametric part: parameters, and features made in order. The body named 'part' is the result."""

    parameters: Annotated[
        dict[str, Parameter],
        Field(
            max_length=MOST_PARAMETERS, description="name -> number, text with unit, or expression of other parameters"
        ),
    ] = {}  # noqa: RUF012 (pydantic copies defaults)
    features: Annotated[
        tuple[Feature, ...], Field(min_length=1, max_length=MOST_FEATURES, description="features in order")
    ]

    @model_validator(mode="wrap")
    @classmethod
    def _named_errors(cls, data: Any, handler: ValidatorFunctionWrapHandler) -> Self:
        """Let every message name its feature and, for an unknown key, the nearest known one."""
        try:
            recipe: Self = handler(data)
        except ValidationError as error:
            raise _reworded(error, data) from None
        mistakes = _mistakes(recipe)
        if mistakes:
            raise _as_validation_error(mistakes)
        return recipe

    def resolve(self) -> ResolvedRecipe:
        """Return the features with every expression worked out.

        Raises
        ------
        ValueError : never for a recipe that passed validation
        """
        values, errors = resolve_parameters(self.parameters)
        if errors:
            raise ValueError("; ".join(errors.values()))
        features = []
        for feature in self.features:
            fields = {k: _plain(getattr(feature, k), values) for k in type(feature).model_fields}
            kind, name = str(fields.pop("feature")), str(fields.pop("name"))
            _choose(fields, kind)
            features.append(ResolvedFeature(name, kind, fields))
        return ResolvedRecipe(tuple(features), {n: v.number for n, v in values.items()})


# --- checks over the whole recipe ------------------------------------------------------------------------------------
def _mistakes(recipe: Recipe) -> list[Mistake]:
    found: list[Mistake] = []
    for name in recipe.parameters:
        try:
            check_name(name)
        except ValueError as error:
            found.append((("parameters", name), str(error)))
    values, errors = resolve_parameters(recipe.parameters)
    found += [(("parameters", name), message) for name, message in errors.items()]
    for index, feature in enumerate(recipe.features):
        for location, expression in _expressions(feature, ("features", index)):
            if any(n in errors for n in expression.names()):
                continue  # the parameter's own mistake is in the list
            try:
                evaluate(expression, values)
            except ValueError as error:
                key = next((str(k) for k in reversed(location) if isinstance(k, str)), "")
                found.append((location, f"feature '{feature.name}', {key}: {error}"))
    return found + _wrong_names(recipe)


def _wrong_names(recipe: Recipe) -> list[Mistake]:
    """Names must be new; references must point backward; bodies must exist."""
    found: list[Mistake] = []
    made: dict[str, str] = {}
    bodies = {MAIN_BODY}
    for index, feature in enumerate(recipe.features):
        at: Location = ("features", index)
        if feature.name in made or feature.name == MAIN_BODY:
            found.append(((*at, "name"), f"feature name '{feature.name}' is used twice; every feature needs its own"))
        for location, name in _references(feature, at):
            if name not in made:
                found.append((location, f"feature '{feature.name}': no earlier feature '{name}'{_near(name, made)}"))
            elif location[-2] == "of" and made[name] not in REPEATABLE:
                found.append((location, f"feature '{feature.name}': cannot repeat {made[name]} '{name}'"))
        for location, name in _body_references(feature, at):
            if name not in bodies:
                hint = _near(name, bodies) or "; a body starts with a feature that has 'mode: new'"
                found.append((location, f"feature '{feature.name}': no body '{name}'{hint}"))
        made[feature.name] = str(feature.feature)
        if getattr(feature, "mode", "") == "new":
            bodies.add(feature.name)
        if getattr(feature, "tools", ()) and not getattr(feature, "keep", False):
            bodies -= set(feature.tools) - {MAIN_BODY}  # type: ignore[union-attr]
    return found


def _expressions(value: Any, at: Location) -> Iterator[tuple[Location, Expression]]:
    if isinstance(value, Expression):
        yield at, value
    elif isinstance(value, BaseModel):
        for key in type(value).model_fields:
            yield from _expressions(getattr(value, key), (*at, key))
    elif isinstance(value, tuple):
        for index, item in enumerate(value):
            yield from _expressions(item, (*at, index))


def _references(feature: Any, at: Location) -> Iterator[tuple[Location, str]]:
    """Yield every mention of another feature with its place."""
    for index, name in enumerate(getattr(feature, "of", ())):
        yield (*at, "of", index), name
    plane = getattr(feature, "on", None)
    if isinstance(plane, PlaneOn) and plane.face is not None:
        yield from _mentions(plane.face, (*at, "on"), FACE_WORDS)
    for key, known in (("edges", EDGE_WORDS), ("faces", FACE_WORDS), ("open", FACE_WORDS)):
        for choice in getattr(feature, key, ()):
            yield from _mentions(choice.select, (*at, key), known)


def _mentions(text: str, at: Location, known: tuple[str, ...]) -> Iterator[tuple[Location, str]]:
    words = split_words(text, known)
    for name in (words.of, *(words.between or ())):
        if name is not None and name != MAIN_BODY:
            yield at, name


def _body_references(feature: Any, at: Location) -> Iterator[tuple[Location, str]]:
    body = getattr(feature, "body", None)
    if body is not None and getattr(feature, "mode", "") != "new":
        yield (*at, "body"), body
    for index, name in enumerate(getattr(feature, "tools", ())):
        yield (*at, "tools", index), name


# --- errors ----------------------------------------------------------------------------------------------------------
def _as_validation_error(mistakes: list[Mistake]) -> ValidationError:
    lines = [
        # braces would be read as placeholders
        InitErrorDetails(type=PydanticCustomError("recipe", "{text}", {"text": text}), loc=at, input=None)
        for at, text in mistakes
    ]
    return ValidationError.from_exception_data("Recipe", lines)


def _reworded(error: ValidationError, data: Any) -> ValidationError:
    mistakes: list[Mistake] = []
    for line in error.errors(include_url=False):
        at: Location = line["loc"]
        text = line["msg"].removeprefix("Value error, ")
        if line["type"] == "extra_forbidden":
            text = f"unknown key '{at[-1]}'{_near(str(at[-1]), _known_keys(at))}"
        elif line["type"] == "missing":
            text = f"key '{at[-1]}' is missing"
        elif line["type"] == "union_tag_invalid" and len(at) == 2 and isinstance(data, Mapping):
            kind = line["input"].get("feature") if isinstance(line["input"], Mapping) else ""
            text = f"unknown kind of feature '{kind}'{_near(str(kind), KINDS)}; known: {', '.join(KINDS)}"
        elif line["type"] == "union_tag_not_found" and len(at) == 2:
            text = f"key 'feature' is missing; it says what to make: {', '.join(KINDS)}"
        mistakes.append((at, f"{_feature_label(at, data)}{text}"))
    return _as_validation_error(mistakes)


def _feature_label(at: Location, data: Any) -> str:
    """Return ``feature 'name': `` for a place inside a feature."""
    if len(at) < 2 or at[0] != "features" or not isinstance(data, Mapping):
        return ""
    features, index = data.get("features"), at[1]
    if not isinstance(features, (list, tuple)) or not isinstance(index, int) or index >= len(features):
        return ""
    item = features[index]
    name = item.get("name") if isinstance(item, Mapping) else None
    return f"feature '{name}': " if isinstance(name, str) else f"feature {index + 1}: "


def _known_keys(at: Location) -> list[str]:
    """Return the keys that the mapping around `at` may have."""
    if len(at) == 1:
        return list(Recipe.model_fields)
    model: Any = KINDS.get(str(at[2])) if len(at) > 2 else None
    if model is None:
        return []
    for step in at[3:-1]:
        if isinstance(step, str):
            model = _inner_model(model, step) or model
    return list(model.model_fields)


def _inner_model(model: type[BaseModel], step: str) -> type[BaseModel] | None:
    """Return the model under key (or union tag) `step` of `model`, None for a tag that is the model itself."""
    if step not in model.model_fields:
        return None
    candidates = list(_models_in(model.model_fields[step].annotation))
    return candidates[0] if len(candidates) == 1 else None


def _models_in(annotation: Any) -> Iterator[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        yield annotation
    for argument in getattr(annotation, "__args__", ()):
        yield from _models_in(argument)


def _near(name: str, known: Any) -> str:
    close = difflib.get_close_matches(name, list(known), n=1, cutoff=0.5)
    return f"; nearest known: '{close[0]}'" if close else ""


# --- resolving -------------------------------------------------------------------------------------------------------
def _plain(value: Any, parameters: Mapping[str, Value]) -> Any:
    if isinstance(value, Expression):
        number = evaluate(value, parameters)
        return round(number) if value.whole else number
    if isinstance(value, Choice):
        return value, {k: _plain(getattr(value, k), parameters) for k in ("within", "at")}
    if isinstance(value, BaseModel):
        return {k: _plain(getattr(value, k), parameters) for k in type(value).model_fields}
    if isinstance(value, tuple):
        return tuple(_plain(item, parameters) for item in value)
    return value


def _choose(fields: dict[str, Any], kind: str) -> None:
    """Turn choices and faces into selectors, in place."""
    for key in ("edges", "faces", "open"):
        if key in fields and kind in ("fillet", "chamfer", "draft", "shell"):
            known = EDGE_WORDS if key == "edges" else FACE_WORDS
            fields[key] = tuple(_selector(c.select, known, **rest) for c, rest in fields[key])
    plane = fields.get("on")
    if isinstance(plane, dict) and plane.get("face"):
        plane["face"] = _selector(plane["face"], FACE_WORDS)


def _selector(text: str, known: tuple[str, ...], within: Any = None, at: Any = None) -> Selector:
    parts = split_words(text, known)
    return Selector(text, parts.words, parts.of, parts.between, at, within)
