"""Signing in and out over HTTP."""

import hashlib
from datetime import UTC, datetime, timedelta

import pytest
import sqlalchemy as sa
from argon2 import PasswordHasher
from fastapi.testclient import TestClient

from service.app import create_app
from service.people.models import FailedSignIn, Person, SignIn
from service.people.passwords import needs_new_hash, verify
from service.settings import Settings
from service.storage.engine import Database
from service.storage.types import new_id
from service.web.access import Role
from tests.clients import PASSWORD, Enter
from tests.people.conftest import AddPerson, bearer
from tests.people.conftest import SignIn as EnterByRoute

WRONG = "not the right password"


def test_signing_in_answers_a_token_and_sets_a_cookie_that_scripts_cannot_read(
    client: TestClient, add: AddPerson
) -> None:
    add("Mira Voss", Role.BENCH, Role.OPERATOR)
    answer = client.post("/api/v1/sign-ins", json={"name": "Mira Voss", "password": PASSWORD})
    body = answer.json()
    assert answer.status_code == 201
    assert answer.headers["location"] == "/api/v1/sign-ins/current"
    assert answer.headers["cache-control"] == "no-store"
    assert (body["person"], body["roles"]) == ("Mira Voss", ["bench", "operator"])
    assert body["token"].startswith("cws_")
    assert len(body["token"]) == 4 + 43
    term = datetime.fromisoformat(body["expires_at"]) - datetime.now(UTC)
    assert timedelta(days=6, hours=23) < term <= timedelta(days=7)
    name, *attributes = answer.headers["set-cookie"].lower().split("; ")
    assert name.startswith("coilwright=cws_")
    assert {"httponly", "path=/", "samesite=lax"} <= set(attributes)
    assert "secure" not in attributes
    assert client.get("/api/v1/people/me").json()["name"] == "Mira Voss"


def test_under_tls_the_cookie_is_bound_to_the_host(
    settings: Settings, add: AddPerson, client: TestClient
) -> None:
    add("Mira Voss")
    assert client.get("/api/v1/health").status_code == 200
    app = create_app(settings.model_copy(update={"https": True}))
    with TestClient(app, base_url="https://testserver") as secure:
        answer = secure.post("/api/v1/sign-ins", json={"name": "Mira Voss", "password": PASSWORD})
        name, *attributes = answer.headers["set-cookie"].lower().split("; ")
        assert name.startswith("__host-coilwright=cws_")
        assert {"secure", "httponly", "path=/", "samesite=lax"} <= set(attributes)
        assert not any(attribute.startswith("domain") for attribute in attributes)
        assert secure.get("/api/v1/people/me").status_code == 200


def test_only_the_hash_of_a_token_is_kept(
    add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    with database.read() as session:
        (kept,) = session.scalars(sa.select(SignIn.token_hash))
    assert kept == hashlib.sha256(token.encode()).hexdigest()


@pytest.mark.parametrize(
    ("kept", "typed"),
    [
        ("Zoë Łuk", "ZOE\u0308 łuk"),  # the accent as a sign of its own
        ("Jonas Groß", "jonas GROSS"),
        ("مريم", "مريم"),
        ("Ada \N{CLIPBOARD}", " ada   \N{CLIPBOARD} "),
    ],
)
def test_names_are_compared_without_case_and_form_and_kept_as_typed(
    add: AddPerson, enter: EnterByRoute, kept: str, typed: str
) -> None:
    add(kept)
    answer = enter(typed)
    assert answer.status_code == 201
    assert answer.json()["person"] == kept


def test_a_wrong_password_and_an_unknown_name_read_the_same(
    add: AddPerson, enter: EnterByRoute
) -> None:
    add("Mira Voss")
    wrong, unknown = enter("Mira Voss", WRONG), enter("Nobody Known", WRONG)
    assert wrong.status_code == unknown.status_code == 401
    assert wrong.json() == unknown.json()
    assert wrong.json()["type"] == "urn:coilwright:problem:not-signed-in"
    assert "set-cookie" not in wrong.headers


def test_after_five_failures_the_right_password_also_waits_and_others_sign_in(
    add: AddPerson, enter: EnterByRoute
) -> None:
    add("Mira Voss")
    add("Tom Aldar")
    assert [enter("mira voss", WRONG).status_code for _ in range(5)] == [401] * 5
    waits = enter("Mira Voss")
    assert waits.status_code == 429
    assert 0 < int(waits.headers["retry-after"]) <= 15 * 60
    assert waits.json()["type"] == "urn:coilwright:problem:too-many-attempts"
    assert enter("Tom Aldar").status_code == 201


def test_an_unknown_name_waits_like_a_known_one(enter: EnterByRoute) -> None:
    codes = [enter("Nobody Known", WRONG).status_code for _ in range(6)]
    assert codes == [401] * 5 + [429]


def test_after_thirty_failures_an_address_waits(
    add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    add("Mira Voss")
    now = datetime.now(UTC)
    with database.write() as session:
        session.add_all(
            FailedSignIn(id=new_id(), name=f"guess {number}", address="testclient", at=now)
            for number in range(30)
        )
        session.commit()
    assert enter("Mira Voss").status_code == 429


def test_a_quarter_of_an_hour_later_failures_are_forgotten(
    add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    add("Mira Voss")
    for _ in range(5):
        enter("Mira Voss", WRONG)
    with database.write() as session:
        session.execute(sa.update(FailedSignIn).values(at=FailedSignIn.at))
        for failure in session.scalars(sa.select(FailedSignIn)):
            failure.at -= timedelta(minutes=15, seconds=1)
        session.commit()
    assert enter("Mira Voss").status_code == 201
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(FailedSignIn)) == 0


def test_a_success_clears_the_slips_before_it(add: AddPerson, enter: EnterByRoute) -> None:
    add("Mira Voss")
    for _ in range(2):
        assert [enter("Mira Voss", WRONG).status_code for _ in range(4)] == [401] * 4
        assert enter("Mira Voss").status_code == 201


def test_a_restart_does_not_forget_who_was_guessing(
    settings: Settings, add: AddPerson, enter: EnterByRoute
) -> None:
    add("Mira Voss")
    for _ in range(5):
        enter("Mira Voss", WRONG)
    with TestClient(create_app(settings)) as again:
        answer = again.post("/api/v1/sign-ins", json={"name": "Mira Voss", "password": PASSWORD})
    assert answer.status_code == 429


def test_who_has_left_cannot_sign_in_and_stays_in_the_record(
    as_owner: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    person = add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    gone = as_owner.patch(
        f"/api/v1/people/{person.id}",
        json={"active": False, "reason": "Moved away."},
        headers={"If-Match": '"1"'},
    )
    assert gone.json()["active"] is False
    assert as_owner.get("/api/v1/people/me", headers=bearer(token)).status_code == 401
    assert enter("Mira Voss").status_code == 401
    listed = as_owner.get("/api/v1/people").json()
    assert "Mira Voss" in [one["name"] for one in listed]
    acts = as_owner.get("/api/v1/acts", params={"subject_id": str(person.id)}).json()
    assert acts[0]["reason"] == "Moved away."


def test_signing_out_ends_the_token_at_once(
    client: TestClient, add: AddPerson, enter: EnterByRoute
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    other = enter("Mira Voss").json()["token"]
    out = client.delete("/api/v1/sign-ins/current", headers=bearer(token))
    assert out.status_code == 204
    assert "coilwright=" in out.headers["set-cookie"]
    assert client.get("/api/v1/people/me", headers=bearer(token)).status_code == 401
    assert client.get("/api/v1/people/me", headers=bearer(other)).status_code == 200


def test_signing_in_anew_ends_the_sign_in_that_the_browser_carried(
    client: TestClient, add: AddPerson
) -> None:
    add("Mira Voss")
    entry = {"name": "Mira Voss", "password": PASSWORD}
    client.cookies.set("coilwright", "cws_planted")
    first = client.post("/api/v1/sign-ins", json=entry).json()["token"]
    assert first != "cws_planted"
    client.cookies.clear()
    client.cookies.set("coilwright", first)
    second = client.post("/api/v1/sign-ins", json=entry).json()["token"]
    client.cookies.clear()
    assert client.get("/api/v1/people/me", headers=bearer(first)).status_code == 401
    assert client.get("/api/v1/people/me", headers=bearer(second)).status_code == 200


@pytest.mark.parametrize(
    ("started", "seen", "code"),
    [
        (timedelta(hours=11), timedelta(hours=11), 200),
        (timedelta(hours=13), timedelta(hours=12, seconds=1), 401),
        (timedelta(days=7, seconds=1), timedelta(minutes=2), 401),
        (timedelta(days=6, hours=23), timedelta(minutes=2), 200),
    ],
)
def test_a_sign_in_ends_by_idleness_and_by_age(
    client: TestClient,
    add: AddPerson,
    enter: EnterByRoute,
    database: Database,
    started: timedelta,
    seen: timedelta,
    code: int,
) -> None:
    add("Mira Voss")
    token = enter("Mira Voss").json()["token"]
    now = datetime.now(UTC)
    with database.write() as session:
        session.execute(sa.update(SignIn).values(started_at=now - started, seen_at=now - seen))
        session.commit()
    assert client.get("/api/v1/people/me", headers=bearer(token)).status_code == code
    with database.read() as session:
        noted = session.scalars(sa.select(SignIn.seen_at)).one()
    assert (now - noted < timedelta(minutes=1)) == (code == 200)


def test_a_hash_of_other_parameters_is_made_anew_at_the_next_sign_in(
    add: AddPerson, enter: EnterByRoute, database: Database
) -> None:
    weak = PasswordHasher(time_cost=1, memory_cost=1024, parallelism=1).hash(PASSWORD)
    add("Mira Voss", password_hash=weak)
    assert enter("Mira Voss").status_code == 201
    with database.read() as session:
        kept = session.scalars(sa.select(Person.password_hash)).one()
    assert kept != weak
    assert verify(kept, PASSWORD)
    assert not needs_new_hash(kept)
    assert enter("Mira Voss").status_code == 201


@pytest.mark.parametrize(
    ("body", "pointer"),
    [
        ('{"name": "Mira Voss"}', "/password"),
        ('{"name": "Mira Voss", "password": NaN}', "/password"),
        ('{"name": "Mira Voss", "password": 123456789012}', "/password"),
        ('{"name": "Mira Voss", "password": ""}', "/password"),
        ('{"name": "Mira Voss", "password": null}', "/password"),
        ('{"name": 7, "password": "an invented one"}', "/name"),
        ('{"name": "Mira\\u0000Voss", "password": "an invented one"}', "/name"),
        ('{"name": "Mira Voss", "password": "an invented one", "remember": true}', "/remember"),
    ],
)
def test_a_bad_sign_in_body_is_refused_by_its_field(
    client: TestClient, body: str, pointer: str
) -> None:
    headers = {"Content-Type": "application/json"}
    answer = client.post("/api/v1/sign-ins", content=body, headers=headers)
    assert answer.status_code == 422
    assert answer.json()["pointer"] == pointer
    assert answer.headers["content-type"] == "application/problem+json"


@pytest.mark.parametrize("password", [123456789012, "x" * 5000])
def test_a_refusal_never_repeats_the_password(client: TestClient, password: object) -> None:
    answer = client.post("/api/v1/sign-ins", json={"name": "Mira Voss", "password": password})
    assert answer.status_code == 422
    assert str(password)[:12] not in answer.text


@pytest.mark.parametrize(
    "headers", [{"Sec-Fetch-Site": "cross-site"}, {"Origin": "http://elsewhere.invalid"}]
)
def test_a_sign_in_sent_from_another_site_is_refused(
    client: TestClient, add: AddPerson, headers: dict[str, str]
) -> None:
    add("Mira Voss")
    entry = {"name": "Mira Voss", "password": PASSWORD}
    answer = client.post("/api/v1/sign-ins", json=entry, headers=headers)
    assert answer.status_code == 403
    assert "set-cookie" not in answer.headers


def test_json_sent_as_plain_text_is_refused(client: TestClient) -> None:
    answer = client.post(
        "/api/v1/sign-ins",
        content='{"name": "Mira Voss", "password": "an invented one"}',
        headers={"Content-Type": "text/plain"},
    )
    assert answer.status_code in (415, 422)


def test_a_device_key_is_nobody_here(client: TestClient, sign_in: Enter) -> None:
    lead = sign_in(Role.LEAD)
    machine = lead.post("/api/v1/machines", json={"name": "Winder A", "top_speed_rpm": 1500.0})
    issued = lead.post(
        "/api/v1/counters/devices", json={"name": "Counter A", "machine_id": machine.json()["id"]}
    )
    headers = bearer(issued.json()["key"])
    for path in ("people/me", "people", "acts", "machines", "spools"):
        assert client.get(f"/api/v1/{path}", headers=headers).status_code == 401, path


def test_the_log_tells_of_refusals_on_one_line_and_never_the_password(
    enter: EnterByRoute, caplog: pytest.LogCaptureFixture
) -> None:
    caplog.set_level("INFO", logger="coilwright")
    enter("Nobody\nINFO signed in: somebody", WRONG)
    told = [entry.getMessage() for entry in caplog.records if "Nobody" in entry.getMessage()]
    assert len(told) == 1
    assert "\n" not in told[0]
    assert WRONG not in caplog.text
