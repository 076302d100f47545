from __future__ import annotations

from collections.abc import Iterator

import pytest

from exceed.ledger.schema import SERVER_SCHEMA
from exceed.ledger.store import Ledger, open_ledger
from ledger.server import server, why_not


@pytest.fixture(scope="session")
def server_url() -> Iterator[str]:
    reason = why_not()
    if reason is not None:
        pytest.skip(reason)
    with server() as url:
        yield url


@pytest.fixture(params=["sqlite", "postgresql"])
def place(request: pytest.FixtureRequest, tmp_path) -> str:
    """An empty place for a ledger: every test that asks for it runs on both databases."""
    if request.param == "sqlite":
        return f"sqlite:///{tmp_path / 'ledger.sqlite'}"
    url: str = request.getfixturevalue("server_url")
    import sqlalchemy

    engine = sqlalchemy.create_engine(url, poolclass=sqlalchemy.NullPool)
    with engine.begin() as connection:
        connection.exec_driver_sql(f"DROP SCHEMA IF EXISTS {SERVER_SCHEMA} CASCADE")
    return url


@pytest.fixture
def book(place: str) -> Iterator[Ledger]:
    with open_ledger(place, create=True) as opened:
        yield opened
