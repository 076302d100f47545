"""The V-n diagram as a whole: the invented Larkspur's figures by hand, steps, flaps, categories, outputs."""

from __future__ import annotations

import json
import math
import re
from pathlib import Path

import numpy as np
import pytest
from typer.testing import CliRunner

from exceed.cli.app import app
from exceed.documents.aircraft import category_aircraft, load_aircraft
from exceed.drawing import envelope_at as drawn_at
from exceed.envelopes import envelope_asked, envelope_at, envelope_of
from exceed.errors import DocumentError, UsageError
from exceed.physics import envelope as physics
from exceed.report.envelope import envelope_page, envelope_summary, render_envelope

KT = 1852.0 / 3600.0
FT = 0.3048
LARKSPUR = """
format: exceed-aircraft/1
registration: ZZ-NMA
type: Larkspur 200
category: aerobatic
mass: {empty: 640 kg, maximum_take_off: 960 kg}
stall_speed:
  - {flaps: 0 deg, mass: 960 kg, upright: 55 KCAS, inverted: 66 KCAS}
  - {flaps: 30 deg, mass: 960 kg, upright: 48 KCAS}
load_factor:
  - {flaps: 0 deg, mass_up_to: 880 kg, maximum: 6 g, minimum: -3 g}
  - {flaps: 0 deg, mass_up_to: 960 kg, maximum: 4.4 g, minimum: -1.76 g}
  - {flaps: 30 deg, maximum: 2 g, minimum: 0 g}
rolling: {factor: 0.667, above_roll_rate: 15 deg/s}
speeds:
  manoeuvring: {over: mass, points: [[700 kg, 110 KIAS], [960 kg, 128 KIAS]]}
  normal_operating: 140 KIAS
  never_exceed: {over: pressure_altitude, points: [[0 ft, 175 KIAS], [15000 ft, 160 KIAS]]}
  flaps_extended: [{flaps: 10 deg, maximum: 110 KIAS}, {flaps: 30 deg, maximum: 90 KIAS}]
position_error:
  - {flaps: 0 deg, points: [[50 KIAS, 54 KCAS], [100 KIAS, 101 KCAS], [180 KIAS, 180 KCAS]]}
wing: {area: 13.6 m2, span: 9.2 m, mean_chord: 1.5 m, lift_curve_slope: 4.9 1/rad}
source: "Invented for the demonstration"
"""
STEPPED = """
format: exceed-aircraft/1
registration: ZZ-NMA
mass: {maximum_take_off: 900 kg}
stall_speed: [{mass: 900 kg, upright: 50 KCAS, inverted: 60 KCAS}]
load_factor:
  - {speed_up_to: 120 KCAS, maximum: 5 g, minimum: -2 g}
  - {maximum: 4 g, minimum: -1 g}
speeds: {never_exceed: 160 KCAS}
"""


def larkspur(text: str = LARKSPUR) -> dict:
    return envelope_summary(envelope_of(load_aircraft(text)))


def corner(summary: dict, name: str) -> dict:
    return next(row for row in summary["corners"] if row["name"] == name)


def speed(summary: dict, symbol: str) -> dict:
    return next(row for row in summary["speeds"] if row["symbol"] == symbol)


def test_corners_at_sea_level_are_those_of_the_hand_calculation() -> None:
    found = larkspur()
    # at sea level EAS is CAS; V = V_S sqrt(n); the position error by hand: 175 KIAS is 175 + 1/80 x 5 KCAS
    meets = corner(found, "stall line meets positive limit")
    assert meets["equivalent_airspeed_kt"] == pytest.approx(55.0 * math.sqrt(4.4), abs=0.001)
    assert meets["calibrated_airspeed_kt"] == pytest.approx(meets["equivalent_airspeed_kt"], abs=0.001)
    below = corner(found, "stall line meets negative limit")
    assert below["equivalent_airspeed_kt"] == pytest.approx(66.0 * math.sqrt(1.76), abs=0.001)
    end = corner(found, "V_NE, positive limit")
    assert (end["indicated_airspeed_kt"], end["load_factor_g"]) == (175.0, 4.4)
    assert end["calibrated_airspeed_kt"] == pytest.approx(175.0 + 5.0 / 80.0, abs=0.001)
    assert corner(found, "V_NE, negative limit")["load_factor_g"] == -1.76
    assert found["corners"][0]["name"] == "stall at 1 g"
    assert found["corners"][-1]["name"] == "inverted stall at -1 g"


def test_the_manuals_manoeuvring_speed_is_kept_apart_from_the_meeting_point() -> None:
    found = larkspur()
    assert speed(found, "V_A")["indicated_airspeed_kt"] == 128.0
    assert speed(found, "V_S sqrt(n)")["source"] == "computed"
    assert speed(found, "V_S sqrt(n)")["equivalent_airspeed_kt"] == pytest.approx(115.369, abs=0.001)
    # 128 KIAS by the table is 128 + 1 - 28/80 x 1 = 128.65 KCAS; (128.65 / 55)^2 = 5.47
    assert "at the manual's V_A the wing stalls at 5.47 g, 1.07 g beyond the limit" in found["notes"]


def test_a_manoeuvring_speed_goes_with_the_root_of_mass_only_where_the_manual_says_so() -> None:
    table = "{over: mass, points: [[700 kg, 110 KIAS], [960 kg, 128 KIAS]]}"
    for form, expected in (
        ("{value: 128 KIAS, mass: 960 kg, scale: sqrt_mass}", 128.0 * math.sqrt(540.0 / 960.0)),
        ("{value: 128 KIAS, mass: 960 kg}", 128.0),
        (table, 110.0),  # the ends of a table are held
    ):
        found = envelope_summary(envelope_of(load_aircraft(LARKSPUR.replace(table, form)), mass=540.0))
        assert speed(found, "V_A")["indicated_airspeed_kt"] == pytest.approx(expected, abs=0.001)
        assert speed(found, "V_A")["notes"]


def test_mass_and_altitude_move_stall_limit_and_speed_limit() -> None:
    found = envelope_summary(envelope_of(load_aircraft(LARKSPUR), mass=860.0, pressure_altitude=5000.0 * FT))
    stall = 55.0 * math.sqrt(860.0 / 960.0)
    assert corner(found, "stall at 1 g")["equivalent_airspeed_kt"] == pytest.approx(stall, abs=0.001)
    assert corner(found, "stall line meets positive limit")["load_factor_g"] == 6.0
    assert speed(found, "V_NE")["indicated_airspeed_kt"] == pytest.approx(170.0)
    # CAS is above EAS at height: 170.125 KCAS is 169.84 KEAS at 5000 ft (compressible pitot-static relations)
    assert speed(found, "V_NE")["equivalent_airspeed_kt"] == pytest.approx(169.84, abs=0.02)
    assert [row["maximum_g"] for row in found["limits"]] == [6.0, pytest.approx(6.0 * 0.667)]
    assert found["limits"][1]["condition"] == "rolling faster than 15 deg/s"


def test_above_the_last_mass_the_limit_shrinks_and_that_is_said() -> None:
    found = envelope_summary(envelope_of(load_aircraft(LARKSPUR), mass=1000.0))
    assert found["limits"][0]["maximum_g"] == pytest.approx(4.4 * 0.96)
    assert any("maximum take-off mass" in note for note in found["notes"])
    assert any("shrink" in note for note in found["notes"])


def test_flaps_end_the_diagram_at_their_speed_and_bring_their_limit() -> None:
    found = envelope_summary(envelope_of(load_aircraft(LARKSPUR), flaps=math.radians(10.0)))
    # interpolated between 55 and 48 KCAS
    assert corner(found, "stall at 1 g")["equivalent_airspeed_kt"] == pytest.approx(55.0 - 7.0 / 3.0, abs=0.001)
    end = corner(found, "V_FE, positive limit")
    assert (end["indicated_airspeed_kt"], end["load_factor_g"]) == (110.0, 2.0)
    assert corner(found, "V_FE, negative limit")["load_factor_g"] == 0.0
    assert "limit load factors are those listed for flaps 30 deg" in found["notes"]
    assert [row["at"] for row in found["gusts"]] == ["V_FE"]


def test_gusts_are_those_of_the_rule_in_its_own_units() -> None:
    # 14 CFR 23.341(c) as printed: lb/ft2, slug/ft3, kt, ft/s; 23.333(c): 50 ft/s at V_C, 25 ft/s at V_D
    found = larkspur()
    loading = 960.0 / 0.45359237 / (13.6 / FT**2)
    chord = 1.5 / FT
    mu = 2.0 * loading / (0.0023769 * chord * 4.9 * 32.174)
    relief = 0.88 * mu / (5.3 + mu)
    for row, velocity, symbol in zip(found["gusts"], (50.0, 25.0), ("V_NO", "V_NE"), strict=True):
        assert (row["gust_velocity_ft_s"], row["at"]) == (velocity, symbol)
        change = relief * velocity * row["equivalent_airspeed_kt"] * 4.9 / (498.0 * loading)
        assert row["load_factor_up_g"] == pytest.approx(1.0 + change, abs=0.002)
        assert row["load_factor_down_g"] == pytest.approx(1.0 - change, abs=0.002)


def test_gusts_shrink_above_20000_ft() -> None:
    aircraft = load_aircraft(LARKSPUR)
    found = envelope_of(aircraft, pressure_altitude=35000.0 * FT).gusts
    assert [row.velocity for row in found] == pytest.approx([37.5 * FT, 18.75 * FT])


def test_no_gust_lines_for_codes_with_other_gusts() -> None:
    found = larkspur(LARKSPUR.replace("category: aerobatic", "category: sailplane-utility"))
    assert found["gusts"] == []
    assert any(row["what"] == "gust lines" and "sailplane" in row["why"] for row in found["missing"])


def test_a_limit_that_steps_with_speed_gives_a_corner_on_either_side() -> None:
    found = larkspur(STEPPED)
    named = [(row["name"], round(row["equivalent_airspeed_kt"], 1), row["load_factor_g"]) for row in found["corners"]]
    assert named == [
        ("stall at 1 g", 50.0, 1.0),
        ("stall line meets positive limit", 111.8, 5.0),
        ("positive limit up to here", 120.0, 5.0),
        ("positive limit from here", 120.0, 4.0),
        ("V_NE, positive limit", 160.0, 4.0),
        ("V_NE, negative limit", 160.0, -1.0),
        ("negative limit from here", 120.0, -1.0),
        ("negative limit up to here", 120.0, -2.0),
        ("stall line meets negative limit", 84.9, -2.0),
        ("inverted stall at -1 g", 60.0, -1.0),
    ]
    assert [(row["speed_from_kt"], row["speed_to_kt"]) for row in found["limits"]] == [(None, 120.0), (120.0, None)]


def test_without_steps_the_boundary_is_that_of_the_plain_diagram() -> None:
    found = envelope_at(load_aircraft(LARKSPUR), 960.0)
    assert found is not None
    plain = physics.envelope(55.0 * KT, 66.0 * KT, 4.4, -1.76, found.equivalent_airspeed[-1])
    assert [row.name for row in found.corners] == [row.name for row in plain.corners]
    np.testing.assert_allclose([row.load_factor for row in found.corners], [row.load_factor for row in plain.corners])
    np.testing.assert_allclose(
        [row.equivalent_airspeed for row in found.corners], [row.equivalent_airspeed for row in plain.corners]
    )
    np.testing.assert_allclose(
        np.interp(plain.equivalent_airspeed, found.equivalent_airspeed, found.upper), plain.upper
    )
    np.testing.assert_allclose(
        np.interp(plain.equivalent_airspeed, found.equivalent_airspeed, found.lower), plain.lower
    )
    assert drawn_at is envelope_at


def test_high_up_the_mach_number_ends_the_diagram() -> None:
    text = LARKSPUR.replace("rolling:", "mach: {maximum_operating: 0.30}\nrolling:")
    low, high = (envelope_of(load_aircraft(text), pressure_altitude=height * FT) for height in (0.0, 14000.0))
    assert any(row.name == "V_NE, positive limit" for row in low.corners)
    end = next(row for row in high.corners if row.name == "M_MO, positive limit")
    # EAS = a0 M sqrt(delta); delta at 14 000 ft is 0.5876 (ISO 2533)
    assert end.speed.equivalent == pytest.approx(340.294 * 0.30 * math.sqrt(0.5876), rel=1e-3)


def test_what_is_missing_is_said_and_nothing_is_made_up() -> None:
    found = larkspur("format: exceed-aircraft/1\nregistration: ZZ-NMA\n")
    assert found["corners"] == found["speeds"] == found["limits"] == found["stall_speeds"] == found["gusts"] == []
    whats = " / ".join(row["what"] for row in found["missing"])
    for words in ("stall line", "positive limit", "negative limit", "speed limit", "V_A", "gust lines", "rolling"):
        assert words in whats
    # without an inverted stall speed the negative limit is known, and not from which speed on
    half = larkspur(LARKSPUR.replace(", inverted: 66 KCAS", ""))
    assert corner(half, "V_NE, negative limit")["load_factor_g"] == -1.76
    assert not [row for row in half["corners"] if "inverted" in row["name"]]
    assert any(row["what"] == "negative stall line" for row in half["missing"])


def test_a_category_is_marked_assumed_and_asks_for_its_mass() -> None:
    found = envelope_summary(envelope_of(category_aircraft("normal", 1100.0)))
    # 14 CFR 23.337(a): 2.1 + 24000 / (W + 10000), at most 3.8; -0.4 of it
    # 23.333(b)(3), 23.337(b): the negative limit runs from V_C in a line to 0 at V_D
    assert [(row["condition"], row["maximum_g"], row["minimum_g"], row["assumed"]) for row in found["limits"]] == [
        ("up to V_C", 3.8, -1.52, True),
        ("at V_D, from V_C in a line", 3.8, 0.0, True),
    ]
    assert "(assumed)" in render_envelope(found)
    with pytest.raises(UsageError, match="AIRCRAFT: the limits of the category normal depend"):
        envelope_asked("normal")
    with pytest.raises(UsageError, match="write 'utility' if that is meant"):
        envelope_asked("utilty")


def test_rows_by_mass_hold_nothing_where_the_mass_is_not_known() -> None:
    text = STEPPED.replace("mass: {maximum_take_off: 900 kg}\n", "").replace(
        "stall_speed: [{mass: 900 kg, ", "stall_speed: [{"
    )
    found = larkspur(text.replace("- {maximum: 4 g", "- {mass_up_to: 900 kg, maximum: 4 g"))
    assert found["conditions"]["mass"]["value"] is None
    assert {"what": "positive limit", "why": "the rows go by mass, and the mass is not known"} in found["missing"]


def test_wrong_options_are_all_told_at_once(tmp_path: Path) -> None:
    path = tmp_path / "larkspur.yaml"
    path.write_text(STEPPED.replace("mass: {max", "flaps: none\nmass: {max"), "utf-8")
    with pytest.raises(UsageError) as told:
        envelope_asked(str(path), mass="900", altitude="90 kg", flaps="200 deg")
    assert [problem.place for problem in told.value.problems] == ["--mass", "--altitude", "--flaps"]
    assert "-20 to 90 deg" in str(told.value)
    with pytest.raises(UsageError, match="this aeroplane has none"):
        envelope_asked(str(path), flaps="10 deg")
    with pytest.raises(DocumentError):
        envelope_asked(str(tmp_path / "nowhere.yaml"))


def test_texts_fit_80_columns_and_a_pipe_gets_them_unsqueezed() -> None:
    summary = larkspur()
    for units in ("trade", "metric"):
        narrow = render_envelope(summary, width=80, unicode=False, units=units)
        assert max(map(len, narrow.splitlines())) <= 80
        assert "~" not in narrow
        assert narrow.isascii()
    assert "EAS km/h" in narrow
    assert "324.2" in narrow  # 175.06 kt
    wide = render_envelope(summary)
    assert "V_NE, positive limit" in wide
    assert "licensed engineers and pilots decide" in wide


def test_the_page_is_whole_and_asks_the_network_for_nothing() -> None:
    found = envelope_of(load_aircraft(LARKSPUR.replace("Larkspur 200", "<script>alert(1)</script>")))
    page = envelope_page(envelope_summary(found), found)
    assert "<script>alert(1)" not in page
    assert "stall line meets positive limit" in page
    data = json.loads(re.search(r'id="plot-data">(.*?)</script>', page, re.S).group(1))
    names = [line["name"] for line in data["envelope"]["data"]]
    assert names[:2] == ["positive boundary", "negative boundary"]
    assert {"V_NE speed limit", "limit while rolling", "V_A of the manual", "corners"} <= set(names)
    assert not re.findall(r'(?:src|href)="(?!data:)', page.split("<main")[1].split("</main")[0])
    # a category has nothing to draw, and its page no empty figure
    bare = envelope_of(category_aircraft("utility"))
    assert "data-plot" not in envelope_page(envelope_summary(bare), bare)


def test_the_command_prints_writes_and_repeats_itself(tmp_path: Path) -> None:
    path, out, page = tmp_path / "larkspur.yaml", tmp_path / "out.json", tmp_path / "out.html"
    path.write_text(LARKSPUR, "utf-8")
    told = CliRunner().invoke(app, ["envelope", str(path), "--mass", "905 kg", "--json", str(out), "--html", str(page)])
    assert told.exit_code == 0, told.output
    assert "V_A" in told.stdout
    summary = json.loads(out.read_text("utf-8"))
    assert summary["format"] == "exceed/envelope/1"
    assert summary["conditions"]["mass"] == {"value": 905.0, "unit": "kg", "source": "as asked for"}
    assert page.read_text("utf-8").startswith("<!doctype html>")
    first, second = (CliRunner().invoke(app, ["envelope", str(path), "--json", "-"]).stdout for _ in range(2))
    assert first == second
    assert json.loads(first)["corners"]
    wrong = CliRunner().invoke(app, ["envelope", str(path), "--mass", "heavy"])
    assert wrong.exit_code == 2
    assert "--mass: 'heavy' does not start with a number" in wrong.stderr
