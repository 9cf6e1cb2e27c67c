"""Recipes over HTTP: drafts, release, differences, predictions."""

import json
from concurrent.futures import ThreadPoolExecutor
from copy import deepcopy
from typing import Any
from uuid import UUID

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient
from httpx import Response
from sqlalchemy.orm.exc import StaleDataError

from service.recipes.models import Revision
from service.recipes.prediction import predict
from service.storage.engine import Database
from service.storage.records import Act, verify
from tests.recipes.bodies import example, recipe

NOWHERE = "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f"


def create(lead: TestClient, name: str = "Harbour neck", **changes: Any) -> dict[str, Any]:
    body = {"name": name, "kind": "pickup", "body": example(**changes), "note": "Invented."}
    answer = lead.post("/api/v1/recipes", json=body)
    assert answer.status_code == 201, answer.text
    made: dict[str, Any] = answer.json()
    assert answer.headers["location"] == f"/api/v1/revisions/{made['id']}"
    assert answer.headers["etag"] == '"1"'
    return made


def change(
    lead: TestClient, revision: dict[str, Any], seen: str | None, **changes: Any
) -> Response:
    answer: Response = lead.put(
        f"/api/v1/revisions/{revision['id']}",
        json={"body": example(**changes), "note": "Changed."},
        headers={"If-Match": seen} if seen else {},
    )
    return answer


def release(lead: TestClient, revision: dict[str, Any], **body: Any) -> Response:
    answer: Response = lead.post(f"/api/v1/revisions/{revision['id']}/release", json=body)
    return answer


def revise(lead: TestClient, recipe_id: str, **changes: Any) -> dict[str, Any]:
    answer = lead.post(f"/api/v1/recipes/{recipe_id}/revisions", json={"body": example(**changes)})
    assert answer.status_code == 201, answer.text
    made: dict[str, Any] = answer.json()
    return made


def test_a_recipe_begins_with_a_draft(as_lead: TestClient) -> None:
    made = create(as_lead)
    assert (made["number"], made["state"], made["version"]) == (1, "draft", 1)
    assert made["expectation"] is None
    assert made["limits"] == []
    assert made["body"]["turns"] == 7600
    # Defaults are written out, so that a later default changes no recipe.
    assert made["body"]["former_slit"] is False
    shown = as_lead.get(f"/api/v1/revisions/{made['id']}")
    assert shown.json() == made


def test_a_name_is_taken_once_also_in_its_other_spelling(as_lead: TestClient) -> None:
    create(as_lead, "Caf\u00e9")
    again = as_lead.post("/api/v1/recipes", json={"name": "Cafe\u0301", "body": example()})
    assert again.status_code == 409
    assert again.json()["pointer"] == "/name"


def test_a_draft_is_changed_by_who_has_seen_it(as_lead: TestClient) -> None:
    made = create(as_lead)
    assert change(as_lead, made, None).status_code == 428
    changed = change(as_lead, made, '"1"', turns=7500)
    assert changed.status_code == 200
    assert changed.headers["etag"] == '"2"'
    assert changed.json()["body"]["turns"] == 7500
    stale = change(as_lead, made, '"1"', turns=7400)
    assert stale.status_code == 412
    assert stale.json()["current"] == '"2"'
    assert as_lead.get(f"/api/v1/revisions/{made['id']}").json()["body"]["turns"] == 7500


def test_release_freezes_expectation_and_limits(as_lead: TestClient) -> None:
    made = create(as_lead)
    answer = release(as_lead, made)
    assert answer.status_code == 200, answer.text
    released = answer.json()
    expected = predict(recipe())
    assert released["state"] == "released"
    assert released["released_by"] == "Invented Lead"
    assert released["expectation"]["kernel_version"] == expected.kernel_version
    assert released["expectation"]["resistance_ohm"]["value"] == expected.resistance_ohm.value
    limits = {(one["stage"], one["characteristic"]): one for one in released["limits"]}
    assert len(limits) == 6
    nominal = expected.resistance_at_20_c_ohm.value
    assert limits["raw", "resistance"]["lower"] == pytest.approx(0.95 * nominal)
    assert as_lead.get(f"/api/v1/revisions/{made['id']}").json() == released


def test_a_coil_that_does_not_fit_is_not_released(as_lead: TestClient) -> None:
    made = create(as_lead, turns=15_000)
    refused = release(as_lead, made)
    assert refused.status_code == 422
    problem = refused.json()
    assert problem["pointer"] == "/turns"
    assert problem["value"] == 15_000
    assert "At most about" in problem["mend"]
    assert problem["turns_that_fit"] < 15_000
    kept = as_lead.get(f"/api/v1/revisions/{made['id']}").json()
    assert (kept["state"], kept["limits"], kept["expectation"]) == ("draft", [], None)


def test_parts_that_do_not_fit_together_are_told_at_release(as_lead: TestClient) -> None:
    made = create(as_lead, layers=4)
    refused = release(as_lead, made)
    assert refused.status_code == 422
    assert refused.json()["pointer"] == "/layers"


def test_a_released_revision_never_changes(as_lead: TestClient) -> None:
    made = create(as_lead)
    released = release(as_lead, made).json()
    for seen in (f'"{released["version"]}"', '"1"', "*"):
        refused = change(as_lead, made, seen, turns=1)
        assert refused.status_code == 409
        assert refused.json()["type"].endswith("wrong-state")
    assert release(as_lead, made).status_code == 409
    assert as_lead.get(f"/api/v1/revisions/{made['id']}").json() == released


def test_an_edit_that_read_the_draft_before_its_release_is_lost(
    as_lead: TestClient, database: Database
) -> None:
    made = create(as_lead)
    with database.read() as session:
        seen = session.get(Revision, UUID(made["id"]))
        assert seen is not None
        session.expunge(seen)
    release(as_lead, made)
    with database.write() as session:
        session.add(seen)
        seen.note = "Written over."
        with pytest.raises(StaleDataError):
            session.flush()


def test_the_next_revision_retires_the_one_before_unless_told_not_to(as_lead: TestClient) -> None:
    first = create(as_lead)
    release(as_lead, first)
    second = revise(as_lead, first["recipe_id"], turns=7500)
    assert second["number"] == 2
    release(as_lead, second)
    before = as_lead.get(f"/api/v1/revisions/{first['id']}").json()
    assert before["state"] == "retired"
    assert before["retired_at"] is not None
    assert before["body"] == first["body"]
    third = revise(as_lead, first["recipe_id"], turns=7400)
    release(as_lead, third, retire_previous=False)
    states = as_lead.get(f"/api/v1/recipes/{first['recipe_id']}").json()["revisions"]
    assert [(one["number"], one["state"]) for one in states] == [
        (3, "released"),
        (2, "released"),
        (1, "retired"),
    ]


def test_a_revision_is_retired_with_a_reason(as_lead: TestClient) -> None:
    made = create(as_lead)
    path = f"/api/v1/revisions/{made['id']}/retire"
    assert as_lead.post(path, json={"reason": "Not yet."}).status_code == 409
    release(as_lead, made)
    assert as_lead.post(path, json={}).status_code == 422
    retired = as_lead.post(path, json={"reason": "The wire is not made any more."})
    assert (retired.status_code, retired.json()["state"]) == (200, "retired")


def test_the_difference_of_two_revisions_is_told_field_by_field(as_lead: TestClient) -> None:
    first = create(as_lead)
    second = revise(as_lead, first["recipe_id"], turns=7500, wire={"build": "heavy"})
    answer = as_lead.get(
        f"/api/v1/revisions/{second['id']}/difference", params={"against": first["id"]}
    ).json()
    assert (answer["against"]["number"], answer["revision"]["number"]) == (1, 2)
    assert answer["differences"] == [
        {"pointer": "/wire/build", "before": "single", "after": "heavy"},
        {"pointer": "/turns", "before": 7600, "after": 7500},
    ]
    missing = as_lead.get(f"/api/v1/revisions/{second['id']}/difference?against={NOWHERE}")
    assert (missing.status_code, missing.json()["pointer"]) == (404, "against")


def test_recipes_are_listed_with_their_released_revision(
    as_auditor: TestClient, as_lead: TestClient
) -> None:
    first = create(as_lead, "One")
    release(as_lead, first)
    revise(as_lead, first["recipe_id"], turns=7500)
    create(as_lead, "Two")
    create(as_lead, "Three")
    page = as_auditor.get("/api/v1/recipes", params={"limit": 2})
    assert [one["name"] for one in page.json()] == ["Three", "Two"]
    assert page.json()[0]["released"] is None
    rest = as_auditor.get(page.headers["link"].split(">")[0].strip("<"))
    assert [one["name"] for one in rest.json()] == ["One"]
    assert rest.json()[0]["released"]["number"] == 1
    assert rest.json()[0]["draft"]["number"] == 2
    assert "link" not in rest.headers


def test_a_prediction_is_for_everybody_and_stores_nothing(
    as_operator: TestClient, client: TestClient, database: Database
) -> None:
    answer = as_operator.post("/api/v1/predictions", json=example())
    assert answer.status_code == 200
    expected = predict(recipe())
    assert answer.json() == expected.model_dump(mode="json")
    assert client.post("/api/v1/predictions", json=example()).status_code == 401
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(Revision)) == 0


def test_recipes_are_made_by_leads_only(
    as_operator: TestClient, as_bench: TestClient, as_auditor: TestClient, as_owner: TestClient
) -> None:
    body = {"name": "x", "body": example()}
    for client in (as_operator, as_bench, as_auditor, as_owner):
        assert client.post("/api/v1/recipes", json=body).status_code == 403
        assert client.get("/api/v1/recipes").status_code == 200


def test_every_change_is_an_act_in_the_chain(as_lead: TestClient, database: Database) -> None:
    made = create(as_lead)
    change(as_lead, made, '"1"', turns=7500)
    release(as_lead, made)
    release(as_lead, revise(as_lead, made["recipe_id"]))
    with database.read() as session:
        verbs = session.scalars(
            sa.select(Act.verb)
            .where(Act.subject_kind.in_(["recipe", "revision"]))
            .order_by(Act.position)
        ).all()
        held, broken = verify(session)
    assert list(verbs) == [
        "create recipe",
        "draft revision",
        "change draft",
        "release revision",
        "draft revision",
        "release revision",
        "retire revision",
    ]
    assert broken is None
    assert held >= len(verbs)


def test_one_of_two_who_release_at_once_is_told_so(as_lead: TestClient) -> None:
    made = create(as_lead)
    with ThreadPoolExecutor(2) as pool:
        answers = list(pool.map(lambda _: release(as_lead, made).status_code, range(2)))
    assert sorted(answers) == [200, 409]


def without(field: str) -> dict[str, Any]:
    body = example()
    del body[field]
    return body


def within(part: str, field: str, value: Any) -> dict[str, Any]:
    body = deepcopy(example())
    body[part][field] = value
    return body


BAD_BODIES: list[tuple[Any, str]] = [
    (without("turns"), "/body/turns"),
    (example(turns=0), "/body/turns"),
    (example(turns=-7600), "/body/turns"),
    (example(turns=7600.5), "/body/turns"),
    (example(turns="7600"), "/body/turns"),
    (example(turns=True), "/body/turns"),
    (example(turns=10**9), "/body/turns"),
    (example(tunrs=1), "/body/tunrs"),
    (within("wire", "size", "AWG 99"), "/body/wire/size"),
    (within("wire", "build", "grade 1"), "/body/wire/build"),
    (within("former", "winding_height_mm", 0), "/body/former/winding_height_mm"),
    (within("former", "winding_height_mm", "11,0"), "/body/former/winding_height_mm"),
    (within("former", "winding_height_mm", None), "/body/former/winding_height_mm"),
    (within("tolerance", "resistance_percent", -5), "/body/tolerance/resistance_percent"),
    ([], "/body"),
    (None, "/body"),
]


def test_a_bad_body_is_refused_by_field(as_lead: TestClient) -> None:
    draft = create(as_lead)
    for body, pointer in BAD_BODIES:
        for refused in (
            as_lead.post("/api/v1/recipes", json={"name": "Bad", "body": body}),
            as_lead.put(
                f"/api/v1/revisions/{draft['id']}",
                json={"body": body},
                headers={"If-Match": '"1"'},
            ),
        ):
            assert (refused.status_code, refused.json()["pointer"]) == (422, pointer), body
            assert refused.json()["mend"], body
    assert as_lead.get(f"/api/v1/revisions/{draft['id']}").json() == draft


def test_a_number_that_is_none_is_refused(as_lead: TestClient) -> None:
    for number in ("NaN", "Infinity", "-Infinity", "1e400", "-0.0", "1e308"):
        text = json.dumps({"name": "Bad", "body": example(turns="HERE")})
        refused = as_lead.post(
            "/api/v1/recipes",
            content=text.replace('"HERE"', number),
            headers={"Content-Type": "application/json"},
        )
        assert (refused.status_code, refused.json()["pointer"]) == (422, "/body/turns"), number


def test_a_bad_name_is_refused(as_lead: TestClient) -> None:
    names: list[Any] = ["", "   ", "a\x00b", "x" * 121, 7, None, ["x"]]
    for name in names:
        refused = as_lead.post("/api/v1/recipes", json={"name": name, "body": example()})
        assert (refused.status_code, refused.json()["pointer"]) == (422, "/name"), name


def test_a_hostile_name_is_kept_as_text(as_lead: TestClient) -> None:
    for name in ("<script>", "'; DROP TABLE recipe; --", "=1+1", "ł ß \u0645\u0631 🧵"):
        made = create(as_lead, name)
        assert as_lead.get(f"/api/v1/recipes/{made['recipe_id']}").json()["name"] == name


def test_what_is_not_there_is_a_404(as_lead: TestClient) -> None:
    nothing = {"id": NOWHERE}
    for answer in (
        as_lead.get(f"/api/v1/recipes/{NOWHERE}"),
        as_lead.get(f"/api/v1/revisions/{NOWHERE}"),
        change(as_lead, nothing, '"1"'),
        release(as_lead, nothing),
        as_lead.post(f"/api/v1/revisions/{NOWHERE}/retire", json={"reason": "x"}),
        as_lead.post(f"/api/v1/recipes/{NOWHERE}/revisions", json={"body": example()}),
    ):
        assert answer.status_code == 404
        assert answer.json()["type"].endswith("not-found")


def test_odd_addresses_are_refused(as_lead: TestClient) -> None:
    for path in ("recipes/7", "revisions/..%2f", "recipes?limit=1000000", "recipes?after=x"):
        assert as_lead.get(f"/api/v1/{path}").status_code in (404, 422), path
