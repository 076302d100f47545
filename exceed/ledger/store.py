"""Open a ledger, read it, write it whole or not at all, copy it; every failure becomes one clear message.

One writer at a time: SQLite's own write lock, taken at the start (BEGIN IMMEDIATE), an advisory lock on a server.
What was committed survives a killed program (WAL with full synchronisation).
"""

from __future__ import annotations

import contextlib
import os
import random
import sqlite3
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, TypeVar

from sqlalchemy import Connection, Engine, create_engine, event, text
from sqlalchemy.exc import NoSuchModuleError, SQLAlchemyError
from sqlalchemy.pool import NullPool

from exceed.errors import OutputError, Problem, UsageError
from exceed.ledger.address import Address, address
from exceed.ledger.failures import busy, damaged, failure, plain
from exceed.ledger.schema import APPLICATION_ID, COLUMNS, DIALECTS, MIGRATIONS, SERVER_SCHEMA

Row = dict[str, Any]
Result = TypeVar("Result")
# the first with STRICT tables
_OLDEST = (3, 37, 0)
_HEADER = b"SQLite format 3\x00"
BUSY_S = 20.0
_TRIES = 6
# any fixed number will do: it names the lock that writers of a ledger take in turn
_LOCK = 4151950217
# a larger file is not read through each time it is opened
_CHECKED_TO = 64 << 20


def utc_now() -> str:
    """Now, as UTC text to the second."""
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


def storable(value: Any) -> Any:
    """A value as every database takes it: text without zero characters and lone surrogates."""
    if not isinstance(value, str):
        return int(value) if isinstance(value, bool) else value
    return value.replace("\x00", "\\x00").encode("utf-8", "backslashreplace").decode("utf-8")


class Table:
    """One connection inside a transaction: rows in, rows out, values only as parameters."""

    def __init__(self, connection: Connection) -> None:
        self.connection = connection

    def rows(self, sql: str, **values: Any) -> list[Row]:
        """All rows of a query, as dicts."""
        found = self.connection.execute(text(sql), {key: storable(value) for key, value in values.items()})
        return [dict(row) for row in found.mappings()]

    def one(self, sql: str, **values: Any) -> Row | None:
        """The first row, or None."""
        found = self.rows(sql, **values)
        return found[0] if found else None

    def add(self, table: str, **values: Any) -> int:
        """A new row; its number. Names come from the code, values go in as parameters."""
        names = list(values)
        if not set(names) <= set(COLUMNS[table]):
            raise KeyError(f"{table} has no such columns: {names}")
        sql = (
            f"INSERT INTO {table} ({', '.join(names)}) VALUES ({', '.join(':' + name for name in names)}) RETURNING id"
        )
        done = self.connection.execute(text(sql), {key: storable(value) for key, value in values.items()})
        return int(done.scalar_one())

    def add_many(self, table: str, rows: Sequence[Row]) -> None:
        """New rows that all have the same columns."""
        if not rows:
            return
        names = list(rows[0])
        if not set(names) <= set(COLUMNS[table]):
            raise KeyError(f"{table} has no such columns: {names}")
        sql = f"INSERT INTO {table} ({', '.join(names)}) VALUES ({', '.join(':' + name for name in names)})"
        self.connection.execute(text(sql), [{key: storable(value) for key, value in row.items()} for row in rows])


class Ledger:
    """A ledger that was opened. Use `reading` and `writing`; `close` at the end, or a `with`."""

    def __init__(self, where: Address, engine: Engine) -> None:
        self.where = where
        self._engine = engine

    def __enter__(self) -> Ledger:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        self._engine.dispose()

    def reading(self, work: Callable[[Table], Result]) -> Result:
        """`work` on one consistent state of the ledger."""
        return self._run(work, write=False)

    def writing(self, work: Callable[[Table], Result]) -> Result:
        """`work`, then everything it wrote is there for good; after an error nothing of it is. May run `work` again."""
        return self._run(work, write=True)

    def _run(self, work: Callable[[Table], Result], *, write: bool) -> Result:
        for turn in range(_TRIES):
            try:
                with self._engine.connect() as connection:
                    connection = connection.execution_options(ledger_write=write)
                    with connection.begin():
                        return work(Table(connection))
            except SQLAlchemyError as error:
                if turn + 1 < _TRIES and busy(error):
                    # not all at once again
                    time.sleep(random.uniform(0.05, 0.2) * 2**turn)
                    continue
                raise failure(error, self.where, write=write) from error
        raise AssertionError("unreachable")

    def forget(self) -> bool:
        """Let no old page keep what was blanked: empty SQLite's write-ahead log. False where a reader forbids it."""
        if self.where.file is None:
            return True
        with contextlib.closing(sqlite3.connect(self.where.file, timeout=BUSY_S)) as raw:
            return bool(raw.execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchone()[0] == 0)

    def backup(self, out: Path) -> None:
        """A copy of an SQLite ledger in one consistent state, also while others write. Raises ExceedError."""
        if self.where.file is None:
            raise UsageError.one(
                self.where.shown, "a server's ledger is not copied from here", "an SQLite ledger",
                f"use the server's own tool: pg_dump --schema={SERVER_SCHEMA}",
            )  # fmt: skip
        if out.exists():
            raise OutputError.one(str(out), "is there already", "a new file", "choose another name")
        part = out.with_name(f".{out.name}.part")
        try:
            _private(part)
            with (
                contextlib.closing(sqlite3.connect(self.where.file, timeout=BUSY_S)) as source,
                contextlib.closing(sqlite3.connect(part)) as target,
            ):
                source.backup(target)
                # a copy is one file, and read-only places must be able to show it
                target.execute("PRAGMA journal_mode = DELETE")
            os.replace(part, out)
        except (OSError, sqlite3.Error) as error:
            raise OutputError.one(str(out), f"the copy failed: {plain(error)}", "", "choose another place") from error
        finally:
            part.unlink(missing_ok=True)


def open_ledger(place: str, *, create: bool = False) -> Ledger:
    """Open a ledger, bring its tables up to date; `create` makes one where none is. Raises ExceedError.

    place : `default` or a URL.
    """
    where = address(place)
    if where.file is not None:
        _look(where, where.file, create)
    try:
        engine = create_engine(
            where.url,
            poolclass=NullPool,
            hide_parameters=True,
            connect_args={"timeout": BUSY_S} if where.file is not None else {"connect_timeout": 10},
        )
    except (NoSuchModuleError, ImportError) as error:
        raise UsageError.one(
            where.shown,
            "psycopg is not installed",
            "the extra 'postgresql'",
            "python -m pip install 'exceed[postgresql]'",
        ) from error
    _prepare(engine, server=where.file is None)
    ledger = Ledger(where, engine)
    try:
        _upgrade(ledger, create)
    except BaseException:
        ledger.close()
        raise
    return ledger


def _look(where: Address, file: Path, create: bool) -> None:
    """Is this file a ledger, or may it become one? Nothing that is something else is touched."""
    if sqlite3.sqlite_version_info < _OLDEST:
        oldest = ".".join(map(str, _OLDEST))
        raise UsageError.one("SQLite", f"version {sqlite3.sqlite_version} is too old", f"{oldest} or newer",
                             "use a newer Python, or a PostgreSQL ledger")  # fmt: skip
    try:
        if file.is_dir():
            raise UsageError.one(where.shown, "is a folder", "a file", "add a file name")
        if not file.exists() or file.stat().st_size == 0:
            if not create:
                raise _no_ledger(where)
            if not file.parent.exists():
                if not where.default:
                    raise FileNotFoundError(2, "the folder does not exist")
                file.parent.mkdir(parents=True, mode=0o700)
            _private(file)
            return
        with file.open("rb") as stream:
            head = stream.read(100)
    except OSError as error:
        raise UsageError.one(where.shown, f"cannot be opened: {plain(error)}", "a file you may write", "check the path"
                             ) from error  # fmt: skip
    if not head.startswith(_HEADER):
        raise UsageError.one(
            where.shown, "is no SQLite file, or a damaged one", "a ledger", "check the path, or take a backup"
        )
    if int.from_bytes(head[68:72], "big") not in (0, APPLICATION_ID):
        raise UsageError.one(where.shown, "is an SQLite file of another program", "a ledger", "choose another file")


def _no_ledger(where: Address) -> UsageError:
    place = "default" if where.default else "URL"
    do = f"begin one: exceed scan PATH --ledger {place}"
    return UsageError(Problem(where.shown, "there is no ledger here", "a ledger that was begun", do))


def _private(file: Path) -> None:
    """A new empty file that only its owner may read and write; the files beside it inherit that."""
    with contextlib.suppress(FileExistsError):
        os.close(os.open(file, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o600))


def _prepare(engine: Engine, *, server: bool) -> None:
    """How every connection behaves."""

    @event.listens_for(engine, "connect")
    def _connect(raw: Any, _record: Any) -> None:
        if server:
            return
        raw.isolation_level = None  # we say BEGIN ourselves: the driver would do so only before the first write
        cursor = raw.cursor()
        cursor.execute("PRAGMA foreign_keys = ON")
        cursor.execute("PRAGMA synchronous = FULL")
        cursor.execute("PRAGMA secure_delete = ON")  # a blanked name is overwritten, not only unlinked
        cursor.execute("PRAGMA trusted_schema = OFF")
        cursor.close()

    @event.listens_for(engine, "begin")
    def _begin(connection: Connection) -> None:
        write = bool(connection.get_execution_options().get("ledger_write"))
        if not server:
            connection.exec_driver_sql("BEGIN IMMEDIATE" if write else "BEGIN")
            return
        connection.exec_driver_sql(f"SET LOCAL search_path TO {SERVER_SCHEMA}, pg_catalog")
        if write:
            connection.exec_driver_sql(f"SELECT pg_advisory_xact_lock({_LOCK})")
        else:
            connection.exec_driver_sql("SET TRANSACTION ISOLATION LEVEL REPEATABLE READ, READ ONLY")


def _version(table: Table, *, server: bool) -> int | None:
    """The version of the tables; None where there are none of ours; -1 where there are others."""
    if server:
        there = table.one("SELECT to_regclass(:name) AS found", name=f"{SERVER_SCHEMA}.schema_version")
        if there is None or there["found"] is None:
            return None
    else:
        names = {row["name"] for row in table.rows("SELECT name FROM sqlite_master WHERE type = 'table'")}
        if "schema_version" not in names:
            return -1 if names else None
        if table.rows("PRAGMA application_id")[0]["application_id"] != APPLICATION_ID:
            return -1
    found = table.one("SELECT max(version) AS version FROM schema_version")
    return int(found["version"] or 0) if found is not None else None


def _upgrade(ledger: Ledger, create: bool) -> None:
    server = ledger.where.file is None
    if not server:
        _sound(ledger)

    def check(table: Table) -> int | None:
        return _version(table, server=server)

    def step(table: Table) -> None:
        version = _fits(ledger.where, _version(table, server=server))
        dialect = DIALECTS["postgresql" if server else "sqlite"]
        if server and version == 0:
            table.connection.exec_driver_sql(f"CREATE SCHEMA IF NOT EXISTS {SERVER_SCHEMA}")
        for number, migration in enumerate(MIGRATIONS[version:], version + 1):
            for sql in migration(dialect):
                table.connection.exec_driver_sql(sql)
            table.add("schema_version", version=number, applied_at=utc_now())

    found = _fits(ledger.where, ledger.reading(check))
    if found == 0 and not create:
        raise _no_ledger(ledger.where)
    if found < len(MIGRATIONS):
        if not server:
            _into_wal(ledger)
        ledger.writing(step)


def _fits(where: Address, version: int | None) -> int:
    if version == -1:
        raise UsageError.one(where.shown, "is an SQLite file of another program", "a ledger", "choose another file")
    if version is not None and version > len(MIGRATIONS):
        raise UsageError.one(
            where.shown, f"was written by a newer exceed (version {version} of the tables)",
            f"version {len(MIGRATIONS)} or older", "install the newer exceed; nothing was changed",
        )  # fmt: skip
    return version or 0


def _sound(ledger: Ledger) -> None:
    """Refuse a damaged file before anything is written into it."""
    file = ledger.where.file
    if file is None or file.stat().st_size > _CHECKED_TO:
        return
    found = ledger.reading(lambda table: table.rows("PRAGMA quick_check(1)"))
    if found and found[0].get("quick_check") != "ok":
        raise damaged(ledger.where)


def _into_wal(ledger: Ledger) -> None:
    """The write-ahead log is a property of the file: set once, outside any transaction."""
    assert ledger.where.file is not None
    for turn in range(_TRIES):
        try:
            with contextlib.closing(sqlite3.connect(ledger.where.file, timeout=BUSY_S)) as raw:
                raw.execute("PRAGMA journal_mode = WAL")
            return
        except sqlite3.OperationalError as error:
            if turn + 1 == _TRIES:
                raise UsageError.one(
                    ledger.where.shown, f"cannot be begun: {plain(error)}", "a file you may write", "try again"
                ) from error
            time.sleep(0.1 * 2**turn)


def chunks(items: Sequence[Any], size: int = 500) -> Iterator[Sequence[Any]]:
    """Pieces of a list that fit into one query."""
    for first in range(0, len(items), size):
        yield items[first : first + size]


def named(items: Sequence[Any], stem: str = "v") -> tuple[str, Mapping[str, Any]]:
    """Placeholders for an IN list and their values."""
    values = {f"{stem}{turn}": item for turn, item in enumerate(items)}
    return ", ".join(f":{name}" for name in values), values
