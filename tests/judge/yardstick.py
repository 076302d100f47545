"""Simulated truth for the certainty of peaks: signals at 200 Hz, recorders that see them slowly and with errors.

Everything here is invented and seeded. Two sets of families that share no shape: FIT, on which the factors in
`exceed/judge/peaks.py` were fitted, and CHECK, which the tests use and the fit never saw.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from exceed.judge import peaks
from exceed.judge.certainty import Peak, is_undecided, probability_beyond, size_peak, upward_room, white_noise

FINE = 200.0  # Hz, rate of the truth


@dataclass(frozen=True, eq=False)
class Case:
    """One recorded excursion and its truth.

    `true_peak` is the truth's extreme within one interval of the recorded one, `true_event` its extreme over the whole
    excursion above half height. `bias` was drawn from `standard_uncertainty`, which does not hold the white `noise`.
    """

    family: str
    rate: float
    side: int
    time: np.ndarray
    values: np.ndarray
    index: int
    standard_uncertainty: float
    noise: float
    resolution: float
    bias: float
    true_peak: float
    true_event: float
    above_half: int


# --- shapes: (t in s about the middle, generator) -> increment whose extreme is about 1 ------------------------------


def _smooth(x: np.ndarray, width: float) -> np.ndarray:
    """Moving average twice over `width` seconds: rounds corners as an aeroplane's inertia does."""
    n = max(1, round(width * FINE))
    kernel = np.ones(n) / n
    return np.convolve(np.convolve(x, kernel, "same"), kernel, "same")


def raised_cosine(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    return np.where(np.abs(t) < d / 2, 0.5 + 0.5 * np.cos(2 * np.pi * t / d), 0.0)


def half_sine(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    return np.where(np.abs(t) < d / 2, np.cos(np.pi * t / d), 0.0)


def trapezoid(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    ramp = d * rng.uniform(0.2, 0.4)
    return _smooth(np.clip((d / 2 - np.abs(t)) / ramp, 0.0, 1.0), ramp * rng.uniform(0.3, 0.8))


def double_hump(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    gap, second, width = d * rng.uniform(0.45, 0.65), rng.uniform(0.7, 1.05), d * rng.uniform(0.16, 0.24)
    one = np.exp(-0.5 * ((t + gap / 2) / width) ** 2)
    return one + second * np.exp(-0.5 * ((t - gap / 2) / width) ** 2)


def ramp_in(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    """Quick pull, slow release: product of two logistic steps."""
    rise, fall = d * rng.uniform(0.04, 0.09), d * rng.uniform(0.12, 0.25)
    if rng.random() < 0.5:
        rise, fall = fall, rise
    up = 1 / (1 + np.exp(-np.clip((t + d / 4) / rise, -50, 50)))
    down = 1 / (1 + np.exp(np.clip((t - d / 4) / fall, -50, 50)))
    return up * down / max(float((up * down).max()), 1e-9)


def bell(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    return np.exp(-0.5 * (t / (d / 5)) ** 2)


def pull_with_ripple(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    """A pilot's corrections on a pull: a ripple of a third to a sixth of its length, no quicker than 2.5 Hz."""
    period = max(d * rng.uniform(1 / 6, 1 / 3), 0.4)
    return sech(t, d, rng) * (1 + rng.uniform(0.02, 0.1) * np.cos(2 * np.pi * t / period + rng.uniform(0, 6.28)))


def skewed(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    """Half a raised cosine up and another, up to three times as long, down."""
    part = d * rng.uniform(0.25, 0.75)
    s = t + d / 2
    x = np.where(s < part, s / part, 1 + (s - part) / (d - part))
    return np.where((s > 0) & (s < d), 0.5 - 0.5 * np.cos(np.pi * x), 0.0)


def sech(t: np.ndarray, d: float, rng: np.random.Generator) -> np.ndarray:
    return 1 / np.cosh(np.clip(t / (d / 7), -60, 60))


# --- noise-like air ---------------------------------------------------------------------------------------------------


def _coloured(n: int, shape: Callable[[np.ndarray], np.ndarray], rng: np.random.Generator) -> np.ndarray:
    """Gaussian noise of unit variance whose power spectrum has the given shape over frequency (Hz)."""
    m = 4 * n
    f = np.fft.rfftfreq(m, 1 / FINE)
    power = shape(f)
    power[0] = 0.0
    spectrum = np.sqrt(power) * (rng.normal(size=f.size) + 1j * rng.normal(size=f.size))
    x = np.fft.irfft(spectrum, m)
    return np.asarray((x / x.std())[:n])


def dryden(n: int, rng: np.random.Generator) -> np.ndarray:
    """Vertical Dryden spectrum through the lag of lift (Sears, |.|^2 = 1/(1 + 2 pi k)) and a heave high-pass."""
    scale, speed, chord = 10 ** rng.uniform(1.7, 2.7), rng.uniform(40, 90), rng.uniform(1.0, 2.0)

    def shape(f: np.ndarray) -> np.ndarray:
        w = 2 * np.pi * f
        x = (scale * w / speed) ** 2
        gust = (1 + 3 * x) / (1 + x) ** 2
        return gust / (1 + np.pi * w * chord / speed) * (w**2 / (w**2 + 1.0)) / (1 + (w / (2 * np.pi * 15)) ** 4)

    return _coloured(n, shape, rng)


def von_karman(n: int, rng: np.random.Generator) -> np.ndarray:
    """Vertical von Karman spectrum through a second-order response of the aeroplane (short period 0.5-1.5 Hz)."""
    scale, speed, short = 10 ** rng.uniform(1.7, 2.9), rng.uniform(40, 120), rng.uniform(0.5, 1.5)

    def shape(f: np.ndarray) -> np.ndarray:
        w = 2 * np.pi * f
        x = (1.339 * scale * w / speed) ** 2
        gust = (1 + 8 / 3 * x) / (1 + x) ** (11 / 6)
        r = f / short
        return gust * r**2 / ((1 - r**2) ** 2 + (1.2 * r) ** 2) / (1 + (f / 8) ** 2)

    return _coloured(n, shape, rng)


def band_noise(n: int, rng: np.random.Generator) -> np.ndarray:
    """Buffet- or wake-like: a band of frequencies between 0.3 and 3 Hz."""
    f0, width = rng.uniform(0.3, 2.0), rng.uniform(0.2, 1.0)
    return _coloured(n, lambda f: np.exp(-0.5 * ((f - f0) / width) ** 2), rng)


def waves(n: int, rng: np.random.Generator) -> np.ndarray:
    """A few sinusoids of 0.2 to 2 Hz."""
    t = np.arange(n) / FINE
    x = sum(
        rng.uniform(0.3, 1) * np.sin(2 * np.pi * t * np.exp(rng.uniform(-1.6, 0.7)) + rng.uniform(0, 6.28))
        for _ in range(rng.integers(2, 6))
    )
    return np.asarray(x / np.std(x))


def one_minus_cosine(t: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """Discrete 1-cosine gusts (14 CFR 25.341: gradient distance 30-350 ft) through a first-order lag of lift."""
    speed, out = rng.uniform(45, 120), np.zeros_like(t)
    for _ in range(rng.integers(1, 4)):
        gradient, start = rng.uniform(9.1, 106.7), rng.uniform(-0.5, 0.5)
        d = 2 * gradient / speed
        s = t - start
        out += rng.uniform(0.3, 1.0) * rng.choice([-1, 1]) * raised_cosine(s, d, rng)
    lag = np.exp(-np.arange(0, 0.6, 1 / FINE) / rng.uniform(0.03, 0.12))
    return np.convolve(out, lag / lag.sum())[: t.size]


MANOEUVRES: dict[str, Callable[..., np.ndarray]] = {
    "raised cosine": raised_cosine, "half sine": half_sine, "trapezoid": trapezoid,
    "double hump": double_hump, "ramp in": ramp_in, "bell": bell, "ripple": pull_with_ripple,
    "skewed": skewed, "sech": sech,
}  # fmt: skip
AIR = {"dryden": dryden, "von karman": von_karman, "band noise": band_noise, "waves": waves}
FIT = ("raised cosine", "trapezoid", "skewed", "sech", "ripple", "dryden", "gust on pull", "waves")
CHECK = ("half sine", "double hump", "ramp in", "bell", "von karman", "one-cosine", "band noise")
GUSTS = ("dryden", "gust on pull", "waves", "von karman", "one-cosine", "band noise")


def truth(family: str, t: np.ndarray, rng: np.random.Generator) -> tuple[np.ndarray, int]:
    """True load factor on the fine axis `t` (s, about 0) and the side of its excursion near t = 0."""
    side = 1 if rng.random() < 0.7 else -1
    size = rng.uniform(0.8, 5.0) if side > 0 else rng.uniform(0.8, 3.5)
    drift = 1.0 + 0.03 * np.sin(2 * np.pi * t / rng.uniform(8, 30) + rng.uniform(0, 6.28))
    if family in MANOEUVRES:
        duration = float(np.exp(rng.uniform(np.log(0.3), np.log(6.0))))
        return drift + side * size * MANOEUVRES[family](t, duration, rng), side
    if family in AIR:
        air = AIR[family](t.size, rng)
        return drift + rng.uniform(0.05, 0.4) * air, side
    if family == "gust on pull":
        pull = side * size * sech(t, float(rng.uniform(2, 6)), rng)
        return drift + pull + rng.uniform(0.02, 0.15) * dryden(t.size, rng), side
    if family == "one-cosine":
        base = rng.uniform(0, 1.5) * np.sin(2 * np.pi * t / rng.uniform(4, 15) + rng.uniform(0, 6.28))
        air = rng.uniform(0.4, 2.0) * one_minus_cosine(t, rng) + 0.03 * von_karman(t.size, rng)
        return drift + base + air, side
    raise ValueError(family)


def record(
    family: str, rate: float, seed: int, *, noise: float | None = None, resolution: float | None = None,
    accuracy: float | None = None, least: float = 0.25,
) -> Case:  # fmt: skip
    """One excursion of a family as a recorder of the given rate (Hz) sees it; None draws the sensor's errors.

    Excursions that the recorder shows with less than `least` (g above or below level flight) are drawn anew: a pull
    that fell wholly between two samples is no recorded extreme, and what could be said of it is `shortest_sized`.
    """
    for attempt in range(1000):
        rng = np.random.default_rng([seed, attempt, int(rate * 100), sum(family.encode())])
        case = _record(family, rate, rng, noise, resolution, accuracy)
        if case.side * (case.values[case.index] - 1.0) >= least:
            return case
    raise ValueError(f"{family} at {rate} Hz is never seen")


def _record(
    family: str, rate: float, rng: np.random.Generator, noise: float | None, resolution: float | None,
    accuracy: float | None,
) -> Case:  # fmt: skip
    interval = 1.0 / rate
    half = 12 * interval + 4.0
    t = np.arange(-half, half, 1 / FINE)
    x, side = truth(family, t, rng)
    draws = rng.choice([0.0, 0.005, 0.01, 0.02]), rng.choice([0.004, 0.01, 0.03]), rng.choice([0.005, 0.02, 0.05, 0.1])
    noise = float(draws[0]) if noise is None else noise
    resolution = float(draws[1]) if resolution is None else resolution
    accuracy = float(draws[2]) if accuracy is None else accuracy
    uncertainty = accuracy / 1.96
    bias = float(rng.normal() * uncertainty)
    nominal = np.arange(-half + interval * (1 + rng.random()), half - interval, interval)
    time = nominal + rng.normal(size=nominal.size) * 0.01 * interval
    seen = np.interp(time, t, x) + bias + noise * rng.normal(size=time.size)
    seen = np.round(seen / resolution) * resolution if resolution else seen
    # the excursion: the largest sample near the middle, and the samples about it above half its height
    near = np.flatnonzero(np.abs(nominal) < 3.5 if family not in GUSTS else np.abs(nominal) < max(2.0, 2 * interval))
    v = side * seen
    index = int(near[np.argmax(v[near])])
    height = v[index] - side * 1.0
    above = v > side * 1.0 + 0.5 * height
    first = last = index
    while first > 0 and above[first - 1]:
        first -= 1
    while last < v.size - 1 and above[last + 1]:
        last += 1
    index = first + int(np.argmax(v[first : last + 1]))  # an excursion may run out of the middle
    fine = side * x
    local = fine[np.abs(t - nominal[index]) <= interval].max()
    event = fine[(t >= nominal[first] - interval) & (t <= nominal[last] + interval)].max()
    a, b = max(0, index - 9), min(v.size, index + 10)
    return Case(
        family, rate, side, nominal[a:b], seen[a:b], index - a, uncertainty, noise, resolution, bias,
        side * float(local), side * float(event), last - first + 1,
    )  # fmt: skip


def size(case: Case, *, noise_known: bool = True) -> Peak:
    """The peak as a caller sizes it: the noise measured, or within the accuracy that the aircraft file states."""
    uncertainty = case.standard_uncertainty if noise_known else float(np.hypot(case.standard_uncertainty, case.noise))
    return size_peak(
        case.time, case.values, case.side, case.index, standard_uncertainty=uncertainty, interval=1.0 / case.rate,
        resolution=case.resolution, noise=case.noise if noise_known else None,
    )  # fmt: skip


# --- the fit ----------------------------------------------------------------------------------------------------------

FIT_SEEDS, CHECK_SEEDS = 10_000, 500_000


def quantile_regression(features: np.ndarray, target: np.ndarray, tau: float) -> np.ndarray:
    """Coefficients, none negative, of the tau-quantile of `target` (Koenker and Bassett 1978, as a linear program)."""
    from scipy import sparse
    from scipy.optimize import linprog

    n, k = features.shape
    cost = np.r_[np.full(k, 1e-6), np.full(n, tau), np.full(n, 1 - tau)]
    equal = sparse.hstack([sparse.csr_matrix(features), sparse.eye(n), -sparse.eye(n)]).tocsc()
    return np.asarray(linprog(cost, A_eq=equal, b_eq=target, bounds=[(0, None)] * (k + 2 * n), method="highs").x[:k])


def fit_features(
    families: tuple[str, ...], cases: int, rates: tuple[float, ...], seeds: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Features of the widths up and down, the scale they were divided by, how far the truth lies above the middle, and
    the rate; a row for each case that is sized."""
    rows = []
    for family in families:
        for rate in rates:
            for k in range(cases):
                c = record(family, rate, seeds + k)
                u, v = (c.time - c.time[c.index]) * rate, c.side * c.values
                a, b = max(0, c.index - peaks.HALO), min(v.size, c.index + peaks.HALO + 1)
                u, v, place = u[a:b], v[a:b], c.index - a
                step = c.resolution / 12**0.5
                known = float(np.hypot(c.noise, step)) if k % 2 else None
                s = peaks._spread(u, v, place, step, known, float(np.hypot(c.standard_uncertainty, c.noise)))
                error, ratio = peaks._ratio(u, v, place, s.noise)
                if 1.0 / rate > peaks.SLOW and ratio > peaks.ALIASED:
                    continue
                up, down = peaks._features(float(v[place]), s, error, ratio, 1.0 / rate)
                size_of = max(up[0] + error + s.noise, 1e-9)
                # the sensor's common error is added afterwards, so the truth is moved by it here
                true = c.side * (c.true_peak + c.bias)
                rows.append((*up, *down, size_of, true - s.middle, rate))
    table = np.array(rows)
    split = len(up)
    return table[:, :split], table[:, split:-3], table[:, -3], table[:, -2], table[:, -1]


def fit_factors(cases: int = 400, rates: tuple[float, ...] = (8.0, 4.0, 2.0, 1.0)) -> dict[str, np.ndarray]:
    """The factors of `exceed/judge/peaks.py` from the FIT families.

    The ends of the interval are fitted over all families together and a little outside 95 % (98.5 % upward, 98 %
    downward), since other shapes than those fitted must be covered as well. The inner points upward (84 %, 95 %), which
    make the probabilities, are then scaled so that the middle one of the families is right, not the hardest.
    """
    parts = [fit_features((family,), cases, rates, FIT_SEEDS) for family in FIT]
    up, down, scale, above, _ = (np.concatenate([p[i] for p in parts]) for i in range(5))
    up, down, above = up / scale[:, None], down / scale[:, None], above / scale
    factors = {
        "_UP_1": quantile_regression(up, above, 0.8413),
        "_OUT_95": quantile_regression(up, above, 0.95),
        "_UP_95": quantile_regression(up, above, 0.985),
        "_DOWN_1": quantile_regression(down, -above, 0.8413),
        "_DOWN_95": quantile_regression(down, -above, 0.98),
    }
    for name, quantile in (("_UP_1", 0.8413), ("_OUT_95", 0.95)):
        needed = [np.quantile(p[3] / np.maximum(p[0] @ factors[name], 1e-12), quantile) for p in parts]
        factors[name] = factors[name] * float(np.median(needed))
    return factors


# --- what the tests and the documentation measure ---------------------------------------------------------------------


def inside(peak: Peak, true: float) -> bool:
    """Whether the interval holds the truth; an open end holds everything on its side."""
    return (peak.low is None or peak.low <= true) and (peak.high is None or true <= peak.high)


def half_width(peak: Peak) -> float:
    return float("nan") if peak.low is None or peak.high is None else 0.5 * (peak.high - peak.low)


@dataclass(frozen=True)
class Coverage:
    family: str
    rate: float
    cases: int
    sized: float
    covered: float  # of all; an open end covers
    covered_sized: float  # of those sized
    beyond: float  # of those sized: the truth lay outside on the far side
    event_covered: float  # of those sized: the truth of the whole excursion
    width: float  # median half-width of those sized, g
    raw: float  # rms error of the sample, g
    estimate: float  # rms error of the estimate, g


def coverage(family: str, rate: float, cases: int, *, noise_known: bool = True, seeds: int = CHECK_SEEDS) -> Coverage:
    every = [record(family, rate, seeds + k) for k in range(cases)]
    sizes = [size(c, noise_known=noise_known) for c in every]
    pairs = list(zip(sizes, every, strict=True))
    sized = [(p, c) for p, c in pairs if p.sized]

    def share(of: list[tuple[Peak, Case]], test: Callable[[Peak, Case], bool]) -> float:
        return sum(test(p, c) for p, c in of) / max(len(of), 1)

    def beyond(p: Peak, c: Case) -> bool:
        return c.true_peak > (p.high or 0.0) if c.side > 0 else c.true_peak < (p.low or 0.0)

    # the sensor's common error is no error of the estimate, so it is taken out of both
    raw = [c.values[c.index] - c.bias - c.true_peak for _, c in sized]
    error = [p.estimate - c.bias - c.true_peak for p, c in sized]
    return Coverage(
        family,
        rate,
        cases,
        len(sized) / cases,
        share(pairs, lambda p, c: inside(p, c.true_peak)),
        share(sized, lambda p, c: inside(p, c.true_peak)),
        share(sized, beyond),
        share(sized, lambda p, c: inside(p, c.true_event)),
        float(np.median([half_width(p) for p, _ in sized])) if sized else float("nan"),
        float(np.sqrt(np.mean(np.square(raw)))) if raw else float("nan"),
        float(np.sqrt(np.mean(np.square(error)))) if error else float("nan"),
    )


def calibration(rates: tuple[float, ...], cases: int, *, families: tuple[str, ...] = CHECK) -> np.ndarray:
    """(10, 4): for each tenth of stated probability the number of levels, their mean probability, how often the truth
    was beyond, and how far apart these are. Levels lie at random in the interval of each sized peak."""
    stated, seen = [], []
    for family in families:
        for rate in rates:
            for k in range(cases):
                c = record(family, rate, CHECK_SEEDS + k)
                p = size(c)
                if not p.sized:
                    continue
                for shift in np.random.default_rng([k, int(rate)]).uniform(-1, 1, size=3):
                    level = p.estimate + shift * half_width(p)
                    stated.append(probability_beyond(p, level))
                    seen.append(c.side * (c.true_peak - level) > 0)
    p_all, o_all = np.array(stated), np.array(seen)
    tenth = np.minimum((p_all * 10).astype(int), 9)
    rows = []
    for k in range(10):
        m = tenth == k
        rows.append(
            (m.sum(), p_all[m].mean(), o_all[m].mean(), o_all[m].mean() - p_all[m].mean()) if m.any() else (0, 0, 0, 0)
        )
    return np.array(rows)


def calm_stretch(seconds: float, rng: np.random.Generator, gusts: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Time and true load factor of touring flight: a turn every two minutes, mostly moderate, every third one to
    between 3.3 and 3.7 g, in air that gusts with the given standard deviation (g)."""
    t = np.arange(0.0, seconds, 1 / FINE)
    x = 1.0 + 0.02 * np.sin(2 * np.pi * t / 40.0)
    if gusts:
        x = x + gusts * _coloured(t.size, lambda f: (1 + (f / 0.3) ** 2) ** -1.3 / (1 + (f / 6) ** 2), rng)
    for start in np.arange(10.0, seconds - 110.0, 115.0):
        ramp = rng.uniform(1.5, 4.0)
        length = rng.uniform(2 * ramp, 40.0)
        rise = rng.uniform(2.3, 2.7) if rng.random() < 1 / 3 else rng.uniform(0.2, 2.3)
        middle = start + 25.0 + rng.uniform(0, 40)
        s = np.clip((length / 2 - np.abs(t - middle)) / ramp, 0, 1)
        x = x + rise * s * s * (3 - 2 * s)
    return t, x


def undecided_per_hour(
    rate: float, gusts: float, hours: float, *, limit: float = 3.8, seed: int = 3
) -> tuple[float, float]:
    """Undecided stretches and calls of `size_peak` per flight hour of calm flight, for a sensor of 0.05 g."""
    rng = np.random.default_rng([seed, int(rate * 100), int(gusts * 1000)])
    interval, uncertainty, noise, resolution = 1 / rate, 0.05 / 1.96, 0.008, 0.01
    found, calls, piece = 0, 0, 600.0
    for _ in range(round(hours * 3600 / piece)):
        t, x = calm_stretch(piece, rng, gusts)
        time = np.arange(rng.random() * interval, piece - 1.0, interval)
        seen = np.interp(time, t, x) + rng.normal() * uncertainty + noise * rng.normal(size=time.size)
        seen = np.round(seen / resolution) * resolution
        measured = min(white_noise(seen), uncertainty)
        room = upward_room(
            time, seen, 1, interval=interval, noise=measured, resolution=resolution, standard_uncertainty=uncertainty
        )
        top = np.r_[False, (seen[1:-1] >= seen[:-2]) & (seen[1:-1] > seen[2:]), False]
        beyond, last = time[seen > limit], -np.inf
        for i in np.flatnonzero(top & (seen <= limit) & (seen + room > limit)):
            a, b = max(0, i - peaks.HALO), min(time.size, i + peaks.HALO + 1)
            calls += 1
            p = size_peak(
                time[a:b], seen[a:b], 1, int(i - a), standard_uncertainty=uncertainty, interval=interval,
                resolution=resolution, noise=measured,
            )  # fmt: skip
            # within a second of a sample beyond the limit it belongs to that event
            if is_undecided(p, limit) and not np.any(np.abs(beyond - time[i]) < 1.0):
                found += time[i] - last > 1.0
                last = time[i]
    return float(found / hours), calls / hours


def shortest_table(rate: float = 8.0, cases: int = 200) -> dict[float, tuple[float, float, float]]:
    """For excursions of so many intervals from base to base (raised cosine and half sine): rms under-read of the
    sample, rms error of the estimate, and median half-width, all in parts of the height."""
    rows = {}
    for intervals in (1.5, 2.0, 3.0, 4.0, 6.0, 8.0):
        raw, error, width = [], [], []
        for k in range(cases):
            rng = np.random.default_rng([k, int(intervals * 10)])
            t = np.arange(-5.0, 5.0, 1 / 2000)
            shape = (raised_cosine, half_sine)[k % 2]
            x = 1.0 + 3.0 * shape(t, intervals / rate, rng)
            time = np.arange(-4.0 + rng.random() / rate, 4.0, 1 / rate)
            seen = np.interp(time, t, x) + 0.005 * rng.normal(size=time.size)
            i = int(np.argmax(seen))
            p = size_peak(
                time[i - 8 : i + 9],
                seen[i - 8 : i + 9],
                1,
                8,
                standard_uncertainty=0.0025,
                interval=1 / rate,
                noise=0.005,
            )
            raw.append((seen[i] - x.max()) / 3.0)
            error.append((p.estimate - x.max()) / 3.0)
            width.append(half_width(p) / 3.0)
        rows[intervals] = (
            float(np.sqrt(np.mean(np.square(raw)))),
            float(np.sqrt(np.mean(np.square(error)))),
            float(np.nanmedian(width)),
        )
    return rows
