"""The spec described for editors (JSON Schema) and for people (a commented starter)."""

from __future__ import annotations

from typing import Any, Final

from moldgen.spec.fields import AUTO
from moldgen.spec.schema import Spec
from moldgen.spec.starter import starter

__all__ = ["json_schema", "starter"]

_DIALECT: Final = "https://json-schema.org/draft/2020-12/schema"


def json_schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a spec file, each key with meaning, unit and default."""
    schema = Spec.model_json_schema()
    for definition in (schema, *schema.get("$defs", {}).values()):
        for name, prop in definition.get("properties", {}).items():
            definition["properties"][name] = _tidy(prop, definition)
    return {"$schema": _DIALECT, **schema, "title": "moldgen spec"}


def _tidy(prop: dict[str, Any], owner: dict[str, Any]) -> dict[str, Any]:
    """Say `auto` where the loaded spec holds None, and leave out what tells an editor nothing."""
    prop = _without_null(prop)
    prop.pop("title", None)
    prop.setdefault("description", owner.get("description", ""))
    if prop.get("default", 0) is None and _offers_auto(prop):
        prop["default"] = AUTO
    if prop.get("default", 0) in (None, "", [], ()) or isinstance(prop.get("default"), dict):
        del prop["default"]
    return prop


def _without_null(prop: dict[str, Any]) -> dict[str, Any]:
    """Leave out the form `null`: a key without a value is a slip."""
    forms = [_without_null(form) for form in prop.get("anyOf", ()) if form.get("type") != "null"]
    if not forms:
        return dict(prop)
    rest = {k: v for k, v in prop.items() if k != "anyOf"}
    return {**forms[0], **rest} if len(forms) == 1 else {"anyOf": forms, **rest}


def _offers_auto(prop: dict[str, Any]) -> bool:
    own = prop.get("const") == AUTO or AUTO in prop.get("enum", ())
    return own or any(_offers_auto(form) for form in prop.get("anyOf", ()))
