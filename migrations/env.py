"""Alembic's environment: uses the caller's connection, or opens one from the settings."""

from alembic import context

from service.models import Base
from service.settings import Settings
from service.storage.engine import make_engine


def run() -> None:
    connection = context.config.attributes.get("connection")
    if connection is None:
        engine = make_engine(Settings().url(), foreign_keys=False)
        with engine.connect() as opened, opened.begin():
            _configure_and_run(opened)
        return
    _configure_and_run(connection)


def _configure_and_run(connection: object) -> None:
    context.configure(
        connection=connection,  # type: ignore[arg-type]  # typed loosely by Alembic's config
        target_metadata=Base.metadata,
        render_as_batch=True,
        compare_type=True,
        compare_server_default=True,
    )
    with context.begin_transaction():
        context.run_migrations()


run()
