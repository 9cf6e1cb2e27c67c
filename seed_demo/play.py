"""Play the whole job in the invented workshop, over the REST interface, and show its coils."""

import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import uvicorn
from rich.console import Console

from seed_demo.job import Job
from seed_demo.table import coils_table
from seed_demo.workshop import LEAD, OWNER, PASSWORD, PEOPLE, SHOP
from service.app import create_app
from service.errors import SetupError
from service.people.command import add_from_terminal
from service.settings import Settings
from service.storage.engine import Database
from service.storage.migrate import migrate

_START_SECONDS = 20.0


def run_demo(data_folder: Path, *, serve: bool, port: int | None) -> None:
    """Migrate, play once, print the table; then serve until Ctrl-C if asked to."""
    console = Console(highlight=False)
    settings = Settings(data_folder=data_folder, database_url=None)
    settings = settings.model_copy(
        update={
            "database_url": None,
            "host": "127.0.0.1",
            "port": (settings.port if port is None else port) if serve else 0,
        }
    )
    migrate(settings.url())
    console.print(f"[bold]{SHOP['name']}[/bold]: everybody and everything here is invented.")
    fresh = _is_empty(settings)
    if fresh:
        add_from_terminal(settings, OWNER, ["owner"], PASSWORD)
    with _served(settings) as address:
        if fresh:
            Job(address, console).play()
        else:
            console.print(f"The workshop is there already, in {data_folder}; it is kept.")
        console.print(coils_table(address))
        if serve:
            _invite(console, address)
            _wait()


def _is_empty(settings: Settings) -> bool:
    from sqlalchemy import func, select  # noqa: PLC0415 - one count, and only here

    from service.people.models import Person  # noqa: PLC0415

    database = Database(settings.url())
    try:
        with database.read() as session:
            return not session.scalar(select(func.count()).select_from(Person))
    finally:
        database.close()


@contextmanager
def _served(settings: Settings) -> Iterator[str]:
    """The service on a real port, in a thread of its own."""
    config = uvicorn.Config(
        create_app(settings),
        host=settings.host,
        port=settings.port,
        log_level="warning",
        timeout_graceful_shutdown=3,
    )
    server = uvicorn.Server(config)
    thread = threading.Thread(target=server.run, name="service", daemon=True)
    thread.start()
    deadline = time.monotonic() + _START_SECONDS
    while not server.started:
        if not thread.is_alive() or time.monotonic() > deadline:
            raise SetupError(
                f"The service could not start on port {settings.port}.",
                pointer="--port",
                mend="Choose a free port with --port.",
            )
        time.sleep(0.02)
    host, number = server.servers[0].sockets[0].getsockname()[:2]
    try:
        yield f"http://{host}:{number}"
    finally:
        server.should_exit = True
        thread.join(10)


def _invite(console: Console, address: str) -> None:
    console.print(f"\nThe workshop is served at [bold]{address}[/bold]")
    console.print(f"Sign in with the password “{PASSWORD}” as:")
    for name, roles in PEOPLE.items():
        console.print(f"  {name:<12} {', '.join(roles)}")
    console.print(f"{LEAD} may do everything on the floor. Ctrl-C ends it; the data stay.")


def _wait() -> None:
    try:
        while True:
            time.sleep(3600)
    except KeyboardInterrupt:
        return
