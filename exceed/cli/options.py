"""Options that several commands share: same name, same meaning."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from exceed.settings import Settings

Fleet = Annotated[
    Path | None,
    typer.Option(
        "--fleet", metavar="FILE", help="Fleet file; default: the nearest fleet.yaml, in the log's folder or above it."
    ),
]
Aircraft = Annotated[
    str | None,
    typer.Option(
        "--aircraft",
        metavar="FILE|CATEGORY",
        help=(
            "Aircraft file, or a published category whose limits are assumed: aerobatic, utility, normal, ... "
            "(a wrong word lists them all)."
        ),
    ),
]
Channels = Annotated[
    Path | None,
    typer.Option("--channels", metavar="FILE", help="What the log's columns mean; 'describe --write' starts one."),
]
Loading = Annotated[
    Path | None, typer.Option("--loading", metavar="FILE", help="Loading sheet: what was on board at take-off.")
]
Registration = Annotated[
    str | None, typer.Option("--registration", metavar="REG", help="The aeroplane, where the log does not say.")
]
Mass = Annotated[
    str | None,
    typer.Option(
        "--mass", metavar='"900 kg"', help="Take-off mass, with its unit; of a category the maximum take-off mass."
    ),
]


class Severity(StrEnum):
    advisory = "advisory"
    caution = "caution"
    warning = "warning"


class Certainty(StrEnum):
    possible = "possible"
    likely = "likely"
    established = "established"


class Units(StrEnum):
    trade = "trade"
    metric = "metric"


class Kind(StrEnum):
    aircraft = "aircraft"
    rules = "rules"
    channels = "channels"
    loading = "loading"
    fleet = "fleet"


class SchemaKind(StrEnum):
    aircraft = "aircraft"
    rules = "rules"
    channels = "channels"
    loading = "loading"
    fleet = "fleet"
    summary = "summary"


def settings(
    paths: list[str],
    *,
    fleet: Path | None = None,
    aircraft: str | None = None,
    rules: list[str] | None = None,
    channels: Path | None = None,
    loading: Path | None = None,
    registration: str | None = None,
    mass: str | None = None,
    jobs: int | None = None,
    dask: str | None = None,
    plots: bool = False,
    debug: bool = False,
) -> Settings:
    """Options as the pipeline takes them, texts still unread."""
    from exceed.settings import Settings

    return Settings(
        paths=tuple(paths),
        fleet=str(fleet) if fleet else None,
        aircraft=aircraft,
        rules=tuple(rules or ()),
        channels=str(channels) if channels else None,
        loading=str(loading) if loading else None,
        registration=registration,
        mass=mass,
        jobs=jobs,
        dask=dask,
        plots=plots,
        debug=debug,
    )
