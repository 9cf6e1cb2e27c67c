"""The database: engines, isolation, and the sessions that read and write.

SQLite runs in WAL with ``synchronous=FULL`` (a commit is on the disk before it is answered), its
writers begin IMMEDIATE (a reader that turns into a writer would fail at once instead of waiting),
and one lock in this process queues them fairly, since SQLite's own waiting sleeps in steps.
PostgreSQL runs at READ COMMITTED; code changes a row by one UPDATE, by a version column, or after
``with_for_update()``.
"""

import threading
from collections.abc import Iterator
from contextlib import contextmanager, nullcontext
from pathlib import Path
from sqlite3 import Connection as SqliteConnection
from typing import Any

import sqlalchemy as sa
from sqlalchemy import Engine, event
from sqlalchemy.engine import make_url
from sqlalchemy.orm import Session

from service.errors import SetupError
from service.storage.events import SUBSCRIBERS_KEY, Subscribers

BUSY_TIMEOUT_MS = 30_000
_PRAGMAS = {"journal_mode": "wal", "synchronous": "2", "busy_timeout": str(BUSY_TIMEOUT_MS)}


def make_engine(url: str, *, read_only: bool = False, foreign_keys: bool = True) -> Engine:
    """An engine for ``url``; ``read_only`` engines refuse to write."""
    address = make_url(url)
    if address.get_backend_name() == "sqlite":
        return _sqlite_engine(address, read_only=read_only, foreign_keys=foreign_keys)
    if address.get_backend_name() != "postgresql":
        raise SetupError(
            f"The database {address.get_backend_name()!r} is not one that Coilwright runs on.",
            pointer="COILWRIGHT_DATABASE_URL",
            mend="Use sqlite:///… or postgresql+psycopg://…",
        )
    address = address.set(drivername="postgresql+psycopg")
    options: dict[str, Any] = {"postgresql_readonly": True} if read_only else {}
    return sa.create_engine(
        address, pool_pre_ping=True, pool_size=10, max_overflow=20, execution_options=options
    )


def _sqlite_engine(address: sa.URL, *, read_only: bool, foreign_keys: bool) -> Engine:
    pool: dict[str, int] = {}
    if address.database:
        Path(address.database).parent.mkdir(parents=True, exist_ok=True)
        pool = {"pool_size": 20, "max_overflow": 40}
    engine = sa.create_engine(address, **pool)

    @event.listens_for(engine, "connect")
    def _set_up(connection: SqliteConnection, _record: object) -> None:
        connection.isolation_level = None  # the driver opens no transactions of its own
        for name, value in _PRAGMAS.items():
            connection.execute(f"PRAGMA {name}={value}")
        connection.execute(f"PRAGMA foreign_keys={'ON' if foreign_keys else 'OFF'}")
        if read_only:
            connection.execute("PRAGMA query_only=ON")

    @event.listens_for(engine, "begin")
    def _begin(connection: sa.Connection) -> None:
        connection.exec_driver_sql("BEGIN" if read_only else "BEGIN IMMEDIATE")

    return engine


def check_sqlite(engine: Engine) -> None:
    """Refuse to start where SQLite did not take the settings that durability rests on.

    A network file system, for one, turns WAL down without an error.
    """
    if engine.dialect.name != "sqlite":
        return
    with engine.connect() as connection:
        for name, wanted in _PRAGMAS.items():
            found = str(connection.exec_driver_sql(f"PRAGMA {name}").scalar())
            if found != wanted:
                raise SetupError(
                    f"SQLite runs with {name}={found} instead of {wanted}.",
                    pointer="COILWRIGHT_DATA_FOLDER",
                    value=str(engine.url.database),
                    mend="Put the data folder on a local disk, not on a network share.",
                )


class Database:
    """The engines of one database, and the only maker of sessions."""

    def __init__(
        self, url: str, read_url: str | None = None, subscribers: Subscribers | None = None
    ) -> None:
        self._info = {SUBSCRIBERS_KEY: subscribers or {}}
        self.writer = make_engine(url)
        self.reader = make_engine(read_url or url, read_only=True)
        self.is_sqlite = self.writer.dialect.name == "sqlite"
        self._writing = threading.Lock()

    def close(self) -> None:
        self.writer.dispose()
        self.reader.dispose()

    @contextmanager
    def write(self) -> Iterator[Session]:
        """A session that may write. Leaving it rolls back; only its ``commit()`` keeps."""
        with self._writing if self.is_sqlite else nullcontext(), self._session(self.writer) as work:
            yield work

    @contextmanager
    def read(self) -> Iterator[Session]:
        """A session that refuses to write; runs beside the writer."""
        with self._session(self.reader) as session:
            yield session

    @contextmanager
    def _session(self, engine: Engine) -> Iterator[Session]:
        with Session(engine, expire_on_commit=False, info=self._info) as session:
            try:
                yield session
            finally:
                session.rollback()
