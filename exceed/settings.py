"""What a user asks of one run, as texts; `prepare` reads and checks them."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Settings:
    """One run's wishes. Paths are as given; `rules` empty means the fleet's, else the set `airframe`."""

    paths: tuple[str, ...]
    fleet: str | None = None
    aircraft: str | None = None
    rules: tuple[str, ...] = ()
    channels: str | None = None
    loading: str | None = None
    registration: str | None = None
    mass: str | None = None
    jobs: int | None = None
    dask: str | None = None
    plots: bool = False
    debug: bool = False

    def options(self) -> tuple[tuple[str, str], ...]:
        """The options that bear on the judgement, name and value, for the evidence."""
        rows = (
            ("--aircraft", self.aircraft),
            ("--channels", self.channels),
            ("--fleet", self.fleet),
            ("--loading", self.loading),
            ("--mass", self.mass),
            ("--registration", self.registration),
        )
        return tuple((name, value) for name, value in rows if value is not None)
