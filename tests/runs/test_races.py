"""Two people at once: one wins, the other is told, and nothing is done twice."""

from concurrent.futures import ThreadPoolExecutor
from threading import Barrier

import sqlalchemy as sa

from service.runs.models import Attempt
from service.stock.models import SpoolDraw
from service.storage.engine import Database
from service.storage.records import verify
from tests.runs.conftest import Do, Hands


def at_once(first: Do, second: Do) -> list[int]:
    barrier = Barrier(2)

    def run(act: Do) -> int:
        barrier.wait(timeout=10)
        return act().status_code

    with ThreadPoolExecutor(2) as pool:
        return sorted(pool.map(run, (first, second)))


def test_of_two_who_end_one_run_the_second_is_refused(operator: Hands, database: Database) -> None:
    for _ in range(5):
        serial = operator.started()
        codes = at_once(
            lambda serial=serial: operator.finish(serial, 7600),
            lambda serial=serial: operator.finish(serial, 7590),
        )
        assert codes == [200, 409]
        assert len(operator.show(serial)["attempts"]) == 1
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(SpoolDraw)) == 5
        assert verify(session)[1] is None


def test_of_two_who_end_one_run_by_what_they_saw_the_second_is_stale(operator: Hands) -> None:
    serial = operator.started()
    seen = f'"{operator.show(serial)["version"]}"'
    codes = at_once(
        lambda: operator.do(serial, "finish", seen, agreed_turns=7600),
        lambda: operator.do(serial, "loss", seen, cause="wire break"),
    )
    assert codes == [200, 412]


def test_of_two_who_start_on_one_machine_the_second_learns_who_is_on_it(
    operator: Hands, database: Database
) -> None:
    for _ in range(3):
        first, second = operator.plan(2)
        codes = at_once(lambda a=first: operator.start(a), lambda b=second: operator.start(b))
        assert codes == [201, 409]
        (on_it,) = [one for one in (first, second) if operator.show(one)["state"] == "winding"]
        operator.finish(on_it)
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(Attempt)) == 3


def test_a_repeated_request_with_its_key_ends_the_run_once(
    operator: Hands, database: Database
) -> None:
    serial = operator.started()
    answers = [
        operator.client.post(
            f"/api/v1/runs/{serial}/finish",
            json={"agreed_turns": 7600},
            headers={"Idempotency-Key": "tablet-1-entry-9"},
        )
        for _ in range(2)
    ]
    assert [answer.status_code for answer in answers] == [200, 200]
    assert answers[0].json() == answers[1].json()
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(SpoolDraw)) == 1


def test_a_plan_and_the_closing_of_its_order_do_not_cross(lead: Hands) -> None:
    order = lead.ordered(3)
    codes = at_once(
        lambda: lead.client.post(f"/api/v1/orders/{order}/close", json={}),
        lambda: lead.client.post("/api/v1/runs", json={"order": order}),
    )
    planned = lead.client.get("/api/v1/runs").json()
    # Either it was planned before the order closed, or it was refused after.
    assert codes in ([200, 201], [200, 409])
    assert len(planned) == (1 if codes == [200, 201] else 0)
