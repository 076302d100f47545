"""One table: what recorders call a quantity. Trade terms, abbreviations, plain English; no maker's own list.

A phrase is a set of words after `WORDS` has reduced spellings (`ACCN` -> acceleration). The figure is how sure the
name alone makes it. A name that holds more words than a phrase is weaker; one that holds a word of `REFUSED` is none.
"""

from __future__ import annotations

Phrase = tuple[str, str, float]


def _rows(quantity: str, text: str, score: float) -> list[Phrase]:
    return [(quantity, phrase.strip(), score) for phrase in text.split(",")]


# several quantities may share a phrase: the unit then decides (fuel quantity in L or in kg)
PHRASES: list[Phrase] = [
    *_rows(
        "load_factor",
        "nz, nzw, load factor, normal load factor, vertical load factor, normal acceleration, vertical acceleration, "
        "vrtg, vertg, vg, gz, accz, az, acceleration z, z acceleration, normac, nac, n z, g load, gload, g "
        "force, gforce, "
        "normal g, vertical g, g normal, g vertical, g meter, gmeter, load factor nz, acceleration normal, "
        "accnorm, vertaccel, "
        "normal acceleration nz, acceleration vertical, vert g, nzb, vacc, nzcg, acn, acnz",
        1.0,
    ),
    *_rows("load_factor", "g, gs, acceleration, load", 0.6),
    *_rows(
        "longitudinal_load_factor",
        "nx, nxb, longitudinal acceleration, longitudinal load factor, longg, gx, accx, ax, acceleration x, "
        "x acceleration, longitudinal g, g longitudinal, acceleration longitudinal, longac, longaccel, fore aft "
        "acceleration, n x",
        1.0,
    ),
    *_rows(
        "longitudinal_load_factor",
        "long acceleration, lon acceleration, long g, lon g, lng acceleration, longitude acceleration, long load "
        "factor",
        0.95,
    ),
    *_rows(
        "lateral_load_factor",
        "ny, nyb, lateral acceleration, lateral load factor, latg, gy, accy, ay, acceleration y, y acceleration, "
        "lateral g, g lateral, acceleration lateral, latac, lataccel, side acceleration, n y",
        1.0,
    ),
    *_rows("lateral_load_factor", "lat acceleration, lat g, latitude acceleration, lat load factor", 0.95),
    *_rows(
        "bank_angle",
        "bank, bank angle, roll, roll angle, roll attitude, angle of bank, rolla, bnk, aob, bank attitude, "
        "attitude roll, "
        "roll angle bank",
        1.0,
    ),
    *_rows(
        "pitch_angle", "pitch, pitch angle, pitch attitude, pitcha, attitude pitch, angle pitch, pitch inclination", 1.0
    ),
    *_rows(
        "roll_rate",
        "roll rate, bank rate, bank angle rate, p, gyro x, gyrx, gyrox, wx, omega x, angular rate x, rate roll, "
        "rollr, rrate, "
        "roll angle rate, body roll rate, p rate, roll angular rate, roll speed, x rate",
        1.0,
    ),
    *_rows(
        "pitch_rate",
        "pitch rate, q, gyro y, gyry, gyroy, wy, omega y, angular rate y, rate pitch, pitchr, prate, pitch angle "
        "rate, q rate, "
        "body pitch rate, pitch angular rate, pitch speed, y rate",
        1.0,
    ),
    *_rows(
        "yaw_rate",
        "yaw rate, r, gyro z, gyrz, gyroz, wz, omega z, angular rate z, rate yaw, yawr, yrate, r rate, body yaw rate, "
        "yaw angular rate, yaw speed, z rate",
        1.0,
    ),
    *_rows(
        "heading",
        "heading, magnetic heading, true heading, heading magnetic, heading mag, mag heading, heading true, "
        "hdgm, hdgt, mh, th, "
        "heading angle, compass, magnetic compass, yaw, yaw angle, hdg mag, gyro heading, azimuth angle, thdg, mhdg",
        1.0,
    ),
    *_rows(
        "track_angle",
        "track, track angle, ground track, track true, true track, track magnetic, track mag, course over ground, "
        "ground course, cog, geometric track, tk, track over ground, trk angle, tka, inertial track",
        1.0,
    ),
    *_rows(
        "turn_rate", "turn rate, rate of turn, heading rate, track rate, rot, turn rate angle, track angle rate", 1.0
    ),
    *_rows(
        "angle_of_attack",
        "aoa, angle of attack, alpha, incidence, alfa, aoal, aoar, incidence angle, aoa angle, alpha vane, aoa vane, "
        "local angle of attack, body angle of attack",
        1.0,
    ),
    *_rows(
        "sideslip_angle", "sideslip, sideslip angle, aos, angle of sideslip, slip angle, yaw sideslip, slipangle", 1.0
    ),
    *_rows(
        "indicated_airspeed",
        "ias, v ind, v indicated, v ias, ind speed, indicated airspeed, indicated air speed, airspeed indicated, "
        "kias, vias, vi, indicated speed, "
        "airspeed ias, speed indicated",
        1.0,
    ),
    *_rows("indicated_airspeed", "airspeed, air speed, asi", 0.8),
    *_rows(
        "calibrated_airspeed",
        "cas, calibrated airspeed, calibrated air speed, kcas, airspeed calibrated, vcas, vc, airspeed cas, "
        "rectified airspeed, calibrated speed",
        1.0,
    ),
    *_rows(
        "equivalent_airspeed", "eas, equivalent airspeed, equivalent air speed, keas, veas, airspeed equivalent", 1.0
    ),
    *_rows(
        "true_airspeed",
        "tas, v true, v tas, true airspeed, true air speed, ktas, vtas, airspeed true, vt, airspeed tas, true speed",
        1.0,
    ),
    *_rows(
        "ground_speed",
        "gs, v ground, v gnd, v gs, ground speed, groundspeed, gspd, gndspd, sog, speed over ground, gps speed, "
        "ground velocity, geometric speed, "
        "geometric ground speed, inertial ground speed, grspd, vg speed, gps ground speed",
        1.0,
    ),
    *_rows("mach", "mach, mach number, machnumber, m, mn, mno, mach mach", 1.0),
    *_rows(
        "pressure_altitude",
        "pressure altitude, palt, pressalt, altitude pressure, altitude std, std altitude, altstd, standard altitude, "
        "altitude standard, hp, palt std, altitude qne, qne altitude, altitude 1013, pa, baro pressure altitude, "
        "barometric altitude std, "
        "pressure height, press height, padat, altitude fine, mode c, zp, hpa altitude, standard pressure altitude",
        1.0,
    ),
    *_rows(
        "pressure_altitude",
        "barometric altitude, balt, altitude barometric, altitude, baroalt, altbaro, adc altitude, air data altitude, "
        "altp",
        0.8,
    ),
    *_rows(
        "pressure_altitude",
        "indicated altitude, altitude indicated, altitude msl, msl altitude, baro corrected altitude, altimeter, "
        "corrected altitude, qnh altitude, altitude qnh, baro altitude corrected, baro corr altitude",
        0.55,
    ),
    *_rows(
        "geometric_altitude",
        "geometric altitude, gps altitude, gnss altitude, altitude gps, galt, altgps, gpsalt, altitude gnss, gps "
        "height, "
        "ellipsoid height, geometric height, altitude wgs84, altitude geometric, inertial altitude, height msl, "
        "geometric altitude msl",
        1.0,
    ),
    *_rows(
        "height_above_ground",
        "radio altitude, radio height, ralt, radalt, ra, radar altitude, rad altitude, height above ground, agl, "
        "height agl, altitude agl, radht, lrra, radio altimeter, radar altimeter, rh, altrad, height radio, hra, "
        "radar height, "
        "altitude radio, terrain clearance, above ground level, radio altimeter height, radalt height",
        1.0,
    ),
    *_rows(
        "vertical_speed",
        "vertical speed, vs, vspd, vspeed, ivv, vsi, vvi, rate of climb, roc, climb rate, vertspd, vario, "
        "vertical velocity, "
        "inertial vertical speed, vertical rate, roc rod, barometric vertical speed, altitude rate, alt rate, "
        "baro vertical speed, "
        "vertical v speed, inertial vertical velocity, variometer, vertrate, vertspeed, varioref, hdot, altrate, "
        "rate climb, barometric rate, baro altitude rate, geometric vertical speed",
        1.0,
    ),
    *_rows(
        "static_air_temperature",
        "sat, static air temperature, oat, outside air temperature, static temperature, outside temperature, "
        "ambient temperature, air temperature, temperature static, ambient air temperature, free air "
        "temperature, fat, temperature oat, "
        "outside air, true air temperature, temperature outside, iat",
        1.0,
    ),
    *_rows(
        "total_air_temperature",
        "tat, total air temperature, total temperature, rat, ram air temperature, temperature total",
        1.0,
    ),
    *_rows(
        "static_pressure",
        "static pressure, ps, pstat, pstatic, pressure static, ambient pressure, static air pressure, p static, pst, "
        "psta, barometric pressure, baro pressure, pstat air",
        1.0,
    ),
    *_rows(
        "impact_pressure",
        "impact pressure, qc, qci, pitot pressure differential, pressure impact, differential pressure, pitot "
        "static difference, "
        "delta p, dp, pdiff, diff pressure",
        0.9,
    ),
    *_rows(
        "altimeter_setting",
        "altimeter setting, qnh, baro setting, barometric setting, baro set, altimeter set, baro correction, baro",
        0.9,
    ),
    *_rows(
        "flap_angle",
        "flap, flap angle, flap position, flap deflection, trailing edge flap, te flap, flap surface, flapang, "
        "te flap angle, "
        "trailing edge flap position, te flap position, wing flap, wing flap angle, flap extended, flap setting, "
        "fl pos",
        1.0,
    ),
    *_rows(
        "gear_down",
        "gear, landing gear, gear down, gear position, landing gear down, gear down locked, landing gear "
        "position, ldg, lg, "
        "gear extended, gear dn lk, gear locked, gear down and locked, gear dnlk, gear down lock, landing gear "
        "extended, "
        "gear up, gear retracted, landing gear up, landing gear selection, gear downlock",
        1.0,
    ),
    *_rows(
        "airbrakes_out",
        "airbrake, air brake, speed brake, airbrake out, airbrake position, airbrake angle, airbrake extended, "
        "dive brake, "
        "speed brake position, airbrake in, air brakes out, speed brake extended, spoiler position, spoiler extended, "
        "airbrake deployed, spoiler angle, airbrake retracted",
        1.0,
    ),
    *_rows(
        "weight_on_wheels",
        "wow, weight on wheels, air ground, ground air, airgnd, gndair, on ground, squat switch, squat, ground, "
        "on the ground, airgrnd, ground contact, agl switch, airborne, in air, in flight, air gnd, on gnd, "
        "weight off wheels, "
        "inflight, gear squat, wheels weight, oleo, oleo switch, gear compressed, air ground switch, weight wheels",
        1.0,
    ),
    *_rows(
        "stall_warning",
        "stall warning, stall, stall warn, stick shaker, shaker, stallwarn, stall horn, stall warning horn, "
        "stall alert",
        1.0,
    ),
    *_rows("on_tow", "on tow, tow, tow hook, under tow, tow rope, towing", 0.9),
    *_rows("on_winch", "on winch, winch, winch launch, winch hook, winch rope, winch cable", 0.9),
    *_rows(
        "fuel_mass",
        "fuel, fuel quantity, fuel mass, fuel weight, fq, fob, fqty, fuel on board, fuel total, total fuel, fuel "
        "quantity total, "
        "fuel total quantity, total fuel quantity, fuel remaining total",
        0.9,
    ),
    *_rows(
        "fuel_volume",
        "fuel, fuel quantity, fuel volume, fq, fob, fqty, fuel on board, fuel total, total fuel, fuel quantity total, "
        "fuel total quantity, total fuel quantity, fuel remaining total",
        0.9,
    ),
    *_rows(
        "fuel_mass_flow",
        "ff, fuel flow, fuel mass flow, fflow, fuelflow, total fuel flow, fuel flow rate, engine fuel flow",
        0.9,
    ),
    *_rows(
        "fuel_volume_flow",
        "ff, fuel flow, fuel volume flow, fflow, fuelflow, total fuel flow, fuel flow rate, engine fuel flow",
        0.9,
    ),
    *_rows(
        "mass",
        "mass, gross mass, gross weight, gw, weight, aircraft mass, aircraft weight, total mass, auw, all up weight, "
        "total weight, aircraft gross weight, airplane weight, aeroplane mass",
        0.9,
    ),
    *_rows(
        "centre_of_gravity",
        "centre of gravity, cg position, xcg, centre gravity, cg arm, x cg, centre of gravity position, cg",
        0.9,
    ),
    *_rows(
        "latitude",
        "latitude, lat, latp, present position latitude, gps latitude, position latitude, geometric latitude, "
        "position lat, gps lat, geometric lat",
        0.95,
    ),
    *_rows(
        "longitude",
        "longitude, lon, lonp, long, lng, present position longitude, gps longitude, position longitude, "
        "geometric longitude, "
        "position lon, gps lon, gps long, geometric lon, geometric long",
        0.95,
    ),
    *_rows(
        "engine_speed",
        "engine speed, rpm, engine rpm, propeller rpm, propeller speed, crankshaft speed, tacho, tachometer, np, erpm",
        0.95,
    ),
]
