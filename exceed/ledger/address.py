"""Where a ledger lies: a URL as text, checked, and shown without its password."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from sqlalchemy.engine import URL, make_url
from sqlalchemy.exc import ArgumentError

from exceed.errors import UsageError

FILE_NAME = "exceed-ledger.sqlite"
SERVER = "postgresql+psycopg"
_EXPECTED = f"default, sqlite:///FILE or {SERVER}://USER@HOST/DATABASE"


@dataclass(frozen=True, slots=True)
class Address:
    """A ledger's place. `shown` is the only form that may be printed; `file` is None for a server."""

    url: URL
    shown: str
    file: Path | None
    default: bool = False


def data_folder(environment: Mapping[str, str] | None = None) -> Path:
    """The user's data folder (XDG Base Directory Specification: an XDG_DATA_HOME that is not absolute is ignored)."""
    known = os.environ if environment is None else environment
    named = known.get("XDG_DATA_HOME", "")
    base = Path(named) if named and os.path.isabs(named) else Path.home() / ".local" / "share"
    return base / "exceed"


def address(text: str) -> Address:
    """`default` or a URL as the place of a ledger. Raises UsageError, which never repeats a password."""
    if text == "default":
        file = data_folder() / FILE_NAME
        return Address(URL.create("sqlite", database=str(file)), str(file), file, default=True)
    if "://" not in text:
        raise UsageError.one("--ledger", f"'{hidden(text)}' is no URL", _EXPECTED, f"write 'sqlite:///{hidden(text)}'")
    try:
        url = make_url(text)
        port_fits = url.port is None or 0 < url.port < 65536
    except (ArgumentError, ValueError) as error:
        raise UsageError.one("--ledger", f"'{hidden(text)}' is no URL", _EXPECTED, "correct the URL") from error
    if url.drivername == "sqlite":
        return _file(url)
    if url.drivername != SERVER:
        near = "postgres" in url.drivername
        do = f"write '{SERVER}://...'" if near else "use SQLite or PostgreSQL"
        raise UsageError.one("--ledger", f"'{url.drivername}' cannot hold a ledger", _EXPECTED, do)
    if not port_fits:
        raise UsageError.one("--ledger", f"port {url.port} cannot be", "1 to 65535", "correct the URL")
    return Address(url, _shown(url), None)


def _file(url: URL) -> Address:
    if url.host or url.username or url.password or url.port:
        raise UsageError.one("--ledger", "a file has no host", "sqlite:///FILE, sqlite:////ROOTED/FILE", "add a slash")
    if url.query:
        raise UsageError.one("--ledger", "a file takes no options", "sqlite:///FILE", "leave '?' and what follows out")
    name = url.database or ""
    if name in ("", ":memory:") or name.startswith("file:"):
        raise UsageError.one("--ledger", "there is no file name", "sqlite:///FILE", "name a file that stays")
    file = Path(name)
    return Address(URL.create("sqlite", database=name), f"sqlite:///{name}", file)


def _shown(url: URL) -> str:
    """The URL with nothing secret: no password, and of the options only where the server listens."""
    query = {key: value for key, value in url.query.items() if key in ("host", "port", "dbname", "sslmode")}
    return url.set(password=None, query=query).render_as_string(hide_password=True)


def hidden(text: str) -> str:
    """A text that is no good URL, without what might be a password in it."""
    text = re.sub(r"//.*@", "//***@", text, flags=re.DOTALL)
    return re.sub(r"(?i)(pass\w*|secret|token)=[^&\s]*", r"\1=***", text)
