"""A user's wishes -> everything read and checked before the first log is opened.

All documents of a run are loaded here, once; a wrong one ends the run before anything is scanned.
"""

from __future__ import annotations

import os
from collections.abc import Iterable
from dataclasses import dataclass, field
from pathlib import Path

from exceed.core.outcome import JudgedWith, RuleSetRow
from exceed.documents.aircraft import CATEGORIES, Aircraft, category_aircraft, load_aircraft, same_registration
from exceed.documents.channels import Channels, load_channels
from exceed.documents.fleet import Fleet, FleetAircraft, load_fleet
from exceed.documents.loading import LoadingSheet, load_loading
from exceed.documents.rulebook import BUILT_IN, RuleBook, layer, load_rules
from exceed.documents.values import ValueFault, parse
from exceed.errors import DocumentError, ExceedError, Problem, UsageError
from exceed.settings import Settings

FLEET_FILE = "fleet.yaml"


@dataclass(frozen=True, slots=True)
class Member:
    """One aeroplane as this run judges it: its documents."""

    registration: str | None
    aircraft: Aircraft | None
    book: RuleBook
    channels: Channels | None = None
    loading: tuple[LoadingSheet, ...] = ()


@dataclass(frozen=True, slots=True)
class LoadedFleet:
    """A fleet file and the documents of its aeroplanes, by registration as the file writes it."""

    fleet: Fleet
    members: dict[str, Member]


@dataclass(frozen=True, slots=True)
class Run:
    """What every log of a run is judged with. Picklable: it travels to other processes as it is.

    default : for logs that no fleet row claims. fleets : fleet file -> its documents. by_folder : folder of logs -> its
    nearest fleet file.
    """

    settings: Settings
    default: Member
    mass: float | None = None
    fleets: dict[str, LoadedFleet] = field(default_factory=dict)
    by_folder: dict[str, str] = field(default_factory=dict)
    judged_with: tuple[JudgedWith, ...] = ()
    rule_sets: tuple[RuleSetRow, ...] = ()
    notes: tuple[str, ...] = ()

    def fleet_of(self, location: str) -> LoadedFleet | None:
        """The fleet that a log belongs to by where it lies."""
        path = self.by_folder.get(str(Path(location).parent))
        return self.fleets[path] if path is not None else None


def prepare(settings: Settings, folders: Iterable[tuple[str, str]]) -> Run:
    """Load all documents that the settings and the logs' places call for.

    folders : (folder of a log, the folder given as PATH or '') for each log. Raises DocumentError with every problem of
    every document.
    """
    problems: list[Problem] = []
    folders = list(folders)
    loader = _Loader(problems, _root(settings, folders))
    mass = _mass(settings, problems)
    own_rules = [loader.rules(name) for name in settings.rules]
    book = loader.book(own_rules) if settings.rules else loader.book([loader.rules("airframe")])
    aircraft = _aircraft(settings, mass, loader)
    channels = loader.channels(settings.channels) if settings.channels else None
    sheets = tuple(filter(None, [loader.loading(settings.loading)])) if settings.loading else ()
    by_folder, fleets = _fleets(settings, folders, loader)
    loaded = {
        path: _loaded_fleet(fleet, settings, loader, book, aircraft, channels, sheets) for path, fleet in fleets.items()
    }
    if problems:
        raise DocumentError(*dict.fromkeys(problems))
    return Run(
        settings=settings,
        default=Member(settings.registration, aircraft, book, channels, sheets),
        mass=mass,
        fleets=loaded,
        by_folder=by_folder,
        judged_with=(
            *loader.used(),
            *(JudgedWith("option", name=name, value=value) for name, value in settings.options()),
        ),
        rule_sets=_rule_rows(
            [book, *(member.book for one in loaded.values() for member in one.members.values())], loader.root
        ),
        notes=tuple(f"fleet file used: {_shown(path, loader.root)}" for path in fleets if not settings.fleet),
    )


class _Loader:
    """Loads each document once, gathers what is wrong and what was used."""

    def __init__(self, problems: list[Problem], root: Path) -> None:
        self.problems = problems
        self.root = root
        self._kept: dict[tuple[str, str], object] = {}
        self._used: dict[tuple[str, str], JudgedWith] = {}

    def used(self) -> tuple[JudgedWith, ...]:
        return tuple(self._used[key] for key in sorted(self._used))

    def _load(self, kind: str, origin: str, load):  # type: ignore[no-untyped-def]
        key = (kind, origin)
        if key not in self._kept:
            try:
                document = load(origin if origin in BUILT_IN else Path(origin))
            except ExceedError as error:
                self.problems.extend(error.problems)
                document = None
            self._kept[key] = document
            if document is not None:
                self._used[key] = JudgedWith(
                    kind, path=_shown(document.path or origin, self.root), sha256=document.sha256
                )
        return self._kept[key]

    def rules(self, origin: str):  # type: ignore[no-untyped-def]
        return self._load("rules", origin, lambda one: load_rules(one if isinstance(one, str) else _word_or_path(one)))

    def aircraft(self, origin: str) -> Aircraft | None:
        return self._load("aircraft", origin, load_aircraft)  # type: ignore[no-any-return]

    def channels(self, origin: str) -> Channels | None:
        return self._load("channels", origin, load_channels)  # type: ignore[no-any-return]

    def loading(self, origin: str) -> LoadingSheet | None:
        return self._load("loading", origin, load_loading)  # type: ignore[no-any-return]

    def fleet(self, origin: str) -> Fleet | None:
        return self._load("fleet", origin, load_fleet)  # type: ignore[no-any-return]

    def book(self, sets: list) -> RuleBook:  # type: ignore[type-arg]
        try:
            return layer([one for one in sets if one is not None])
        except DocumentError as error:
            self.problems.extend(error.problems)
            return RuleBook((), ())


def _word_or_path(path: Path) -> str | Path:
    """A word that is no file is told apart by the rules' loader, which suggests the nearest set."""
    return path if path.exists() or "/" in str(path) else str(path)


def _mass(settings: Settings, problems: list[Problem]) -> float | None:
    if settings.mass is None:
        return None
    try:
        value = parse(settings.mass, "mass")
    except ValueFault as error:
        problems.append(Problem("--mass", error.problem, error.expected, error.do))
        return None
    if not value > 0.0:
        problems.append(
            Problem("--mass", f"'{settings.mass}' is not above zero", "a mass in kg or lb", "write it as '900 kg'")
        )
        return None
    return float(value)


def _aircraft(settings: Settings, mass: float | None, loader: _Loader) -> Aircraft | None:
    wish = settings.aircraft
    if wish is None:
        return None
    if wish in CATEGORIES or (not Path(wish).exists() and "/" not in wish and not wish.endswith((".yaml", ".yml"))):
        try:
            return category_aircraft(wish, mass)
        except ExceedError as error:
            loader.problems.extend(error.problems)
        except ValueError as error:
            loader.problems.append(
                Problem(
                    "--aircraft",
                    f"the limits of category '{wish}' cannot be worked out: {error}",
                    "the maximum take-off mass",
                    "add --mass with the maximum take-off mass, as in --mass '1100 kg'",
                )
            )
        return None
    return loader.aircraft(wish)


def _fleets(
    settings: Settings, folders: Iterable[tuple[str, str]], loader: _Loader
) -> tuple[dict[str, str], dict[str, Fleet]]:
    """Folder -> fleet file, and the fleet files themselves."""
    by_folder: dict[str, str] = {}
    fleets: dict[str, Fleet] = {}
    for folder, given in sorted(set(folders)):
        path = settings.fleet or nearest_fleet(folder, given)
        if path is None:
            continue
        fleet = loader.fleet(path)
        if fleet is not None:
            by_folder[folder] = path
            fleets[path] = fleet
    if settings.fleet and not fleets:
        fleet = loader.fleet(settings.fleet)
    return by_folder, fleets


def nearest_fleet(folder: str, given: str) -> str | None:
    """The nearest fleet.yaml in a log's folder or above it, up to the PATH given or the working folder."""
    here = Path(folder)
    top = [Path(given).resolve()] if given else []
    working = Path.cwd()
    if here.resolve().is_relative_to(working):
        top.append(working)
    bounds = [bound for bound in top if here.resolve().is_relative_to(bound)]
    highest = min(bounds, key=lambda path: len(path.parts)) if bounds else here.resolve()
    current = here.resolve()
    while True:
        candidate = current / FLEET_FILE
        if candidate.is_file():
            return os.path.relpath(candidate) if candidate.is_relative_to(working) else str(candidate)
        if current == highest or current.parent == current:
            return None
        current = current.parent


def _loaded_fleet(
    fleet: Fleet,
    settings: Settings,
    loader: _Loader,
    book: RuleBook,
    aircraft: Aircraft | None,
    channels: Channels | None,
    sheets: tuple[LoadingSheet, ...],
) -> LoadedFleet:
    return LoadedFleet(
        fleet,
        {
            row.registration: _member(fleet, row, settings, loader, book, aircraft, channels, sheets)
            for row in fleet.aircraft
        },
    )


def _member(
    fleet: Fleet,
    row: FleetAircraft,
    settings: Settings,
    loader: _Loader,
    book: RuleBook,
    aircraft: Aircraft | None,
    channels: Channels | None,
    sheets: tuple[LoadingSheet, ...],
) -> Member:
    """An aeroplane of the fleet; what the command line names goes before what the fleet file names."""
    own_aircraft = aircraft
    if settings.aircraft is None and row.aircraft is not None:
        own_aircraft = loader.aircraft(str(fleet.resolve(row.aircraft)))
        if own_aircraft is not None and not same_registration(own_aircraft.registration, row.registration):
            loader.problems.append(
                Problem(
                    fleet.path,
                    f"{row.registration} names {row.aircraft}, which is the file of {own_aircraft.registration}",
                    f"the aircraft file of {row.registration}",
                    "correct the path here, or the registration there",
                )
            )
    own_book = book if settings.rules else loader.book([loader.rules(name) for name in fleet.rules_of(row)])
    own_channels = channels
    if settings.channels is None and row.channels is not None:
        own_channels = loader.channels(str(fleet.resolve(row.channels)))
    own_sheets = list(sheets)
    if settings.loading is None:
        for pattern in row.loading:
            found = sorted(fleet.folder.glob(pattern))
            own_sheets += [sheet for path in found if (sheet := loader.loading(str(path))) is not None]
    return Member(row.registration, own_aircraft, own_book, own_channels, tuple(own_sheets))


def _rule_rows(books: list[RuleBook], root: Path) -> tuple[RuleSetRow, ...]:
    rows: dict[str, RuleSetRow] = {}
    for book in books:
        for one in book.sets:
            rows[one.name] = RuleSetRow(
                name=_shown(one.name, root),
                title=one.title or one.name,
                rules=len(one.rules),
                titles=tuple((rule.id, rule.title or rule.id) for rule in one.rules),
                quantities=tuple((rule.id, rule.quantity) for rule in one.rules),
                overrides=tuple(sorted({row.rule for row in book.replaced if row.later == one.name})),
            )
    return tuple(rows[name] for name in sorted(rows))


def _root(settings: Settings, folders: list[tuple[str, str]]) -> Path:
    """Where shown paths start: the first folder given as PATH, else the folder of the first log, else here."""
    for path in settings.paths:
        if os.path.isdir(path):
            return Path(path).resolve()
    return Path(folders[0][0]).resolve() if folders and "://" not in folders[0][0] else Path.cwd()


def _shown(path: str, root: Path) -> str:
    """A path as outputs show it: relative to the PATH given, with forward slashes; never a place of this machine."""
    if path in BUILT_IN or "://" in path:
        return path
    return os.path.relpath(Path(path).resolve(), root).replace(os.sep, "/")


__all__ = ["LoadedFleet", "Member", "Run", "UsageError", "prepare"]
