"""The three invented aeroplanes as the flight model flies them; the YAML files tell the program the same limits."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from scenario.air import G0, KT


@dataclass(frozen=True, slots=True)
class Airframe:
    """What the flight model needs of an aeroplane. Speeds in kt where the name says so, otherwise SI."""

    registration: str
    reference_mass: float
    wing_area: float
    chord: float
    lift_slope: float
    stall_kcas: tuple[tuple[float, float], ...]  # (flaps in deg, 1 g stall speed at the reference mass)
    inverted_stall_kcas: float
    position_error: tuple[tuple[float, float], ...]  # (IAS, CAS) in kt
    reference_kcas: float  # where drag_0 and drag_n hold
    thrust: float  # static thrust over weight
    thrust_fade: float  # share lost at the reference speed
    drag_0: float
    drag_n: float
    rotate_kcas: float
    final_kcas: float
    roll_rate: float  # rad/s, what the pilot uses at most
    fuel_flow_idle: float  # kg/s
    fuel_flow_full: float
    engine_speed_idle: float  # rev/min, or per cent for the jet
    engine_speed_full: float
    jet: bool = False
    retractable: bool = False
    zero_lift_angle: float = -0.035
    accelerometer: tuple[float, float, float] = (0.0, 0.0, 0.0)  # from the CG: forward, right, down, m

    def longitudinal(self, equivalent_airspeed: float, load_factor: float, power: float) -> float:
        """Thrust minus drag over weight at a power setting between 0 and 1."""
        ratio = max(equivalent_airspeed / (self.reference_kcas * KT), 0.15)
        thrust = power * self.thrust * max(0.15, 1.0 - self.thrust_fade * ratio)
        return thrust - self.drag_0 * ratio**2 - self.drag_n * (load_factor / ratio) ** 2

    def normal_force_limit(self, equivalent_airspeed: float, mass: float, flaps_deg: float, inverted: bool) -> float:
        """Largest size of load factor that the wing can give: (V / V_s)^2 m_ref / m, constant maximum coefficient."""
        speed = self.inverted_stall_kcas if inverted else interpolate(flaps_deg, self.stall_kcas)
        return float((equivalent_airspeed / (speed * KT)) ** 2 * self.reference_mass / mass)

    def incidence(self, load_factor: float, equivalent_airspeed: float, mass: float, flaps_deg: float) -> float:
        """Angle of attack in rad that gives a load factor; each degree of flap shifts it by 0.12 deg."""
        pressure = 0.5 * 1.225 * max(equivalent_airspeed, 15.0) ** 2
        coefficient = load_factor * mass * G0 / (pressure * self.wing_area)
        return self.zero_lift_angle + coefficient / self.lift_slope - 0.0021 * flaps_deg


def interpolate(x: float, table: tuple[tuple[float, float], ...]) -> float:
    """Linear between rows, held beyond the ends."""
    if x <= table[0][0]:
        return table[0][1]
    for (x0, y0), (x1, y1) in pairwise(table):
        if x <= x1:
            return y0 + (y1 - y0) * (x - x0) / (x1 - x0)
    return table[-1][1]


LARKSPUR = Airframe(
    registration="ZZ-NMA", reference_mass=960.0, wing_area=13.6, chord=1.5, lift_slope=4.9,
    stall_kcas=((0.0, 55.0), (30.0, 48.0)), inverted_stall_kcas=66.0,
    position_error=((50.0, 54.0), (100.0, 101.0), (180.0, 180.0)),
    reference_kcas=130.0, thrust=0.40, thrust_fade=0.45, drag_0=0.12, drag_n=0.006,
    rotate_kcas=58.0, final_kcas=68.0, roll_rate=1.9,
    fuel_flow_idle=0.0012, fuel_flow_full=0.0125, engine_speed_idle=900.0, engine_speed_full=2650.0,
    accelerometer=(0.35, 0.0, -0.1),
)  # fmt: skip

FENWICK = Airframe(
    registration="ZZ-NMC", reference_mass=1150.0, wing_area=16.2, chord=1.47, lift_slope=4.7,
    stall_kcas=((0.0, 54.0), (20.0, 49.0), (35.0, 46.0)), inverted_stall_kcas=70.0,
    position_error=((45.0, 50.0), (80.0, 81.0), (110.0, 109.0), (165.0, 163.0)),
    reference_kcas=110.0, thrust=0.32, thrust_fade=0.45, drag_0=0.085, drag_n=0.012,
    rotate_kcas=56.0, final_kcas=66.0, roll_rate=0.6,
    fuel_flow_idle=0.001, fuel_flow_full=0.0098, engine_speed_idle=800.0, engine_speed_full=2600.0,
    accelerometer=(0.2, 0.0, 0.15),
)  # fmt: skip

CORRAN = Airframe(
    registration="ZZ-NMJ", reference_mass=4300.0, wing_area=22.0, chord=1.65, lift_slope=5.2,
    stall_kcas=((0.0, 96.0), (15.0, 86.0), (35.0, 78.0)), inverted_stall_kcas=120.0,
    position_error=((80.0, 81.0), (150.0, 150.5), (280.0, 279.0)),
    reference_kcas=220.0, thrust=0.50, thrust_fade=0.30, drag_0=0.05, drag_n=0.012,
    rotate_kcas=99.0, final_kcas=106.0, roll_rate=0.5,
    fuel_flow_idle=0.025, fuel_flow_full=0.16, engine_speed_idle=52.0, engine_speed_full=100.0,
    jet=True, retractable=True, zero_lift_angle=-0.026, accelerometer=(-0.4, 0.0, 0.3),
)  # fmt: skip
