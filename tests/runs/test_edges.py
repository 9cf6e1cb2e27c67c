"""What comes in at the machine and cannot be right is refused by field."""

from typing import Any

from fastapi.testclient import TestClient

from service.storage.serials import draw_serial
from tests.runs.conftest import Hands


def test_bad_input_at_the_machine_is_refused_by_field(operator: Hands, nowhere: str) -> None:
    planned, started = operator.plan(2)
    operator.start(started)
    floor = operator.floor
    cases: list[tuple[str, str, dict[str, Any], int, str]] = [
        (planned, "start", {"machine_id": nowhere}, 404, "/machine_id"),
        (planned, "start", {"machine_id": "A"}, 422, "/machine_id"),
        (planned, "start", {"machine_id": None}, 422, "/machine_id"),
        (planned, "start", {"spool": ""}, 422, "/spool"),
        (planned, "start", {"spool": floor.lot}, 422, "/spool"),
        (planned, "start", {"spool": floor.spool[:-1]}, 422, "/spool"),
        (planned, "start", {"spool": "../../etc"}, 422, "/spool"),
        (planned, "start", {"spool": draw_serial("spool")}, 404, "/spool"),
        (planned, "start", {"magnet_lot": floor.spool}, 422, "/magnet_lot"),
        (planned, "start", {"operator": "x"}, 422, "/operator"),
        (planned, "finish", {"agreed_turns": 7600}, 409, "/state"),
        (planned, "loss", {"cause": "wire break"}, 409, "/state"),
        (started, "finish", {"agreed_turns": 0}, 422, "/agreed_turns"),
        (started, "finish", {"agreed_turns": -7600}, 422, "/agreed_turns"),
        (started, "finish", {"agreed_turns": "7600"}, 422, "/agreed_turns"),
        (started, "finish", {"agreed_turns": "7,600"}, 422, "/agreed_turns"),
        (started, "finish", {"agreed_turns": 1e308, "confirmed": True}, 422, "/agreed_turns"),
        (started, "finish", {"agreed_turns": 7600, "confirmed": "yes"}, 422, "/confirmed"),
        (started, "finish", {"agreed_turns": 7600, "reason": ""}, 422, "/reason"),
        (started, "finish", {"agreed_turns": 7600, "reason": "x" * 1001}, 422, "/reason"),
        (started, "finish", {"turns": 7600}, 422, "/turns"),
        (started, "loss", {"cause": "other"}, 422, "/cause"),
        (started, "loss", {}, 422, "/cause"),
        (started, "loss", {"cause": "wire break", "scrap": 1}, 422, "/scrap"),
    ]
    for serial, what, body, status, pointer in cases:
        usual = {"machine_id": floor.other_machine_id, "spool": floor.spool}
        sent = {**usual, **body} if what == "start" else body
        refused = operator.do(serial, what, **sent)
        assert (refused.status_code, refused.json()["pointer"]) == (status, pointer), (what, body)
    for number in ("NaN", "Infinity", "-Infinity"):
        refused = operator.client.post(
            f"/api/v1/runs/{started}/finish",
            content=f'{{"agreed_turns": {number}}}',
            headers={"Content-Type": "application/json"},
        )
        assert (refused.status_code, refused.json()["pointer"]) == (422, "/agreed_turns")
    assert operator.show(planned)["state"] == "planned"
    assert operator.show(started)["state"] == "winding"


def test_labels_that_are_none_are_told_apart(operator: Hands) -> None:
    for label, status in (
        (operator.floor.spool, 422),
        ("R000", 422),
        (draw_serial("run"), 404),
        ("%00", 422),
        ("a" * 3000, 422),
    ):
        assert operator.client.get(f"/api/v1/runs/{label}").status_code == status, label


def test_who_may_work_at_the_machine(
    as_bench: TestClient, as_auditor: TestClient, as_owner: TestClient, operator: Hands
) -> None:
    (serial,) = operator.plan()
    for client in (as_bench, as_auditor, as_owner):
        hands = Hands(client, operator.floor)
        assert hands.start(serial).status_code == 403
        assert hands.finish(serial).status_code == 403
        assert hands.do(serial, "loss", cause="wire break").status_code == 403
        assert hands.show(serial)["state"] == "planned"
