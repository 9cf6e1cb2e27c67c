"""Fixtures of databases: each test that asks gets a migrated one of its own, on both kinds."""

import itertools
import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
import sqlalchemy as sa
from sqlalchemy.engine import make_url

from service.models import Base
from service.storage.migrate import migrate
from tests.servers import postgresql_server, server_programs

_numbers = itertools.count()


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption(
        "--database",
        choices=("both", "sqlite", "postgresql"),
        default="both",
        help="which databases the tests run on",
    )


def pytest_generate_tests(metafunc: pytest.Metafunc) -> None:
    if "database_kind" in metafunc.fixturenames:
        wanted = metafunc.config.getoption("--database")
        kinds = ["sqlite", "postgresql"] if wanted == "both" else [wanted]
        metafunc.parametrize("database_kind", kinds, scope="session")


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A migrated, empty database file that each test copies."""
    file = tmp_path_factory.mktemp("template") / "template.db"
    migrate(f"sqlite:///{file}")
    engine = sa.create_engine(f"sqlite:///{file}")
    with engine.connect() as connection:
        connection.exec_driver_sql("PRAGMA wal_checkpoint(TRUNCATE)")
    engine.dispose()
    return file


@pytest.fixture(scope="session")
def postgresql_url() -> Iterator[str]:
    """The URL of a server for this run; its absence is a failure where CI says so."""
    programs = server_programs()
    if programs is None:
        if os.environ.get("CI"):
            pytest.fail("no PostgreSQL server programs, and CI must prove both databases")
        pytest.skip("NO POSTGRESQL SERVER: install Debian's postgresql or the test extra")
    with postgresql_server(programs) as url:
        template = make_url(url).set(database="template_coilwright")
        _create_database(url, "template_coilwright")
        migrate(template.render_as_string(hide_password=False))
        yield url


def _create_database(url: str, name: str, template: str | None = None) -> None:
    engine = sa.create_engine(url, isolation_level="AUTOCOMMIT", poolclass=sa.NullPool)
    with engine.connect() as connection:
        like = f" TEMPLATE {template}" if template else ""
        connection.execute(sa.text(f"CREATE DATABASE {name}{like}"))


def _drop_database(url: str, name: str) -> None:
    engine = sa.create_engine(url, isolation_level="AUTOCOMMIT", poolclass=sa.NullPool)
    with engine.connect() as connection:
        connection.execute(sa.text(f"DROP DATABASE {name} WITH (FORCE)"))


@pytest.fixture
def database_url(
    database_kind: str, request: pytest.FixtureRequest, tmp_path: Path
) -> Iterator[str]:
    """The URL of a migrated, empty database that nobody else uses meanwhile.

    SQLite: a copy of the template. PostgreSQL: one database for the run, emptied before each
    test, since making one anew takes half a second.
    """
    if database_kind == "sqlite":
        file = tmp_path / "coilwright.db"
        shutil.copyfile(request.getfixturevalue("sqlite_template"), file)
        yield f"sqlite:///{file}"
        return
    url: str = request.getfixturevalue("emptied_url")
    _empty(url)
    yield url


@pytest.fixture(scope="session")
def emptied_url(postgresql_url: str) -> str:
    """The database of this process that tests share one after the other."""
    name = f"shared_{os.getpid()}"
    _create_database(postgresql_url, name, "template_coilwright")
    return make_url(postgresql_url).set(database=name).render_as_string(hide_password=False)


def _empty(url: str) -> None:
    engine = sa.create_engine(url, isolation_level="AUTOCOMMIT", poolclass=sa.NullPool)
    tables = ", ".join(f'"{table.name}"' for table in Base.metadata.sorted_tables)
    with engine.connect() as connection:
        # A test that failed may have left a transaction open; it must not block this one.
        connection.execute(
            sa.text(
                "SELECT pg_terminate_backend(pid) FROM pg_stat_activity"
                " WHERE datname = current_database() AND pid <> pg_backend_pid()"
            )
        )
        connection.execute(sa.text(f"TRUNCATE {tables}"))


@pytest.fixture
def fresh_database_url(database_kind: str, request: pytest.FixtureRequest) -> Iterator[str]:
    """As ``database_url``, but made anew: for tests that change the schema."""
    if database_kind == "sqlite":
        yield request.getfixturevalue("database_url")
        return
    server: str = request.getfixturevalue("postgresql_url")
    name = f"t_{os.getpid()}_{next(_numbers)}"
    _create_database(server, name, "template_coilwright")
    yield make_url(server).set(database=name).render_as_string(hide_password=False)
    _drop_database(server, name)
