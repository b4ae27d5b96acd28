"""Short forms for recipes in tests."""

from __future__ import annotations

from typing import Any

import pytest
from pydantic import ValidationError

from moldgen.errors import PartError
from moldgen.kernel.features import build_recipe
from moldgen.spec.recipe import Recipe

BASE = {"feature": "block", "name": "base", "size": [40, 30, 10]}
"""Its volume is 12000 mm^3."""

BASE_VOLUME = 12000.0


def feature(kind: str, name: str = "it", **values: Any) -> dict[str, Any]:
    return {"feature": kind, "name": name, **values}


def recipe(*features: dict[str, Any], **parameters: Any) -> Recipe:
    return Recipe.model_validate({"parameters": parameters, "features": list(features)})


def build(*features: dict[str, Any], **parameters: Any) -> Any:
    return build_recipe(recipe(*features, **parameters).resolve())


def refusal(*features: dict[str, Any], **parameters: Any) -> PartError:
    """Return the error with which the kernel refuses a recipe that is well formed."""
    resolved = recipe(*features, **parameters).resolve()
    with pytest.raises(PartError) as caught:
        build_recipe(resolved)
    return caught.value


def mistakes(*features: dict[str, Any], **parameters: Any) -> dict[tuple[int | str, ...], str]:
    """Return what is wrong with a recipe that is not well formed: place -> message."""
    with pytest.raises(ValidationError) as caught:
        recipe(*features, **parameters)
    return {line["loc"]: line["msg"] for line in caught.value.errors()}
