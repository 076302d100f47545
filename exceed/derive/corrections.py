"""Position error of the airspeed system: indicated to calibrated airspeed and back, by the aeroplane's own table."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from exceed.core.recording import Array


@dataclass(frozen=True, slots=True, eq=False)
class PositionError:
    """Rows by flap setting: `flap_angle` rad ascending, and for each the indicated and calibrated speeds, m/s."""

    flap_angle: tuple[float, ...]
    indicated: tuple[Array, ...]
    calibrated: tuple[Array, ...]


def _between_settings(curves: list[Array], settings: tuple[float, ...], flap_angle: Array | None) -> Array:
    """Curves of each flap setting -> the one at the flap angle, linear between settings, ends held."""
    if flap_angle is None or len(curves) == 1:
        # flaps not recorded: the clean row
        return curves[int(np.argmin(np.abs(settings)))]
    result = curves[-1]
    for low in range(len(curves) - 2, -1, -1):
        share = (flap_angle - settings[low]) / (settings[low + 1] - settings[low])
        mixed = curves[low] + np.clip(share, 0.0, 1.0) * (curves[low + 1] - curves[low])
        result = np.where(flap_angle < settings[low + 1], mixed, result)
    return np.where(np.isnan(flap_angle), np.nan, result)


def calibrated_from_indicated(
    indicated_airspeed: Array, position_error: PositionError, error_flap_angle: Array | None = None
) -> Array:
    """Calibrated airspeed: indicated plus the table's correction, the last correction held beyond its ends.

    indicated_airspeed : (n,) m/s; error_flap_angle : (n,) rad, None where not recorded (clean row). Returns (n,) m/s.
    Source: [DEFINITION]; the table is the manual's.
    """
    curves = [
        indicated_airspeed + np.interp(indicated_airspeed, indicated, calibrated - indicated)
        for indicated, calibrated in zip(position_error.indicated, position_error.calibrated, strict=True)
    ]
    return _between_settings(curves, position_error.flap_angle, error_flap_angle)


def indicated_from_calibrated(
    calibrated_airspeed: Array, position_error: PositionError, error_flap_angle: Array | None = None
) -> Array:
    """Indicated airspeed; the inverse of `calibrated_from_indicated` for each row of the table.

    calibrated_airspeed : (n,) m/s; error_flap_angle : (n,) rad or None. Returns (n,) m/s.
    Source: [DEFINITION]; the table is the manual's.
    """
    curves = [
        calibrated_airspeed - np.interp(calibrated_airspeed, calibrated, calibrated - indicated)
        for indicated, calibrated in zip(position_error.indicated, position_error.calibrated, strict=True)
    ]
    return _between_settings(curves, position_error.flap_angle, error_flap_angle)
