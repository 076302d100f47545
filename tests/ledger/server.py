"""A private PostgreSQL server in a temporary folder, run as a user without rights; none where its programs are not."""

from __future__ import annotations

import os
import pwd
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from glob import glob
from pathlib import Path


def program(name: str) -> str | None:
    """Where Debian or anybody puts it."""
    return shutil.which(name) or next(iter(sorted(glob(f"/usr/lib/postgresql/*/bin/{name}"), reverse=True)), None)


def why_not() -> str | None:
    """The reason why no server can be started here."""
    missing = [name for name in ("initdb", "pg_ctl") if program(name) is None]
    if missing:
        return f"no PostgreSQL server here: {', '.join(missing)} not found (Debian package postgresql)"
    if os.getuid() == 0 and _unprivileged() is None:
        return "PostgreSQL does not run as root, and there is no user 'postgres' or 'nobody'"
    try:
        import psycopg  # noqa: F401
    except ImportError:
        return "psycopg is not installed"
    return None


def _unprivileged() -> str | None:
    for name in ("postgres", "nobody"):
        try:
            pwd.getpwnam(name)
            return name
        except KeyError:
            continue
    return None


@contextmanager
def server() -> Iterator[str]:
    """The URL of a running server's database, reached by a socket in its own folder; gone afterwards."""
    # the socket's path must be short, and the user must be able to reach it
    folder = Path(tempfile.mkdtemp(prefix="exceed-pg-", dir="/tmp"))
    user = _unprivileged() if os.getuid() == 0 else None
    if user is not None:
        shutil.chown(folder, user)

    def run(*command: str) -> None:
        done = subprocess.run(
            command,
            user=user,
            capture_output=True,
            text=True,
            cwd=folder,
            env={"PATH": os.environ["PATH"], "LC_ALL": "C"},
        )
        if done.returncode:
            raise RuntimeError(f"{command[0]}: {done.stdout}{done.stderr}")

    initdb, control = program("initdb"), program("pg_ctl")
    assert initdb is not None
    assert control is not None
    data = str(folder / "data")
    try:
        run(initdb, "-D", data, "-U", "exceed", "-A", "trust", "-E", "UTF8", "--no-sync")
        options = f"-c listen_addresses='' -c unix_socket_directories='{folder}' -c fsync=off -c shared_buffers=16MB"
        run(control, "-D", data, "-w", "-t", "60", "-l", str(folder / "log"), "-o", options, "start")
        try:
            yield f"postgresql+psycopg://exceed@/postgres?host={folder}"
        finally:
            run(control, "-D", data, "-m", "immediate", "-w", "stop")
    finally:
        shutil.rmtree(folder, ignore_errors=True)
