"""Orders, and the coils planned for them."""

import uuid
from datetime import UTC, datetime
from typing import Any

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.errors import ConfirmationNeeded, WrongState
from service.recipes.acts import create_recipe, new_revision, release, retire, revision_by_id
from service.runs.acts import decide, plan_runs
from service.runs.models import Order, Run
from service.runs.rules import Move, RunState
from service.runs.serials import free_serials
from service.storage.engine import Database
from service.storage.records import Act, Actor, verify
from service.storage.serials import read_serial
from tests.recipes.bodies import recipe
from tests.runs.conftest import Floor, Hands


def put(database: Database, serial: str, state: RunState) -> None:
    """Put a run into a state, past the table: the moves have tests of their own."""
    with database.write() as session:
        session.execute(sa.update(Run).where(Run.serial == serial).values(state=str(state)))
        session.commit()


def test_an_order_is_placed_for_a_released_revision(lead: Hands) -> None:
    answer = lead.order(12, promised_on="2026-12-18", note="In pairs.")
    assert answer.status_code == 201, answer.text
    order = answer.json()
    assert answer.headers["location"] == f"/api/v1/orders/{order['serial']}"
    assert read_serial(order["label"], "order") == order["serial"]
    assert order["recipe"]["recipe"] == "Harbour neck"
    assert (order["done"], order["to_do"], order["runs"]) == (0, 12, {})
    assert order["promised_on"] == "2026-12-18"
    assert lead.client.get(f"/api/v1/orders/{order['label']}").json() == order


def test_a_draft_and_a_retired_revision_take_no_order(
    lead: Hands, database: Database, lead_actor: Actor
) -> None:
    now = datetime.now(UTC)
    with database.write() as session:
        draft = new_revision(
            session, lead_actor, uuid.UUID(lead.floor.recipe_id), body=recipe(), note=None, now=now
        )
        session.commit()
    refused = lead.order(revision_id=str(draft.id))
    assert (refused.status_code, refused.json()["pointer"]) == (409, "/revision_id")
    with database.write() as session:
        released = revision_by_id(session, uuid.UUID(lead.floor.revision_id))
        retire(session, lead_actor, released, reason="Test.", now=now)
        session.commit()
    assert lead.order().status_code == 409


def test_an_order_tells_what_is_done_and_what_is_to_do(
    lead: Hands, database: Database, lead_actor: Actor
) -> None:
    order = lead.ordered(5)
    first, second, third, fourth = lead.plan(4, order=order)
    put(database, first, RunState.ACCEPTED)
    put(database, second, RunState.SCRAPPED)
    put(database, third, RunState.MEASURED)
    with database.write() as session:
        other = create_recipe(
            session,
            lead_actor,
            name="Harbour bridge",
            kind="pickup",
            body=recipe(turns=7500),
            note=None,
            now=datetime.now(UTC),
        )
        run = session.scalars(sa.select(Run).where(Run.serial == third)).one()
        decide(
            session,
            lead_actor,
            run,
            move=Move.REGRADE,
            cause=None,
            reason="Fits the other recipe.",
            regrade_recipe_id=other.recipe_id,
            conformity="does not conform",
            now=datetime.now(UTC),
        )
        session.commit()
    shown = lead.client.get(f"/api/v1/orders/{order}").json()
    assert shown["runs"] == {"accepted": 2, "scrapped": 1, "planned": 1}
    assert (shown["done"], shown["to_do"]) == (1, 4)
    # Good ones and those on their way count; the scrapped and the regraded are wound anew.
    assert len(lead.plan(3, order=order)) == 3
    more = lead.client.post("/api/v1/runs", json={"order": order, "count": 1})
    assert more.status_code == 422
    assert more.json()["type"].endswith("confirmation-needed")
    assert len(lead.plan(1, order=order, confirmed=True)) == 1
    assert fourth not in (first, second, third)


def test_planned_coils_have_labels_and_the_order_revision(lead: Hands) -> None:
    order = lead.ordered(3)
    runs = lead.plan(3, order=order, magnet_lot=lead.floor.lot)
    assert len({read_serial(serial, "run") for serial in runs}) == 3
    shown = lead.show(runs[0])
    assert (shown["state"], shown["order"], shown["customer"]) == (
        "planned",
        order,
        "Invented Guitars",
    )
    assert shown["planned_turns"] == 7600
    assert shown["magnet_lot"] == lead.floor.lot
    assert shown["expected"]["resistance_ohm"]["value"] > 5000
    assert shown["expected"]["resistance_ohm"]["standard_uncertainty"] > 0
    assert "uncertainty_budget" not in shown["expected"]
    assert shown["moves"] == ["start winding", "scrap"]


def test_an_order_keeps_its_revision_when_that_is_retired(
    lead: Hands, database: Database, lead_actor: Actor
) -> None:
    order = lead.ordered(3)
    now = datetime.now(UTC)
    with database.write() as session:
        second = new_revision(
            session,
            lead_actor,
            uuid.UUID(lead.floor.recipe_id),
            body=recipe(turns=7500),
            note=None,
            now=now,
        )
        release(session, lead_actor, second, now)
        session.commit()
    (serial,) = lead.plan(1, order=order)
    assert lead.show(serial)["recipe"]["revision"] == 1
    assert lead.start(serial).status_code == 201
    alone = lead.client.post("/api/v1/runs", json={"revision_id": lead.floor.revision_id})
    assert (alone.status_code, alone.json()["pointer"]) == (409, "/revision_id")


def test_a_closed_order_takes_no_coils_and_starts_none(lead: Hands) -> None:
    order = lead.ordered(3)
    first, second = lead.plan(2, order=order)
    assert lead.start(first).status_code == 201
    path = f"/api/v1/orders/{order}/close"
    busy = lead.client.post(path, json={"reason": "Enough."})
    assert (busy.status_code, busy.json()["run"]) == (409, first)
    lead.finish(first)
    stale = lead.client.post(path, json={}, headers={"If-Match": '"7"'})
    assert stale.status_code == 412
    closed = lead.client.post(path, json={"reason": "Enough."})
    assert (closed.status_code, closed.json()["state"]) == (200, "closed")
    assert lead.client.post(path, json={}).status_code == 409
    refused = lead.client.post("/api/v1/runs", json={"order": order})
    assert (refused.status_code, refused.json()["pointer"]) == (409, "/order")
    assert lead.start(second).status_code == 409


def test_orders_are_listed_newest_first_in_pages(lead: Hands, as_auditor: TestClient) -> None:
    orders = [lead.ordered(quantity) for quantity in (1, 2, 3)]
    lead.client.post(f"/api/v1/orders/{orders[0]}/close", json={})
    page = as_auditor.get("/api/v1/orders", params={"limit": 1, "state": "open"})
    assert [one["serial"] for one in page.json()] == [orders[2]]
    rest = as_auditor.get(page.headers["link"].split(">")[0].strip("<"))
    assert [one["serial"] for one in rest.json()] == [orders[1]]
    assert "link" not in rest.headers
    assert as_auditor.get("/api/v1/orders?state=lost").status_code == 422


def test_a_bad_order_is_refused_by_field(lead: Hands, nowhere: str) -> None:
    for field, value, status in (
        ("quantity", 0, 422),
        ("quantity", -3, 422),
        ("quantity", 2.5, 422),
        ("quantity", "3", 422),
        ("quantity", 100_001, 422),
        ("quantity", True, 422),
        ("customer", "  ", 422),
        ("customer", "x" * 121, 422),
        ("customer", "a\x00b", 422),
        ("promised_on", "2026-02-30", 422),
        ("promised_on", "18.12.2026", 422),
        ("revision_id", "7", 422),
        ("revision_id", nowhere, 404),
        ("note", "", 422),
        ("price", 12, 422),
    ):
        refused = lead.order(**{field: value})
        assert (refused.status_code, refused.json()["pointer"]) == (status, f"/{field}"), value
    assert lead.client.get("/api/v1/orders").json() == []


def test_a_bad_plan_is_refused_by_field(lead: Hands, nowhere: str) -> None:
    order = lead.ordered()
    revision = lead.floor.revision_id
    bodies: list[tuple[dict[str, Any], int, str]] = [
        ({}, 422, "/order"),
        ({"order": order, "revision_id": revision}, 422, "/order"),
        ({"order": order, "count": 0}, 422, "/count"),
        ({"order": order, "count": 201}, 422, "/count"),
        ({"order": order, "count": 1.5}, 422, "/count"),
        ({"order": order[:6] + ("0" if order[6] != "0" else "1")}, 422, "/order"),
        ({"order": lead.floor.spool}, 422, "/order"),
        ({"order": "J" * 21}, 422, "/order"),
        ({"revision_id": nowhere}, 404, "/revision_id"),
        ({"revision_id": revision, "magnet_lot": lead.floor.spool}, 422, "/magnet_lot"),
    ]
    for body, status, pointer in bodies:
        refused = lead.client.post("/api/v1/runs", json=body)
        assert (refused.status_code, refused.json()["pointer"]) == (status, pointer), body
        assert refused.json()["detail"]
    assert lead.client.get("/api/v1/runs").json() == []


def test_who_may_order_and_plan(
    as_bench: TestClient, as_auditor: TestClient, as_owner: TestClient, operator: Hands
) -> None:
    floor = operator.floor
    for client, order, plan in (
        (as_bench, 403, 403),
        (as_auditor, 403, 403),
        (as_owner, 201, 403),
        (operator.client, 403, 201),
    ):
        hands = Hands(client, floor)
        assert hands.order().status_code == order
        body = {"revision_id": floor.revision_id}
        assert client.post("/api/v1/runs", json=body).status_code == plan
        assert client.get("/api/v1/runs").status_code == 200


def test_runs_are_listed_by_state_machine_and_order(lead: Hands, as_auditor: TestClient) -> None:
    order = lead.ordered(3)
    planned, started, wound = lead.plan(3, order=order)
    lone = lead.wound(machine_id=lead.floor.other_machine_id)
    lead.start(wound)
    lead.finish(wound)
    lead.start(started)

    def found(**params: Any) -> list[str]:
        answer = as_auditor.get("/api/v1/runs", params=params)
        assert answer.status_code == 200, answer.text
        return [run["serial"] for run in answer.json()]

    assert found()[0] == lone
    assert set(found()) == {planned, started, wound, lone}
    assert found(state="planned") == [planned]
    assert set(found(state=["winding", "wound"])) == {started, wound, lone}
    assert set(found(machine=lead.floor.machine_id)) == {started, wound}
    assert found(machine=lead.floor.other_machine_id) == [lone]
    assert set(found(order=order)) == {planned, started, wound}
    assert found(order=order, state="winding") == [started]
    line = next(run for run in as_auditor.get("/api/v1/runs").json() if run["serial"] == started)
    assert line["machine"]["name"] == "Machine A"
    assert line["recipe"]["revision"] == 1
    first = as_auditor.get("/api/v1/runs", params={"limit": 3})
    rest = as_auditor.get(first.headers["link"].split(">")[0].strip("<"))
    serials = [run["serial"] for run in [*first.json(), *rest.json()]]
    assert len(serials) == len(set(serials)) == 4


def test_odd_filters_are_refused(lead: Hands) -> None:
    for query, status in (
        ("state=asleep", 422),
        ("machine=A", 422),
        ("order=J0000000", 422),
        ("limit=1000000", 422),
        ("limit=0", 422),
        ("after=x", 422),
    ):
        assert lead.client.get(f"/api/v1/runs?{query}").status_code == status, query


def test_every_order_and_plan_is_an_act_in_the_chain(lead: Hands, database: Database) -> None:
    order = lead.ordered(2)
    lead.plan(2, order=order)
    lead.client.post(f"/api/v1/orders/{order}/close", json={"reason": "Enough."})
    with database.read() as session:
        verbs = session.scalars(
            sa.select(Act.verb).where(Act.subject_kind.in_(["order", "run"])).order_by(Act.position)
        ).all()
        _, broken = verify(session)
    assert list(verbs) == ["place order", "plan run", "plan run", "close order"]
    assert broken is None


def test_a_serial_in_use_is_not_drawn_again(
    lead: Hands, database: Database, monkeypatch: pytest.MonkeyPatch
) -> None:
    taken = lead.plan(2)
    draws = iter([taken[0], taken[1], taken[0], "R00000P", "R00000P", "R00001N"])
    monkeypatch.setattr("service.runs.serials.draw_serial", lambda _kind: next(draws))
    with database.read() as session:
        assert free_serials(session, Run.serial, "run", 2) == ["R00000P", "R00001N"]


def test_the_acts_refuse_what_the_routes_refuse(
    floor: Floor, lead: Hands, database: Database, lead_actor: Actor
) -> None:
    order = lead.ordered(1)
    with database.write() as session:
        found = session.scalars(sa.select(Order).where(Order.serial == order)).one()
        with pytest.raises(ConfirmationNeeded):
            plan_runs(
                session,
                lead_actor,
                order_id=found.id,
                revision_id=None,
                count=2,
                magnet_lot_id=None,
                now=datetime.now(UTC),
            )
        session.rollback()
        draft = new_revision(
            session,
            lead_actor,
            uuid.UUID(floor.recipe_id),
            body=recipe(),
            note=None,
            now=datetime.now(UTC),
        )
        with pytest.raises(WrongState):
            plan_runs(
                session,
                lead_actor,
                order_id=None,
                revision_id=draft.id,
                count=1,
                magnet_lot_id=None,
                now=datetime.now(UTC),
            )


def test_a_longer_list_asks_the_database_no_more_often(lead: Hands, database: Database) -> None:
    statements: list[str] = []

    def note(_c: object, _u: object, statement: str, *_rest: object) -> None:
        statements.append(statement)

    def asked(path: str) -> int:
        statements.clear()
        assert lead.client.get(path).status_code == 200
        return len(statements)

    order = lead.ordered(30)
    for serial in lead.plan(2, order=order):
        lead.start(serial)
        lead.finish(serial)
    sa.event.listen(database.reader, "before_cursor_execute", note)
    few = asked("/api/v1/runs"), asked("/api/v1/orders")
    for _ in range(3):
        lead.ordered(1)
    for serial in lead.plan(6, order=order)[:4]:
        lead.start(serial)
        lead.finish(serial)
    assert (asked("/api/v1/runs"), asked("/api/v1/orders")) == few
