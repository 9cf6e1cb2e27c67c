"""What is done about people: add, change, set passwords, and sign in and out."""

import uuid
from collections.abc import Sequence
from datetime import datetime
from typing import Any

import sqlalchemy as sa
from sqlalchemy.orm import Session
from sqlalchemy.orm.attributes import flag_modified

from service.errors import AlreadyThere, NotFound
from service.people import rules
from service.people.models import Person, PersonRole
from service.people.sign_ins import (
    end_all_sign_ins,
    end_sign_in,
    forgive,
    identify_person,
    prove_own_password,
    start_sign_in,
)
from service.storage.records import Actor, record
from service.web.access import Role

__all__ = [
    "add_person",
    "change_person",
    "end_sign_in",
    "identify_person",
    "person_of",
    "prove_own_password",
    "set_password",
    "shown_person",
    "start_sign_in",
]

_ROLES = [role.value for role in Role]
_ADVISORY_LOCK = 727404  # queues on PostgreSQL the changes by which an owner may leave


def add_person(
    session: Session,
    actor: Actor,
    *,
    name: str,
    password_hash: str,
    roles: Sequence[Role | str],
    now: datetime,
) -> Person:
    """A person who may sign in. Hash the password before the transaction: hashing is slow."""
    kept = rules.check_name(name)
    wanted = rules.check_roles(roles, _ROLES)
    _refuse_same_name(session, kept)
    person = Person(name=kept, password_hash=password_hash, created_at=now)
    person.parts = [PersonRole(role=role) for role in wanted]
    session.add(person)
    session.flush()
    after = {"name": kept, "roles": wanted}
    record(session, actor, "add person", "person", person.id, at=now, after=after)
    return person


def _refuse_same_name(session: Session, name: str, own_id: uuid.UUID | None = None) -> None:
    wanted = rules.same_name(name)
    for row in session.execute(sa.select(Person.id, Person.name)):
        if row.id != own_id and rules.same_name(row.name) == wanted:
            raise AlreadyThere(
                f"There is somebody named “{row.name}” already.",
                pointer="/name",
                value=name,
                mend="Add a second name or a letter; names of who left stay taken.",
            )


def shown_person(session: Session, person_id: uuid.UUID) -> Person:
    """The person, to be read only."""
    person = session.get(Person, person_id)
    if person is None:
        raise NotFound("There is no such person.", value=str(person_id))
    return person


def person_of(session: Session, person_id: uuid.UUID) -> Person:
    """The person, held until the end of the transaction."""
    person = session.get(Person, person_id, with_for_update=True)
    if person is None:
        raise NotFound("There is no such person.", value=str(person_id))
    return person


def change_person(
    session: Session,
    actor: Actor,
    person: Person,
    *,
    roles: Sequence[Role | str] | None,
    active: bool | None,
    reason: str,
    now: datetime,
    name: str | None = None,
) -> None:
    """Change a name or roles, or let somebody go: sign-ins end, and the name stays in the record.

    What is None stays. Raises WrongState where no owner would be left.
    """
    wanted: dict[str, Any] = {}
    if name is not None:
        wanted["name"] = rules.check_name(name)
        _refuse_same_name(session, wanted["name"], person.id)
    if roles is not None:
        wanted["roles"] = rules.check_roles(roles, _ROLES)
    if active is not None:
        wanted["active"] = active
    after = {field: value for field, value in wanted.items() if getattr(person, field) != value}
    if not after:
        return
    before = {field: getattr(person, field) for field in after}
    if not after.get("active", True) or Role.OWNER not in after.get("roles", [Role.OWNER]):
        rules.check_owner_remains(_active_owners(session), person.id)
    if "roles" in after:
        kept = {part.role: part for part in person.parts}
        person.parts = [kept.get(role) or PersonRole(role=role) for role in after["roles"]]
    person.name = after.get("name", person.name)
    person.active = after.get("active", person.active)
    # Where only roles moved the row itself is unchanged: its version must move all the same.
    flag_modified(person, "active")
    session.flush()
    if not person.active:
        end_all_sign_ins(session, person.id, now)
    record(
        session, actor, "change person", "person", person.id,
        at=now, before=before, after=after, reason=reason,
    )  # fmt: skip


def _active_owners(session: Session) -> set[uuid.UUID]:
    """Asked one after the other, so that two owners cannot both leave as the last but one."""
    if session.get_bind().dialect.name == "postgresql":
        session.execute(sa.text("SELECT pg_advisory_xact_lock(:key)"), {"key": _ADVISORY_LOCK})
    return set(
        session.scalars(
            sa.select(PersonRole.person_id)
            .join(Person, Person.id == PersonRole.person_id)
            .where(Person.active, PersonRole.role == Role.OWNER.value)
        )
    )


def set_password(
    session: Session, actor: Actor, person: Person, *, password_hash: str, now: datetime
) -> None:
    """Set a password made elsewhere; ends every sign-in of that person, and any pause."""
    person.password_hash = password_hash
    end_all_sign_ins(session, person.id, now)
    forgive(session, person.name)
    session.flush()
    record(session, actor, "set password", "person", person.id, at=now)
