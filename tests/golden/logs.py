"""The logs of the golden runs: invented, of straight lines and half sines, so that anyone can see what is in them."""

from __future__ import annotations

import math
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from itertools import pairwise

Corners = list[tuple[float, float]]


def line(time: float, corners: Corners) -> float:
    """Straight between the corners (time, value), held beyond them."""
    if time <= corners[0][0]:
        return corners[0][1]
    for (start, low), (end, high) in pairwise(corners):
        if time <= end:
            return low + (high - low) * (time - start) / (end - start)
    return corners[-1][1]


def hump(time: float, start: float, seconds: float, size: float) -> float:
    """Half a sine from `start` on."""
    inside = (time - start) / seconds
    return size * math.sin(math.pi * inside) if 0.0 < inside < 1.0 else 0.0


def grain(number: int, size: float) -> float:
    """Noise that is the same everywhere: -size..size by a fixed rule."""
    return size * (((number * 7919) % 101) / 50.0 - 1.0)


def table(heading: str, rate: float, seconds: float, row: Callable[[int, float], str]) -> str:
    count = round(seconds * rate) + 1
    return "\n".join([heading, *(row(number, number / rate) for number in range(count))]) + "\n"


def sortie() -> str:
    """Elapsed seconds, 8 Hz: take-off, a pull to 6.4 g at 120 s, V_NO exceeded for 10 s before it, a landing.

    Between 150 s and 154 s the recorder wrote nothing.
    """
    speed = [(0, 0), (20, 0), (40, 62), (60, 85), (90, 90), (110, 150), (124, 130), (140, 105), (175, 100), (205, 62),
             (215, 20), (225, 0)]  # fmt: skip
    height = [(0, 400), (38, 400), (90, 2500), (105, 2500), (120, 1900), (130, 2300), (150, 2200), (206, 400)]

    def row(number: int, time: float) -> str:
        n = 1.0 + hump(time, 119.0, 2.2, 5.4) + hump(time, 108.0, 3.0, -0.7) + grain(number, 0.008)
        bank = hump(time, 158.0, 14.0, 32.0)
        return f"{time:.3f},{n:.3f},{line(time, speed):.1f},{line(time, height) + grain(number, 2.0):.0f},{bank:.1f}"

    text = table("Time [s],Normal acceleration [g],IAS [kt],Pressure altitude [ft],Bank [deg]", 8.0, 230.0, row)
    kept = [one for one in text.splitlines() if not (one[0].isdigit() and 150.0 < float(one.split(",")[0]) < 154.0)]
    return "\n".join(kept) + "\n"


def descent() -> str:
    """UTC stamps, 2 Hz, metric, begins and ends in the air: V_NE exceeded for a good while, flaps too fast."""
    speed = [(0, 200), (30, 210), (60, 318), (80, 318), (100, 230), (130, 195), (150, 185), (180, 150), (200, 140)]
    height = [(0, 1600), (30, 1600), (100, 900), (200, 500)]
    flaps = [(0, 0), (140, 0), (143, 20), (200, 20)]
    start = datetime(2031, 5, 2, 9, 30, tzinfo=UTC)

    def row(number: int, time: float) -> str:
        stamp = (start + timedelta(seconds=time)).strftime("%Y-%m-%dT%H:%M:%S.%f")[:-3] + "Z"
        n = 9.80665 * (1.0 + hump(time, 96.0, 6.0, 0.8)) + grain(number, 0.1)
        return f"{stamp};{n:.2f};{line(time, speed):.1f};{line(time, height):.1f};{line(time, flaps):.0f};{number % 7}"

    return table("UTC;NZ (m/s2);IAS (km/h);Pressure altitude (m);Flap angle (deg);Setting 4", 2.0, 200.0, row)


def bare() -> str:
    """No registration, no aircraft file, nothing but an accelerometer and a column that no one can tell."""

    def row(number: int, time: float) -> str:
        n = 1.0 + hump(time, 40.0, 4.0, 1.6) + hump(time, 60.0, 5.0, -0.8) + grain(number, 0.01)
        if number == 600:  # one sample of an electrical spike
            n = 9.2
        return f"{time:.3f},{n:.3f},{90.0 + 20.0 * math.sin(time / 15.0):.1f}"

    return table("t [s],G,SPD", 8.0, 100.0, row)


LOGS: dict[str, Callable[[], str]] = {
    "day/sortie.csv": sortie,
    "day/descent.csv": descent,
    "bare/bare.csv": bare,
}
