import statistics
import time
import uuid
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.counters.acts import issue_device
from service.runs.models import Run
from service.shop.models import Machine
from service.storage.engine import Database
from service.storage.records import Actor
from service.storage.serials import draw_serial, shown
from service.storage.types import new_id
from tests.pages.reading import HTML, get
from tests.runs.conftest import Floor, Hands

SCRIPT = "<script>alert('Winder')</script>"


@contextmanager
def counted(database: Database) -> Iterator[list[str]]:
    """The statements that are read meanwhile."""
    statements: list[str] = []

    def note(_c: object, _cur: object, statement: str, *_rest: object) -> None:
        statements.append(statement)

    sa.event.listen(database.reader, "before_cursor_execute", note)
    yield statements
    sa.event.remove(database.reader, "before_cursor_execute", note)


def key_of_counter(database: Database, actor: Actor, machine_id: str) -> str:
    with database.write() as session:
        _device, key = issue_device(
            session, actor, name="Counter", machine_id=uuid.UUID(machine_id), now=datetime.now(UTC)
        )
        session.commit()
    return key


def count(client: TestClient, key: str, *counts: int) -> None:
    events = [
        {"boot": 1, "sequence": place, "kind": "total", "count": turns}
        for place, turns in enumerate(counts, 1)
    ]
    answer = client.post(
        "/api/v1/counters/events",
        json={"events": events},
        headers={"Authorization": f"Bearer {key}"},
    )
    assert answer.status_code == 200, answer.text


def test_a_free_machine_says_so(as_operator: TestClient, floor: Floor) -> None:
    page = get(as_operator, "/floor")
    assert page.words_of("h2")[:2] == ["Machine A", "Machine B"]
    assert page.text.count("No coil on it.") == 2
    assert floor.machine_id in page.response.text


def test_a_winding_machine_shows_the_turns_to_go(
    client: TestClient, operator: Hands, database: Database, lead_actor: Actor, floor: Floor
) -> None:
    key = key_of_counter(database, lead_actor, floor.machine_id)
    serial = operator.started()
    count(client, key, 0, 4210)
    page = get(operator.client, "/floor")
    (to_go,) = page.all("strong", **{"data-live": "to_go"})
    assert to_go.text == "3390"
    assert page.all("section", **{"data-machine": floor.machine_id, "data-run": serial})
    assert "4210 of 7600 turns" in page.text
    assert "Harbour neck, revision 1" in page.text
    assert shown(serial) in page.text


def test_counts_without_a_coil_wait_visibly_until_they_are_assigned(
    client: TestClient, operator: Hands, database: Database, lead_actor: Actor, floor: Floor
) -> None:
    key = key_of_counter(database, lead_actor, floor.machine_id)
    count(client, key, 10, 50)
    assert "counted while no coil was on it" in get(operator.client, "/floor").text
    serial = operator.started()
    page = get(operator.client, "/counts")
    form = page.form("/counts")
    assert "counter from 10 to 50" in page.text
    answer = operator.client.post(
        "/counts",
        data={**form.fields, "run": serial, "reason": "Start pressed late."},
        headers=HTML,
        follow_redirects=False,
    )
    assert answer.status_code == 303
    assert "No counts wait." in get(operator.client, "/counts").text


def test_what_is_planned_and_what_waits_for_the_bench_is_listed(operator: Hands) -> None:
    wound = operator.wound()
    planned = operator.plan(2)
    page = get(operator.client, "/floor")
    tickets = page.words_of("a", **{"class": "ticket"})
    assert any(shown(planned[0]) in ticket for ticket in tickets)
    assert any(shown(wound) in ticket and "wound" in ticket for ticket in tickets)
    assert "Without an order · 2 to wind" in page.text


def test_a_script_in_a_name_is_shown_as_text(
    as_operator: TestClient, database: Database, floor: Floor
) -> None:
    with database.write() as session:
        machine = session.get(Machine, uuid.UUID(floor.machine_id))
        assert machine is not None
        machine.name = SCRIPT
        session.commit()
    page = get(as_operator, "/floor")
    assert SCRIPT in page.words_of("h2")
    assert SCRIPT not in page.response.text


def many_runs(database: Database, floor: Floor, how_many: int) -> None:
    now = datetime.now(UTC) - timedelta(days=1)
    states = ["accepted"] * 90 + ["planned"] * 5 + ["wound"] * 3 + ["on hold", "scrapped"]
    serials: set[str] = set()
    while len(serials) < how_many:
        serials.add(draw_serial("run"))
    rows = [
        {
            "id": new_id(),
            "serial": serial,
            "revision_id": uuid.UUID(floor.revision_id),
            "state": states[index % len(states)],
            "attempt_number": 0,
            "created_at": now,
            "changed_at": now + timedelta(seconds=index),
            "version": 1,
        }
        for index, serial in enumerate(serials)
    ]
    with database.write() as session:
        session.execute(sa.insert(Run), rows)
        session.commit()


def test_the_floor_asks_few_questions_however_many_runs_there_are(
    as_operator: TestClient, database: Database, floor: Floor
) -> None:
    many_runs(database, floor, 300)
    with counted(database) as statements:
        page = get(as_operator, "/floor")
    reads = [statement for statement in statements if statement.startswith("SELECT")]
    assert len(reads) <= 12
    assert "Waiting for the bench · 9" in page.text


@pytest.mark.slow
def test_the_floor_is_drawn_in_fifty_milliseconds_with_ten_thousand_runs(
    as_operator: TestClient, database: Database, floor: Floor
) -> None:
    many_runs(database, floor, 10_000)
    get(as_operator, "/floor")
    times = []
    for _ in range(9):
        begun = time.perf_counter()
        get(as_operator, "/floor")
        times.append(time.perf_counter() - begun)
    assert statistics.median(times) <= 0.050
