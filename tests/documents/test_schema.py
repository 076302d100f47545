"""JSON Schemas and starter files: the one accepts the other, and both keep up with the models."""

from __future__ import annotations

import json
import re
from typing import Any

import jsonschema
import pytest
import yaml

from exceed.documents.build import KINDS
from exceed.documents.lint import lint, load_any
from exceed.documents.rulebook import BUILT_IN, folder
from exceed.documents.schema import _models, schema, template
from exceed.errors import UsageError


def validator(kind: str) -> jsonschema.Draft202012Validator:
    return jsonschema.Draft202012Validator(schema(kind))


def keys_of(node: Any) -> set[str]:
    """Every key that a schema names, at any depth."""
    found: set[str] = set()
    if isinstance(node, dict):
        found |= set(node.get("properties", {}))
        for value in node.values():
            found |= keys_of(value)
    elif isinstance(node, list):
        for value in node:
            found |= keys_of(value)
    return found


@pytest.mark.parametrize("kind", KINDS)
def test_the_schema_is_valid_and_accepts_the_starter_file(kind: str) -> None:
    jsonschema.Draft202012Validator.check_schema(schema(kind))
    assert list(validator(kind).iter_errors(yaml.safe_load(template(kind)))) == []
    assert json.loads(json.dumps(schema(kind))) == schema(kind)


@pytest.mark.parametrize("kind", KINDS)
def test_the_starter_file_lints_clean_and_is_commented(kind: str) -> None:
    text = template(kind)
    assert lint(text) == []
    load_any(text)
    assert text.splitlines()[0].startswith("# ")
    assert len(max(text.splitlines(), key=len)) <= 120


@pytest.mark.parametrize("kind", KINDS)
def test_the_starter_file_shows_every_key(kind: str) -> None:
    text = template(kind)
    missing = {key for key in keys_of(schema(kind)) if f"{key}:" not in text}
    # shown in words where a key is one of several of its kind
    assert missing == set()


@pytest.mark.parametrize("name", BUILT_IN)
def test_the_schema_accepts_the_built_in_rules(name: str) -> None:
    assert list(validator("rules").iter_errors(yaml.safe_load((folder() / f"{name}.yaml").read_text()))) == []


WRONG = [
    ("aircraft", "mass: {empty: 640}"),
    ("aircraft", "mass: {empty: 640 kt}"),
    ("aircraft", "mass: {empti: 640 kg}"),
    ("aircraft", "speeds: {never_exceed: 175 kt}"),
    ("aircraft", "speeds: {never_exceed: {over: colour, points: [[1 kg, 1 KIAS], [2 kg, 1 KIAS]]}}"),
    ("aircraft", "category: acrobatic"),
    ("aircraft", "stall_speed: [{flaps: 0 deg}]"),
    ("aircraft", "path: x"),
    ("rules", "rules: [{id: a}]"),
    ("rules", "rules: [{id: a, quantity: mach, above: {red: 0.8}}]"),
    ("rules", "rules: [{id: a, quantity: mach, above: {caution: 0.8}, when: [{phase: cruize}]}]"),
    ("rules", "rules: [{id: a, quantity: mach, rate: true}]"),
    ("rules", "quantities: {a: degc}\nrules: [{id: a, quantity: mach}]"),
    ("channels", "clock: {column: t, kind: sundial}"),
    ("channels", "channels: [{column: A}]"),
    ("loading", "stations: {pilot: 80}"),
    ("fleet", "operator: x"),
]


@pytest.mark.parametrize(("kind", "text"), WRONG)
def test_the_schema_refuses_what_lint_refuses(kind: str, text: str) -> None:
    whole = f"format: exceed-{kind}/1\n{text}\n"
    assert list(validator(kind).iter_errors(yaml.safe_load(whole)))
    assert lint(whole)


@pytest.mark.parametrize("kind", KINDS)
def test_the_schema_refuses_another_format_and_a_missing_one(kind: str) -> None:
    data = yaml.safe_load(template(kind))
    assert list(validator(kind).iter_errors({**data, "format": "exceed-other/1"}))
    del data["format"]
    assert list(validator(kind).iter_errors(data))


@pytest.mark.parametrize("kind", KINDS)
def test_every_key_is_described(kind: str) -> None:
    for name, row in schema(kind)["properties"].items():
        assert row.get("description"), name
    for model in _models().values():
        for name, field in model.model_fields.items():
            assert name in model.HIDDEN or field.description, name


def test_numbers_with_units_have_a_pattern_and_say_what_is_due() -> None:
    whole = schema("aircraft")
    mass = whole["$defs"]["Masses"]["properties"]["empty"]
    (text,) = [row for row in mass["anyOf"] if row.get("type") == "string"]
    assert text["description"] == "a mass in kg, lb"
    for good in ("640 kg", "640kg", "1.4e3 lb", " +.5 kg "):
        assert re.search(text["pattern"], good), good
    for bad in ("640", "640 kt", "kg", "6,4 kg", "1 200 kg", "nan kg"):
        assert not re.search(text["pattern"], bad), bad
    speed = json.dumps(whole["$defs"]["SpeedLimit"])
    assert "an airspeed in KCAS, KEAS, KIAS, KTAS" in speed


def test_an_unknown_kind_suggests_the_nearest() -> None:
    for call in (schema, template):
        with pytest.raises(UsageError) as caught:
            call("aircraf")
        assert str(caught.value) == (
            "'aircraf' is not a kind of file\n  expected: one of aircraft, channels, fleet, loading, rules\n"
            "  do: write 'aircraft' if that is meant"
        )
