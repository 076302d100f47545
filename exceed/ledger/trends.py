"""How often, per 1,000 flights and per 1,000 hours, month by month, with exact bounds."""

from __future__ import annotations

from collections import defaultdict
from datetime import UTC, datetime

from exceed.core.findings import CERTAINTIES, SEVERITIES
from exceed.ledger.history import DECIDED_AWAY, Decisions, Filters, Owners, at_least, event_rows
from exceed.ledger.store import Row, Table
from exceed.ledger.totals import Airframe, Flown, distinct, flown

CONFIDENCE = 0.95
# under the table and on the page
SOURCE = (
    "95 % bounds: exact, of the Poisson distribution (F. Garwood, Fiducial limits for the Poisson distribution, "
    "Biometrika 28, 1936, 437-442; from memory), by the chi-squared distribution"
)


def poisson_bounds(count: int, confidence: float = CONFIDENCE) -> tuple[float, float]:
    """Exact central confidence bounds of a Poisson mean when `count` was seen.

    Parameters: count, not negative; confidence between 0 and 1.    Returns: (low, high), in counts; low is 0 for 0.
    Source: Garwood 1936 (from memory): chi2(a/2; 2k)/2 and chi2(1 - a/2; 2k + 2)/2.
    """
    if count < 0 or not 0.0 < confidence < 1.0:
        raise ValueError("a count is not negative, a confidence lies between 0 and 1")
    from scipy.stats import chi2

    tail = (1.0 - confidence) / 2.0
    low = 0.0 if count == 0 else float(chi2.ppf(tail, 2 * count)) / 2.0
    return low, float(chi2.ppf(1.0 - tail, 2 * count + 2)) / 2.0


def month_of(moment: float) -> str:
    return datetime.fromtimestamp(moment, UTC).strftime("%Y-%m")


def _months(first: str, last: str) -> list[str]:
    """Every month from the first to the last, those without a flight too."""
    year, month = int(first[:4]), int(first[5:])
    found = []
    while f"{year:04d}-{month:02d}" <= last:
        found.append(f"{year:04d}-{month:02d}")
        year, month = (year + 1, 1) if month == 12 else (year, month + 1)
    return found


def trends(table: Table, filters: Filters) -> list[Row]:
    """One row a month, then one of the undated, then all: events, flights, hours, rates with bounds.

    An event counts if a limit was left (at least `possible`) and nobody decided that it was no exceedance; `undecided`
    stretches do not. Flights and hours are those of the same aeroplanes; a flight counts in the month it began in.
    """
    owners, decisions = Owners.read(table), Decisions.read(table)
    events: dict[str | None, int] = defaultdict(int)
    away: dict[str | None, int] = defaultdict(int)
    for row in event_rows(table):
        _, key = owners.now(row["flight_id"], (row["registration"], row["reg_key"]))
        if filters.key not in (None, key) or filters.rule not in (None, row["rule"]):
            continue
        if row["kind"] != "event" or not filters.in_time(row["start_at"], row["end_at"]):
            continue
        if not at_least(row["severity"], filters.severity, SEVERITIES):
            continue
        if not at_least(row["certainty"], filters.certainty or "possible", CERTAINTIES):
            continue
        month = None if row["start_at"] is None else month_of(row["start_at"])
        decision = decisions.of(row, owners)
        gone = decision is not None and decision["as"] in DECIDED_AWAY and not decision["worse_since"]
        (away if gone else events)[month] += 1
    flights: dict[str | None, list[Flown]] = defaultdict(list)
    for one in flown(table, owners):
        if filters.key in (None, one.reg_key) and filters.in_time(one.start, one.end):
            flights[None if one.start is None else month_of(one.start)].append(one)
    dated = sorted(month for month in {*events, *away, *flights} if month is not None)
    months: list[str | None] = list(_months(dated[0], dated[-1])) if dated else []
    if None in flights or None in events or None in away:
        months.append(None)
    found = [_row(month, events[month], away[month], flights[month]) for month in months]
    everything = [one for rows in flights.values() for one in rows]
    found.append({**_row(None, sum(events.values()), sum(away.values()), everything), "period": "all"})
    return found


def _row(month: str | None, events: int, away: int, flights: list[Flown]) -> Row:
    groups: dict[str, Airframe] = {}
    for one in flights:
        groups.setdefault(one.reg_key, Airframe(one.registration, one.reg_key)).flights.append(one)
    hours = sum(group.hours_flown() + sum(one.length for one in group.undated()) / 3600.0 for group in groups.values())
    number = sum(one.numbered for one in distinct(flights))
    return {
        "period": month or "undated",
        "events": events,
        "decided_away": away,
        "flights": number,
        "hours": round(hours, 4),
        "per_1000_flights": _rate(events, number),
        "per_1000_hours": _rate(events, hours),
        "confidence": CONFIDENCE,
    }


def _rate(events: int, exposure: float) -> Row | None:
    """Events per 1,000 of something, with bounds; None where there was none of it."""
    if exposure <= 0.0:
        return None
    low, high = poisson_bounds(events)
    scale = 1000.0 / exposure
    return {"value": round(events * scale, 3), "low": round(low * scale, 3), "high": round(high * scale, 3)}
