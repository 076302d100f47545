"""Rule sets by name and by file, one on top of another; and what the built-in sets may and may not say."""

from __future__ import annotations

from pathlib import Path

import pytest

from exceed.documents.limits import FactLimit
from exceed.documents.lint import lint
from exceed.documents.rulebook import BUILT_IN, folder, layer, load_rules
from exceed.documents.rules import Rule, RuleSet
from exceed.errors import DocumentError

HEAD = "format: exceed-rules/1\nrules:\n"


def rules(text: str, name: str) -> RuleSet:
    return load_rules(HEAD + text, name)


def test_a_later_rule_that_overrides_replaces_the_earlier_and_this_is_recorded() -> None:
    first = rules(
        "  - {id: a, quantity: load_factor, above: {caution: 6 g}}\n  - {id: b, quantity: mach, above: {caution: 0.8}}\n",  # noqa: E501
        "one.yaml",
    )
    second = rules("  - {id: a, quantity: load_factor, above: {caution: 5 g}, override: true}\n", "two.yaml")
    book = layer([first, second])
    assert [rule.id for rule in book.rules] == ["a", "b"]
    assert book.rules[0].levels[0].absolute == 5
    assert [str(row) for row in book.replaced] == ["rule 'a' of one.yaml is replaced by that of two.yaml"]


def test_the_same_id_without_override_is_an_error_at_its_place() -> None:
    first = rules("  - {id: a, quantity: load_factor, above: {caution: 6 g}}\n", "one.yaml")
    second = rules("  - {id: a, quantity: load_factor, above: {caution: 5 g}}\n", "two.yaml")
    with pytest.raises(DocumentError) as caught:
        layer([first, second])
    assert str(caught.value) == (
        "two.yaml:3:10: id 'a' is there already, in one.yaml:3:10\n"
        "  expected: each id once, or 'override: true'\n"
        "  do: give it another id, or write 'override: true' to replace the earlier rule"
    )


def test_the_very_same_rule_in_two_sets_counts_once() -> None:
    text = "  - {id: a, quantity: load_factor, above: {caution: 6 g}}\n"
    book = layer([rules(text, "one.yaml"), rules("  # other file\n" + text, "two.yaml")])
    assert len(book.rules) == 1
    assert book.replaced == ()


def test_the_same_file_given_twice_counts_once_and_is_noted() -> None:
    first = rules("  - {id: a, quantity: load_factor, above: {caution: 6 g}, override: true}\n", "one.yaml")
    book = layer([first, first])
    assert len(book.sets) == 1
    assert "rule set one.yaml is given twice and counts once" in book.notes


def test_an_override_of_nothing_is_noted() -> None:
    book = layer([rules("  - {id: a, quantity: load_factor, above: {caution: 6 g}, override: true}\n", "one.yaml")])
    assert book.notes == ("rule 'a' of one.yaml says 'override' and there is no earlier rule of this id",)


def test_two_sets_must_agree_on_the_kind_of_a_declared_quantity() -> None:
    def declared(unit: str, name: str, rule: str) -> RuleSet:
        text = f"format: exceed-rules/1\nquantities: {{oil: {unit}}}\nrules: [{{id: {rule}, quantity: oil, above: {{caution: 100 {unit}}}}}]\n"  # noqa: E501
        return load_rules(text, name)

    book = layer([declared("degC", "one.yaml", "a"), declared("degF", "two.yaml", "b")])
    assert book.find("oil_2") is not None
    with pytest.raises(DocumentError) as caught:
        layer([declared("degC", "one.yaml", "a"), declared("bar", "two.yaml", "b")])
    assert caught.value.problems[0].problem == "quantity 'oil' is in bar here and in degC in one.yaml"


def test_an_unknown_name_suggests_the_nearest_set() -> None:
    with pytest.raises(DocumentError) as caught:
        load_rules("airfame")
    assert str(caught.value) == (
        "airfame: there is no rule set and no file of this name\n"
        "  expected: a file, or one of aerobatic, airframe, engine, gust, handling, landing\n"
        "  do: write 'airframe' if that is meant"
    )
    with pytest.raises(DocumentError) as caught:
        load_rules("rules/none.yaml")
    assert caught.value.problems[0].problem == "there is no such file"


# ---------------------------------------------------------------------------- built-in sets


def test_every_built_in_set_is_a_file_and_every_file_is_known() -> None:
    assert sorted(path.stem for path in folder().glob("*.yaml")) == sorted(BUILT_IN)


@pytest.mark.parametrize("name", BUILT_IN)
def test_a_built_in_set_lints_clean_and_says_where_it_comes_from(name: str) -> None:
    assert lint(folder() / f"{name}.yaml") == []
    made = load_rules(name)
    assert (made.name, made.path) == (name, name)
    for rule in made.rules:
        assert rule.source, rule.id
        assert rule.title
        assert rule.rule_set == name


@pytest.mark.parametrize(
    "order", [BUILT_IN, tuple(reversed(BUILT_IN)), ("aerobatic", "airframe"), ("airframe", "landing")]
)
def test_built_in_sets_can_be_used_together_in_any_order(order: tuple[str, ...]) -> None:
    book = layer(load_rules(name) for name in order)
    ids = [rule.id for rule in book.rules]
    assert len(ids) == len(set(ids))
    assert book.replaced == ()
    assert book.notes == ()


EVERY = [(name, rule) for name in BUILT_IN for rule in load_rules(name).rules]


@pytest.mark.parametrize(("name", "rule"), EVERY, ids=[f"{name}/{rule.id}" for name, rule in EVERY])
def test_cautions_and_warnings_stand_only_on_the_aircraft_file_or_on_discretes(name: str, rule: Rule) -> None:
    serious = [level for level in rule.levels if level.severity != "advisory"]
    if not serious:
        return
    assert isinstance(rule.limit, FactLimit)
    # the 110 % of a load factor sorts events into caution and warning
    allowed = {1.0, 1.1} if rule.quantity == "load_factor" else {1.0}
    assert {level.percent for level in serious} <= allowed


@pytest.mark.parametrize(("name", "rule"), EVERY, ids=[f"{name}/{rule.id}" for name, rule in EVERY])
def test_inspections_name_a_chapter_and_leave_the_task_to_the_approved_manual(name: str, rule: Rule) -> None:
    if rule.inspection is not None:
        assert rule.inspection.ata == "05-50"
        assert "approved manual" in rule.inspection.task
    if name == "gust":
        assert rule.inspection is None


def test_the_airframe_set_looks_whenever_airborne_and_never_at_manoeuvring_speed() -> None:
    made = {rule.id: rule for rule in load_rules("airframe").rules}
    assert len(made) == 18
    for rule in made.values():
        phases = [condition.phase for condition in rule.when if condition.phase]
        # a landing mass counts at the landing; no aeroplane takes off within it by design
        assert phases == [("landing",) if rule.id == "landing-mass" else ("airborne",)], rule.id
        assert isinstance(rule.limit, FactLimit)
        assert rule.limit.fact != "aircraft.speeds.manoeuvring"
    facts = {rule.limit.fact.removeprefix("aircraft.") for rule in made.values() if isinstance(rule.limit, FactLimit)}
    assert facts >= {
        "load_factor.maximum", "load_factor.minimum", "speeds.never_exceed", "speeds.maximum_operating",
        "mach.maximum_operating", "speeds.flaps_extended", "speeds.gear_extended", "speeds.gear_operating",
        "speeds.airbrakes", "speeds.aerotow", "speeds.winch", "mass.maximum_take_off", "mass.maximum_landing",
        "mass.maximum_zero_fuel", "loading.forward", "loading.aft",
    }  # fmt: skip


def test_engine_limits_come_from_the_aircraft_file_only() -> None:
    for rule in load_rules("engine").rules:
        assert isinstance(rule.limit, FactLimit)
        assert rule.limit.fact.startswith("aircraft.limits.")


def test_the_load_factor_rule_is_the_one_of_the_format() -> None:
    rule = next(rule for rule in load_rules("airframe").rules if rule.id == "load-factor-high")
    assert (rule.lasting, rule.joining, rule.release, rule.must_see) == (0.0, 1.0, 0.05, 0.5)
    assert [(level.severity, level.percent) for level in rule.levels] == [("caution", 1.0), ("warning", 1.1)]


def test_rules_are_found_beside_the_package_or_inside_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    package = tmp_path / "somewhere" / "exceed"
    (package / "documents").mkdir(parents=True)
    (tmp_path / "somewhere" / "rules").mkdir()
    monkeypatch.setattr("exceed.documents.rulebook.rules_module.__file__", str(package / "documents" / "rules.py"))
    assert folder() == tmp_path.resolve() / "somewhere" / "rules"
    (package / "rules").mkdir()
    assert folder() == package.resolve() / "rules"
