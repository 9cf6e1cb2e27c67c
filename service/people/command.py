"""Adding people from the terminal, before anybody can sign in."""

from datetime import UTC, datetime

from service.people.acts import add_person
from service.people.passwords import hash_password
from service.people.rules import check_password
from service.settings import Settings
from service.storage.engine import Database
from service.storage.migrate import migrate
from service.storage.records import COMMAND_LINE


def add_from_terminal(settings: Settings, name: str, roles: list[str], password: str) -> None:
    """Bring the database to this version and add a person to it."""
    check_password(password, "password")
    migrate(settings.url())
    password_hash = hash_password(password)
    database = Database(settings.url())
    try:
        with database.write() as session:
            add_person(
                session,
                COMMAND_LINE,
                name=name,
                password_hash=password_hash,
                roles=roles,
                now=datetime.now(UTC),
            )
            session.commit()
    finally:
        database.close()
