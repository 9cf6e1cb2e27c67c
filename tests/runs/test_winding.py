"""At the machine, over HTTP: a coil is started, taken off, or lost."""

import uuid
from collections.abc import Callable
from datetime import UTC, datetime, timedelta

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.recipes.winding import wire_for
from service.runs.acts import finish, run_by_label, start
from service.runs.models import Attempt
from service.shop.models import Machine
from service.stock.models import Spool, SpoolDraw
from service.storage.engine import Database
from service.storage.records import Act, Actor, verify
from tests.recipes.bodies import recipe
from tests.runs.conftest import Hands

Count = Callable[..., None]


@pytest.fixture
def count(client: TestClient, lead: Hands) -> Count:
    """A counter on machine A; called with the cumulative count, it sends one event."""
    issued = lead.client.post(
        "/api/v1/counters/devices", json={"name": "Counter A", "machine_id": lead.floor.machine_id}
    )
    assert issued.status_code == 201, issued.text
    sequence = iter(range(1, 1000))

    def send(total: int, kind: str = "total") -> None:
        event = {"boot": 1, "sequence": next(sequence), "kind": kind, "count": total}
        answer = client.post(
            "/api/v1/counters/events",
            json={"events": [event]},
            headers={"Authorization": f"Bearer {issued.json()['key']}"},
        )
        assert answer.status_code == 200, answer.text
        assert answer.json()["taken"] == 1

    return send


def drawn(database: Database, serial: str) -> tuple[float, float]:
    with database.read() as session:
        spool = session.scalars(sa.select(Spool).where(Spool.serial == serial)).one()
        return spool.drawn_length_m, spool.drawn_mass_kg


def test_a_coil_is_started_on_a_machine_from_a_spool(operator: Hands) -> None:
    (serial,) = operator.plan()
    answer = operator.start(serial, magnet_lot=operator.floor.lot)
    assert answer.status_code == 201, answer.text
    assert answer.headers["location"] == f"/api/v1/runs/{serial}"
    run = answer.json()
    assert (run["state"], run["attempt_number"], run["magnet_lot"]) == (
        "winding",
        1,
        operator.floor.lot,
    )
    (attempt,) = run["attempts"]
    assert attempt["machine"]["name"] == "Machine A"
    assert attempt["spool"]["serial"] == operator.floor.spool
    assert (attempt["number"], attempt["outcome"], attempt["ended_at"]) == (1, "winding", None)
    assert attempt["started_by"] == "Invented Operator"
    assert answer.headers["etag"] == f'"{run["version"]}"'
    assert operator.show(serial) == run


def test_labels_are_read_with_dash_and_in_small_letters(operator: Hands) -> None:
    (serial,) = operator.plan()
    typed = f"{serial[:4]}-{serial[4:]}".lower()
    spool = f"{operator.floor.spool[:4]}-{operator.floor.spool[4:]}".lower()
    assert operator.start(typed, spool=spool).status_code == 201


def test_a_busy_machine_names_the_run_on_it(operator: Hands) -> None:
    on_it = operator.started()
    (other,) = operator.plan()
    refused = operator.start(other)
    assert refused.status_code == 409
    problem = refused.json()
    assert (problem["pointer"], problem["run"]) == ("/machine_id", on_it)
    assert f"{on_it[:4]}-{on_it[4:]}" in problem["detail"]
    assert operator.show(other)["state"] == "planned"
    elsewhere = operator.start(other, machine_id=operator.floor.other_machine_id)
    assert elsewhere.status_code == 201


def test_a_machine_is_free_again_when_its_coil_is_off(operator: Hands) -> None:
    operator.wound()
    operator.started()


def test_a_run_is_started_once(operator: Hands) -> None:
    serial = operator.started()
    again = operator.start(serial, machine_id=operator.floor.other_machine_id)
    assert (again.status_code, again.json()["value"]) == (409, "winding")


def test_a_spool_of_another_wire_is_refused_with_what_to_load(operator: Hands) -> None:
    (serial,) = operator.plan()
    refused = operator.start(serial, spool=operator.floor.thinner_spool)
    assert refused.status_code == 422
    problem = refused.json()
    assert (problem["pointer"], problem["value"]) == ("/spool", operator.floor.thinner_spool)
    assert "AWG 42" in problem["mend"]
    assert "AWG 43" in problem["detail"]


@pytest.mark.parametrize("state", ["quarantined", "empty"])
def test_a_spool_out_of_use_is_refused(operator: Hands, database: Database, state: str) -> None:
    (serial,) = operator.plan()
    with database.write() as session:
        spool = session.scalars(sa.select(Spool).where(Spool.serial == operator.floor.spool)).one()
        spool.state = state
        session.commit()
    refused = operator.start(serial)
    assert (refused.status_code, refused.json()["pointer"]) == (422, "/spool")
    assert state in refused.json()["detail"]


def test_a_machine_out_of_use_is_refused(operator: Hands, database: Database) -> None:
    (serial,) = operator.plan()
    with database.write() as session:
        machine = session.get(Machine, uuid.UUID(operator.floor.machine_id))
        assert machine is not None
        machine.active = False
        session.commit()
    refused = operator.start(serial)
    assert (refused.status_code, refused.json()["pointer"]) == (409, "/machine_id")


def test_the_coil_is_taken_off_and_its_wire_drawn(operator: Hands, database: Database) -> None:
    serial = operator.started()
    answer = operator.finish(serial, 7590)
    assert answer.status_code == 200, answer.text
    run = answer.json()
    (attempt,) = run["attempts"]
    assert (run["state"], attempt["outcome"]) == ("wound", "wound")
    assert (attempt["agreed_turns"], attempt["machine_turns"]) == (7590, None)
    assert attempt["ended_by"] == "Invented Operator"
    assert attempt["wire_length_m"] == pytest.approx(wire_for(recipe(), 7590))
    length, mass = drawn(database, operator.floor.spool)
    assert length == pytest.approx(attempt["wire_length_m"])
    # AWG 42 single: 28.15 g/km of bare copper, and 1.05 g/km of enamel between the bare 63.5 um
    # and the overall 71.1 um (by hand, at 1300 kg/m3).
    assert mass / length == pytest.approx(29.20e-6, rel=1e-3)
    with database.read() as session:
        assert session.scalars(sa.select(SpoolDraw.purpose)).all() == [f"run {serial}"]


def test_the_machines_count_holds_where_nobody_says_otherwise(
    operator: Hands, count: Count
) -> None:
    count(312)
    serial = operator.started()
    count(312 + 4000)
    count(312 + 7601)
    attempt = operator.finish(serial, None).json()["attempts"][0]
    assert (attempt["machine_turns"], attempt["agreed_turns"]) == (7601, 7601)
    assert attempt["agreed_reason"] is None


def test_who_differs_from_the_machine_says_why(operator: Hands, count: Count) -> None:
    serial = operator.started()
    count(7601)
    refused = operator.finish(serial, 7598)
    assert (refused.status_code, refused.json()["pointer"]) == (422, "/reason")
    assert refused.json()["machine_turns"] == 7601
    # The refusal left the winding as it was: it still counts.
    assert operator.show(serial)["state"] == "winding"
    count(7603)
    attempt = operator.finish(serial, 7598, reason="Five unwound by hand.").json()["attempts"][0]
    assert (attempt["machine_turns"], attempt["agreed_turns"]) == (7603, 7598)
    assert attempt["agreed_reason"] == "Five unwound by hand."


def test_without_counter_and_entry_the_turns_are_asked_for(operator: Hands) -> None:
    serial = operator.started()
    refused = operator.finish(serial, None)
    assert (refused.status_code, refused.json()["pointer"]) == (422, "/agreed_turns")
    assert operator.show(serial)["state"] == "winding"


def test_turns_far_from_the_recipes_are_asked_back_once(operator: Hands) -> None:
    serial = operator.started()
    for turns in (7.6, 4210, 9121, 76_000):
        question = operator.finish(serial, turns)
        assert question.status_code == 422, turns
        problem = question.json()
        assert problem["type"].endswith("confirmation-needed")
        assert (problem["pointer"], problem["planned_turns"]) == ("/agreed_turns", 7600)
        assert operator.show(serial)["state"] == "winding"
    assert operator.finish(serial, 4210, confirmed=True).status_code == 200


def test_a_machines_count_far_from_the_recipes_is_asked_back_too(
    operator: Hands, count: Count
) -> None:
    serial = operator.started()
    count(4210)
    assert operator.finish(serial, None).json()["type"].endswith("confirmation-needed")
    assert operator.finish(serial, None, confirmed=True).status_code == 200


def test_a_coil_is_not_ended_twice(operator: Hands, database: Database) -> None:
    serial = operator.wound()
    length, _ = drawn(database, operator.floor.spool)
    assert operator.finish(serial).status_code == 409
    assert operator.do(serial, "loss", cause="wire break").status_code == 409
    assert drawn(database, operator.floor.spool)[0] == length


def test_a_stale_page_moves_nothing(operator: Hands) -> None:
    (serial,) = operator.plan()
    seen = f'"{operator.show(serial)["version"]}"'
    floor = operator.floor
    started = operator.do(serial, "start", seen, machine_id=floor.machine_id, spool=floor.spool)
    assert started.status_code == 201
    for what, body in (
        ("start", {"machine_id": floor.machine_id, "spool": floor.spool}),
        ("finish", {"agreed_turns": 7600}),
        ("loss", {"cause": "wire break"}),
    ):
        stale = operator.do(serial, what, seen, **body)
        assert stale.status_code == 412, what
        assert stale.json()["current"] == started.headers["etag"]
    assert operator.do(serial, "finish", started.headers["etag"], agreed_turns=7600).is_success


def test_a_coil_lost_before_any_test_stays_counted_and_is_wound_again(
    operator: Hands, database: Database, count: Count
) -> None:
    count(0)
    serial = operator.started()
    count(3000)
    lost = operator.do(serial, "loss", cause="wire break")
    assert lost.status_code == 200, lost.text
    run = lost.json()
    (first,) = run["attempts"]
    assert (run["state"], first["outcome"], first["lost_cause"]) == (
        "rework",
        "lost",
        "wire break",
    )
    # Wire of a lost coil is lost too.
    assert first["wire_length_m"] == pytest.approx(wire_for(recipe(), 3000))
    assert drawn(database, operator.floor.spool)[0] == pytest.approx(first["wire_length_m"])
    assert run["dispositions"] == []
    assert operator.start(serial).status_code == 201
    count(3000 + 7600)
    again = operator.finish(serial, None).json()
    assert again["attempt_number"] == 2
    assert [(one["number"], one["outcome"]) for one in again["attempts"]] == [
        (1, "lost"),
        (2, "wound"),
    ]
    assert again["attempts"][1]["machine_turns"] == 7600


def test_a_coil_lost_with_its_bobbin_is_scrapped_with_a_cause(operator: Hands) -> None:
    serial = operator.started()
    run = operator.do(serial, "loss", cause="geometry", scrap=True).json()
    assert run["state"] == "scrapped"
    (decision,) = run["dispositions"]
    assert (decision["kind"], decision["cause"]) == ("scrap", "geometry")
    assert decision["decided_by"] == "Invented Operator"
    assert decision["reason"]
    assert run["moves"] == []
    assert operator.start(serial).status_code == 409
    # Its machine is free for the next coil.
    operator.started()


def test_the_wire_of_a_lost_coil_without_a_count_is_not_guessed(
    operator: Hands, database: Database
) -> None:
    serial = operator.started()
    run = operator.do(serial, "loss", cause="not stated").json()
    assert run["attempts"][0]["wire_length_m"] is None
    assert drawn(database, operator.floor.spool) == (0.0, 0.0)


def test_a_server_clock_set_back_makes_no_negative_winding(
    operator: Hands, database: Database, lead_actor: Actor
) -> None:
    (serial,) = operator.plan()
    now = datetime.now(UTC) + timedelta(hours=3)
    with database.write() as session:
        run = run_by_label(session, serial)
        spool = session.scalars(sa.select(Spool).where(Spool.serial == operator.floor.spool)).one()
        machine_id = uuid.UUID(operator.floor.machine_id)
        start(
            session,
            lead_actor,
            run,
            machine_id=machine_id,
            spool_id=spool.id,
            magnet_lot_id=None,
            now=now,
        )
        attempt = finish(
            session,
            lead_actor,
            run,
            agreed_turns=7600,
            reason=None,
            now=now - timedelta(hours=1),
        )
        assert attempt.ended_at == attempt.started_at == now
        assert run.changed_at == now
        session.commit()


def test_every_move_is_an_act_in_the_chain(operator: Hands, database: Database) -> None:
    serial = operator.started()
    operator.do(serial, "loss", cause="wire break", reason="A nick in the enamel.")
    operator.start(serial)
    operator.finish(serial)
    with database.read() as session:
        acts = session.execute(
            sa.select(Act.before, Act.verb, Act.after, Act.reason)
            .where(Act.subject_kind == "run")
            .order_by(Act.position)
        ).all()
        _, broken = verify(session)
    told = [(before["state"], verb, after["state"]) for before, verb, after, _ in acts[1:]]
    assert told == [
        ("planned", "start winding", "winding"),
        ("winding", "give up the coil", "rework"),
        ("rework", "start winding", "winding"),
        ("winding", "finish winding", "wound"),
    ]
    assert acts[2].reason == "A nick in the enamel."
    assert broken is None


def test_an_open_winding_stays_one_a_machine_in_the_database_itself(
    operator: Hands, database: Database
) -> None:
    operator.started()
    (other,) = operator.plan()
    with database.write() as session:
        run = run_by_label(session, other)
        spool_id = session.scalars(
            sa.select(Spool.id).where(Spool.serial == operator.floor.spool)
        ).one()
        session.add(
            Attempt(
                run_id=run.id,
                number=1,
                machine_id=uuid.UUID(operator.floor.machine_id),
                spool_id=spool_id,
                outcome="winding",
                started_at=datetime.now(UTC),
                started_by="x",
            )
        )
        with pytest.raises(sa.exc.IntegrityError):
            session.flush()
