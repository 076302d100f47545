"""The recorded rows of the integration -> the named truth channels of a flight. SI."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from scenario.air import (
    DENSITY_0,
    G0,
    GAS_CONSTANT,
    Array,
    calibrated_airspeed,
    indicated_airspeed,
    mach_number,
    standard_pressure,
)  # fmt: skip
from scenario.airframes import Airframe

if TYPE_CHECKING:
    from scenario.flight import Sim

STEP = 0.01


def _lagged(values: Array, seconds: float) -> Array:
    """First-order lag, started in balance."""
    keep = np.exp(-STEP / seconds)
    out = np.empty_like(values)
    state = values[0]
    for i, value in enumerate(values.tolist()):
        state = keep * state + (1.0 - keep) * value
        out[i] = state
    return out


def channels_from_rows(airframe: Airframe, rows: list[tuple[float, ...]], sim: Sim) -> dict[str, Array]:
    """All truth channels; every array has one value a row (100 Hz)."""
    table = np.asarray(rows, dtype=float).T
    (time, speed, qa, qb, qc, qd, height, pressure_altitude, normal, longitudinal, geometric, aerodynamic, roll_w,
     flaps, gear, brakes, ground, heading_ground, rise_ground, fuel, flow, mass, warning, power, gust_up, gust_along,
     temperature, yaw_ground) = table  # fmt: skip
    on_ground = ground > 0.5
    headwind = sim.headwind
    # wind axes in north, east, down
    x_n, x_e, x_d = qa**2 + qb**2 - qc**2 - qd**2, 2 * (qb * qc + qa * qd), 2 * (qb * qd - qa * qc)
    y_d = 2 * (qc * qd + qa * qb)
    z_n, z_e, z_d = 2 * (qb * qd + qa * qc), 2 * (qc * qd - qa * qb), qa**2 - qb**2 - qc**2 + qd**2
    # body axes: turned up by the incidence about the common y axis
    cos_i, sin_i = np.cos(geometric), np.sin(geometric)
    b_n, b_e, b_d = cos_i * x_n - sin_i * z_n, cos_i * x_e - sin_i * z_e, cos_i * x_d - sin_i * z_d
    bz_d = sin_i * x_d + cos_i * z_d
    pitch = np.where(on_ground, geometric, -np.arcsin(np.clip(b_d, -1, 1)))
    bank = np.where(on_ground, 0.0, np.arctan2(y_d, bz_d))
    heading = np.where(on_ground, heading_ground, np.arctan2(b_e, b_n))
    # velocity over the ground; the wind blows from the runway's direction
    wind_n, wind_e = -headwind * np.cos(sim.runway), -headwind * np.sin(sim.runway)
    v_n = np.where(on_ground, speed * np.cos(heading_ground), speed * x_n + wind_n)
    v_e = np.where(on_ground, speed * np.sin(heading_ground), speed * x_e + wind_e)
    rise = np.where(on_ground, rise_ground, -speed * x_d)
    airspeed = np.where(on_ground, np.maximum(speed + headwind * np.cos(heading_ground - sim.runway), 0.0), speed)
    airspeed = np.maximum(airspeed + gust_along, 0.0)
    # body load factors. In flight `normal` is along the body axis already; on the ground it is vertical
    lift = np.where(on_ground, normal, (normal + longitudinal * sin_i) / cos_i)
    load_factor = np.where(on_ground, normal * cos_i - longitudinal * sin_i, normal)
    longitudinal_body = longitudinal * cos_i + lift * sin_i
    lateral = np.where(on_ground, speed * yaw_ground / G0, 0.0)
    # rates: of the wind axes, turned into the body, plus the change of incidence
    safe = np.maximum(speed, 8.0)
    q_w = np.where(on_ground, 0.0, (lift - z_d) * G0 / safe)
    r_w = np.where(on_ground, yaw_ground, y_d * G0 / safe)
    p_w = np.where(on_ground, 0.0, roll_w)
    change = np.gradient(geometric, STEP)
    # the switch between ground and air is a change of bookkeeping, not a rotation
    edges = np.flatnonzero(np.diff(ground)) if len(ground) > 1 else np.array([], dtype=int)
    for edge in edges:
        change[max(edge - 1, 0) : edge + 3] = 0.0
    static_pressure = standard_pressure(pressure_altitude)
    density = static_pressure / (GAS_CONSTANT * temperature)
    mach = mach_number(airspeed, temperature)
    calibrated = calibrated_airspeed(mach, static_pressure)
    span = airframe.engine_speed_full - airframe.engine_speed_idle
    engine_speed = airframe.engine_speed_idle + span * _lagged(power, 1.2)
    oil = 273.15 + 62.0 + 38.0 * _lagged(power, 180.0)
    return {
        "time": time,
        "north": np.concatenate([[0.0], np.cumsum(0.5 * (v_n[1:] + v_n[:-1]) * STEP)]),
        "east": np.concatenate([[0.0], np.cumsum(0.5 * (v_e[1:] + v_e[:-1]) * STEP)]),
        "velocity_north": v_n,
        "velocity_east": v_e,
        "height_above_aerodrome": height,
        "height_above_ground": height,
        "pressure_altitude": pressure_altitude,
        "vertical_speed": rise,
        "true_airspeed": airspeed,
        "equivalent_airspeed": airspeed * np.sqrt(density / DENSITY_0),
        "calibrated_airspeed": calibrated,
        "indicated_airspeed": indicated_airspeed(calibrated, airframe.position_error),
        "mach": mach,
        "ground_speed": np.hypot(v_n, v_e),
        "track_angle": np.mod(np.where(np.hypot(v_n, v_e) > 0.3, np.arctan2(v_e, v_n), heading), 2 * np.pi),
        "static_pressure": static_pressure,
        "static_air_temperature": temperature,
        "outside_air_temperature": temperature,
        "total_air_temperature": temperature * (1.0 + 0.2 * mach**2),
        "load_factor": load_factor,
        "longitudinal_load_factor": longitudinal_body,
        "lateral_load_factor": lateral,
        "bank_angle": bank,
        "pitch_angle": pitch,
        "heading": np.mod(heading, 2 * np.pi),
        "roll_rate": p_w * cos_i - r_w * sin_i,
        "pitch_rate": q_w + change,
        "yaw_rate": p_w * sin_i + r_w * cos_i,
        "angle_of_attack": aerodynamic,
        "sideslip_angle": np.zeros_like(time),
        "flap_angle": np.radians(flaps),
        "gear_down": (gear > 0.999).astype(float),
        "airbrakes_out": brakes,
        "weight_on_wheels": ground,
        "stall_warning": warning,
        "fuel_mass": fuel,
        "fuel_flow": flow,
        "mass": mass,
        "engine_speed": engine_speed,
        "oil_temperature": oil,
        "wind_speed": np.full_like(time, headwind),
        "wind_direction": np.full_like(time, sim.runway),
        "gust_up": gust_up,
        "gust_along": gust_along,
    }
