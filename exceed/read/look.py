"""What a first look at a log shows: its columns, what each is taken for and why, its clock, its facts."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from exceed.read.container import Source
from exceed.read.stamps import ClockPlan
from exceed.read.table import Layout


@dataclass(frozen=True, slots=True)
class Column:
    """One column. `unit` is a row of the unit table, None while it is open; `problem` says why it is not used."""

    index: int
    name: str
    unit_text: str = ""
    source: str = ""
    form: str = "number"
    sample: tuple[str, ...] = ()
    quantity: str | None = None
    alternatives: tuple[str, ...] = ()
    unit: str | None = None
    units: tuple[str, ...] = ()
    score: float = 0.0
    reason: str = ""
    found_by: str = ""
    problem: str = ""
    question: str = ""
    positive: str | None = None
    datum: str | None = None
    accuracy: float | None = None
    declared: bool = False
    ignored: bool = False
    group: tuple[int, ...] = ()  # sub-frame columns in order of time, this one first
    part: int = -1  # the first column of the sub-frame group that it belongs to
    field_type: str = ""  # of Parquet

    def with_(self, **changes: object) -> Column:
        return replace(self, **changes)  # type: ignore[arg-type]


@dataclass(frozen=True, slots=True)
class Survey:
    """A log, looked at but not read. `quantities` are those that a load can try to give."""

    source: Source
    layout: Layout | None
    columns: tuple[Column, ...]
    clock: ClockPlan
    facts: tuple[tuple[str, str], ...] = ()
    registration: str | None = None
    recorder_serial: str | None = None
    channels: object | None = None
    declared: dict[str, str] = field(default_factory=dict)
    rows: int | None = None
    notes: tuple[str, ...] = ()

    @property
    def path(self) -> str:
        return self.source.shown

    @property
    def quantities(self) -> tuple[str, ...]:
        """Quantities that a column may give, sorted."""
        return tuple(sorted({c.quantity for c in self.columns if c.quantity and not c.problem}))

    def column(self, name: str) -> Column | None:
        """The column of a name, compared without case and outer blanks."""
        wanted = name.strip().lower()
        exact = [c for c in self.columns if c.name.strip() == name.strip()]
        loose = exact or [c for c in self.columns if c.name.strip().lower() == wanted]
        return loose[0] if loose else None
