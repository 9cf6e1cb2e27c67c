"""People who sign in at the real route."""

from collections.abc import Callable
from datetime import UTC, datetime

import pytest
from argon2 import PasswordHasher
from fastapi.testclient import TestClient
from httpx import Response

from service.people import passwords
from service.people.acts import add_person
from service.people.models import Person
from service.storage.engine import Database
from service.storage.records import COMMAND_LINE
from service.web.access import Role
from tests.clients import PASSWORD

REAL_HASHER = passwords._hasher
_quick = PasswordHasher(time_cost=1, memory_cost=64, parallelism=1)
_quick_hash = _quick.hash(PASSWORD)
_quick_nobody = _quick.hash("nobody")

SignIn = Callable[..., Response]
AddPerson = Callable[..., Person]


@pytest.fixture(autouse=True)
def quick_hashes(monkeypatch: pytest.MonkeyPatch) -> None:
    """Hashing is slow on purpose, and these tests hash hundreds of times."""
    monkeypatch.setattr(passwords, "_hasher", _quick)
    monkeypatch.setattr(passwords, "_NOBODY", _quick_nobody)


@pytest.fixture
def password_hash() -> str:
    return _quick_hash


@pytest.fixture
def add(database: Database, password_hash: str) -> AddPerson:
    """Adds a person whose password is PASSWORD."""

    def add_one(name: str, *roles: Role, password_hash: str = password_hash) -> Person:
        with database.write() as session:
            person = add_person(
                session,
                COMMAND_LINE,
                name=name,
                password_hash=password_hash,
                roles=list(roles) or [Role.OPERATOR],
                now=datetime.now(UTC),
            )
            session.commit()
            return person

    return add_one


@pytest.fixture
def enter(client: TestClient) -> SignIn:
    """Posts to the sign-in route and forgets the cookie."""

    def post(name: str, password: str = PASSWORD, **more: object) -> Response:
        answer: Response = client.post(
            "/api/v1/sign-ins", json={"name": name, "password": password, **more}
        )
        client.cookies.clear()
        return answer

    return post


def bearer(token: str) -> dict[str, str]:
    return {"Authorization": f"Bearer {token}"}
