"""Air, turns, forces and limits: for each quantity of the check values, the call of our physics that gives it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from exceed.core.constants import (
    FOOT,
    KNOT,
    POUND,
    STANDARD_GRAVITY,
    ZERO_CELSIUS,
)
from exceed.physics import (
    airspeed,
    atmosphere,
    category,
    design_speeds,
    envelope,
    kinematics,
    load_limits,
    stall,
    turning,
)

Answer = Any  # a number, a word, or a list of numbers
Compute = Callable[[Any], Answer]  # the inputs: names to numbers or text

PSF = POUND / FOOT**2
DEG = float(np.radians(1.0))


def numbers(text: str) -> list[float]:
    return [float(item) for item in text.split(",")]


# ---- air


def height(i: Any) -> float:
    if "geopotential_m" in i:
        return float(i["geopotential_m"])
    return float(i.get("geopotential_ft", i.get("pressure_altitude_ft", 0.0)) * FOOT)


def pressure(i: Any) -> Any:
    return atmosphere.static_pressure(height(i))


def temperature(i: Any) -> Any:
    if "oat_C" in i:
        return i["oat_C"] + ZERO_CELSIUS
    return atmosphere.standard_temperature(height(i)) + i.get("isa_dev_K", 0.0)


def air_density(i: Any) -> Any:
    return atmosphere.density(pressure(i), temperature(i))


def sound(i: Any) -> Any:
    return atmosphere.speed_of_sound(temperature(i))


def cas(i: Any) -> float:
    return float(i["cas_kt"] * KNOT)


def mach(i: Any) -> Any:
    return i["mach"] if "mach" in i else airspeed.mach(cas(i), height(i))


AIR: dict[str, Compute] = {
    "temperature": temperature,
    "temperature_off_standard": temperature,
    "pressure": pressure,
    "density": air_density,
    "density_off_standard": air_density,
    "speed_of_sound": sound,
    "sound_speed_off_standard": sound,
    "theta": lambda i: atmosphere.temperature_ratio(temperature(i)),
    "delta": lambda i: atmosphere.pressure_ratio(pressure(i)),
    "sigma": lambda i: atmosphere.density_ratio(pressure(i), temperature(i)),
    "density_altitude": lambda i: atmosphere.density_altitude(pressure(i), temperature(i)) / FOOT,
    "pressure_altitude": lambda i: atmosphere.pressure_altitude(i["static_pressure_Pa"]) / FOOT,
    "qnh_shift": lambda i: atmosphere.altimeter_shift(i["qnh_hPa"] * 100.0) / FOOT,
    "mach_from_cas": mach,
    "tas_from_cas": lambda i: airspeed.true_airspeed(cas(i), height(i), temperature(i)) / KNOT,
    "eas_from_cas": lambda i: airspeed.equivalent_airspeed(cas(i), height(i)) / KNOT,
    "compressibility_correction_eas_minus_cas": lambda i: (
        airspeed.equivalent_airspeed(cas(i), height(i)) / KNOT - i["cas_kt"]
    ),
    "impact_pressure_from_cas": lambda i: airspeed.impact_pressure(cas(i)),
    "dynamic_pressure_from_cas": lambda i: airspeed.dynamic_pressure(mach(i), pressure(i)),
    "cas_from_mach": lambda i: airspeed.calibrated_airspeed_from_mach(i["mach"], height(i)) / KNOT,
    "tas_from_mach": lambda i: airspeed.true_airspeed_from_mach(i["mach"], temperature(i)) / KNOT,
    "eas_from_mach": lambda i: airspeed.equivalent_airspeed_from_mach(i["mach"], height(i)) / KNOT,
    "tas_from_eas": lambda i: (
        airspeed.true_airspeed_from_equivalent(i["eas_kt"] * KNOT, height(i), temperature(i)) / KNOT
    ),
    "crossover_altitude": lambda i: airspeed.crossover_altitude(cas(i), i["mach"]) / FOOT,
    "sat_from_tat": lambda i: (
        airspeed.static_air_temperature(i["tat_C"] + ZERO_CELSIUS, i["mach"], i["recovery"]) - ZERO_CELSIUS
    ),
}


# ---- turns, stall and speeds


def tas(i: Any) -> float:
    return float(i["tas_kt"] * KNOT if "tas_kt" in i else i["tas_m_s"])


def bank(i: Any) -> float:
    return float(i["bank_deg"] * DEG)


def level_turn_n(i: Any) -> Any:
    return turning.load_factor_level_turn(bank(i))


def rate(i: Any) -> Any:
    return turning.turn_rate(bank(i), tas(i))


def at_load_factor(i: Any) -> Any:
    return stall.stall_speed_at_load_factor(i["vs_kt"] * KNOT, i["n"]) / KNOT


def mass_scaled(speed: str) -> Compute:
    return lambda i: stall.speed_at_mass(i[speed], i["weight"], i["weight_ref"])


TURNS: dict[str, Compute] = {
    "load_factor_from_bank": level_turn_n,
    "stall_speed_ratio_from_bank": lambda i: stall.stall_speed_at_load_factor(1.0, level_turn_n(i)),
    "bank_from_load_factor": lambda i: turning.bank_angle_from_load_factor(i["n"]) / DEG,
    "accelerated_stall_speed": at_load_factor,
    "manoeuvring_speed": lambda i: envelope.design_manoeuvring_speed(i["vs_kt"] * KNOT, i["n"]) / KNOT,
    "stall_margin_fraction": lambda i: stall.stall_margin_fraction(i["v_kt"], at_load_factor(i)),
    "load_factor_at_stall": lambda i: stall.load_factor_at_stall(i["v_kt"], i["vs_kt"]),
    "stall_line_load_factor": lambda i: envelope.envelope_upper(i["v_kt"], i["vs_kt"], 1e9, 1e9),
    "speed_weight_scaled": mass_scaled("v_ref_kt"),
    "stall_speed_weight_scaled": mass_scaled("vs_ref"),
    "load_factor_weight_scaled": lambda i: load_limits.load_factor_at_mass(i["n_ref"], i["weight"], i["weight_ref"]),
    "turn_radius": lambda i: turning.turn_radius(bank(i), tas(i)),
    # the question takes g for 10 m/s2, and the radius goes with 1/g
    "turn_radius_g10": lambda i: turning.turn_radius(bank(i), tas(i)) * STANDARD_GRAVITY / 10.0,
    "turn_rate": lambda i: rate(i) / DEG,
    "turn_time_360": lambda i: turning.turn_time(rate(i)),
    # V2/(R tan) for kt and ft; V omega/tan for kt and deg/s: what the handbook's 11.26 and 1091 stand for
    "exact_radius_constant": lambda i: FOOT / turning.turn_radius(45.0 * DEG, KNOT),
    "exact_rate_constant": lambda i: turning.turn_rate(45.0 * DEG, KNOT) / DEG,
    "standard_rate_constant": lambda i: turning.true_airspeed_of_turn(45.0 * DEG, turning.STANDARD_RATE) / KNOT,
    "standard_rate_bank": lambda i: turning.bank_angle_level_turn(tas(i), i["rate_deg_s"] * DEG) / DEG,
    "standard_rate_reaches_25deg": lambda i: turning.true_airspeed_of_turn(bank(i), turning.STANDARD_RATE) / KNOT,
    "pull_up_load_factor": lambda i: turning.load_factor_pull_up(tas(i), i["radius_m"], i["gamma_deg"] * DEG),
}


# ---- specific force


def transferred(i: Any) -> Any:
    def triple(names: str) -> list[float]:
        return [float(i[name]) for name in names.split()]

    return kinematics.specific_force_at_cg(
        triple("fx fy fz"), triple("p q r"), triple("pdot qdot rdot"), triple("rx ry rz")
    )


def load_factor_moved(i: Any) -> Any:
    return kinematics.load_factor_at_cg(
        kinematics.load_factor_of_specific_force(i["fz"]),
        i["p"],
        i["q"],
        i["r"],
        i["pdot"],
        i["qdot"],
        (i["rx"], i["ry"], i["rz"]),
    )


def path(i: Any) -> tuple[float, float, float, float]:
    return tas(i), i["gammadot_deg_s"] * DEG, i["chidot_deg_s"] * DEG, i["gamma_deg"] * DEG


def attitude(i: Any) -> tuple[float, float]:
    return i["theta_deg"] * DEG, i["phi_deg"] * DEG


FORCES: dict[str, Compute] = {
    "fx_cg": lambda i: transferred(i)[0],
    "fy_cg": lambda i: transferred(i)[1],
    "fz_cg": lambda i: transferred(i)[2],
    "nz_cg": load_factor_moved,
    "nz_sensor": lambda i: kinematics.load_factor_of_specific_force(i["fz"]),
    "turn_psidot": lambda i: rate(i) / DEG,
    "turn_p": lambda i: kinematics.roll_rate_level_turn(rate(i), i["theta_deg"] * DEG) / DEG,
    "turn_q": lambda i: kinematics.pitch_rate_level_turn(rate(i), i["theta_deg"] * DEG, bank(i)) / DEG,
    "turn_r": lambda i: kinematics.yaw_rate_level_turn(rate(i), i["theta_deg"] * DEG, bank(i)) / DEG,
    "turn_n": level_turn_n,
    "bank_from_qr": lambda i: kinematics.bank_angle_from_body_rates(i["q_deg_s"] * DEG, i["r_deg_s"] * DEG) / DEG,
    "bank_from_turn_rate": lambda i: turning.bank_angle_level_turn(tas(i), i["psidot_deg_s"] * DEG) / DEG,
    "load_factor_from_turn_rate": lambda i: turning.load_factor_from_turn_rate(tas(i), i["psidot_deg_s"] * DEG),
    "n_from_flight_path": lambda i: kinematics.load_factor_from_flight_path(
        tas(i), i["gammadot_deg_s"] * DEG, i["gamma_deg"] * DEG, bank(i)
    ),
    "n_from_path_rates": lambda i: kinematics.load_factor_from_path_rates(*path(i)),
    "bank_from_path_rates": lambda i: kinematics.bank_angle_from_path_rates(*path(i)) / DEG,
    "gamma_from_climb_rate": lambda i: kinematics.flight_path_angle(i["climb_m_s"], tas(i)) / DEG,
    "n_lift_axis": lambda i: kinematics.load_factor_lift_axis(i["nx"], i["nz"], i["alpha_deg"] * DEG),
    "n_path_axis": lambda i: kinematics.longitudinal_load_factor_path_axis(i["nx"], i["nz"], i["alpha_deg"] * DEG),
    "static_nx": lambda i: kinematics.longitudinal_load_factor_at_rest(attitude(i)[0]),
    "static_ny": lambda i: kinematics.lateral_load_factor_at_rest(*attitude(i)),
    "static_nz": lambda i: kinematics.load_factor_at_rest(*attitude(i)),
    "vertical_accel_from_altitude_sine": lambda i: kinematics.oscillation_load_factor(i["amplitude_m"], i["f_hz"]),
    "touchdown_mean_increment": lambda i: kinematics.stopping_load_factor(i["sink_m_s"], i["stop_s"]),
}


# ---- limits

_CATEGORY_NAMES = {  # as a row of the check values names it: our category, and which pair of its figures
    "utility": ("utility", ""),
    "acrobatic": ("aerobatic", ""),
    "CS-VLA": ("very-light", ""),
    "CS-22 U at VA": ("sailplane-utility", ""),
    "CS-22 A at VA": ("sailplane-aerobatic", ""),
    "CS-22 U at VD": ("sailplane-utility", "_at_dive"),
    "CS-22 A at VD": ("sailplane-aerobatic", "_at_dive"),
    "CS-22 airbrakes out": ("sailplane-utility", "_airbrakes"),
    "LSA F2245": ("light-sport", ""),
    "CS-23 normal": ("normal", ""),
    "CS-23 utility": ("utility", ""),
    "CS-23 aerobatic": ("aerobatic", ""),
}
CATEGORIES_COMPUTED = frozenset(_CATEGORY_NAMES)


def of_category(side: str) -> Compute:
    def figure(i: Any) -> float:
        name, pair = _CATEGORY_NAMES[i["category"]]
        # light enough for the cap of the normal category, which is the figure these rows quote
        limits = category.category_load_factors(name, 1000.0)
        return float(getattr(limits, side + pair))

    return figure


def normal(side: str) -> Compute:
    return lambda i: float(getattr(category.category_load_factors("normal", i["weight_lb"] * POUND), side))


def design_category(i: Any) -> str:
    name = str(i["category"])
    return "aerobatic" if name == "acrobatic" else name


LIMITS: dict[str, Compute] = {
    "n_pos_category": of_category("maximum"),
    "n_neg_category": of_category("minimum"),
    "n_pos_23_normal": normal("maximum"),
    "n_neg_23_normal": normal("minimum"),
    "n_cap_weight_23": lambda i: design_speeds.mass_of_load_factor(3.8) / POUND,
    "n_floor_weight_25": lambda i: design_speeds.mass_of_load_factor(2.5) / POUND,
    "n_pos_25": lambda i: category.category_load_factors("transport", i["weight_lb"] * POUND).maximum,
    "n_neg_25_between_vc_vd": lambda i: envelope.tapered_load_factor(
        i["v_kt"],
        i["vc_kt"],
        i["vd_kt"],
        category.CATEGORIES["transport"].minimum,
        category.CATEGORIES["transport"].minimum_at_dive,
    ),
    "n_neg_23_between_vc_vd": lambda i: envelope.tapered_load_factor(
        i["v_kt"], i["vc_kt"], i["vd_kt"], i["n_neg_vc"], i["n_end"]
    ),
    "flaps_extended_limit_23": lambda i: category.CATEGORIES["normal"].maximum_flaps,
    "flaps_extended_limit_25": lambda i: category.CATEGORIES["transport"].maximum_flaps,
    "flaps_extended_limit_22": lambda i: category.CATEGORIES["sailplane-utility"].maximum_flaps,
    "flaps_extended_lower_limit": lambda i: category.CATEGORIES["normal"].minimum_flaps,
    "rolling_fraction_23": lambda i: category.ROLLING_FRACTION,
    "rolling_fraction_25": lambda i: category.ROLLING_FRACTION,
    "rolling_limit": lambda i: load_limits.load_factor_maximum_rolling(i["n_pos"], 1.0, category.ROLLING_FRACTION, 0.0),
    "ultimate_load_factor": lambda i: category.ultimate_load_factor(i["n_limit"]),
    "ultimate_factor_22": lambda i: category.ULTIMATE_OVER_LIMIT,
    "ultimate_factor_23": lambda i: category.ULTIMATE_OVER_LIMIT,
    "ultimate_factor_25": lambda i: category.ULTIMATE_OVER_LIMIT,
    "vc_min_23": lambda i: design_speeds.cruise_speed_minimum(i["wing_loading_psf"] * PSF, design_category(i)) / KNOT,
    "vd_over_vcmin_23": lambda i: design_speeds.dive_over_cruise_minimum(
        i["wing_loading_psf"] * PSF, design_category(i)
    ),
    "vf_min_23": lambda i: design_speeds.flap_design_speed_minimum(i["vs_kt"], i["vsf_kt"]),
    "vref_min_23": lambda i: design_speeds.reference_speed_minimum(i["vs1_kt"], i["vmc_kt"]),
}
