"""Alembic is the only maker of the schema, and models and migrations agree."""

import re
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest
import sqlalchemy as sa
from alembic import command
from alembic.script import ScriptDirectory

from service.errors import SetupError
from service.models import Base
from service.storage.engine import make_engine
from service.storage.migrate import alembic_config, is_current, migrate


@pytest.fixture
def engine(fresh_database_url: str) -> Iterator[sa.Engine]:
    engine = make_engine(fresh_database_url, foreign_keys=False)
    yield engine
    engine.dispose()


def revisions() -> list[str]:
    script = ScriptDirectory.from_config(alembic_config())
    return [revision.revision for revision in reversed(list(script.walk_revisions()))]


def test_models_and_migrations_agree(engine: sa.Engine) -> None:
    with engine.connect() as connection, connection.begin():
        command.check(alembic_config(connection))


def test_every_revision_goes_up_and_down_and_up(engine: sa.Engine) -> None:
    with engine.connect() as connection, connection.begin():
        config = alembic_config(connection)
        command.downgrade(config, "base")
        for revision in revisions():
            command.upgrade(config, revision)
            command.downgrade(config, "-1")
            command.upgrade(config, revision)
        command.check(config)
        command.downgrade(config, "base")
        left = set(sa.inspect(connection).get_table_names()) - {"alembic_version"}
        assert left == set()


def parts_of(statement: str) -> list[str]:
    """The parts of a CREATE TABLE, sorted: a column added later stands last when migrated."""
    inside = statement[statement.index("(") + 1 : statement.rindex(")")]
    flat = re.sub(r"\s+", " ", inside.replace('"', ""))
    return sorted(part.strip().rstrip(",") for part in re.split(r",(?![^(]*\))", flat))


def named(connection: sa.Connection, query: str) -> dict[str, str]:
    return {row[0]: row[1] for row in connection.execute(sa.text(query))}


def test_the_migrated_tables_carry_every_constraint_of_the_models(
    tmp_path: Path, sqlite_template: Path
) -> None:
    # Alembic's own comparison does not see a CHECK constraint that is missing.
    made = make_engine(f"sqlite:///{tmp_path / 'made.db'}")
    Base.metadata.create_all(made)
    migrated = make_engine(f"sqlite:///{sqlite_template}")
    query = "SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL AND name NOT LIKE 'alembic%'"
    with made.connect() as connection:
        wanted = named(connection, query)
    with migrated.connect() as connection:
        found = named(connection, query)
    assert set(found) == set(wanted)
    for name, statement in wanted.items():
        assert parts_of(found[name]) == parts_of(statement), name
        assert statement.rstrip().endswith("STRICT") == found[name].rstrip().endswith("STRICT")
    made.dispose()
    migrated.dispose()


def test_a_database_of_a_newer_program_is_refused_and_left_alone(
    fresh_database_url: str, engine: sa.Engine
) -> None:
    with engine.connect() as connection, connection.begin():
        connection.execute(sa.text("UPDATE alembic_version SET version_num = 'from_the_future'"))
    with pytest.raises(SetupError, match="not known to this version"):
        migrate(fresh_database_url)
    with engine.connect() as connection:
        assert (
            connection.scalar(sa.text("SELECT version_num FROM alembic_version"))
            == "from_the_future"
        )


def test_two_processes_that_migrate_at_once_both_end_at_the_newest(tmp_path: Path) -> None:
    url = f"sqlite:///{tmp_path / 'race.db'}"
    code = f"from service.storage.migrate import migrate; migrate({url!r})"
    racers = [subprocess.Popen([sys.executable, "-c", code]) for _ in range(2)]
    assert [racer.wait(60) for racer in racers] == [0, 0]
    engine = make_engine(url)
    assert is_current(engine)
    engine.dispose()


def test_migrating_again_changes_nothing(fresh_database_url: str) -> None:
    migrate(fresh_database_url)
    engine = make_engine(fresh_database_url)
    assert is_current(engine)
    engine.dispose()
