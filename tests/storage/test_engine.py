"""Engines: the settings that durability rests on, and writers that do not lose updates."""

import threading
import uuid
from datetime import UTC, datetime
from pathlib import Path

import pytest
import sqlalchemy as sa
import sqlalchemy.exc
from sqlalchemy.dialects import sqlite

from service.errors import SetupError
from service.people.models import Person
from service.shop.models import Machine
from service.storage.engine import Database, check_sqlite, make_engine
from service.storage.types import Utc


def test_sqlite_runs_with_wal_full_sync_foreign_keys_and_patience(tmp_path: Path) -> None:
    engine = make_engine(f"sqlite:///{tmp_path / 'a.db'}")
    with engine.connect() as connection:
        found = [
            connection.exec_driver_sql(f"PRAGMA {name}").scalar()
            for name in ("journal_mode", "synchronous", "foreign_keys", "busy_timeout")
        ]
    assert found == ["wal", 2, 1, 30000]
    check_sqlite(engine)
    engine.dispose()


def test_a_database_without_wal_is_refused_at_the_start() -> None:
    engine = make_engine("sqlite://")  # memory cannot take WAL, as a network share cannot
    with pytest.raises(SetupError, match="journal_mode"):
        check_sqlite(engine)
    engine.dispose()


def test_an_unknown_database_is_refused_by_name() -> None:
    with pytest.raises(SetupError, match="mysql"):
        make_engine("mysql://host/name")


def test_two_writers_lose_no_update(database_url: str) -> None:
    database = Database(database_url)
    with database.write() as session:
        session.add(
            Person(name="Invented", password_hash="x", created_at=datetime.now(UTC), version=1)
        )
        session.commit()

    def add_many() -> None:
        for _ in range(100):
            with database.write() as session:
                person = session.scalars(sa.select(Person).with_for_update()).one()
                session.execute(
                    sa.update(Person)
                    .where(Person.id == person.id)
                    .values(version=person.version + 1)
                )
                session.commit()

    threads = [threading.Thread(target=add_many) for _ in range(2)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(60)
    with database.read() as session:
        assert session.scalars(sa.select(Person.version)).one() == 201
    database.close()


def test_a_reading_session_refuses_to_write(database_url: str) -> None:
    database = Database(database_url)
    with database.read() as session, pytest.raises(sqlalchemy.exc.DBAPIError):
        session.execute(sa.text("DELETE FROM person"))
    database.close()


def test_leaving_a_session_without_commit_keeps_nothing(database_url: str) -> None:
    database = Database(database_url)
    with database.write() as session:
        session.add(Person(name="Gone", password_hash="x", created_at=datetime.now(UTC)))
        session.flush()
    with database.read() as session:
        assert session.scalars(sa.select(Person.name)).all() == []
    database.close()


@pytest.mark.parametrize("value", [float("nan"), -1.0, 0.0, 1e9, float("inf")])
def test_impossible_numbers_are_refused_by_the_database_itself(
    database_url: str, value: float
) -> None:
    engine = make_engine(database_url)
    machine = {
        "id": uuid.uuid4(),
        "name": "m",
        "top_speed_rpm": value,
        "pulses_per_turn": 1,
        "counts_direction": False,
        "active": True,
        "created_at": datetime.now(UTC),
        "version": 1,
    }
    with engine.connect() as connection, pytest.raises(sqlalchemy.exc.IntegrityError):
        connection.execute(sa.insert(Machine), machine)
    engine.dispose()


def test_a_time_without_a_zone_is_refused() -> None:
    with pytest.raises(ValueError, match="without a zone"):
        Utc().process_bind_param(datetime(2026, 1, 1), sqlite.dialect())  # noqa: DTZ001 - the point
