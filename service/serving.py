"""Start the server: migrate, then listen."""

import typer
import uvicorn

from service.app import create_app
from service.settings import Settings
from service.storage.migrate import migrate


def serve_forever(settings: Settings) -> None:
    """Serve until stopped. One process: on SQLite it is the only writer."""
    migrate(settings.url())
    typer.echo(f"Coilwright listens on http://{settings.host}:{settings.port}")
    uvicorn.run(
        create_app(settings),
        host=settings.host,
        port=settings.port,
        log_level="warning",
        timeout_graceful_shutdown=5,
    )
