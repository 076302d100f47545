"""Dates as the user writes them."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from exceed.errors import UsageError


def instant(option: str, text: str, *, last: bool = False) -> float:
    """Epoch seconds of a date (its beginning; with `last` its end) or of an ISO 8601 date and time, UTC if unsaid.

    Raises UsageError.
    """
    try:
        moment = datetime.fromisoformat(text.strip())
        if moment.tzinfo is None:
            moment = moment.replace(tzinfo=UTC)
        if last and len(text.strip()) == 10:
            moment += timedelta(days=1)
        return moment.timestamp()
    except (ValueError, OverflowError) as error:
        raise UsageError.one(
            option, f"'{text}' is no date", "a date like 2031-05-02, or 2031-05-02T09:14Z", "write the year first"
        ) from error


def utc_text(moment: float) -> str:
    """`2031-05-02T09:15:43Z` from epoch seconds."""
    return datetime.fromtimestamp(moment, UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
