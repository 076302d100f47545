"""The flights of the invented day, each a list of manoeuvres (kt calibrated, ft pressure altitude, ft/min, deg, g)."""

from __future__ import annotations

from scenario import manoeuvres as do
from scenario.flight import Manoeuvre


def out(alt_ft: float, kcas: float, rate: float, flaps: float = 0.0) -> list[Manoeuvre]:
    """Start, taxi, take-off and climb."""
    return [do.standing(45), do.taxi(75), do.take_off(flaps), do.climb(alt_ft, kcas, rate)]


def back(
    kcas: float, rate: float, final: float, flaps: list[tuple[float, float]], sink: float, impact: float = 0.18
) -> list[Manoeuvre]:
    """Descend, turn to the runway's heading, approach, land and taxi in."""
    return [
        do.descend(1500, kcas, rate), do.turn_to(240, final + 12, 1500), do.level(12, final + 8, 1500),
        do.approach(final, flaps), do.landing(sink, impact), do.taxi(60, 330), do.standing(25),
    ]  # fmt: skip


LARK_FLAPS = [(900.0, 15.0), (500.0, 30.0)]
FEN_FLAPS = [(900.0, 20.0), (450.0, 35.0)]


def clear_over_g() -> list[Manoeuvre]:
    """Solo aerobatics; the last pull-out is too hard."""
    return [
        *out(4500, 85, 1200), do.level(30, 120, 4500), do.steep_turn(60, 20, None, 4500, 125),
        do.level(20, 145, 4500), do.loop(4.2), do.recover(4300, 120, 25), do.roll(100), do.recover(4300, 115, 20),
        do.inverted(8, 112), do.recover(4300, 100, 25), do.dive(35, 140), do.pull(6.45, 0.9, 0.35, 0.9),
        do.recover(4000, 110, 30), do.turn_to(60, 105, 4000), *back(100, 1000, 68, LARK_FLAPS, 130),
    ]  # fmt: skip


def hidden_over_g() -> list[Manoeuvre]:
    """Dual; a short pull beyond the lower limit of the heavier aeroplane."""
    return [
        *out(4000, 85, 900), do.level(40, 120, 4000), do.turn_to(60, 115, 4000), do.level(20, 140, 4000),
        do.loop(3.6), do.recover(4000, 100, 30), do.dive(25, 124), do.pull(4.54, 0.58, 0.0, 0.58),
        do.recover(3700, 105, 30), do.steep_turn(50, 20, None, 3700, 110), do.recover(3700, 105, 15),
        *back(98, 900, 68, LARK_FLAPS, 150),
    ]  # fmt: skip


def clean() -> list[Manoeuvre]:
    """A quiet local flight."""
    return [
        *out(3000, 85, 900), do.level(120, 115, 3000), do.turn_to(330, 115, 3000),
        do.steep_turn(45, 40, None, 3000, 115), do.recover(3000, 115, 60), do.pull(2.6, 1.2, 0.3, 1.2),
        do.recover(3100, 105, 30), do.turn_to(60, 105, 3000), do.level(60, 105, 3000),
        *back(95, 700, 68, LARK_FLAPS, 110),
    ]  # fmt: skip


def gap() -> list[Manoeuvre]:
    """A long pull in which the recorder will stop."""
    return [
        *out(4500, 85, 1200), do.level(60, 120, 4500), do.roll(90), do.recover(4500, 120, 30),
        do.turn_to(60, 105, 4500), do.level(15, 100, 4500), do.dive(38, 140), do.pull(6.5, 0.9, 0.8, 1.0),
        do.recover(4300, 105, 40), do.roll(-90), do.recover(4300, 105, 30), *back(100, 1000, 68, LARK_FLAPS, 140),
    ]  # fmt: skip


def spikes() -> list[Manoeuvre]:
    """Quiet flight and one sharp pull."""
    return [
        *out(4000, 85, 1200), do.level(90, 120, 4000), do.turn_to(150, 115, 4000), do.level(60, 120, 4000),
        do.dive(33, 140), do.pull(6.45, 0.55, 0.1, 0.55), do.recover(3800, 110, 45), do.roll(110),
        do.recover(3800, 110, 30), do.turn_to(60, 105, 3800), *back(100, 1000, 68, LARK_FLAPS, 120),
    ]  # fmt: skip


def gusty() -> list[Manoeuvre]:
    """A cruise in rough air with single gusts."""
    gusts = [(60.0, 1.1, 8.5), (150.0, 0.9, -7.0), (215.0, 1.3, 10.0), (290.0, 1.0, 7.0)]
    return [
        *out(3000, 78, 700, 10.0), do.level(60, 112, 3000), do.rough_air(360, 115, 3000, 1.3, gusts),
        do.turn_to(60, 100, 3000), do.level(60, 100, 3000), *back(92, 600, 66, FEN_FLAPS, 140),
    ]  # fmt: skip


def stall() -> list[Manoeuvre]:
    """A steep turn that is tightened until the wing lets go."""
    return [
        *out(4500, 78, 750, 10.0), do.level(60, 105, 4500), do.steep_turn(60, 24, 2.35, 4500, 74),
        do.recover(4300, 95, 40), do.turn_to(60, 100, 4300), do.level(45, 100, 4300),
        *back(95, 800, 66, FEN_FLAPS, 150),
    ]  # fmt: skip


def flap_overspeed() -> list[Manoeuvre]:
    """Flaps too early, a go-around, a second approach."""
    return [
        *out(2500, 78, 750, 10.0), do.level(90, 110, 2500), do.turn_to(60, 105, 2500), do.level(60, 105, 2500),
        do.descend(1500, 110, 700), do.turn_to(240, 108, 1500), do.level(8, 108, 1500), do.configure(20.0),
        do.level(11, 108, 1500), do.approach(66, [(420, 35)], 120), do.go_around(1500, 72, 500),
        do.turn_to(60, 80, 1500), do.level(50, 80, 1500), *back(80, 500, 66, FEN_FLAPS, 120),
    ]  # fmt: skip


def fast_descent() -> list[Manoeuvre]:
    """A descent beyond V_NE."""
    return [
        *out(5500, 78, 800), do.level(60, 115, 5500), do.turn_to(60, 112, 5500), do.level(30, 120, 5500),
        do.descend(3300, 167, 2500), do.level(60, 110, 3300), *back(100, 800, 66, FEN_FLAPS, 160),
    ]  # fmt: skip


def mach() -> list[Manoeuvre]:
    """A high leg beyond M_MO."""
    return [
        do.standing(30), do.taxi(60), do.take_off(15.0), do.climb(1800, 150, 1800), do.climb(32000, 235, 4600, 0.64),
        do.level(25, 300, 32000, 0.665), do.level(32, 300, 32000, 0.722), do.level(30, 300, 32000, 0.64),
        do.descend(10000, 245, 5600, 0.66, airbrakes=True), do.descend(2000, 220, 4000, airbrakes=True),
        do.turn_to(240, 200, 2000), do.level(45, 145, 2000), do.configure(15.0), do.level(25, 125, 2000),
        do.approach(106, [(1200, 35)], 50), do.landing(150), do.taxi(70, 330), do.standing(20),
    ]  # fmt: skip


def hard_landing() -> list[Manoeuvre]:
    """A flight that ends with little flare."""
    return [
        do.standing(40), do.taxi(75), do.take_off(15.0), do.climb(1800, 150, 1800), do.climb(9000, 210, 3000),
        do.level(120, 220, 9000), do.turn_to(60, 220, 9000), do.level(60, 215, 9000), do.descend(2000, 210, 2600),
        do.turn_to(240, 190, 2000), do.level(35, 150, 2000), do.configure(15.0), do.level(15, 132, 2000),
        do.approach(106, [(1500, 35)], 25), do.landing(590, 0.26), do.taxi(70, 330), do.standing(20),
    ]  # fmt: skip
