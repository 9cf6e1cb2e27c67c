"""Magnet lots over HTTP."""

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.storage.engine import Database
from service.storage.records import Act
from service.storage.serials import draw_serial
from tests.stock.bodies import MAGNET_LOTS, Json, magnets, received


def test_a_lot_is_received_listed_and_found_by_its_label(as_operator: TestClient) -> None:
    answer = as_operator.post(MAGNET_LOTS, json=magnets())
    assert answer.status_code == 201, answer.text
    body = answer.json()
    assert answer.headers["location"] == f"{MAGNET_LOTS}/{body['serial']}"
    assert {name: body[name] for name in magnets()} == magnets()
    assert as_operator.get(f"{MAGNET_LOTS}/{body['label'].lower()}").json() == body
    assert as_operator.get(MAGNET_LOTS).json() == [body]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"material": ""}, "/material"),
        ({"piece": "nul\x00"}, "/piece"),
        ({"pieces": 0}, "/pieces"),
        ({"pieces": 1.5}, "/pieces"),
        ({"pieces": "600"}, "/pieces"),
        ({"pieces": True}, "/pieces"),
        ({"pieces": 1_000_001}, "/pieces"),
        ({"count": 1}, "/count"),
    ],
)
def test_a_bad_lot_is_refused_by_its_field(
    as_operator: TestClient, changes: Json, pointer: str
) -> None:
    answer = as_operator.post(MAGNET_LOTS, json=magnets(**changes))
    assert answer.status_code == 422, answer.text
    assert answer.json()["pointer"] == pointer


def test_the_label_of_a_spool_is_no_magnet_lot(as_operator: TestClient) -> None:
    answer = as_operator.get(f"{MAGNET_LOTS}/{received(as_operator)['serial']}")
    assert answer.status_code == 422
    assert "label of a spool, not of a magnet lot" in answer.json()["detail"]
    assert as_operator.get(f"{MAGNET_LOTS}/{draw_serial('magnet lot')}").status_code == 404


def test_an_auditor_receives_nothing(as_auditor: TestClient) -> None:
    assert as_auditor.post(MAGNET_LOTS, json=magnets()).status_code == 403


def test_a_lot_is_corrected_by_who_has_seen_it_and_says_why(
    as_operator: TestClient, database: Database
) -> None:
    made = as_operator.post(MAGNET_LOTS, json=magnets())
    assert made.headers["etag"] == '"1"'
    path = made.headers["location"]
    edit = {"pieces": 580, "reason": "Twenty came broken."}
    assert as_operator.patch(path, json=edit).status_code == 428
    answer = as_operator.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert answer.status_code == 200, answer.text
    assert answer.json() == {**made.json(), "pieces": 580, "version": 2}
    assert as_operator.patch(path, json=edit, headers={"If-Match": '"1"'}).status_code == 412
    assert as_operator.get(path).headers["etag"] == '"2"'
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "change magnet lot")).one()
        assert (act.before, act.after, act.reason) == (
            {"pieces": 600},
            {"pieces": 580},
            "Twenty came broken.",
        )


@pytest.mark.parametrize(
    ("edit", "pointer"),
    [
        ({"pieces": 580}, "/reason"),
        ({"pieces": 0, "reason": "Counted."}, "/pieces"),
        ({"pieces": "many", "reason": "Counted."}, "/pieces"),
        ({"material": "", "reason": "Read again."}, "/material"),
        ({"serial": "M000000", "reason": "Read again."}, "/serial"),
    ],
)
def test_a_bad_correction_is_refused_by_its_field(
    as_operator: TestClient, edit: Json, pointer: str
) -> None:
    path = as_operator.post(MAGNET_LOTS, json=magnets()).headers["location"]
    answer = as_operator.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert (answer.status_code, answer.json()["pointer"]) == (422, pointer)
