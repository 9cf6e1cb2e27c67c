"""The record chain: any change to a row of the past shows."""

from datetime import UTC, datetime, timedelta

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.storage.engine import Database
from service.storage.records import COMMAND_LINE, Act, digest, record, verify

AT = datetime(2026, 11, 3, 14, 0, tzinfo=UTC)


def chain_of(database: Database, length: int) -> None:
    with database.write() as session:
        for i in range(length):
            record(
                session,
                COMMAND_LINE,
                "change",
                "thing",
                i,
                at=AT + timedelta(seconds=i),
                before={"value": i, "name": "é ł"},
                after={"value": i + 0.1, "when": AT},
                reason="invented",
            )
        session.commit()


def broken_at(database: Database, change: "sa.Update | sa.Delete") -> int | None:
    with database.write() as session:
        session.execute(change)
        session.commit()
    with database.read() as session:
        found = verify(session)[1]
    return found.position if found else None


@pytest.fixture
def database(database_url: str) -> Database:
    return Database(database_url)


def test_a_chain_as_written_holds(database: Database) -> None:
    chain_of(database, 20)
    with database.read() as session:
        assert verify(session) == (20, None)
    database.close()


@pytest.mark.parametrize(
    "values",
    [
        {"actor_name": "somebody else"},
        {"after": {"value": 99}},
        {"before": None},
        {"reason": ""},
        {"at": AT},
        {"verb": "other"},
        {"subject_id": "8"},
        {"hash": "1" * 64},
    ],
)
def test_an_altered_act_is_found_at_its_row(database: Database, values: dict[str, object]) -> None:
    chain_of(database, 9)
    assert broken_at(database, sa.update(Act).where(Act.position == 7).values(values)) == 7
    database.close()


def test_an_act_taken_out_is_found(database: Database) -> None:
    chain_of(database, 9)
    assert broken_at(database, sa.delete(Act).where(Act.position == 4)) == 4
    database.close()


def test_an_altered_act_with_its_hash_made_again_breaks_the_next(database: Database) -> None:
    chain_of(database, 5)
    with database.write() as session:
        act = session.get(Act, 3)
        assert act is not None
        act.actor_name = "somebody else"
        act.hash = digest(act)
        session.commit()
    with database.read() as session:
        found = verify(session)[1]
    assert found is not None
    assert found.position == 4
    database.close()


def test_an_empty_chain_holds(database: Database) -> None:
    with database.read() as session:
        assert isinstance(session, Session)
        assert verify(session) == (0, None)
    database.close()
