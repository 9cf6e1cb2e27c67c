"""Every route of the service has one access rule, and reading changes nothing."""

import re
from collections.abc import Iterator
from pathlib import Path

import pytest
import sqlalchemy as sa
from fastapi.dependencies.models import Dependant
from fastapi.routing import APIRoute, iter_route_contexts
from fastapi.testclient import TestClient

from service.app import create_app
from service.models import Base
from service.settings import Settings
from service.storage.engine import Database
from service.web.access import Allow, AllowAnyone, AllowDevice
from service.web.unit import UnitRoute
from tests.runs.conftest import Floor, Hands, floor, lead

__all__ = ["Floor", "floor", "lead"]

OPEN = {
    ("GET", "/api/v1/health"),
    ("POST", "/api/v1/sign-ins"),
    ("GET", "/"),
    ("GET", "/sign-in"),
    ("POST", "/sign-in"),
    ("POST", "/sign-out"),
}
FOR_DEVICES = {("POST", "/api/v1/counters/events")}
# What is no route of ours: the interface's description, and the pages' style sheets and scripts.
PLAIN = {"/api/v1/openapi.json", "/static"}
# Answers until the reader leaves.
STREAM = "/api/v1/live/floor"

Routes = dict[tuple[str, str], APIRoute]


def all_routes() -> Iterator[tuple[str, object]]:
    app = create_app(Settings(database_url="sqlite://", data_folder=Path("not-used")))
    for context in iter_route_contexts(app.routes):
        yield str(context.path), context.original_route


def api_routes() -> Routes:
    return {
        (method, path): route
        for path, route in all_routes()
        if isinstance(route, APIRoute)
        for method in route.methods or ()
    }


def rules_of(dependant: Dependant) -> list[object]:
    found: list[object] = []
    for part in dependant.dependencies:
        if isinstance(part.call, Allow | AllowDevice | AllowAnyone):
            found.append(part.call)
        found += rules_of(part)
    return found


ROUTES = api_routes()
NAMES = [f"{method} {path}" for method, path in ROUTES]
READS = sorted(path for method, path in ROUTES if method == "GET" and "{" not in path)
GUARDED = [path for path in READS if ("GET", path) not in OPEN and path.startswith("/api/v1/")]


def test_the_walk_finds_the_service() -> None:
    assert {"/api/v1/machines", "/api/v1/people", "/api/v1/counters/waiting"} <= set(GUARDED)
    assert len(ROUTES) > 60


def test_whatever_is_no_route_of_ours_is_named_here() -> None:
    plain = {path for path, route in all_routes() if not isinstance(route, APIRoute)}
    assert {re.sub("^/static/[0-9a-f]{12}$", "/static", path) for path in plain} == PLAIN


@pytest.mark.parametrize("name", NAMES)
def test_a_route_has_one_access_rule_and_the_unit_of_work(name: str) -> None:
    method, path = name.split(" ")
    route = ROUTES[method, path]
    (rule,) = rules_of(route.dependant)
    assert isinstance(route, UnitRoute)
    assert isinstance(rule, AllowAnyone) == ((method, path) in OPEN)
    assert isinstance(rule, AllowDevice) == ((method, path) in FOR_DEVICES)


def test_a_route_that_reads_opens_no_writing() -> None:
    # A GET is not shielded against other sites, so that it must not be able to store.
    writing = [
        f"{method} {path}"
        for (method, path), route in ROUTES.items()
        if method == "GET" and "_work" in _calls(route.dependant)
    ]
    assert writing == []


def _calls(dependant: Dependant) -> set[str]:
    names = {getattr(dependant.call, "__name__", "")}
    return names.union(*(_calls(part) for part in dependant.dependencies))


def test_nobody_and_no_device_reads_what_people_may(client: TestClient, lead: Hands) -> None:
    issued = lead.client.post(
        "/api/v1/counters/devices", json={"name": "Counter A", "machine_id": lead.floor.machine_id}
    ).json()
    device = {"Authorization": f"Bearer {issued['key']}"}
    for path in GUARDED:
        nobody = client.get(path)
        assert nobody.status_code == 401, path
        assert nobody.json()["type"].endswith("not-signed-in"), path
        for headers in (device, {"Authorization": "Bearer cwd_none"}, {"Cookie": "coilwright=x"}):
            assert client.get(path, headers=headers).status_code == 401, (path, headers)


def test_every_write_refuses_who_is_not_signed_in(client: TestClient) -> None:
    tried = 0
    for method, path in ROUTES:
        if method == "GET" or (method, path) in OPEN or not path.startswith("/api/"):
            continue
        named = re.sub(r"\{[^}]+\}", "00000000-0000-0000-0000-000000000007", path)
        answer = client.request(method, named, json={})
        assert answer.status_code == 401, (method, path, answer.text)
        tried += 1
    assert tried > 20


def contents(database: Database) -> dict[str, list[tuple[object, ...]]]:
    with database.read() as session:
        return {
            table.name: sorted(map(tuple, session.execute(sa.select(table))), key=repr)
            for table in Base.metadata.sorted_tables
        }


def test_reading_changes_nothing(as_owner: TestClient, lead: Hands, database: Database) -> None:
    lead.wound()
    before = contents(database)
    for path in READS:
        if path == STREAM:
            continue
        answer = as_owner.get(path, follow_redirects=False)
        assert answer.status_code in (200, 303, 403, 422), (path, answer.text)
    assert contents(database) == before
    assert before["run"]
    assert before["spool_draw"]
