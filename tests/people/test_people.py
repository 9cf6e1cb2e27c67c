"""People, their roles and passwords, over HTTP."""

import threading
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient
from httpx import Response

from service.people.acts import person_of
from service.people.models import Person
from service.people.passwords import verify
from service.storage.engine import Database
from service.storage.idempotency import KeptAnswer
from service.storage.records import verify as verify_chain
from service.storage.types import new_id
from service.web.access import Role
from tests.clients import PASSWORD, Enter
from tests.people.conftest import AddPerson, bearer
from tests.people.conftest import SignIn as EnterByRoute

NEW = "another invented password"
BODY = {"name": "Tom Aldar", "password": NEW, "roles": ["operator", "bench"]}


def edit(client: TestClient, person_id: object, seen: str | None = '"1"', **body: Any) -> Response:
    answer: Response = client.patch(
        f"/api/v1/people/{person_id}",
        json={"reason": "As agreed.", **body},
        headers={"If-Match": seen} if seen else {},
    )
    return answer


def test_an_owner_adds_a_person_who_can_sign_in(
    as_owner: TestClient, enter: EnterByRoute, database: Database
) -> None:
    answer = as_owner.post("/api/v1/people", json=BODY)
    body = answer.json()
    assert answer.status_code == 201
    assert answer.headers["location"] == f"/api/v1/people/{body['id']}"
    assert answer.headers["etag"] == '"1"'
    assert (body["name"], body["roles"], body["active"]) == (
        "Tom Aldar",
        ["bench", "operator"],
        True,
    )
    assert NEW not in answer.text
    assert enter("Tom Aldar", NEW).status_code == 201
    with database.read() as session:
        assert verify_chain(session)[1] is None


def test_a_person_is_shown_with_the_tag_that_an_edit_needs(
    as_owner: TestClient, add: AddPerson
) -> None:
    person = add("Mira Voss", Role.BENCH)
    shown = as_owner.get(f"/api/v1/people/{person.id}")
    assert (shown.status_code, shown.headers["etag"]) == (200, '"1"')
    assert as_owner.get(f"/api/v1/people/{new_id()}").status_code == 404
    assert as_owner.get("/api/v1/people/me-too").status_code == 422


def test_roles_that_change_move_the_version_and_hold_at_once(
    as_owner: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss", Role.BENCH)
    token = enter("Mira Voss").json()["token"]
    answer = edit(as_owner, person.id, roles=["bench", "lead"])
    assert answer.json()["roles"] == ["bench", "lead"]
    assert answer.headers["etag"] == '"2"'
    made = as_owner.post(
        "/api/v1/machines",
        json={"name": "Winder A", "top_speed_rpm": 1500.0},
        headers=bearer(token),
    )
    assert made.status_code == 201


def test_what_an_edit_leaves_out_stays(as_owner: TestClient, add: AddPerson) -> None:
    person = add("Mira Voss", Role.BENCH)
    answer = edit(as_owner, person.id, name="Mira Voss-Lund")
    assert answer.json()["name"] == "Mira Voss-Lund"
    assert (answer.json()["roles"], answer.json()["active"]) == (["bench"], True)
    record = as_owner.get("/api/v1/acts", params={"subject_id": str(person.id)}).json()
    assert record[0]["before"] == {"name": "Mira Voss"}
    assert record[0]["after"] == {"name": "Mira Voss-Lund"}


def test_an_edit_that_changes_nothing_leaves_no_trace(as_owner: TestClient, add: AddPerson) -> None:
    person = add("Mira Voss", Role.BENCH)
    assert edit(as_owner, person.id, roles=["bench"], active=True).headers["etag"] == '"1"'
    record = as_owner.get("/api/v1/acts", params={"subject_id": str(person.id)}).json()
    assert [act["verb"] for act in record] == ["add person"]


@pytest.mark.parametrize(("seen", "code"), [(None, 428), ('"7"', 412), ('W/"1"', 412)])
def test_an_edit_needs_the_version_that_was_seen(
    as_owner: TestClient, add: AddPerson, seen: str | None, code: int
) -> None:
    person = add("Mira Voss")
    answer = edit(as_owner, person.id, seen, active=False)
    assert answer.status_code == code
    assert as_owner.get(f"/api/v1/people/{person.id}").json()["active"] is True


def test_the_last_owner_can_neither_leave_nor_lose_the_role(as_owner: TestClient) -> None:
    own_id = as_owner.get("/api/v1/people/me").json()["id"]
    for change in ({"active": False}, {"roles": ["lead"]}):
        answer = edit(as_owner, own_id, **change)
        assert answer.status_code == 409
        assert answer.json()["pointer"] == "/roles"
    assert as_owner.get("/api/v1/people/me").json()["roles"] == ["owner"]


def test_of_two_owners_who_leave_at_once_one_stays(sign_in: Enter, database: Database) -> None:
    owners = [sign_in(Role.OWNER, name=name) for name in ("Owner One", "Owner Two")]
    ids = [owner.get("/api/v1/people/me").json()["id"] for owner in owners]
    barrier = threading.Barrier(2)

    def leave(owner: TestClient, own_id: str) -> int:
        barrier.wait(timeout=10)
        return edit(owner, own_id, active=False).status_code

    with ThreadPoolExecutor(2) as pool:
        codes = sorted(pool.map(leave, owners, ids))
    assert codes == [200, 409]
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).where(Person.active)) == 1


def test_a_person_who_left_may_come_back(
    as_owner: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss")
    assert edit(as_owner, person.id, active=False).status_code == 200
    assert edit(as_owner, person.id, '"2"', active=True).status_code == 200
    assert enter("Mira Voss").status_code == 201


@pytest.mark.parametrize("name", ["mira VOSS", "Mira  Voss", "Mira Voss "])
def test_a_like_name_is_refused(as_owner: TestClient, add: AddPerson, name: str) -> None:
    add("Mira Voss")
    answer = as_owner.post("/api/v1/people", json={**BODY, "name": name})
    assert answer.status_code == 409
    assert answer.json()["pointer"] == "/name"


def test_the_name_of_somebody_who_left_is_never_used_again(
    as_owner: TestClient, add: AddPerson
) -> None:
    person = add("Mira Voss")
    edit(as_owner, person.id, active=False)
    assert as_owner.post("/api/v1/people", json={**BODY, "name": "Mira Voss"}).status_code == 409


@pytest.mark.parametrize(
    ("body", "pointer"),
    [
        ('{"name": "   ", "password": "an invented password", "roles": ["lead"]}', "/name"),
        ('{"name": "\\u200b", "password": "an invented password", "roles": ["lead"]}', "/name"),
        ('{"name": "a\\u0007b", "password": "an invented password", "roles": ["lead"]}', "/name"),
        ('{"name": "a\\u0000b", "password": "an invented password", "roles": ["lead"]}', "/name"),
        ('{"name": NaN, "password": "an invented password", "roles": ["lead"]}', "/name"),
        ('{"name": "Tom", "password": "too short", "roles": ["lead"]}', "/password"),
        ('{"name": "Tom", "password": "aaaaaaaaaaaaaaa", "roles": ["lead"]}', "/password"),
        ('{"name": "Tom", "password": 1234567890123, "roles": ["lead"]}', "/password"),
        ('{"name": "Tom", "password": "an invented password", "roles": []}', "/roles"),
        ('{"name": "Tom", "password": "an invented password", "roles": ["king"]}', "/roles/0"),
        ('{"name": "Tom", "password": "an invented password", "roles": "lead"}', "/roles"),
        ('{"name": "Tom", "password": "an invented password"}', "/roles"),
        (
            '{"name": "Tom", "password": "an invented password", "roles": ["lead"], "id": 1}',
            "/id",
        ),
    ],
)
def test_a_bad_person_is_refused_by_the_field(
    as_owner: TestClient, body: str, pointer: str
) -> None:
    headers = {"Content-Type": "application/json"}
    answer = as_owner.post("/api/v1/people", content=body, headers=headers)
    assert answer.status_code == 422
    assert answer.json()["pointer"] == pointer
    assert answer.json()["mend"]
    assert len(as_owner.get("/api/v1/people").json()) == 1


@pytest.mark.parametrize(
    "name",
    ["ł ß é", "e\u0301", "מרים", "Ada \N{CLIPBOARD}", "x" * 120, "O'Hara; DROP TABLE person"],
)
def test_a_name_comes_back_as_it_was_typed(as_owner: TestClient, name: str) -> None:
    answer = as_owner.post("/api/v1/people", json={**BODY, "name": name})
    assert answer.status_code == 201
    assert name in [one["name"] for one in as_owner.get("/api/v1/people").json()]


def test_a_name_that_is_too_long_is_refused(as_owner: TestClient) -> None:
    answer = as_owner.post("/api/v1/people", json={**BODY, "name": "x" * 121})
    assert answer.status_code == 422


def test_ones_own_password_needs_the_present_one_and_ends_all_sign_ins(
    client: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss")
    here, there = (enter("Mira Voss").json()["token"] for _ in range(2))
    path = f"/api/v1/people/{person.id}/password"
    for present in ({}, {"present_password": "a wrong password"}):
        refused = client.post(path, json={"new_password": NEW, **present}, headers=bearer(here))
        assert refused.status_code == 422
        assert refused.json()["pointer"] == "/present_password"
    assert client.get("/api/v1/people/me", headers=bearer(there)).status_code == 200
    done = client.post(
        path, json={"new_password": NEW, "present_password": PASSWORD}, headers=bearer(here)
    )
    assert done.status_code == 204
    for token in (here, there):
        assert client.get("/api/v1/people/me", headers=bearer(token)).status_code == 401
    assert enter("Mira Voss").status_code == 401
    assert enter("Mira Voss", NEW).status_code == 201


def test_a_stolen_cookie_gives_no_more_guesses_than_the_sign_in(
    client: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    codes = [
        client.post(
            f"/api/v1/people/{person.id}/password",
            json={"new_password": NEW, "present_password": f"guess number {guess}"},
            headers=bearer(token),
        ).status_code
        for guess in range(6)
    ]
    assert codes == [422] * 5 + [429]


def test_an_owner_sets_anothers_password_without_it_and_ends_the_pause(
    as_owner: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    for _ in range(5):
        enter("Mira Voss", "a wrong password")
    path = f"/api/v1/people/{person.id}/password"
    assert as_owner.post(path, json={"new_password": NEW}).status_code == 204
    assert as_owner.get("/api/v1/people/me", headers=bearer(token)).status_code == 401
    assert enter("Mira Voss", NEW).status_code == 201


def test_nobody_else_sets_anothers_password(
    as_lead: TestClient, add: AddPerson, database: Database
) -> None:
    person = add("Mira Voss")
    answer = as_lead.post(
        f"/api/v1/people/{person.id}/password",
        json={"new_password": NEW, "present_password": PASSWORD},
    )
    assert answer.status_code == 403
    with database.write() as session:
        assert verify(person_of(session, person.id).password_hash, PASSWORD)


def test_no_quick_digest_of_a_body_with_a_password_is_kept(
    as_owner: TestClient, database: Database
) -> None:
    made = as_owner.post("/api/v1/people", json=BODY, headers={"Idempotency-Key": "tablet-7-1"})
    path = f"/api/v1/people/{made.json()['id']}/password"
    key = {"Idempotency-Key": "tablet-7-2"}
    assert as_owner.post(path, json={"new_password": NEW}, headers=key).status_code == 204
    with database.read() as session:
        assert session.scalars(sa.select(KeptAnswer.key)).all() == []


def test_a_password_fits_however_its_accents_are_composed(
    as_owner: TestClient, enter: EnterByRoute
) -> None:
    as_owner.post("/api/v1/people", json={**BODY, "password": "caf\u00e9 au lait, bien s\u00fbr"})
    assert enter("Tom Aldar", "cafe\u0301 au lait, bien su\u0302r").status_code == 201


ROUTES = [
    ("GET", "/people", {Role.LEAD, Role.OWNER, Role.AUDITOR}),
    ("POST", "/people", {Role.OWNER}),
    ("GET", "/people/me", set(Role)),
    ("GET", "/people/{id}", {Role.LEAD, Role.OWNER, Role.AUDITOR}),
    ("PATCH", "/people/{id}", {Role.OWNER}),
    ("POST", "/people/{id}/password", {Role.OWNER}),
    ("GET", "/acts", {Role.LEAD, Role.OWNER, Role.AUDITOR}),
]


@pytest.mark.parametrize("role", list(Role))
def test_each_route_lets_through_its_roles_and_nobody_else(
    client: TestClient, sign_in: Enter, add: AddPerson, role: Role
) -> None:
    person = add("Mira Voss")
    person_client = sign_in(role)
    for method, path, allowed in ROUTES:
        where = "/api/v1" + path.format(id=person.id)
        body: dict[str, Any] | None = {} if method in ("POST", "PATCH") else None
        code = person_client.request(method, where, json=body).status_code
        # A body that is checked after the role answers 422; a refused role never gets so far.
        if role in allowed:
            assert code in (200, 422, 428), (method, path)
        elif path.endswith("/password"):
            assert code in (403, 422)
        else:
            assert code == 403, (method, path)
        assert client.request(method, where, json=body).status_code == 401, (method, path)
