"""Bring a database to this program's schema; Alembic is the only maker of tables."""

from importlib import resources

import sqlalchemy as sa
from alembic import command
from alembic.config import Config
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from alembic.util import CommandError

from service.errors import SetupError
from service.storage.engine import make_engine

_ADVISORY_LOCK = 727401  # keeps two processes from migrating one PostgreSQL database at once


def alembic_config(connection: sa.Connection | None = None) -> Config:
    """The configuration in code, so that an installed wheel needs no file."""
    config = Config()
    config.set_main_option("script_location", str(resources.files("migrations")))
    config.set_main_option("path_separator", "os")
    if connection is not None:
        config.attributes["connection"] = connection
    return config


def migrate(url: str, revision: str = "head") -> None:
    """Upgrade to ``revision`` in one transaction: the old schema or the new, nothing between.

    Foreign keys are off on SQLite while tables are rebuilt, and proved before the commit.
    Raises SetupError where the database belongs to a newer program; nothing is written then.
    """
    engine = make_engine(url, foreign_keys=False)
    try:
        with engine.connect() as connection, connection.begin():
            if engine.dialect.name == "postgresql":
                connection.execute(
                    sa.text("SELECT pg_advisory_xact_lock(:key)"), {"key": _ADVISORY_LOCK}
                )
            try:
                command.upgrade(alembic_config(connection), revision)
            except CommandError as error:
                raise SetupError(
                    f"The database's schema is not known to this version ({error}).",
                    pointer="COILWRIGHT_DATABASE_URL",
                    mend="Run the newer version of Coilwright that made it, or restore a backup.",
                ) from error
            if (
                engine.dialect.name == "sqlite"
                and connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall()
            ):
                raise SetupError("References are broken after the migration; nothing was changed.")
    finally:
        engine.dispose()


def is_current(engine: sa.Engine) -> bool:
    """Whether the database stands at this program's newest revision."""
    head = ScriptDirectory.from_config(alembic_config()).get_current_head()
    with engine.connect() as connection:
        return MigrationContext.configure(connection).get_current_revision() == head
