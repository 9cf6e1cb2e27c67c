"""Counts over the REST interface: stored once, given to the right coil, never lost silently."""

import random
from typing import Any

import pytest
import sqlalchemy as sa

from service.counters.folding import refold, state_of
from service.counters.models import ContestedEvent, CounterEvent, Fold
from service.storage.engine import Database
from tests.counters.conftest import CounterClient
from tests.runs.conftest import Hands


def count_of(lead: Hands, serial: str) -> dict[str, Any]:
    answer = lead.client.get(f"/api/v1/runs/{serial}/count")
    assert answer.status_code == 200, answer.text
    found: dict[str, Any] = answer.json()
    return found


def test_a_coils_turns_rise_with_its_counts_and_are_agreed_at_the_end(
    lead: Hands, counter: CounterClient
) -> None:
    serial = lead.started()
    taken = counter.taken(counter.event(0, "start"), counter.event(400), counter.event(7600))
    assert taken == {
        "taken": 3, "duplicates": 0, "refused": [], "boot": 1, "stored_through": 3,
    }  # fmt: skip
    assert count_of(lead, serial)["turns"] == 7600
    assert lead.do(serial, "finish").status_code == 200
    (attempt,) = lead.show(serial)["attempts"]
    assert (attempt["machine_turns"], attempt["agreed_turns"]) == (7600, 7600)


def test_a_batch_sent_again_changes_nothing(lead: Hands, counter: CounterClient) -> None:
    serial = lead.started()
    batch = [counter.event(0, "start"), counter.event(500), counter.event(900)]
    counter.taken(*batch)
    again = counter.taken(*batch)
    assert (again["taken"], again["duplicates"], again["stored_through"]) == (0, 3, 3)
    doubled = counter.taken(batch[1], batch[1])
    assert (doubled["taken"], doubled["duplicates"]) == (0, 2)
    assert count_of(lead, serial)["turns"] == 900


@pytest.mark.parametrize("seed", range(4))
def test_batches_in_any_order_give_the_turns_of_the_right_order(
    lead: Hands, counter: CounterClient, database: Database, seed: int
) -> None:
    serial = lead.started()
    events = [counter.event(0, "start")] + [counter.event(50 * k) for k in range(1, 20)]
    dice = random.Random(seed)
    batches = [events[i : i + 4] for i in range(0, len(events), 4)]
    dice.shuffle(batches)
    for batch in [*batches, dice.choice(batches)]:
        counter.taken(*batch)
    assert count_of(lead, serial)["turns"] == 950
    assert counter.taken(counter.event(1000))["stored_through"] == 21
    with database.read() as session:
        row = session.scalars(sa.select(Fold)).one()
        assert refold(session, row).turns == state_of(row).turns == 1000


def test_stored_through_stops_at_a_gap_and_moves_on_when_it_is_filled(
    lead: Hands, counter: CounterClient
) -> None:
    lead.started()
    first, second, third, fourth = (counter.event(10 * k) for k in range(4))
    assert counter.taken(first, third, fourth)["stored_through"] == 1
    assert counter.taken(second)["stored_through"] == 4


def test_one_bad_event_is_named_and_the_good_ones_are_kept(
    lead: Hands, counter: CounterClient
) -> None:
    serial = lead.started()
    good = counter.event(100)
    bad = [
        counter.event(-1),
        counter.event(200, speed_rpm="fast"),
        counter.event(200, "whirr"),
        counter.event(200, colour="red"),
        {"boot": 1, "kind": "total", "count": 5},
    ]
    taken = counter.taken(good, *bad)
    assert taken["taken"] == 1
    assert [one["index"] for one in taken["refused"]] == [1, 2, 3, 4, 5]
    assert [one["pointer"] for one in taken["refused"]] == [
        "/events/1/count",
        "/events/2/speed_rpm",
        "/events/3/kind",
        "/events/4/colour",
        "/events/5/sequence",
    ]
    assert all(one["mend"] for one in taken["refused"])
    assert count_of(lead, serial)["turns"] == 100


def test_a_number_used_for_other_content_is_kept_aside(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    serial = lead.started()
    counter.taken(counter.event(100), counter.event(200))
    taken = counter.taken({"boot": 1, "sequence": 2, "kind": "total", "count": 999})
    assert taken["taken"] == 0
    assert taken["refused"][0]["sequence"] == 2
    assert count_of(lead, serial)["turns"] == 200
    with database.read() as session:
        assert session.scalars(sa.select(ContestedEvent.count)).all() == [999]


def test_a_late_count_is_kept_and_changes_nothing_that_was_agreed(
    lead: Hands, counter: CounterClient
) -> None:
    serial = lead.started()
    early, late, newest = counter.event(100), counter.event(3000), counter.event(7000)
    counter.taken(early, newest)
    assert lead.finish(serial, 7000).status_code == 200
    counter.taken(late)
    found = count_of(lead, serial)
    assert (found["turns"], found["late_turns"]) == (7000, 7000)
    assert lead.show(serial)["attempts"][0]["agreed_turns"] == 7000


def test_counts_without_a_coil_wait_until_a_person_assigns_them(
    lead: Hands, counter: CounterClient
) -> None:
    counter.taken(counter.event(0, "start"), counter.event(300))
    serial = lead.started()
    counter.taken(counter.event(7600))
    (waiting,) = lead.client.get("/api/v1/counters/waiting").json()
    assert (waiting["first_sequence"], waiting["last_sequence"], waiting["events"]) == (1, 2, 2)
    body = {
        "device": "Counter A",
        "boot": 1,
        "first_sequence": 1,
        "last_sequence": 2,
        "run": serial,
    }
    refused = lead.client.post("/api/v1/counters/waiting/assignments", json=body)
    assert refused.json()["pointer"] == "/reason"
    given = lead.client.post(
        "/api/v1/counters/waiting/assignments", json={**body, "reason": "Started late, invented."}
    )
    assert given.status_code == 200, given.text
    assert given.json()["turns"] == 7300
    assert given.json()["late_turns"] == 7600
    assert lead.client.get("/api/v1/counters/waiting").json() == []


def test_two_coils_one_after_the_other_get_their_own_turns(
    lead: Hands, counter: CounterClient
) -> None:
    first = lead.started()
    counter.taken(counter.event(0, "start"), counter.event(7600))
    assert lead.do(first, "finish").status_code == 200
    second = lead.started()
    counter.taken(counter.event(0, "start"), counter.event(7590))
    assert count_of(lead, first)["turns"] == 7600
    found = count_of(lead, second)
    assert (found["turns"], found["questions"]) == (7590, [])


def test_a_restart_during_a_coil_adds_up_and_asks(lead: Hands, counter: CounterClient) -> None:
    serial = lead.started()
    counter.taken(counter.event(0, "start"), counter.event(4210))
    counter.boot, counter.sequence = 2, 0
    counter.taken(counter.event(25))
    found = count_of(lead, serial)
    assert found["turns"] == 4235
    assert [question["kind"] for question in found["questions"]] == ["restart"]


@pytest.mark.parametrize("key", ["", "cwd_nonsense", "cws_nonsense"])
def test_an_unknown_key_is_refused(counter: CounterClient, key: str) -> None:
    counter.key = key
    answer = counter.post(counter.event(1))
    assert answer.status_code == 401
    assert answer.json()["pointer"] == "Authorization"


def test_a_revoked_key_is_refused_at_once_and_its_counts_stay(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    counter.taken(counter.event(1))
    revoked = lead.client.post(
        f"/api/v1/counters/devices/{counter.device_id}/revocation", json={"reason": "Leaked."}
    )
    assert revoked.status_code == 200, revoked.text
    assert counter.post(counter.event(2)).status_code == 401
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(CounterEvent)) == 1


def test_a_key_is_shown_once_and_opens_nothing_else(lead: Hands, counter: CounterClient) -> None:
    assert counter.key not in lead.client.get("/api/v1/counters/devices").text
    headers = {"Authorization": f"Bearer {counter.key}"}
    for path in ("/api/v1/runs", "/api/v1/people", "/api/v1/reports/months/2026-11"):
        assert counter.client.get(path, headers=headers).status_code == 401


def test_a_person_may_not_post_counts(lead: Hands, counter: CounterClient) -> None:
    answer = lead.client.post("/api/v1/counters/events", json={"events": [counter.event(1)]})
    assert answer.status_code == 401


@pytest.mark.parametrize("events", [[], [{"boot": 1}] * 1001])
def test_a_batch_has_one_to_a_thousand_events(
    counter: CounterClient, events: list[dict[str, int]]
) -> None:
    answer = counter.post(*events)
    assert answer.status_code == 422
    assert answer.json()["pointer"] == "/events"


def test_a_body_over_a_mebibyte_is_refused_and_stores_nothing(
    counter: CounterClient, database: Database
) -> None:
    answer = counter.post(counter.event(1, note="x" * 1_100_000))
    assert answer.status_code == 413
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(CounterEvent)) == 0
