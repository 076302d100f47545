"""Numbers with units: what they become in SI, and what is said where they cannot be read."""

from __future__ import annotations

import copy
import math
import pickle

import pint
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from exceed.core.units import AIRSPEED_UNITS, UNITS
from exceed.documents.values import Value, ValueFault, parse

READ = [
    ("54 KCAS", "speed", 54 * 1852 / 3600, "calibrated_airspeed"),
    ("250 km/h IAS", "speed", 250 / 3.6, "indicated_airspeed"),
    ("60 m/s EAS", "speed", 60.0, "equivalent_airspeed"),
    ("120 mph TAS", "speed", 120 * 0.44704, "true_airspeed"),
    ("6 g", "load factor", 6.0, None),
    ("6g", "load factor", 6.0, None),
    ("9.80665 m/s2", "load factor", 1.0, None),
    ("110 %", "ratio", 1.1, None),
    ("95%", "ratio", 0.95, None),
    ("10000 ft", "length", 3048.0, None),
    ("-3 g", "load factor", -3.0, None),
    ("\u22123 g", "load factor", -3.0, None),
    ("+2.5e1 kg", "mass", 25.0, None),
    (".5 s", "time", 0.5, None),
    ("15 degC", "temperature", 288.15, None),
    ("59 degF", "temperature", 288.15, None),
    ("29.92 inHg", "pressure", 101320.75, None),
    ("600 rpm", "rotation", 10.0, None),
    ("40 L/h", "volume flow", 0.04 / 3600, None),
    ("0.72 kg/L", "density", 720.0, None),
    ("4.9 1/rad", "slope", 4.9, None),
    ("  900   kg ", "mass", 900.0, None),
]


@pytest.mark.parametrize(("text", "kind", "si", "airspeed"), READ)
def test_a_value_is_read_into_si(text: str, kind: str, si: float, airspeed: str | None) -> None:
    value = parse(text)
    assert (value.kind, value.airspeed) == (kind, airspeed)
    assert float(value) == pytest.approx(si, rel=1e-7, abs=1e-12)


# spellings of the same unit in the general unit library pint
PINT = {
    "kt": "knot", "km/h": "km/hour", "mph": "mile/hour", "ft/min": "ft/min", "ft/s": "ft/s", "ft": "ft", "in": "inch",
    "deg/s": "degree/s", "lb": "lb", "min": "minute", "h": "hour", "hPa": "hPa", "mbar": "mbar", "bar": "bar",
    "psi": "psi", "L": "L", "USG": "gallon", "kg/L": "kg/L", "lb/h": "lb/hour", "USG/h": "gallon/hour",
    "ft2": "ft**2", "lb.ft": "lbf*ft", "km": "km", "ms": "ms",
}  # fmt: skip


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    return pint.UnitRegistry()


@pytest.mark.parametrize("unit", sorted(PINT))
def test_factors_agree_with_a_general_unit_library(unit: str, registry: pint.UnitRegistry) -> None:
    theirs = registry.Quantity(7.25, PINT[unit]).to_base_units().magnitude
    assert float(parse(f"7.25 {unit}")) == pytest.approx(theirs, rel=1e-9)


WRONG = [
    ("60", "mass", "'60' has no unit", "a mass in kg, lb", "write the unit after the number, as in '60 kg'"),
    ("60 kt", "mass", "'60 kt' is a speed", "a mass in kg, lb", "give a value of that kind"),
    ("5 %", "mass", "'5 %' is per cent", "a mass in kg, lb", "give a value of that kind"),
    ("60 kgg", "mass", "unit 'kgg' is not known", "a mass in kg, lb", "write 'kg' if that is meant"),
    ("60 kp", "mass", "unit 'kp' is not known", "a mass in kg, lb", "write 'kg' if that is meant"),
    ("60 lbs", "mass", "unit 'lbs' is not known", "a mass in kg, lb", "write 'lb' if you meant pounds"),
    ("60 zorkmid", "mass", "unit 'zorkmid' is not known", "a mass in kg, lb", "use a unit of the list"),
    ("60 Kg", "mass", "unit 'Kg' is not known", "a mass in kg, lb", "write 'kg' if that is meant"),
    (
        "140 kph", "speed", "unit 'kph' is not known", "a speed in ft/min, ft/s, km/h, kt, m/s, mph",
        "write 'km/h' if you meant kilometres per hour",
    ),
    ("nan kg", "mass", "'nan kg' is not a finite number", "a mass in kg, lb", "give the figure, or leave the key out"),
    (".inf kg", "mass",
     "'.inf kg' is not a finite number", "a mass in kg, lb", "give the figure, or leave the key out"),
    ("-inf", "mass", "'-inf' is not a finite number", "a mass in kg, lb", "give the figure, or leave the key out"),
    ("1e999 kg", "mass", "'1e999 kg' is too large a number", "a mass in kg, lb", "check the exponent"),
    ("1e308 kg/L", "density", "'1e308 kg/L' is too large a number", "a density in kg/L, kg/m3", "check the exponent"),
    (
        "1 200 kg", "mass", "'1 200 kg' has thousands marks", "digits with a point for decimals and no thousands marks",
        "write '1200 kg'",
    ),
    (
        "1'200 kg", "mass", "'1'200 kg' has thousands marks",
        "digits with a point for decimals and no thousands marks", "write '1200 kg'",
    ),
    (
        "1.200.000 kg", "mass", "'1.200.000 kg' has thousands marks",
        "digits with a point for decimals and no thousands marks", "write '1200000 kg'",
    ),
    (
        "1,200 kg", "mass", "'1,200 kg' has a comma in the number",
        "digits with a point for decimals and no thousands marks", "write '1200 kg' or '1.200 kg', whichever is meant",
    ),
    ("4,4 g", "load factor", "'4,4 g' has a decimal comma", "a decimal point", "write '4.4 g'"),
    ("heavy", "mass", "'heavy' does not start with a number", "a mass in kg, lb", "write a number and its unit"),
    ("kg 60", "mass", "'kg 60' does not start with a number", "a mass in kg, lb", "write a number and its unit"),
    ("", "mass", "no value is given", "a mass in kg, lb", "write a number and its unit"),
    ("-300 degC", "temperature", "'-300 degC' is below absolute zero", "a temperature in K, degC, degF",
     "check the figure and its unit"),
    ("1 state", "mass", "'1 state' is a state", "a mass in kg, lb", "give a value of that kind"),
    ([1], "mass", "a list stands where a value is due", "a mass in kg, lb", "write a number and its unit"),
    ({}, "mass", "a mapping stands where a value is due", "a mass in kg, lb", "write a number and its unit"),
    (None, "mass", "nothing stands where a value is due", "a mass in kg, lb", "write a number and its unit"),
    ("６０ kg", "mass", "'６０ kg' does not start with a number", "a mass in kg, lb", "write a number and its unit"),
    (
        "60 kt IASS", "speed", "'IASS' is not a kind of airspeed", "one of CAS, EAS, IAS, TAS",
        "write 'kt IAS' if that is meant",
    ),
    (
        "60 ft/min IAS", "speed", "'ft/min IAS' is no unit of an airspeed",
        "an airspeed in KCAS, KEAS, KIAS, KTAS, or a speed and its kind, as in '250 km/h IAS'",
        "give the IAS in one of km/h, kt, m/s, mph",
    ),
]  # fmt: skip


@pytest.mark.parametrize(("text", "kind", "problem", "expected", "do"), WRONG)
def test_what_cannot_be_read_says_what_is_wrong_and_what_to_do(
    text: object, kind: str, problem: str, expected: str, do: str
) -> None:
    with pytest.raises(ValueFault) as caught:
        parse(text, kind)
    assert (caught.value.problem, caught.value.expected, caught.value.do) == (problem, expected, do)


def test_an_airspeed_that_must_say_its_kind_says_so() -> None:
    with pytest.raises(ValueFault) as caught:
        parse("140 kt", "speed", airspeed="required")
    assert caught.value.problem == "'140 kt' does not say which airspeed it is"
    assert caught.value.do == "write '140 kt IAS' if the manual means indicated airspeed"
    with pytest.raises(ValueFault, match="is no airspeed"):
        parse("500 ft/min", "speed", airspeed="required")
    with pytest.raises(ValueFault, match="'2 KIAS' is an airspeed"):
        parse("2 KIAS", "speed", airspeed="refused")


def test_a_difference_of_temperatures_has_no_offset() -> None:
    assert float(parse("10 degC", "temperature", difference=True)) == 10.0
    assert float(parse("-18 degF", "temperature", difference=True)) == pytest.approx(-10.0)


def test_a_bare_number_is_right_only_where_asked_for() -> None:
    value = parse("0.8", "ratio", bare=True)
    assert (float(value), value.kind, value.bare) == (0.8, "ratio", True)
    with pytest.raises(ValueFault, match=r"'0\.8' has no unit"):
        parse("0.8", "ratio")


def test_a_value_keeps_its_text_through_pickle_and_copy_and_does_not_change() -> None:
    value = parse("54 KCAS")
    for other in (pickle.loads(pickle.dumps(value)), copy.deepcopy(value), copy.copy(value)):
        assert isinstance(other, Value)
        assert (float(other), other.text, other.unit, other.airspeed) == (
            float(value), "54 KCAS", "kt", "calibrated_airspeed",
        )  # fmt: skip
    with pytest.raises(AttributeError, match="does not change"):
        value.text = "55 KCAS"


@settings(deadline=None)
@given(
    st.floats(-1e9, 1e9, allow_nan=False).map(lambda number: round(number, 6)),
    st.sampled_from(sorted(name for name in UNITS if name not in ("1", "state"))),
    st.sampled_from(["", " ", "  "]),
)
@example(-0.0, "g", " ")
@example(0.0, "degF", " ")
def test_any_number_and_unit_round_trips(number: float, unit: str, gap: str) -> None:
    row = UNITS[unit]
    text = f"{number:f}{gap or ' '}{unit}"
    si = row.to_si(float(f"{number:f}"))
    if row.kind == "temperature" and si < 0:
        with pytest.raises(ValueFault, match="below absolute zero"):
            parse(text)
        return
    value = parse(text)
    assert value.kind == row.kind
    assert math.isclose(row.from_si(float(value)), float(f"{number:f}"), rel_tol=1e-9, abs_tol=1e-6)
    assert parse(value.text) == value


@settings(deadline=None)
@given(st.text(max_size=30))
@example("1_000 kg")
@example("0x10 kg")
@example("1e5")
@example("1 KIAS IAS")
def test_any_text_gives_a_value_or_a_fault_with_words(text: str) -> None:
    try:
        value = parse(text)
    except ValueFault as fault:
        words = (fault.problem, fault.expected, fault.do)
    else:
        words = (value.text,)
        assert math.isfinite(value)
        assert value.unit in UNITS
        assert value.text == " ".join(text.replace("\u2212", "-").split())
    assert all(words)


def test_every_unit_of_the_table_can_be_written() -> None:
    for name, row in UNITS.items():
        if row.kind != "state" and name != "1":
            assert parse(f"300 {name}").unit == name
    for name, (unit, kind) in AIRSPEED_UNITS.items():
        value = parse(f"100 {name}")
        assert (value.unit, value.airspeed) == (unit, kind)
