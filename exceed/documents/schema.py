"""JSON Schemas (draft 2020-12) of our files, made from the models, for editors.

An editor reads YAML by its own rules, so a bare 17 or an unquoted date may reach the schema as a number: free text
accepts both. What a schema cannot say (order of rows, kinds that must agree) `exceed lint` says.
"""

from __future__ import annotations

from typing import Any

from exceed.documents.fields import Model
from exceed.documents.templates import check_kind, template

__all__ = ["schema", "template"]


def _models() -> dict[str, type[Model]]:
    from exceed.documents.aircraft import Aircraft
    from exceed.documents.channels import Channels
    from exceed.documents.fleet import Fleet
    from exceed.documents.loading import LoadingSheet
    from exceed.documents.rules import RuleSet

    return {"aircraft": Aircraft, "rules": RuleSet, "channels": Channels, "loading": LoadingSheet, "fleet": Fleet}


def schema(kind: str) -> dict[str, Any]:
    """The JSON Schema of one kind of file. Raises UsageError for a kind that is not known."""
    models = _models()
    check_kind(kind, models)
    made = models[kind].model_json_schema(by_alias=True, mode="validation")
    cleaned: dict[str, Any] = _clean(made)
    cleaned["properties"]["format"] = {"const": f"exceed-{kind}/1", "description": "first key of the file"}
    cleaned["required"] = ["format", *(name for name in cleaned.get("required", []) if name != "format")]
    head = {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": f"exceed-{kind}/1"}
    return {**head, **{key: value for key, value in cleaned.items() if key not in head}}


def _clean(node: Any) -> Any:
    """Leave out what only Python sees: titles and defaults that are no JSON."""
    if isinstance(node, dict):
        return {
            key: _clean(value)
            for key, value in node.items()
            if not (key == "title" and isinstance(value, str)) and key != "default"
        }
    return [_clean(item) for item in node] if isinstance(node, list) else node
