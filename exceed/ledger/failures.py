"""A database's errors as what a user can do something about: one line, no password, no SQL."""

from __future__ import annotations

import sqlite3

from sqlalchemy.exc import DBAPIError, SQLAlchemyError

from exceed.errors import ExceedError, OutputError, UsageError
from exceed.ledger.address import Address, hidden


def busy(error: SQLAlchemyError) -> bool:
    """Is it only that another one was first? Then it may be tried again."""
    cause = getattr(error, "orig", None)
    code = getattr(cause, "sqlite_errorcode", None)
    if code is not None:
        return code & 0xFF in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED)
    # serialization failure, deadlock (PostgreSQL, appendix A: error codes)
    return getattr(cause, "sqlstate", None) in ("40001", "40P01")


def damaged(where: Address) -> ExceedError:
    """What to tell of a file that is no sound database."""
    return UsageError.one(
        where.shown, "the file is damaged", "a sound ledger", "take the last backup; nothing was changed"
    )


def failure(error: SQLAlchemyError, where: Address, *, write: bool) -> ExceedError:
    """What to tell of a database's error: one line, no password, no SQL."""
    cause = getattr(error, "orig", None) or error
    kept = "nothing was added" if write else "nothing was changed"
    code = getattr(cause, "sqlite_errorcode", None)
    if code is not None:
        short = code & 0xFF
        if short in (sqlite3.SQLITE_CORRUPT, sqlite3.SQLITE_NOTADB):
            return damaged(where)
        if short == sqlite3.SQLITE_FULL or (write and short == sqlite3.SQLITE_IOERR):
            return OutputError.one(
                where.shown, f"the disk is full or failing: {kept}", "room for the ledger", "make room"
            )
        if short in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED):
            return OutputError.one(where.shown, f"another program keeps it locked: {kept}", "", "try again later")
        if short in (sqlite3.SQLITE_READONLY, sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_PERM):
            return OutputError.one(where.shown, f"not allowed to write here: {kept}", "a file and folder you may write",
                                   "check the rights")  # fmt: skip
    state = getattr(cause, "sqlstate", None)
    if where.file is None and isinstance(error, DBAPIError) and (error.connection_invalidated or state is None):
        return UsageError.one(where.shown, f"the server cannot be reached: {_reason(cause)}", "a server that answers",
                              f"check host, port, name and password; {kept}")  # fmt: skip
    if state == "53100":
        return OutputError.one(where.shown, f"the server's disk is full: {kept}", "room for the ledger", "make room")
    return OutputError.one(where.shown, f"{kept}: {_reason(cause)}", "", "see the message")


def _reason(cause: BaseException) -> str:
    """A driver's message in one line, without what might be a secret."""
    words = " ".join(str(cause).split())
    # psycopg lists every address it tried; the last colon parts the address from the reason
    last = words.split(" Is the server running")[0]
    return hidden(last)[:200] or type(cause).__name__


def plain(error: BaseException) -> str:
    """The system's own words for an error."""
    return getattr(error, "strerror", None) or str(error) or type(error).__name__
