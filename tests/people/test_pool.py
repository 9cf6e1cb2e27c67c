"""Many at once, while somebody holds the writer: whoever finishes a write needs a thread."""

import threading
from collections.abc import Callable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta
from time import monotonic, sleep

import pytest
import sqlalchemy as sa
import sqlalchemy.exc
from fastapi.testclient import TestClient
from httpx import Response

from service.people.models import SignIn
from service.storage.engine import Database
from tests.clients import PASSWORD
from tests.people.conftest import AddPerson, bearer
from tests.people.conftest import SignIn as EnterByRoute

MORE_THAN_THE_POOL = 48  # 40 threads carry the routes


@contextmanager
def held_writer(database: Database) -> Iterator[None]:
    with database.write() as session:
        session.execute(sa.select(SignIn.id).limit(1))
        yield


def all_at_once(act: Callable[[], Response], pool: ThreadPoolExecutor) -> list[Future[Response]]:
    barrier = threading.Barrier(MORE_THAN_THE_POOL)

    def run() -> Response:
        barrier.wait(timeout=20)
        return act()

    return [pool.submit(run) for _ in range(MORE_THAN_THE_POOL)]


def test_a_flood_of_sign_ins_leaves_threads_to_others(
    client: TestClient, add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]

    def sign_in() -> Response:
        entry = {"name": "Mira Voss", "password": PASSWORD}
        answer: Response = client.post("/api/v1/sign-ins", json=entry)
        return answer

    with ThreadPoolExecutor(MORE_THAN_THE_POOL + 1) as pool:
        with held_writer(database):
            flood = all_at_once(sign_in, pool)
            sleep(0.5)
            other = pool.submit(client.get, "/api/v1/workshop", headers=bearer(token))
            assert other.result(timeout=10).status_code == 200
        codes = {answer.result(timeout=20).status_code for answer in flood}
    assert codes <= {201, 429, 503}
    assert 201 in codes


def test_tablets_that_all_wake_at_once_are_answered_though_the_writer_is_busy(
    client: TestClient, add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    with database.write() as session:
        session.execute(sa.update(SignIn).values(seen_at=datetime.now(UTC) - timedelta(hours=1)))
        session.commit()
    with ThreadPoolExecutor(MORE_THAN_THE_POOL) as pool:
        with held_writer(database):
            woken = all_at_once(lambda: client.get("/api/v1/workshop", headers=bearer(token)), pool)
            until = monotonic() + 10
            while sum(one.done() for one in woken) < len(woken) - 1 and monotonic() < until:
                sleep(0.02)
            # One may wait to note that the sign-in is in use; nobody else does.
            assert sum(one.done() for one in woken) >= len(woken) - 1
        assert {one.result(timeout=20).status_code for one in woken} == {200}


def test_reading_goes_on_where_nothing_can_be_written(
    client: TestClient,
    add: AddPerson,
    enter: EnterByRoute,
    database: Database,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    with database.write() as session:
        session.execute(sa.update(SignIn).values(seen_at=datetime.now(UTC) - timedelta(hours=1)))
        session.commit()
    executed = sa.orm.Session.execute

    def full(session: sa.orm.Session, statement: object, *args: object, **kwargs: object) -> object:
        if isinstance(statement, sa.Update):
            raise sqlalchemy.exc.OperationalError("UPDATE", {}, Exception("disk full"))
        return executed(session, statement, *args, **kwargs)  # type: ignore[call-overload]  # passed on

    monkeypatch.setattr(sa.orm.Session, "execute", full)
    assert client.get("/api/v1/workshop", headers=bearer(token)).status_code == 200


def test_guesses_at_once_do_not_slip_by_the_limit(client: TestClient, add: AddPerson) -> None:
    add("Mira Voss")

    def guess() -> Response:
        entry = {"name": "Mira Voss", "password": "not the right password"}
        answer: Response = client.post("/api/v1/sign-ins", json=entry)
        return answer

    with ThreadPoolExecutor(12) as pool:
        codes = [future.result().status_code for future in [pool.submit(guess) for _ in range(12)]]
    assert sorted(codes) == [401] * 5 + [429] * 7
