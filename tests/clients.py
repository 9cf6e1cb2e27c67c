"""Fixtures of the running app and of clients signed in with a role."""

import hashlib
import secrets
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient
from sqlalchemy.orm import Session

from service.app import create_app
from service.people.acts import add_person
from service.people.models import SignIn
from service.people.passwords import hash_password
from service.settings import Settings
from service.shop.acts import ensure_workshop
from service.storage.engine import Database
from service.storage.records import COMMAND_LINE, Actor
from service.web.access import Role

PASSWORD = "invented-password-1"


@pytest.fixture
def settings(database_url: str, tmp_path: Path) -> Settings:
    return Settings(database_url=database_url, data_folder=tmp_path / "data")


@pytest.fixture
def app(settings: Settings) -> FastAPI:
    return create_app(settings)


@pytest.fixture
def client(app: FastAPI) -> Iterator[TestClient]:
    """A client that nobody has signed in; also starts and stops the app."""
    with TestClient(app, base_url="http://testserver", raise_server_exceptions=False) as client:
        yield client


@pytest.fixture
def database(client: TestClient) -> Database:
    """The running app's database."""
    found: Database = client.app.state.database  # type: ignore[attr-defined]  # typed as a bare ASGI app
    return found


@pytest.fixture
def session(database: Database) -> Iterator[Session]:
    """A write session on the running app's database. It holds SQLite's one writer: do not call
    writing routes while it is open in a transaction; commit it first."""
    with database.write() as session:
        yield session


@pytest.fixture
def now() -> datetime:
    return datetime(2026, 11, 17, 9, 30, tzinfo=UTC)


@pytest.fixture
def lead_actor() -> Actor:
    return Actor("person", None, "Invented Lead", frozenset(role.value for role in Role))


Enter = Callable[..., TestClient]


@pytest.fixture(scope="session")
def password_hash() -> str:
    """One hash for the whole run: hashing is slow on purpose."""
    return hash_password(PASSWORD)


@pytest.fixture
def sign_in(app: FastAPI, client: TestClient, database: Database, password_hash: str) -> Enter:
    """Makes a person with the given roles and returns a client signed in as that person.

    The sign-in row is made directly: the sign-in route has tests of its own, and costs a hash.
    """

    def enter(*roles: Role, name: str | None = None) -> TestClient:
        token = "cws_" + secrets.token_urlsafe(32)
        now = datetime.now(UTC)
        with database.write() as session:
            ensure_workshop(session, now)
            person = add_person(
                session,
                COMMAND_LINE,
                name=name or f"Invented {' '.join(roles).title()}",
                password_hash=password_hash,
                roles=list(roles),
                now=now,
            )
            session.add(
                SignIn(
                    person_id=person.id,
                    token_hash=hashlib.sha256(token.encode()).hexdigest(),
                    started_at=now,
                    seen_at=now,
                )
            )
            session.commit()
        signed_in = TestClient(app, base_url="http://testserver", raise_server_exceptions=False)
        # Shares the running app and its event loop instead of starting it a second time.
        signed_in.portal = client.portal
        signed_in.cookies.set("coilwright", token)
        return signed_in

    return enter


@pytest.fixture
def as_operator(sign_in: Enter) -> TestClient:
    return sign_in(Role.OPERATOR)


@pytest.fixture
def as_bench(sign_in: Enter) -> TestClient:
    return sign_in(Role.BENCH)


@pytest.fixture
def as_lead(sign_in: Enter) -> TestClient:
    return sign_in(Role.LEAD)


@pytest.fixture
def as_owner(sign_in: Enter) -> TestClient:
    return sign_in(Role.OWNER)


@pytest.fixture
def as_auditor(sign_in: Enter) -> TestClient:
    return sign_in(Role.AUDITOR)
