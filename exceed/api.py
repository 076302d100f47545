"""The Python API: `exceed.scan` and `exceed.trace`. Typed, no printing; user's mistakes raise `exceed.ExceedError`."""

from __future__ import annotations

import os
from collections.abc import Iterable
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

from exceed import pipeline
from exceed.report.summary import summarise
from exceed.settings import Settings

if TYPE_CHECKING:
    import pandas as pd

PathLike = str | os.PathLike[str]


@dataclass(frozen=True)
class Result:
    """What a scan gave. `summary` is the dict of `exceed/summary/1`; the frames have its names."""

    summary: dict[str, Any] = field(repr=False)

    @cached_property
    def events(self) -> pd.DataFrame:
        """One row an event."""
        from exceed.report.frames import events

        return events(self.summary)

    @cached_property
    def undecided(self) -> pd.DataFrame:
        """One row a stretch that was judged inside but may truly have been outside."""
        from exceed.report.frames import events

        return events(self.summary, undecided=True)

    @cached_property
    def assessment(self) -> pd.DataFrame:
        """One row a recording, rule and flight: seconds assessed, unassessed, not applicable."""
        from exceed.report.frames import assessment

        return assessment(self.summary)

    def __repr__(self) -> str:
        totals = self.summary["totals"]
        return f"<exceed.Result: {totals['recordings']} recordings, {totals['flights']} flights, {totals['events']}>"


def _texts(value: PathLike | Iterable[PathLike] | None) -> tuple[str, ...]:
    if value is None:
        return ()
    if isinstance(value, str | os.PathLike):
        return (os.fspath(value),)
    return tuple(os.fspath(one) for one in value)


def _text(value: PathLike | None) -> str | None:
    return None if value is None else os.fspath(value)


def scan(
    paths: PathLike | Iterable[PathLike],
    *,
    aircraft: PathLike | None = None,
    rules: PathLike | Iterable[PathLike] | None = None,
    fleet: PathLike | None = None,
    channels: PathLike | None = None,
    loading: PathLike | None = None,
    registration: str | None = None,
    mass: str | None = None,
    jobs: int | None = 1,
    dask: str | None = None,
) -> Result:
    """Read logs, judge them, and give events and assessment.

    The arguments mean what the options of `exceed scan` mean; `jobs` is 1 here unless asked for. Raises ExceedError for
    a wrong document or wish; a log that could not be done is in `result.summary["recordings"]` with its problem.
    """
    settings = Settings(
        paths=_texts(paths),
        fleet=_text(fleet),
        aircraft=_text(aircraft),
        rules=_texts(rules),
        channels=_text(channels),
        loading=_text(loading),
        registration=registration,
        mass=mass,
        # the cluster has its own processes
        jobs=jobs if dask is None else None,
        dask=dask,
    )
    found = pipeline.scan(settings)
    if found.interrupted:
        raise KeyboardInterrupt
    return Result(summarise(found))


def trace(
    path: PathLike,
    *,
    aircraft: PathLike | None = None,
    fleet: PathLike | None = None,
    channels: PathLike | None = None,
    loading: PathLike | None = None,
    registration: str | None = None,
    mass: str | None = None,
) -> pd.DataFrame:
    """Every recorded and derived quantity of one log, sample by sample, in trade units. Raises ExceedError."""
    from exceed.tables import frame

    settings = Settings(
        paths=_texts(path),
        fleet=_text(fleet),
        aircraft=_text(aircraft),
        channels=_text(channels),
        loading=_text(loading),
        registration=registration,
        mass=mass,
    )
    found, outcome = pipeline.trace_of(settings)
    made: pd.DataFrame = frame(found, outcome)
    return made
