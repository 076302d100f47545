"""One row a quantity: its name, symbol, units, decimals, positive sense and what can be flight.

Names follow ISO 1151-1/-2 for motion and attitude and ISO 2533 for air data. The positive sense stands here only.
"""

from __future__ import annotations

import difflib
from dataclasses import dataclass

from exceed.core.units import KINDS, UNITS, Unit


@dataclass(frozen=True, slots=True)
class Quantity:
    """A quantity of the trade.

    `shown` and `metric` are the units of tables and pages, `plausible` its physically possible range in `shown` units,
    `decimals` the digits of tables (JSON adds two). `sort`: continuous, angle (wraps), state (held between samples).
    `sided`: it has a left and a right, so that a limit without a sign is meant for both. `momentary`: it exists only at
    moments (a touchdown, a gust); none elsewhere is no lack.
    """

    name: str
    symbol: str
    kind: str
    shown: str
    decimals: int
    plausible: tuple[float, float]
    positive: str = ""
    metric: str = ""
    sort: str = "continuous"
    sided: bool = False
    recorded: bool = True
    momentary: bool = False

    @property
    def unit(self) -> Unit:
        return UNITS[self.shown]

    @property
    def si(self) -> str:
        return KINDS[self.kind]

    @property
    def discrete(self) -> bool:
        return self.sort == "state"

    @property
    def column(self) -> str:
        """Its column in the trace table, the unit in the name."""
        suffix = {"1": "", "state": "", "%": "percent"}.get(self.shown, self.shown.replace("/", "_").replace(".", "_"))
        return f"{self.name}_{suffix}" if suffix else self.name


def _speed(name: str, symbol: str, **more: object) -> Quantity:
    return Quantity(name, symbol, "speed", "kt", 1, (-5.0, 1500.0), "forward", "km/h", **more)  # type: ignore[arg-type]


def _momentary(
    name: str,
    symbol: str,
    kind: str,
    shown: str,
    decimals: int,
    plausible: tuple[float, float],
    positive: str,
    metric: str = "",
) -> Quantity:
    return Quantity(name, symbol, kind, shown, decimals, plausible, positive, metric, recorded=False, momentary=True)


_ROWS: tuple[Quantity, ...] = (
    Quantity("load_factor", "n_z", "load factor", "g", 2, (-15.0, 20.0), "up; +1 in steady level flight"),
    Quantity("longitudinal_load_factor", "n_x", "load factor", "g", 2, (-10.0, 10.0), "forward"),
    Quantity("lateral_load_factor", "n_y", "load factor", "g", 2, (-10.0, 10.0), "to the right", sided=True),
    Quantity("bank_angle", "Φ", "angle", "deg", 1, (-360.0, 360.0), "right wing down", sort="angle", sided=True),
    Quantity("pitch_angle", "Θ", "angle", "deg", 1, (-120.0, 120.0), "nose up"),
    Quantity("roll_rate", "p", "angular rate", "deg/s", 1, (-720.0, 720.0), "right wing going down", sided=True),
    Quantity("pitch_rate", "q", "angular rate", "deg/s", 1, (-360.0, 360.0), "nose going up"),
    Quantity("yaw_rate", "r", "angular rate", "deg/s", 1, (-360.0, 360.0), "nose going right", sided=True),
    Quantity("roll_acceleration", "dp/dt", "angular acceleration", "deg/s2", 0, (-9000.0, 9000.0), recorded=False),
    Quantity("pitch_acceleration", "dq/dt", "angular acceleration", "deg/s2", 0, (-9000.0, 9000.0), recorded=False),
    Quantity("yaw_acceleration", "dr/dt", "angular acceleration", "deg/s2", 0, (-9000.0, 9000.0), recorded=False),
    Quantity("heading", "Ψ", "angle", "deg", 1, (-360.0, 720.0), "clockwise from north", sort="angle"),
    Quantity("track_angle", "χ", "angle", "deg", 1, (-360.0, 720.0), "clockwise from north", sort="angle"),
    Quantity("angle_of_attack", "α", "angle", "deg", 1, (-180.0, 180.0), "air from below"),
    Quantity("sideslip_angle", "β", "angle", "deg", 1, (-180.0, 180.0), "air from the right", sided=True),
    _speed("indicated_airspeed", "V_i"),
    _speed("calibrated_airspeed", "V_c"),
    _speed("equivalent_airspeed", "V_e"),
    _speed("true_airspeed", "V"),
    _speed("ground_speed", "V_k"),
    Quantity("mach", "M", "ratio", "1", 3, (-0.01, 5.0)),
    Quantity("pressure_altitude", "H_p", "length", "ft", 0, (-3000.0, 100000.0), "up", "m"),
    Quantity("geometric_altitude", "h", "length", "ft", 0, (-3000.0, 200000.0), "up", "m"),
    Quantity("height_above_ground", "h_r", "length", "ft", 0, (-100.0, 100000.0), "up", "m"),
    Quantity("height_above_aerodrome", "h_a", "length", "ft", 0, (-5000.0, 100000.0), "up", "m", recorded=False),
    Quantity("vertical_speed", "dH/dt", "speed", "ft/min", 0, (-60000.0, 60000.0), "up", "m/s"),
    Quantity("static_air_temperature", "T_s", "temperature", "degC", 1, (-120.0, 80.0)),
    Quantity("total_air_temperature", "T_t", "temperature", "degC", 1, (-120.0, 200.0)),
    Quantity("static_pressure", "p", "pressure", "hPa", 1, (5.0, 1150.0)),
    Quantity("impact_pressure", "q_c", "pressure", "hPa", 1, (-20.0, 3000.0)),
    Quantity("dynamic_pressure", "q", "pressure", "hPa", 1, (-20.0, 3000.0), recorded=False),
    Quantity("altimeter_setting", "QNH", "pressure", "hPa", 0, (850.0, 1100.0)),
    Quantity("flap_angle", "δ_F", "angle", "deg", 0, (-20.0, 90.0), "down"),
    Quantity("gear_down", "", "state", "state", 0, (0.0, 1.0), "down is 1", sort="state"),
    Quantity("gear_moving", "", "state", "state", 0, (0.0, 1.0), "moving is 1", sort="state", recorded=False),
    Quantity("airbrakes_out", "", "state", "state", 0, (0.0, 1.0), "out is 1", sort="state"),
    Quantity("weight_on_wheels", "", "state", "state", 0, (0.0, 1.0), "on the ground is 1", sort="state"),
    Quantity("stall_warning", "", "state", "state", 0, (0.0, 1.0), "warning is 1", sort="state"),
    Quantity("on_tow", "", "state", "state", 0, (0.0, 1.0), "on the tow is 1", sort="state"),
    Quantity("on_winch", "", "state", "state", 0, (0.0, 1.0), "on the winch is 1", sort="state"),
    Quantity("fuel_mass", "m_F", "mass", "kg", 1, (0.0, 400000.0)),
    Quantity("fuel_volume", "", "volume", "L", 1, (0.0, 400000.0)),
    Quantity("fuel_mass_flow", "", "mass flow", "kg/h", 1, (-1.0, 100000.0)),
    Quantity("fuel_volume_flow", "", "volume flow", "L/h", 1, (-1.0, 100000.0)),
    Quantity("mass", "m", "mass", "kg", 0, (0.0, 1000000.0)),
    Quantity("zero_fuel_mass", "", "mass", "kg", 0, (0.0, 1000000.0), recorded=False),
    Quantity("centre_of_gravity", "x_cg", "length", "m", 3, (-100.0, 100.0), "aft of the manual's datum"),
    Quantity("inverted_time", "", "time", "s", 1, (0.0, 1e6), "since turning inverted", recorded=False),
    Quantity("stall_speed", "V_S", "speed", "kt", 1, (0.0, 1000.0), "", "km/h", recorded=False),
    Quantity("stall_margin", "", "speed", "kt", 1, (-1000.0, 1500.0), "above the stall speed", "km/h", recorded=False),
    Quantity("stall_speed_ratio", "V_c/V_S1g", "ratio", "1", 3, (0.0, 100.0), recorded=False),
    Quantity("load_factor_maximum", "n_max", "load factor", "g", 2, (-15.0, 20.0), "up", recorded=False),
    Quantity("load_factor_minimum", "n_min", "load factor", "g", 2, (-15.0, 20.0), "up", recorded=False),
    Quantity("load_factor_margin", "", "load factor", "g", 2, (-30.0, 30.0), "inside the envelope", recorded=False),
    Quantity("manoeuvring_speed", "V_A", "speed", "kt", 1, (0.0, 1000.0), "", "km/h", recorded=False),
    Quantity("turn_radius", "r", "length", "m", 0, (0.0, 1e7), recorded=False),
    Quantity("turn_rate", "dχ/dt", "angular rate", "deg/s", 2, (-120.0, 120.0), "to the right", sided=True),
    _momentary("gust_velocity", "U_de", "speed", "ft/s", 1, (-300.0, 300.0), "up", "m/s"),
    _momentary("touchdown_sink_rate", "", "speed", "ft/min", 0, (-6000.0, 6000.0), "down", "m/s"),
    _momentary("touchdown_load_factor", "", "load factor", "g", 2, (-15.0, 20.0), "up"),
    Quantity("latitude", "", "angle", "deg", 5, (-90.0, 90.0), "north"),
    Quantity("longitude", "", "angle", "deg", 5, (-360.0, 360.0), "east", sort="angle"),
    Quantity("engine_speed", "", "rotation", "rpm", 0, (0.0, 100000.0)),
)

QUANTITIES: dict[str, Quantity] = {row.name: row for row in _ROWS}

# the trace table's order (height_above_ground is radio height only)
TRACE_ORDER: tuple[str, ...] = tuple(row.name for row in _ROWS)


def quantity(name: str) -> Quantity:
    """The row of a quantity. Raises KeyError with the nearest name for one that is not known."""
    try:
        return QUANTITIES[name]
    except KeyError:
        near = nearest_quantity(name)
        raise KeyError(f"{name!r} is not a quantity" + (f"; did you mean {near!r}?" if near else "")) from None


def nearest_quantity(name: str) -> str | None:
    found = difflib.get_close_matches(name.lower(), QUANTITIES, n=1, cutoff=0.6)
    return found[0] if found else None


def declared(name: str, unit: str) -> Quantity:
    """A quantity that a rules or channels file declares under its own name, e.g. oil_temperature in degC."""
    row = UNITS[unit]
    return Quantity(name, "", row.kind, unit, 1, (-1e9, 1e9), sort="state" if row.kind == "state" else "continuous")
