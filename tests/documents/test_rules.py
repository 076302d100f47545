"""Rules files: every key and form, and every kind of mistake at its line and column."""

from __future__ import annotations

import pickle

import pytest

from exceed.core.units import UNITS
from exceed.documents.aircraft import load_aircraft
from exceed.documents.limits import ConstantLimit, FactLimit, RelativeLimit, TableLimit
from exceed.documents.rulebook import load_rules
from exceed.documents.rules import Level, Rule
from exceed.documents.schema import template
from exceed.errors import DocumentError

HEAD = 'format: exceed-rules/1\nquantities: {oil_temperature: degC, torque: "%", valve: state}\nrules:\n'
KT = UNITS["kt"].factor
DEG = UNITS["deg"].factor
FT = UNITS["ft"].factor


def one(body: str) -> Rule:
    """The rule whose keys are written in braces."""
    return load_rules(f"{HEAD}  - {{id: r, {body}}}\n").rules[0]


def test_the_first_rule_of_the_starter_file_arrives_whole() -> None:
    rule = load_rules(template("rules")).rules[0]
    assert (rule.id, rule.title, rule.quantity, rule.kind) == (
        "over-g",
        "Positive load factor",
        "load_factor",
        "load factor",
    )
    assert isinstance(rule.limit, FactLimit)
    assert rule.limit.fact == "aircraft.load_factor.maximum"
    assert rule.levels == (Level("caution", "above", percent=1.0), Level("warning", "above", percent=1.1))
    assert rule.sides == ("above",)
    assert [condition.phase for condition in rule.when] == [("airborne",)]
    assert (rule.lasting, rule.joining, rule.release, rule.must_see, rule.judge_on) == (0, 1, 0.05, 0.5, "estimate")
    assert rule.inspection is not None
    assert (rule.inspection.from_severity, rule.inspection.certainty, rule.inspection.ata, rule.inspection.before) == (
        "caution", "possible", "05-50", "next flight",
    )  # fmt: skip
    assert rule.inspection.task.startswith("Over-g inspection")
    assert rule.source == "14 CFR 23.337 (before Amdt 23-64) for the category; the aircraft's manual for the figure"
    assert rule.notes == ("Text that is shown with the rule.",)
    assert (rule.override, rule.rule_set) == (False, "text")
    assert rule.place.startswith("text:")


def test_a_rule_set_is_frozen_and_survives_pickling() -> None:
    rules = load_rules(template("rules"))
    assert pickle.loads(pickle.dumps(rules)) == rules
    assert rules.quantities == {"oil_temperature": "degC", "torque": "%"}
    assert (rules.title, len(rules.sha256)) == ("Rules to start from", 64)


def test_a_title_that_is_left_out_is_made_of_the_id() -> None:
    assert (
        load_rules(HEAD + "  - {id: some-rule_x, quantity: load_factor, above: {caution: 6 g}}\n").rules[0].title
        == "some rule x"
    )


def test_limits_have_four_forms() -> None:
    constant = one("quantity: load_factor, limit: 6 g, above: {caution: 100 %}").limit
    assert isinstance(constant, ConstantLimit)
    assert constant.value == 6
    table = one("quantity: bank_angle, limit: {over: height_above_aerodrome, points: [[0 ft, 15 deg], [100 ft, 30 deg]], "  # noqa: E501
                "between: step}, above: {advisory: 100 %}").limit  # fmt: skip
    assert isinstance(table, TableLimit)
    assert (table.over, table.between) == ("height_above_aerodrome", "step")
    assert table.points == ((0, pytest.approx(15 * DEG)), (pytest.approx(100 * FT), pytest.approx(30 * DEG)))
    relative = one(
        "quantity: calibrated_airspeed, limit: {quantity: stall_speed, times: 1.2, plus: 5 kt}, below: {advisory: 100 %}"  # noqa: E501
    ).limit
    assert isinstance(relative, RelativeLimit)
    assert (relative.quantity, relative.times, relative.plus) == ("stall_speed", 1.2, 5 * KT)
    plain = one(
        "quantity: calibrated_airspeed, limit: {quantity: stall_speed}, below: {advisory: 110 %, caution: 100 %}"
    ).limit
    assert isinstance(plain, RelativeLimit)
    assert (plain.times, plain.plus) == (1.0, None)


LEVELS = [
    ("quantity: load_factor, limit: 4 g, above: {caution: 100 %}", 4.0, [4.0]),
    ("quantity: load_factor, limit: 4 g, above: {caution: 4.5 g, warning: 5 g}", 4.0, [4.5, 5.0]),
    ("quantity: airspeed, limit: 100 KIAS, above: {advisory: 95 %, warning: {beyond_by: 10 kt}}", 100 * KT,
     [95 * KT, 110 * KT]),
    ("quantity: load_factor, limit: -3 g, below: {advisory: 90 %, caution: 100 %}", -3.0, [-2.7, -3.0]),
    ("quantity: load_factor, limit: -3 g, below: {caution: {beyond_by: 0.5 g}}", -3.0, [-3.5]),
    ("quantity: oil_temperature, limit: 118 degC, above: {advisory: {beyond_by: -3 degC}, caution: 100 %}", 391.15,
     [388.15, 391.15]),
    ("quantity: mach, limit: 0.8, above: {caution: 100 %, warning: {beyond_by: 0.02}}", 0.8, [0.8, 0.82]),
    ("quantity: mach, above: {caution: 0.82}", None, [0.82]),
    ("quantity: torque, above: {caution: 104 %}", None, [1.04]),
    ("quantity: torque, limit: 110 %, above: {caution: 100 %}", 1.1, [1.1]),
]  # fmt: skip


@pytest.mark.parametrize(("body", "limit", "expected"), LEVELS)
def test_levels_are_per_cent_of_the_limit_absolute_or_beyond_it(
    body: str, limit: float | None, expected: list[float]
) -> None:
    assert [level.value(limit) for level in one(body).levels] == pytest.approx(expected)


def test_a_level_may_ask_for_a_longer_time() -> None:
    rule = one("quantity: airspeed, limit: 100 KIAS, above: {caution: {at: 105 %, lasting: 20 s}, warning: 110 %}")
    assert [(level.severity, level.percent, level.lasting) for level in rule.levels] == [
        ("caution", 1.05, 20.0),
        ("warning", 1.1, None),
    ]


def test_a_severer_level_may_lie_inside_if_it_asks_for_a_longer_time() -> None:
    rule = one("quantity: airspeed, limit: 100 KIAS, above: {caution: 110 %, warning: {at: 105 %, lasting: 60 s}}")
    assert [level.percent for level in rule.levels] == [1.1, 1.05]


ORDER = [
    ("load_factor", "aircraft.load_factor.maximum", "above", "100 %", "110 %", True),
    ("load_factor", "aircraft.load_factor.maximum", "above", "110 %", "100 %", False),
    # a negative limit lies farther out at a greater per cent
    ("load_factor", "aircraft.load_factor.minimum", "below", "100 %", "110 %", True),
    ("load_factor", "aircraft.load_factor.minimum", "below", "110 %", "100 %", False),
    # a stall speed at a smaller one
    ("calibrated_airspeed", "{quantity: stall_speed}", "below", "110 %", "100 %", True),
    ("calibrated_airspeed", "{quantity: stall_speed}", "below", "100 %", "110 %", False),
    # the sign of a named fact is not known, so either may be meant, but not twice the same
    ("load_factor", "aircraft.limits.x", "below", "110 %", "100 %", True),
    ("load_factor", "aircraft.limits.x", "below", "100 %", "110 %", True),
    ("load_factor", "aircraft.limits.x", "below", "100 %", "100 %", False),
    ("load_factor", "aircraft.limits.x", "below", "2 g", "1 g", True),
    ("load_factor", "aircraft.limits.x", "below", "1 g", "2 g", False),
    ("load_factor", "aircraft.limits.x", "above", "{beyond_by: 1 g}", "{beyond_by: 2 g}", True),
    ("load_factor", "aircraft.limits.x", "below", "{beyond_by: 2 g}", "{beyond_by: 1 g}", False),
    # one form against the other depends on the limit in force
    ("load_factor", "aircraft.limits.x", "above", "100 %", "{beyond_by: 1 g}", True),
    ("load_factor", "aircraft.limits.x", "above", "100 %", "2 g", True),
]


@pytest.mark.parametrize(("quantity", "limit", "side", "less", "more", "right"), ORDER)
def test_the_severer_level_lies_farther_out(
    quantity: str, limit: str, side: str, less: str, more: str, right: bool
) -> None:
    body = f"quantity: {quantity}, limit: {limit}, {side}: {{caution: {less}, warning: {more}}}"
    if right:
        assert len(one(body).levels) == 2
        return
    with pytest.raises(DocumentError, match=r"warning at .* is (inside|the same as) caution at"):
        one(body)


def test_what_is_expected_of_a_ratio_allows_a_bare_number() -> None:
    with pytest.raises(DocumentError) as caught:
        one("quantity: mach, limit: 0.8, above: {caution: 5 kt}")
    assert caught.value.problems[0].expected == "a number or a per cent, or a per cent of the limit"
    with pytest.raises(DocumentError) as caught:
        one("quantity: load_factor, above: {caution: 5 kt}")
    assert caught.value.problems[0].expected == "a load factor in ft/s2, g, m/s2"


def test_a_discrete_rule_knows_its_states() -> None:
    rule = one("quantity: gear_down, is: {caution: up}, when: [{phase: landing}]")
    assert [(level.severity, level.word, level.value) for level in rule.states] == [("caution", "up", 0)]
    assert rule.sides == ("is",)
    assert one('quantity: stall_warning, is: {caution: "on"}').states[0].value == 1
    # YAML readers that know bools would make this True; we keep the word
    assert one("quantity: stall_warning, is: {caution: on}").states[0].value == 1
    assert one("quantity: valve, is: {advisory: open}").states[0].value == 1


def test_conditions_have_three_forms() -> None:
    rule = one("quantity: load_factor, above: {caution: 6 g}, when: [{phase: [initial climb, cruise]}, "
               "{quantity: bank_angle, above: 10 deg, below: 60 deg}, {any: [{quantity: flap_angle, within: [0 deg, 10 deg]}, "  # noqa: E501
               "{quantity: gear_down, is: down}, {quantity: {rate_of: bank_angle}, above: 5 deg/s}]}]")  # fmt: skip
    first, second, third = rule.when
    assert first.phase == ("initial climb", "cruise")
    assert (second.quantity, second.above, second.below) == (
        "bank_angle", pytest.approx(10 * DEG), pytest.approx(60 * DEG),
    )  # fmt: skip
    inner = third.any
    assert inner[0].within == (0, pytest.approx(10 * DEG))
    assert (inner[1].state, inner[1].state_value) == ("down", 1)
    assert (inner[2].quantity, inner[2].rate) == ("bank_angle", True)
    assert rule.needs() == ("load_factor", "bank_angle", "flap_angle", "gear_down")


def test_counts_totals_and_allowances_are_read() -> None:
    rule = one("quantity: torque, limit: 100 %, above: {caution: 100 %}, allowed: [{up_to: 107 %, for: 20 s, within: flight}, "  # noqa: E501
               "{up_to: 112 %, for: 5 s, within: 10 min}, {up_to: 115 %, for: 1 s}], count: {at_least: 3, within: flight}, "  # noqa: E501
               "total: {above: 300 s, within: 1 h}, release: 2 %")  # fmt: skip
    assert [(step.up_to, step.for_time, step.within) for step in rule.allowed] == [
        (1.07, 20, "flight"), (1.12, 5, 600), (1.15, 1, "event"),
    ]  # fmt: skip
    assert rule.count is not None
    assert (rule.count.at_least, rule.count.within) == (3, "flight")
    assert rule.total is not None
    assert (rule.total.above, rule.total.within) == (300, 3600)
    assert (rule.release, rule.release_is_percent) == (0.02, True)
    assert (
        one("quantity: load_factor, limit: 6 g, above: {caution: 100 %}, release: 0.05 g").release_is_percent is False
    )


def test_touchdown_rules_judge_the_sample_unless_told_otherwise() -> None:
    assert one("quantity: touchdown_load_factor, above: {caution: 2 g}").judge_on == "sample"
    assert one("quantity: touchdown_load_factor, above: {caution: 2 g}, judge_on: estimate").judge_on == "estimate"


def test_the_rate_of_a_quantity_has_its_own_kind() -> None:
    rule = one("quantity: {rate_of: load_factor}, above: {advisory: 5 g/s}")
    assert (rule.quantity, rule.rate, rule.kind) == ("load_factor", True, "load factor rate")
    assert one("quantity: {rate_of: pressure_altitude}, below: {advisory: -3000 ft/min}").kind == "speed"


def test_a_name_with_an_index_is_that_of_one_engine_and_without_it_of_all() -> None:
    rule = one("quantity: oil_temperature, limit: 118 degC, above: {caution: 100 %}")
    recorded = [
        "oil_temperature_10",
        "oil_temperature_2",
        "oil_temperature",
        "oil_temperature_1_3",
        "oil_temperature_x",
    ]
    assert rule.channels(recorded) == (
        "oil_temperature",
        "oil_temperature_1_3",
        "oil_temperature_2",
        "oil_temperature_10",
    )
    single = one("quantity: oil_temperature_2, limit: 118 degC, above: {caution: 100 %}")
    assert single.channels(recorded) == ("oil_temperature_2",)
    assert single.kind == "temperature"


def test_airspeed_takes_its_kind_from_the_limit() -> None:
    assert one("quantity: airspeed, limit: 140 KIAS, above: {caution: 100 %}").airspeed == "indicated_airspeed"
    assert one("quantity: airspeed, above: {caution: 250 km/h CAS}").airspeed == "calibrated_airspeed"
    fact = one("quantity: airspeed, limit: aircraft.speeds.never_exceed, above: {caution: 100 %}")
    assert fact.airspeed is None
    aircraft = load_aircraft(template("aircraft"))
    assert fact.needs(aircraft) == ("indicated_airspeed", "pressure_altitude")


def test_needs_name_what_the_aircraft_fact_varies_with() -> None:
    aircraft = load_aircraft(template("aircraft"))
    for limit, quantity, expected in (
        ("load_factor.maximum", "load_factor", ("load_factor", "load_factor_maximum")),
        ("speeds.flaps_extended", "airspeed", ("indicated_airspeed", "flap_angle")),
        ("loading.forward", "centre_of_gravity", ("centre_of_gravity", "mass")),
        ("speeds.manoeuvring", "airspeed", ("indicated_airspeed", "mass")),
        ("mass.maximum_landing", "mass", ("mass",)),
    ):
        rule = one(f"quantity: {quantity}, limit: aircraft.{limit}, above: {{caution: 100 %}}")
        assert rule.needs(aircraft) == expected


def test_a_fact_that_does_not_fit_the_rule_counts_as_missing() -> None:
    aircraft = load_aircraft(
        "format: exceed-aircraft/1\nlimits: {a: 3 kt, b: 5 KIAS}\nspeeds: {never_exceed: 175 KIAS}\n"
    )
    for body, missing in (
        ("quantity: oil_temperature, limit: aircraft.limits.a", "aircraft.limits.a is a speed and the rule is about a temperature"),  # noqa: E501
        ("quantity: airspeed, limit: aircraft.limits.a", "aircraft.limits.a does not say which airspeed it is"),
        ("quantity: calibrated_airspeed, limit: aircraft.speeds.never_exceed",
         "aircraft.speeds.never_exceed is an indicated airspeed and the rule is about calibrated_airspeed"),
        ("quantity: airspeed, limit: aircraft.limits.b", ""),
        ("quantity: airspeed, limit: aircraft.limits.c", "the aircraft file has no limits.c"),
    ):  # fmt: skip
        fact = one(f"{body}, above: {{caution: 100 %}}").look_up(aircraft)
        assert fact is not None
        assert fact.missing == missing
        assert (fact.value is None) == bool(missing)
    assert one("quantity: load_factor, above: {caution: 6 g}").look_up(aircraft) is None


# what stands in braces after `{id: r, `, a caret before the place that the message points at, and the message
WRONG = [
    ("quantity: ^load_factr, above: {caution: 6 g}", "'load_factr' is not a quantity"),
    ("quantity: load_factor", "no level is given"),
    ("quantity: load_factor, ^abov: {caution: 6 g}", "key 'abov' is not known here"),
    ("quantity: load_factor, above: {^cauton: 6 g}", "key 'cauton' is not a severity"),
    ("quantity: load_factor, above: ^{}", "no level is given"),
    ("quantity: load_factor, above: ^6 g", "'6 g' stands where levels are due"),
    ("quantity: load_factor, above: {caution: ^6}", "'6' is a bare number and load_factor is a load factor"),
    ("quantity: load_factor, above: {caution: ^6 kt}", "'6 kt' is a speed and load_factor is a load factor"),
    ("quantity: load_factor, above: {caution: ^100 %}", "'100 %' is a per cent of the limit, and there is none"),
    (
        "quantity: load_factor, above: {caution: ^{beyond_by: 1 g}}",
        "'beyond_by' counts from the limit, and there is none",
    ),
    ("quantity: load_factor, limit: 6 g, above: {caution: ^{beyond_by: 5 %}}", "'5 %' is a per cent"),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: ^{beyond_by: 5 kt}}",
        "'5 kt' is a speed and load_factor is a load factor",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: ^{at: 5 g, beyond_by: 5 g}}",
        "a level needs one of 'at' and 'beyond_by'",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: ^{lasting: 5 s}}",
        "a level needs one of 'at' and 'beyond_by'",
    ),
    ("quantity: load_factor, limit: 6 g, above: {caution: {at: 100 %, lasting: ^5 g}}", "'5 g' is a load factor"),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 110 %, warning: ^100 %}",
        "warning at '100 %' is inside caution at '110 %'",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {advisory: 6 g, caution: ^100 %}",
        "caution at '100 %' is the same as advisory at '6 g'",
    ),
    (
        "quantity: load_factor, limit: -3 g, below: {caution: 110 %, warning: ^100 %}",
        "warning at '100 %' is inside caution at '110 %'",
    ),
    (
        "quantity: airspeed, limit: aircraft.speeds.winch, above: {caution: {beyond_by: 10 kt}, warning: ^{beyond_by: 5 kt}}",  # noqa: E501
        "warning at '5 kt' beyond is inside caution at '10 kt' beyond",
    ),
    ("quantity: load_factor, above: {caution: 6 g, warning: ^5 g}", "warning at '5 g' is inside caution at '6 g'"),
    (
        "quantity: load_factor, limit: ^6 kt, above: {caution: 100 %}",
        "'6 kt' is a speed and load_factor is a load factor",
    ),
    ("quantity: load_factor, limit: ^50 %, above: {caution: 100 %}", "'50 %' is a per cent of nothing"),
    ("quantity: load_factor, limit: ^[6 g], above: {caution: 100 %}", "a list stands where a limit is due"),
    ("quantity: load_factor, limit: ^{a: 1}, above: {caution: 100 %}", "this mapping is no form of a limit"),
    (
        "quantity: load_factor, limit: ^aircraft.load_factor.maximun, above: {caution: 100 %}",
        "'aircraft.load_factor.maximun' is not a fact of an aeroplane",
    ),
    (
        "quantity: load_factor, limit: ^aircraft.speeds.winch, above: {caution: 100 %}",
        "aircraft.speeds.winch is a speed and load_factor is a load factor",
    ),
    (
        "quantity: bank_angle, limit: {over: ^heigth_above_aerodrome, points: [[0 ft, 1 deg], [1 ft, 2 deg]]}, above: {caution: 100 %}",  # noqa: E501
        "'heigth_above_aerodrome' is not a quantity",
    ),
    (
        "quantity: bank_angle, limit: {over: mass, points: [[^0 ft, 1 deg], [1 ft, 2 deg]]}, above: {caution: 100 %}",
        "'0 ft' is a length and mass is a mass",
    ),
    (
        "quantity: bank_angle, limit: {over: mass, points: [[0 kg, ^1 kt], [1 kg, 2 kt]]}, above: {caution: 100 %}",
        "'1 kt' is a speed and bank_angle is an angle",
    ),
    (
        "quantity: bank_angle, limit: {over: mass, points: [[0 kg, 1 deg], [1 kg, ^2 kt]]}, above: {caution: 100 %}",
        "'2 kt' is another kind of value than '1 deg'",
    ),
    (
        "quantity: bank_angle, limit: {over: mass, points: [[1 kg, 1 deg], ^[1 kg, 2 deg]]}, above: {caution: 100 %}",
        "'1 kg' is not above '1 kg' before it",
    ),
    (
        "quantity: bank_angle, limit: {over: mass, points: [[1 kg, 1 deg], [2 kg, 2 deg]], between: ^cubic}, above: {caution: 100 %}",  # noqa: E501
        "'cubic' is not a way to go between points",
    ),
    (
        "quantity: bank_angle, limit: {quantity: ^stall_speed}, above: {caution: 100 %}",
        "stall_speed is a speed and bank_angle is an angle",
    ),
    (
        "quantity: stall_margin, limit: {quantity: stall_speed, plus: ^5 deg}, above: {caution: 100 %}",
        "'5 deg' is an angle and stall_margin is a speed",
    ),
    ("quantity: airspeed, limit: ^140 kt, above: {caution: 100 %}", "'140 kt' does not say which airspeed it is"),
    (
        "quantity: indicated_airspeed, limit: ^140 KCAS, above: {caution: 100 %}",
        "'140 KCAS' is a calibrated airspeed and the rule is about indicated airspeed",
    ),
    (
        "quantity: oil_temperature, limit: 118 degC, above: {caution: ^105 %}",
        "'105 %' of a temperature depends on the scale, so it says nothing",
    ),
    ("quantity: gear_down, above: ^{caution: 1 g}", "gear_down is a state, so it is neither above nor below a level"),
    ("quantity: gear_down, is: {caution: ^upp}", "'upp' is no state of gear_down"),
    ("quantity: gear_down, is: ^up", "'up' stands where states are due"),
    ("quantity: gear_down, is: ^{advisory: up, caution: down}", "two states in one rule cannot be told apart"),
    ("quantity: gear_down, is: {caution: up}, limit: ^1 g", "gear_down is a state and has no limit"),
    ("quantity: load_factor, is: ^{caution: up}", "load_factor is no state"),
    (
        "quantity: ^{rate_of: oil_temperature}, above: {advisory: 1 K}",
        "there is no unit for the rate of oil_temperature",
    ),
    ("quantity: ^{rat_of: load_factor}, above: {advisory: 5 g/s}", "this is neither a quantity nor the rate of one"),
    (
        "quantity: {rate_of: load_factor}, above: {advisory: ^5 g}",
        "'5 g' is a load factor and load_factor is a load factor rate",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, when: ^{phase: cruise}", "a mapping stands where a list is due"),
    ("quantity: load_factor, above: {caution: 6 g}, when: [{phase: ^cruize}]", "'cruize' is not a phase"),
    ("quantity: load_factor, above: {caution: 6 g}, when: [{phase: [cruise, ^Climb]}]", "'Climb' is not a phase"),
    ("quantity: load_factor, above: {caution: 6 g}, when: [{phase: ^[]}]", "no phase is given"),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [^{}]",
        "a condition needs one of 'phase', 'quantity' and 'any'",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [^{phase: cruise, quantity: mach, above: 0.5}]",
        "a condition needs one of 'phase', 'quantity' and 'any'",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, when: [^{quantity: mach}]", "this condition compares with nothing"),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{quantity: bank_angle, above: ^5 g}]",
        "'5 g' is a load factor and bank_angle is an angle",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, when: [{quantity: bank_angle, is: ^up}]", "bank_angle is no state"),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [^{quantity: gear_down, above: 1 g}]",
        "gear_down is a state",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{quantity: gear_down, is: ^out}]",
        "'out' is no state of gear_down",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{quantity: mach, above: 0.8, below: ^0.5}]",
        "above '0.8' and below '0.5' can never both hold",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{quantity: mach, within: ^[0.8, 0.5]}]",
        "'0.8' is not below '0.5'",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{any: [{quantity: ^mahc, above: 0.8}]}]",
        "'mahc' is not a quantity",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{quantity: ^airspeed, above: 80 KIAS}]",
        "'airspeed' has no limit here to say which it is",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, when: [{phase: [taxi]}, ^{phase: [airborne]}]",
        "no phase is left by this and the phases before it, so the rule never looks",
    ),
    (
        "quantity: touchdown_load_factor, above: {caution: 2 g}, when: [^{phase: [airborne]}]",
        "a touchdown is never in the phase airborne",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, lasting: ^-1 s", "'-1 s' is no possible time here"),
    ("quantity: load_factor, above: {caution: 6 g}, joining: ^1 g", "'1 g' is a load factor"),
    (
        "quantity: load_factor, above: {caution: 6 g}, release: ^1 %",
        "'1 %' is a per cent of the limit, and there is none",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, release: ^1 kt",
        "'1 kt' is a speed and load_factor is a load factor",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, allowed: [{up_to: ^7 g, for: 5 s}]",
        "an allowance counts beyond the limit, and there is none",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 100 %}, allowed: [{up_to: ^100 %, for: 5 s}]",
        "'100 %' leaves nothing beyond the limit",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 100 %}, "
        "allowed: [{up_to: 110 %, for: 5 s}, {up_to: ^110 %, for: 4 s}]",
        "'110 %' is not beyond '110 %' before it",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 100 %}, allowed: [{up_to: 110 %, for: 5 s}, {up_to: ^105 %, for: 4 s}]",  # noqa: E501
        "'105 %' is not beyond '110 %' before it",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 100 %}, allowed: [{up_to: 105 %, for: 5 s}, {up_to: 110 %, for: ^9 s}]",  # noqa: E501
        "'9 s' is longer than '5 s' of the step inside it",
    ),
    (
        "quantity: load_factor, limit: 6 g, above: {caution: 100 %}, allowed: [{up_to: 105 %, for: 5 s, within: ^day}]",
        "'day' is no span to count within",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, count: {at_least: ^0, within: flight}",
        "'0' is not a whole number of 1 or more",
    ),
    (
        "quantity: load_factor, above: {caution: 6 g}, total: {above: ^300 s, within: 200 s}",
        "'300 s' can never add up within '200 s'",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, judge_on: ^peak", "'peak' is not something to judge on"),
    ("quantity: load_factor, above: {caution: 6 g}, override: ^perhaps", "'perhaps' is neither true nor false"),
    ("quantity: load_factor, above: {caution: 6 g}, inspection: ^{from: caution}", "key 'task' is missing"),
    ("quantity: load_factor, above: {caution: 6 g}, inspection: {task: x, from: ^red}", "'red' is not a severity"),
    (
        "quantity: load_factor, above: {caution: 6 g}, inspection: {task: x, certainty: ^sure}",
        "'sure' is not a word for certainty",
    ),
    ("quantity: load_factor, above: {caution: 6 g}, notes: ^[1, [2]]", "a list stands where notes are due"),
    ("quantity: load_factor, above: {caution: 6 g}, ^place: x", "key 'place' is not known here"),
]


@pytest.mark.parametrize(("body", "problem"), WRONG, ids=[f"{row[1][:60]} {n}" for n, row in enumerate(WRONG)])
def test_each_mistake_is_told_once_at_its_line_and_column(body: str, problem: str) -> None:
    before, caret, after = body.partition("^")
    # without a caret it is the rule as a whole, whose brace stands in column 5
    column = len("  - {id: r, ") + len(before) + 1 if caret else 5
    with pytest.raises(DocumentError) as caught:
        one(before + after)
    assert [(row.place, row.problem) for row in caught.value.problems] == [(f"text:4:{column}", problem)]
    assert all(row.expected and row.do for row in caught.value.problems)


FILES = [
    ("format: exceed-rules/1\nrules: []\n", [("2:8", "there is no rule")]),
    ("format: exceed-rules/1\n", [("1:1", "key 'rules' is missing")]),
    ("format: exceed-rules/1\nrules: {a: 1}\n", [("2:8", "a mapping stands where a list is due")]),
    (
        "format: exceed-rules/1\nquantities: {Oil: degC, mach: kt, oil_t: degc, x: [1]}\nrules: [{id: a, quantity: mach, above: {caution: 0.8}}]\n",  # noqa: E501
        [("2:14", "key 'Oil' is no name for a quantity"), ("2:31", "'mach' is known already as a ratio, and kt is no unit of it"),  # noqa: E501
         ("2:42", "unit 'degc' is not known"), ("2:51", "unit a list is not known")],
    ),
    (
        HEAD + "  - {id: a, quantity: load_factor, above: {caution: 6 g}}\n  - {id: a, quantity: mach, above: {cauton: 1}}\n",  # noqa: E501
        [("5:10", "id 'a' is there twice, first as rule 1"), ("5:37", "key 'cauton' is not a severity")],
    ),
    (HEAD + "  - {id: a b, quantity: load_factor, above: {caution: 6 g}}\n", [("4:10", "'a b' is not an id")]),
    (HEAD + "  - {quantity: load_factor, above: {caution: 6 g}}\n", [("4:5", "key 'id' is missing")]),
    (HEAD + "  - just text\n", [("4:5", "'just text' stands where a rule is due")]),
]  # fmt: skip


@pytest.mark.parametrize(("text", "expected"), FILES)
def test_mistakes_of_the_file_as_a_whole(text: str, expected: list[tuple[str, str]]) -> None:
    with pytest.raises(DocumentError) as caught:
        load_rules(text)
    assert [(row.place, row.problem) for row in caught.value.problems] == [
        (f"text:{place}", problem) for place, problem in expected
    ]


def test_all_mistakes_of_all_rules_are_listed_at_once() -> None:
    text = HEAD + (
        "  - {id: a, quantity: load_factr, above: {caution: 6 g}, lasting: 1 kt}\n"
        "  - {id: b, quantity: load_factor, limit: 6 g, above: {caution: 110 %, warning: 100 %}, release: 1 s}\n"
        "  - {id: c, quantity: mach, above: {caution: 0.8}, when: [{phase: cruize}], joning: 1 s}\n"
    )
    with pytest.raises(DocumentError) as caught:
        load_rules(text)
    assert [row.problem for row in caught.value.problems] == [
        "'load_factr' is not a quantity",
        "'1 kt' is a speed",
        "warning at '100 %' is inside caution at '110 %'",
        "'1 s' is a time and load_factor is a load factor",
        "'cruize' is not a phase",
        "key 'joning' is not known here",
    ]


@pytest.mark.parametrize(
    ("body", "do"),
    [
        ("quantity: load_factor, above: {caution: 6}", "write the unit, as in '6 g'"),
        ("quantity: vertical_speed, above: {caution: 600}", "write the unit, as in '600 ft/min'"),
        ("quantity: oil_temperature, above: {caution: 118}", "write the unit, as in '118 degC'"),
        ("quantity: {rate_of: load_factor}, above: {caution: 3}", "write the unit, as in '3 g/s'"),
    ],
)
def test_a_bare_number_is_answered_with_the_unit_of_the_quantity(body: str, do: str) -> None:
    with pytest.raises(DocumentError) as caught:
        one(body)
    assert [row.do for row in caught.value.problems] == [do]


def test_a_known_quantity_may_be_declared_again_in_a_unit_of_its_kind() -> None:
    text = "format: exceed-rules/1\nquantities: {engine_speed: rpm}\nrules: [{id: a, quantity: engine_speed, above: {caution: 2700 rpm}}]\n"  # noqa: E501
    assert load_rules(text).rules[0].kind == "rotation"


def test_the_nearest_quantity_is_suggested_or_how_to_declare_one() -> None:
    for name, do in (
        ("load_factr", "write 'load_factor' if that is meant"),
        ("oil_temprature", "write 'oil_temperature' if that is meant"),
        ("qqq", "declare it: 'quantities: {qqq: UNIT}'"),
    ):
        with pytest.raises(DocumentError) as caught:
            one(f"quantity: {name}, above: {{caution: 6 g}}")
        assert caught.value.problems[0].do == do
