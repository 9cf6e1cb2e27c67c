"""A real browser against a real server on a port of its own; skipped where there is no Chromium."""

import hashlib
import os
import secrets
import shutil
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest
import uvicorn
from playwright.sync_api import Browser, BrowserContext, Page, ViewportSize, sync_playwright

from service.app import SUBSCRIBERS, create_app
from service.people.acts import add_person
from service.people.models import SignIn
from service.settings import Settings
from service.storage.engine import Database
from service.storage.records import COMMAND_LINE
from service.web.access import Role

WIDE: ViewportSize = {"width": 1280, "height": 800}
NARROW: ViewportSize = {"width": 360, "height": 740}
# A browser notes a form that was refused, and asked back, on its console.
_REFUSED_FORM = "the server responded with a status of 422"
_START_SECONDS = 20.0


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    path = shutil.which("chromium")
    if path is None:
        if os.environ.get("CI"):
            pytest.fail("no Chromium, and CI must prove the pages in a browser")
        pytest.skip("NO CHROMIUM: install Debian's chromium to run the browser tests")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=path, args=["--no-sandbox", "--disable-dev-shm-usage"]
        )
        yield browser
        browser.close()


@contextmanager
def served(settings: Settings) -> Iterator[str]:
    """The service in a thread, on a port that was free."""
    config = uvicorn.Config(
        create_app(settings),
        port=0,
        log_level="warning",
        timeout_graceful_shutdown=1,
    )
    server = uvicorn.Server(config)
    thread = threading.Thread(target=server.run, daemon=True)
    thread.start()
    deadline = time.monotonic() + _START_SECONDS
    while not server.started:
        if not thread.is_alive() or time.monotonic() > deadline:
            raise RuntimeError("the server did not start")
        time.sleep(0.02)
    port = server.servers[0].sockets[0].getsockname()[1]
    yield f"http://127.0.0.1:{port}"
    server.should_exit = True
    thread.join(timeout=10)


@pytest.fixture
def database_file(sqlite_template: Path, tmp_path: Path) -> Path:
    file = tmp_path / "coilwright.db"
    shutil.copyfile(sqlite_template, file)
    return file


@pytest.fixture
def address(database_file: Path) -> Iterator[str]:
    settings = Settings(database_url=f"sqlite:///{database_file}")
    with served(settings) as address:
        yield address


@pytest.fixture
def store(database_file: Path, address: str) -> Iterator[Database]:
    """The database behind the server; for what a test prepares, not for what it proves."""
    assert address
    database = Database(f"sqlite:///{database_file}", subscribers=SUBSCRIBERS)
    yield database
    database.close()


Enter = Callable[..., str]


@pytest.fixture
def enter(store: Database, password_hash: str) -> Enter:
    """Adds a person with roles; the token of a sign-in that is under way."""

    def made(name: str, *roles: Role) -> str:
        token = "cws_" + secrets.token_urlsafe(32)
        now = datetime.now(UTC)
        with store.write() as session:
            person = add_person(
                session,
                COMMAND_LINE,
                name=name,
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
        return token

    return made


Open = Callable[..., Page]


@pytest.fixture
def open_page(chromium: Browser, address: str) -> Iterator[Open]:
    """Opens pages that are watched: no console error, no foreign host, no policy violation."""
    contexts: list[BrowserContext] = []
    complaints: list[str] = []

    def made(token: str | None = None, viewport: ViewportSize = WIDE, **more: Any) -> Page:
        context = chromium.new_context(
            base_url=address,
            viewport=viewport,
            has_touch=True,
            **more,
        )
        contexts.append(context)
        if token:
            context.add_cookies([{"name": "coilwright", "value": token, "url": address}])
        page = context.new_page()
        page.on(
            "console",
            lambda message: (
                complaints.append(f"{page.url}: {message.text}")
                if message.type in ("error", "warning") and _REFUSED_FORM not in message.text
                else None
            ),
        )
        page.on("pageerror", lambda error: complaints.append(f"{page.url}: {error}"))
        page.on(
            "request",
            lambda request: (
                None
                if request.url.startswith((address, "data:"))
                else complaints.append(f"{page.url} asked {request.url}")
            ),
        )
        return page

    yield made
    for context in contexts:
        context.close()
    assert not complaints
