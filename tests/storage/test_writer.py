"""The group-commit writer: what fails fails alone, and nothing is answered before its commit."""

import threading
import uuid
from collections.abc import Iterator
from datetime import UTC, datetime

import pytest
import sqlalchemy as sa
import sqlalchemy.exc
from sqlalchemy.orm import Session

from service.errors import Unavailable
from service.people.models import FailedSignIn
from service.storage.engine import Database
from service.storage.writer import GroupWriter


@pytest.fixture
def database(database_url: str) -> Iterator[Database]:
    database = Database(database_url)
    yield database
    database.close()


def note(session: Session, name: str) -> str:
    if name == "bad":
        raise ValueError("a bad one")
    session.add(FailedSignIn(id=uuid.uuid4(), name=name, address="", at=datetime.now(UTC)))
    session.flush()
    if name == "bad after writing":
        raise ValueError("a bad one that had written")
    return name.upper()


def stored(database: Database) -> set[str]:
    with database.read() as session:
        return set(session.scalars(sa.select(FailedSignIn.name)))


def test_what_is_answered_is_stored(database: Database) -> None:
    writer = GroupWriter(database, note)
    futures = [writer.submit(f"n{i}") for i in range(300)]
    assert [future.result(10) for future in futures] == [f"N{i}" for i in range(300)]
    assert stored(database) == {f"n{i}" for i in range(300)}
    writer.close()


def test_a_failed_item_fails_alone_and_leaves_nothing(database: Database) -> None:
    writer = GroupWriter(database, note)
    with database.write() if database.is_sqlite else database.read():
        futures = [writer.submit(name) for name in ("a", "bad", "bad after writing", "b")]
    assert futures[0].result(10) == "A"
    assert futures[3].result(10) == "B"
    for future in futures[1:3]:
        with pytest.raises(ValueError, match="bad one"):
            future.result(10)
    assert stored(database) == {"a", "b"}
    writer.close()


def test_a_commit_that_fails_fails_the_group_and_stores_nothing(database: Database) -> None:
    def disk_full(session: Session, _name: str) -> str:
        note(session, "x")
        raise sqlalchemy.exc.OperationalError("INSERT", {}, Exception("disk full"))

    writer = GroupWriter(database, disk_full)
    with pytest.raises(Unavailable) as refusal:
        writer.submit("x").result(10)
    assert refusal.value.headers["Retry-After"]
    assert stored(database) == set()
    writer.close()


def test_a_full_queue_refuses_at_once_and_says_when_to_come_back(database: Database) -> None:
    entered, go_on = threading.Event(), threading.Event()

    def slow(_session: Session, name: str) -> str:
        entered.set()
        go_on.wait(10)
        return name

    writer = GroupWriter(database, slow, queue_limit=2)
    first = writer.submit("first")
    assert entered.wait(10)
    waiting = [writer.submit("second"), writer.submit("third")]
    with pytest.raises(Unavailable):
        writer.submit("fourth")
    go_on.set()
    assert [future.result(10) for future in (first, *waiting)] == ["first", "second", "third"]
    writer.close()


def test_closing_stores_what_waits_and_takes_no_more(database: Database) -> None:
    writer = GroupWriter(database, note)
    futures = [writer.submit(f"n{i}") for i in range(20)]
    writer.close()
    assert all(future.done() for future in futures)
    assert len(stored(database)) == 20
    with pytest.raises(Unavailable):
        writer.submit("late")
