"""Publications that formulas, limits and check values rest on: one row each.

`note` says honestly how the text was had: read in a copy, seen quoted in a public page, or from memory. A key never
changes once it is printed somewhere.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Source:
    """One publication: `key` as cited in docstrings and outputs, `title`, `edition`, and how far it was read."""

    key: str
    title: str
    edition: str
    note: str = ""


_ROWS = (
    # units
    Source("BIPM-SI", "The International System of Units", "9th edition, 2019", "exact factors, from memory"),
    Source("YARD-POUND-1959", "International yard and pound agreement", "1959", "exact factors, from memory"),
    # atmosphere and air data
    Source(
        "ISO-2533",
        "ISO 2533 Standard Atmosphere; the same definition in ICAO Doc 7488 and U.S. Standard Atmosphere 1976",
        "ISO 1975, ICAO 1993, US 1976",
        "layer definition; printed tables recalled from memory, cross-checked with two open libraries",
    ),
    Source(
        "PITOT-STATIC",
        "Compressible pitot-static relations of the standard atmosphere (isentropic below Mach 1)",
        "textbook",
        "definitions of calibrated, equivalent and true airspeed as used by ICAO and ISO",
    ),
    Source(
        "NACA-1135",
        "Equations, Tables, and Charts for Compressible Flow (NACA Report 1135)",
        "1953",
        "isentropic and Rayleigh pitot relations, from memory; the tables give p02/p1 = 5.640 at Mach 2",
    ),
    Source("STAGNATION", "Stagnation temperature relation with recovery factor", "textbook"),
    Source(
        "ICAO-8168", "Procedures for Air Navigation Services - Aircraft Operations (Doc 8168)", "quoted", "not read"
    ),
    Source("ISATMOSPHERE-JL", "Test values of the open library ISAtmosphere.jl", "public repository", "looked up"),
    Source("AVIATION-FORMULARY", "Aviation Formulary", "web edition", "one worked example, seen quoted"),
    Source(
        "ATPL-NOTES", "Public study notes and question banks for the airline transport licence", "various", "quoted"
    ),
    # flight mechanics
    Source("LEVEL-TURN", "Mechanics of the level coordinated turn", "textbook", "also in FAA-PHAK"),
    Source(
        "FAA-PHAK",
        "Pilot's Handbook of Aeronautical Knowledge (FAA-H-8083-25)",
        "as quoted in public pages",
        "load factors, turns, weight and balance; read through public pages that reproduce the sections",
    ),
    Source("FLIGHT-PATH", "Point-mass equations of motion in flight-path axes", "textbook"),
    Source("RIGID-BODY", "Rigid-body transfer of specific force between two points", "textbook"),
    Source("AXES", "Rotation between body, lift and path axes; ISO 1151 senses", "textbook"),
    Source("WIND-TRIANGLE", "Wind triangle: ground velocity is air velocity plus wind", "textbook"),
    Source(
        "SAVITZKY-GOLAY",
        "Smoothing and differentiation of data by simplified least squares procedures (Anal. Chem. 36, 1627)",
        "1964",
        "local least-squares polynomial, here on uneven times; from memory",
    ),
    Source(
        "NAVWEPS-00-80T-80", "Aerodynamics for Naval Aviators", "1965 edition", "worked figures seen in public copies"
    ),
    Source("ICAO-ANNEX-11", "Annex 11 Air Traffic Services, Attachment A", "as quoted", "two worked turn radii"),
    Source(
        "CONSTANT-CL", "Stall speed at constant maximum lift coefficient", "textbook", "strictly in equivalent airspeed"
    ),
    Source("VN-DIAGRAM", "Flight envelope (V-n diagram) from stall line, limit factors and speeds", "textbook"),
    Source("COMMON-PRACTICE", "Common practice of the trade, no source", "-"),
    Source("DEFINITION", "Definition or arithmetic identity", "-"),
    # airworthiness codes
    Source(
        "14CFR23-OLD", "14 CFR part 23 before amendment 23-64", "Amdt 23-48 text for 23.337", "public copy of the eCFR"
    ),
    Source("14CFR25", "14 CFR part 25", "25.341 as of Amdt 25-141", "paragraphs 303, 333-345, 349 looked up"),
    Source("14CFR27", "14 CFR part 27", "27.337", "looked up"),
    Source(
        "CS-22",
        "EASA/UK CS-22 Sailplanes; JAR-22 pages",
        "various",
        "U at VA and flaps, airbrakes seen; rest from memory",
    ),
    Source("CAM-522", "Canadian Airworthiness Manual chapter 522 (gliders)", "as read", "looked up"),
    Source("CS-23", "EASA CS-23", "figures of a public question bank", "text not read; figures equal 14CFR23-OLD"),
    Source("CS-25", "EASA CS-25", "as read", "25.345 looked up"),
    Source("CS-VLA", "EASA CS-VLA Very Light Aeroplanes", "as recalled", "scope looked up, factors from memory"),
    Source("ASTM-F2245", "ASTM F2245 Light Sport Airplane", "as recalled", "factors from memory"),
    # gusts
    Source(
        "NACA-1206",
        "A Revised Gust-Load Formula (NACA Report 1206, TN 2964)",
        "1954",
        "abstract read; formula as in 23.341",
    ),
    Source(
        "TWO-SECOND-RULE",
        "Gust/manoeuvre separation in operational-loads studies",
        "J. Aircraft 56(5), 2019, abstract",
        "boundary at exactly 2.0 s not confirmed",
    ),
    Source(
        "PEAKS-BETWEEN-MEANS",
        "Peaks-between-means counting in operational-loads reports",
        "various",
        "dead zone of 0.05 g from memory",
    ),
    # mass and balance
    Source(
        "FAA-WB", "Aircraft Weight and Balance Handbook (FAA-H-8083-1)", "as recalled", "method; formulas from memory"
    ),
    # counting and fatigue
    Source(
        "ASTM-E1049",
        "ASTM E1049-85 Cycle Counting in Fatigue Analysis",
        "2017",
        "examples as reproduced by open libraries",
    ),
    Source("PALMGREN-MINER", "Palmgren-Miner linear damage sum", "1945", "textbook"),
    # measurement
    Source(
        "JCGM-100", "JCGM 100 Guide to the expression of uncertainty in measurement (GUM)", "2008", "rules from memory"
    ),
    Source(
        "JCGM-106",
        "JCGM 106 The role of measurement uncertainty in conformity assessment",
        "2012",
        "identified, numbered examples not read",
    ),
    Source("SAMPLED-SINE", "Worst and mean reading of a sampled sinusoid", "identity"),
    Source("QUANTISATION", "Uniform quantisation of a range in 2^bits steps", "textbook"),
    Source("14CFR121-M", "14 CFR 121 Appendix M (flight recorder specification)", "as read", "looked up"),
    Source("14CFR125-D", "14 CFR 125 Appendix D", "as read", "same figures as 121 Appendix B and 135 Appendix D"),
    Source("14CFR135-B", "14 CFR 135 Appendix B", "as read", "looked up"),
    Source("14CFR135-F", "14 CFR 135 Appendix F", "as read", "looked up"),
    Source(
        "ICAO-ANNEX-6-2001",
        "Annex 6 part I, Attachment D Table D-1",
        "1 November 2001",
        "looked up; newer editions not read",
    ),
)

SOURCES: dict[str, Source] = {row.key: row for row in _ROWS}
