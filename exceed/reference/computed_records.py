"""Gusts, counts, certainty and loading: for each quantity of the check values, the call of our physics."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from exceed.core.constants import FOOT, KNOT, POUND, SLUG, US_GALLON
from exceed.physics import counting, gust, loading, uncertainty
from exceed.reference.computed_flight import DEG, PSF, Answer, Compute, numbers

# ---- gusts; a wing of 1 m2 carries the loading


def wing(i: Any) -> tuple[float, float, float, float]:
    """Mass, area, chord and slope."""
    if "mass_per_area_kg_m2" in i:
        return i["mass_per_area_kg_m2"], 1.0, i["chord_m"], i["lift_slope_per_rad"]
    return i["wing_loading_psf"] * PSF, 1.0, i["chord_ft"] * FOOT, i["lift_slope_per_rad"]


def gust_density(i: Any) -> float:
    return float(i["rho_kg_m3"] if "rho_kg_m3" in i else i["rho_slug_ft3"] * SLUG / FOOT**3)


def excursions(i: Any) -> Answer:
    series = numbers(i["series"])
    return [float(x) for x in gust.peaks_between_means(range(len(series)), series, i["dead_zone"]).extreme]


def design_gust(at: str) -> Compute:
    return lambda i: gust.design_gust_velocity(i.get("altitude_ft", 0.0) * FOOT, at) / FOOT


GUSTS: dict[str, Compute] = {
    "kg": lambda i: gust.gust_alleviation_factor(i["mu"]),
    "mass_ratio": lambda i: gust.mass_ratio(*wing(i), gust_density(i)),
    "gust_load_factor": lambda i: (
        1.0 + gust.gust_load_factor_increment(i["ude_fps"] * FOOT, i["v_keas"] * KNOT, *wing(i), gust_density(i))
    ),
    "derived_gust_velocity": lambda i: (
        gust.derived_gust_velocity(i["delta_n"], i["v_keas"] * KNOT, *wing(i), gust_density(i)) / FOOT
    ),
    "unit_constant_498": lambda i: 498.0 * gust.PRINTED_CONSTANT / gust.EXACT_CONSTANT,
    "gust_increment_sharp_edged": lambda i: gust.sharp_edged_gust_increment(
        i["ku_fps"] * FOOT, i["v_keas"] * KNOT, i["wing_loading_psf"] * PSF, 1.0, i["lift_slope_per_deg"] / DEG
    ),
    "ude_vc_23": design_gust("cruise"),
    "ude_vd_23": design_gust("dive"),
    "ude_vb_23_commuter": design_gust("rough-air"),
    "ude_flaps_23": design_gust("flaps"),
    "ude_flaps_25": design_gust("flaps"),
    "uref_25": lambda i: gust.reference_gust_velocity(i["altitude_ft"] * FOOT) / FOOT,
    "uds_25": lambda i: gust.design_gust_of_gradient(i["uref_fps"], i["gradient_ft"] * FOOT, i["fg"]),
    "gust_profile_25": lambda i: gust.gust_profile(i["uds_fps"], i["gradient_ft"], i["s_ft"]),
    # the glider rule takes the sea-level density as 1.225 and no printed constant
    "gust_load_factor_22": lambda i: (
        1.0
        + gust.gust_load_factor_increment(
            i["u_m_s"], i["v_eas_m_s"], *wing(i), gust_density(i), gust_constant=gust.EXACT_CONSTANT
        )
    ),
    "vb_min_25": lambda i: (
        gust.rough_air_speed_minimum(
            i["vs1_keas"] * KNOT,
            i["kg"],
            i["uref_fps"] * FOOT,
            i["vc_keas"] * KNOT,
            i["lift_slope_per_rad"],
            i["wing_loading_psf"] * PSF,
        )
        / KNOT
    ),
    "peak_class": lambda i: "gust" if gust.is_gust(i["time_between_mean_crossings_s"]) else "manoeuvre",
    "peaks_between_means": excursions,
}


# ---- counting


def counted(count: Callable[[Any], counting.Cycles]) -> Compute:
    def cycles(i: Any) -> float:
        found = count(numbers(i["history"]))
        if "mean" not in i:
            return found.total(i["range"])
        chosen = (np.abs(found.range - i["range"]) < 1e-9) & (np.abs(found.mean - i["mean"]) < 1e-9)
        return float(found.count[chosen].sum())

    return cycles


def damage(i: Any) -> float:
    applied, allowable = zip(*(map(float, pair.split(":")) for pair in i["n_over_N"].split(",")), strict=True)
    return counting.miner_damage(applied, allowable)


COUNTS: dict[str, Compute] = {
    "rainflow_cycles": counted(counting.rainflow),
    "rainflow_cycles_by_mean": counted(counting.rainflow),
    "rainflow_repeating_cycles": counted(counting.rainflow_repeating),
    "simple_range_cycles": counted(counting.simple_ranges),
    "range_pair_cycles": counted(counting.range_pairs),
    "level_crossings": lambda i: float(counting.level_crossings(numbers(i["history"]), i["level"], i["reference"])[0]),
    "peak_counts": lambda i: float(counting.peak_counts(numbers(i["history"]), i["value"], i["reference"])[0]),
    "miner_damage": damage,
    "miner_repeats_to_failure": lambda i: counting.repeats_to_failure(damage(i)),
    "miner_damage_power_law": lambda i: counting.damage_power_law(
        counting.rainflow(numbers(i["history"])), i["exponent"], i["constant"]
    ),
    "equivalent_range": lambda i: counting.equivalent_range(counting.rainflow(numbers(i["history"])), i["exponent"]),
}


# ---- certainty and recorders

# as a row of the check values names a recorded parameter: our quantity, and what 1 of its unit is in SI
_RECORDED = {
    "normal_acceleration": ("load_factor", 1.0),
    "longitudinal_acceleration": ("longitudinal_load_factor", 1.0),
    "lateral_acceleration": ("lateral_load_factor", 1.0),
    "vertical_acceleration": ("load_factor", 1.0),
    "pitch_attitude": ("pitch_angle", DEG),
    "roll_attitude": ("bank_angle", DEG),
    "heading": ("heading", DEG),
    "magnetic_heading": ("heading", DEG),
    "angle_of_attack": ("angle_of_attack", DEG),
    "trailing_edge_flap": ("flap_angle", DEG),
    "outside_air_temperature": ("static_air_temperature", 1.0),
    "airspeed_vs0_to_1p2vd": ("indicated_airspeed", 0.01),
    "airspeed": ("indicated_airspeed", 0.01),
    "radio_altitude_below_500ft": ("height_above_ground", FOOT),
}
# rows of the older, coarser rule are compared with the older table
_OLDER = frozenset({"vertical_acceleration", "magnetic_heading", "airspeed"})
RECORDED_COMPUTED = frozenset(_RECORDED)


def default_accuracy(i: Any) -> float:
    quantity, unit = _RECORDED[i["parameter"]]
    table = uncertainty.OLDER_ACCURACY if i["parameter"] in _OLDER else uncertainty.DEFAULT_ACCURACY
    accuracy = table[quantity]
    if i["parameter"].startswith("airspeed"):
        return accuracy.relative / unit
    if quantity in uncertainty.RECORDED_RANGE and i["parameter"] not in _OLDER:
        low, high = uncertainty.RECORDED_RANGE[quantity]
        return 100.0 * accuracy.half_width / (high - low)
    return accuracy.half_width / unit


def recorded_range(end: int) -> Compute:
    return lambda i: uncertainty.RECORDED_RANGE[_RECORDED[i["parameter"]][0]][end]


def input_uncertainty(i: Any) -> Any:
    return uncertainty.combined_uncertainty(
        uncertainty.uncertainty_of_half_width(i["half_width"]), uncertainty.uncertainty_of_step(i["step"])
    )


CERTAINTY: dict[str, Compute] = {
    "p_conform_upper": lambda i: uncertainty.probability_below(i["y"], i["limit"], i["u"]),
    "p_exceed_upper": lambda i: uncertainty.probability_above(i["y"], i["limit"], i["u"]),
    "p_conform_lower": lambda i: uncertainty.probability_above(i["y"], i["limit"], i["u"]),
    "p_conform_two_sided": lambda i: uncertainty.probability_between(i["y"], i["lower"], i["upper"], i["u"]),
    "guard_factor_for_probability": lambda i: uncertainty.guard_factor(i["probability"]),
    "acceptance_limit_guarded": lambda i: uncertainty.guarded_acceptance_limit(i["limit"], i["u"], i["k"], i["r"]),
    "acceptance_limit_guarded_rejection": lambda i: uncertainty.guarded_rejection_limit(
        i["limit"], i["u"], i["k"], i["r"]
    ),
    "min_p_conform_when_accepted": lambda i: uncertainty.probability_below(
        uncertainty.guarded_acceptance_limit(0.0, 1.0, i["k"], i["r"]), 0.0, 1.0
    ),
    "p_conform_simple_acceptance_at_limit": lambda i: uncertainty.probability_below(1.0, 1.0, 0.1),
    "worst_case_peak_ratio": lambda i: uncertainty.worst_peak_ratio(i["f_hz"], i["fs_hz"]),
    "worst_case_under_read_percent": lambda i: 100.0 * uncertainty.worst_under_read(i["f_hz"], i["fs_hz"]),
    "mean_peak_ratio": lambda i: uncertainty.mean_peak_ratio(i["f_hz"], i["fs_hz"]),
    "samples_per_cycle_needed": lambda i: uncertainty.samples_per_cycle(i["max_under_read_fraction"]),
    "half_sine_pulse_worst_ratio": lambda i: uncertainty.half_sine_worst_ratio(i["duration_s"], i["fs_hz"]),
    "upper_bound_true_peak": lambda i: uncertainty.true_peak_bound(i["sampled_increment"], i["f_hz"], i["fs_hz"]),
    "accuracy": default_accuracy,
    "range_min": recorded_range(0),
    "range_max": recorded_range(1),
    "accuracy_band_absolute": lambda i: uncertainty.accuracy_band(i["percent"] / 100.0, i["span"]),
    "standard_uncertainty_rectangular": lambda i: uncertainty.uncertainty_of_half_width(i["half_width"]),
    "standard_uncertainty_resolution": lambda i: uncertainty.uncertainty_of_step(i["step"]),
    "quantisation_step": lambda i: uncertainty.quantisation_step(i["span"], i["bits"]),
    "combined_standard_uncertainty": input_uncertainty,
    "expanded_uncertainty_k2": lambda i: uncertainty.expanded_uncertainty(input_uncertainty(i), 2.0),
}


# ---- mass and balance: any unit goes in and comes out


def sheet(i: Any) -> tuple[list[float], list[float]]:
    masses, arms = zip(*(map(float, item.split("@")) for item in i["items"].split(",")), strict=True)
    return list(masses), list(arms)


BALANCE: dict[str, Compute] = {
    "total_weight": lambda i: loading.total_mass(sheet(i)[0]),
    "total_moment": lambda i: loading.total_moment(*sheet(i)),
    "cg": lambda i: loading.centre_of_gravity_of_stations(*sheet(i)),
    "cg_shift_weight_moved": lambda i: loading.centre_of_gravity_shift(i["moved"], i["distance"], i["total"]),
    "cg_after_weight_change": lambda i: loading.centre_of_gravity_after_change(
        i["total"], i["cg"], i["added"], i["arm"]
    ),
    "cg_percent_mac": lambda i: 100.0 * loading.centre_of_gravity_fraction(i["cg"], i["lemac"], i["mac"]),
    "avgas_weight": lambda i: loading.fuel_mass_of_volume(i["us_gal"] * US_GALLON, loading.AVGAS_DENSITY) / POUND,
    "weight_after_burn": lambda i: loading.mass_after_burn(
        i["weight_start"], i["burn_per_h"] / 3600.0, i["minutes"] * 60.0
    ),
    "overweight": lambda i: "yes" if loading.overweight(i["weight"], i["maximum"]) else "no",
}
