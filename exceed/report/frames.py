"""pandas frames of a summary, with the JSON's names. pandas is imported when a frame is asked for, not before."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pandas as pd

Dict = dict[str, Any]

# the event's plain keys, in the JSON's order; nested ones follow as `peak_value`, `limit_source`, ...
EVENT_COLUMNS: tuple[str, ...] = (
    "id",
    "recording",
    "rule",
    "title",
    "quantity",
    "side",
    "severity",
    "limit_exceeded",
    "certainty",
    "probability",
    "registration",
    "flight",
    "phase",
    "start",
    "end",
    "start_s",
    "end_s",
    "duration_s",
    "peak",
    "limit",
    "levels",
    "context",
    "cut_by",
    "inspection",
    "notes",
)
PEAK_COLUMNS: tuple[str, ...] = (
    "time_s",
    "recorded",
    "recorded_unit",
    "value",
    "estimate",
    "low",
    "high",
    "unit",
    "sized",
    "saturated",
)
LIMIT_COLUMNS: tuple[str, ...] = ("value", "unit", "source", "assumed")
ASSESSMENT_COLUMNS: tuple[str, ...] = (
    "recording",
    "registration",
    "rule",
    "flight",
    "assessed_s",
    "unassessed_s",
    "not_applicable_s",
    "shortest_seen_s",
    "reasons",
)


def events(summary: Dict, *, undecided: bool = False) -> pd.DataFrame:
    """Events, one row each, in the summary's order (`undecided`: those stretches instead).

    Columns have the JSON's names; `peak`, `limit`, `levels`, `context` and `notes` hold the JSON's objects, and the
    figures of peak and limit stand beside them as `peak_value`, `limit_value` and so on. `start` and `end` are UTC
    instants, NaT where the clock is not absolute; `flight` is a nullable integer.
    """
    import pandas as pd

    key = "undecided" if undecided else "events"
    rows = []
    for recording in summary["recordings"]:
        for event in recording[key]:
            row = {name: event[name] for name in EVENT_COLUMNS if name != "recording"}
            row["recording"] = recording["path"]
            row |= {f"peak_{name}": event["peak"][name] for name in PEAK_COLUMNS}
            row |= {f"limit_{name}": event["limit"][name] for name in LIMIT_COLUMNS}
            rows.append(row)
    names = [
        *EVENT_COLUMNS,
        *(f"peak_{name}" for name in PEAK_COLUMNS),
        *(f"limit_{name}" for name in LIMIT_COLUMNS),
    ]
    frame = pd.DataFrame(rows, columns=pd.Index(names))
    frame["flight"] = frame["flight"].astype("Int64")
    for name in ("start", "end"):
        frame[name] = pd.to_datetime(frame[name], utc=True, format="ISO8601").dt.as_unit("us")
    for name in _NUMBERS:
        frame[name] = frame[name].astype("float64")
    return frame


_NUMBERS = (
    "probability",
    "start_s",
    "end_s",
    "duration_s",
    "peak_time_s",
    "peak_recorded",
    "peak_value",
    "peak_estimate",
    "peak_low",
    "peak_high",
    "limit_value",
)


def assessment(summary: Dict) -> pd.DataFrame:
    """What could and could not be assessed: one row a recording and rule, and one more a flight. Seconds as float."""
    import pandas as pd

    rows = [
        {**row, "recording": recording["path"], "registration": recording["registration"]}
        for recording in summary["recordings"]
        for row in recording["assessment"]
    ]
    frame = pd.DataFrame(rows, columns=pd.Index(ASSESSMENT_COLUMNS))
    frame["flight"] = frame["flight"].astype("Int64")
    for name in ("assessed_s", "unassessed_s", "not_applicable_s", "shortest_seen_s"):
        frame[name] = frame[name].astype("float64")
    return frame
