"""What cannot be flight."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from exceed.core.recording import Array

COMPANIONS: dict[str, tuple[str, ...]] = {}


@dataclass(slots=True)
class Checked:
    rejected: list[tuple[int, int, int, str, float | None]] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    lost: int = 0
    noise: float | None = None
    saturation: tuple[float, float] = (-np.inf, np.inf)


def resolution(values: Array) -> float:
    return 0.0


def check(values, at, quantity, interval, discrete, step, sensor, others) -> Checked:
    return Checked()
