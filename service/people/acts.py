"""What is done about people: add, change, sign in and out, and tell who somebody is."""

import hashlib
import secrets
import uuid
from collections.abc import Sequence
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session
from sqlalchemy.orm.attributes import flag_modified

from service.errors import AlreadyThere, InvalidValue, NotFound, NotSignedIn, TooManyAttempts
from service.people import rules
from service.people.models import FailedSignIn, Person, PersonRole, SignIn
from service.people.passwords import hash_password, needs_new_hash, verify
from service.storage.engine import Database
from service.storage.records import Actor, record
from service.web.access import Role

TOKEN_PREFIX = "cws_"  # noqa: S105 - a prefix, not a secret


def _hash_token(token: str) -> str:
    """SHA-256 suffices for 256 random bits."""
    return hashlib.sha256(token.encode()).hexdigest()


def find_by_name(session: Session, name: str) -> Person | None:
    """The person of that name, whatever its case and Unicode form."""
    wanted = rules.same_name(name)
    rows = session.execute(sa.select(Person.id, Person.name))
    found = next((row.id for row in rows if rules.same_name(row.name) == wanted), None)
    return session.get(Person, found) if found else None


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
    if unknown := rules.unknown_roles([str(role) for role in roles], [str(role) for role in Role]):
        raise InvalidValue(
            f"There is no role “{unknown[0]}”.",
            pointer="/roles",
            value=unknown[0],
            mend=f"Roles are {', '.join(Role)}.",
        )
    if find_by_name(session, name):
        raise AlreadyThere(
            f"There is somebody named “{name}” already.",
            pointer="/name",
            value=name,
            mend="Add a second name or a letter.",
        )
    person = Person(name=" ".join(name.split()), password_hash=password_hash, created_at=now)
    person.parts = [PersonRole(role=str(role)) for role in sorted(set(roles))]
    session.add(person)
    session.flush()
    after = {"name": person.name, "roles": person.roles}
    record(session, actor, "add person", "person", person.id, at=now, after=after)
    return person


def person_of(session: Session, person_id: uuid.UUID) -> Person:
    person = session.get(Person, person_id, with_for_update=True)
    if person is None:
        raise NotFound("There is no such person.", value=str(person_id))
    return person


def change_person(
    session: Session,
    actor: Actor,
    person: Person,
    *,
    roles: Sequence[Role] | None,
    active: bool | None,
    reason: str,
    now: datetime,
) -> None:
    """Change roles, or let somebody go: sign-ins end, and the name stays in the record."""
    before = {"roles": person.roles, "active": person.active}
    was_owner = person.active and Role.OWNER in person.roles
    new_roles = sorted(set(person.roles if roles is None else [str(role) for role in roles]))
    new_active = person.active if active is None else active
    owners = session.scalar(
        sa.select(sa.func.count())
        .select_from(Person)
        .join(PersonRole)
        .where(Person.active, PersonRole.role == Role.OWNER.value)
    )
    rules.check_owner_remains(owners or 0, was_owner, new_active and Role.OWNER in new_roles)
    kept = {part.role: part for part in person.parts}
    person.parts = [kept.get(role) or PersonRole(role=role) for role in new_roles]
    person.active = new_active
    if not new_active:
        end_all_sign_ins(session, person.id, now)
    after = {"roles": new_roles, "active": new_active}
    record(
        session, actor, "change person", "person", person.id,
        at=now, before=before, after=after, reason=reason,
    )  # fmt: skip
    # Where only roles moved the row itself is unchanged: its version must move all the same.
    flag_modified(person, "active")
    session.flush()


def set_password(
    session: Session, actor: Actor, person: Person, *, password_hash: str, now: datetime
) -> None:
    """Set a password made elsewhere; ends every sign-in of that person."""
    person.password_hash = password_hash
    end_all_sign_ins(session, person.id, now)
    record(session, actor, "set password", "person", person.id, at=now)
    session.flush()


def end_all_sign_ins(session: Session, person_id: uuid.UUID, now: datetime) -> None:
    session.execute(
        sa.update(SignIn)
        .where(SignIn.person_id == person_id, SignIn.ended_at.is_(None))
        .values(ended_at=now)
    )


def start_sign_in(
    database: Database, *, name: str, password: str, address: str, now: datetime
) -> tuple[Person, str]:
    """Sign somebody in: the person and a new token.

    Has short transactions of its own, so that the slow check holds up no other writer. Raises
    TooManyAttempts (also for the right password) and NotSignedIn.
    """
    wanted = rules.same_name(name)[:120]
    with database.read() as session:
        _check_attempts(session, wanted, address, now)
        found = find_by_name(session, name)
        person_id = found.id if found and found.active else None
        password_hash = found.password_hash if found and found.active else None
    fits = verify(password_hash, password)
    rehashed = (
        hash_password(password)
        if fits and password_hash and needs_new_hash(password_hash)
        else None
    )
    with database.write() as session:
        if not fits or person_id is None:
            session.add(FailedSignIn(name=wanted, address=address[:60], at=now))
            session.commit()
            raise NotSignedIn(
                "Name and password do not belong together.",
                mend="Check both; after some failures there is a pause of 15 minutes.",
            )
        person = person_of(session, person_id)
        if rehashed:
            person.password_hash = rehashed
        session.execute(sa.delete(FailedSignIn).where(FailedSignIn.name == wanted))
        token = TOKEN_PREFIX + secrets.token_urlsafe(32)
        session.add(
            SignIn(person_id=person.id, token_hash=_hash_token(token), started_at=now, seen_at=now)
        )
        who = Actor("person", person.id, person.name, frozenset(person.roles))
        record(session, who, "sign in", "person", person.id, at=now)
        session.commit()
        return person, token


def _check_attempts(session: Session, name: str, address: str, now: datetime) -> None:
    recent = FailedSignIn.at > now - rules.ATTEMPT_WINDOW
    count = sa.select(sa.func.count()).select_from(FailedSignIn)
    of_name = session.scalar(count.where(FailedSignIn.name == name, recent)) or 0
    of_address = session.scalar(count.where(FailedSignIn.address == address[:60], recent)) or 0
    if rules.must_wait(of_name, of_address):
        seconds = int(rules.ATTEMPT_WINDOW.total_seconds())
        raise TooManyAttempts(
            "There were too many failed attempts to sign in.",
            mend="Wait a quarter of an hour; an owner can set a new password meanwhile.",
            headers={"Retry-After": str(seconds)},
        )


def end_sign_in(session: Session, token: str, now: datetime) -> None:
    session.execute(
        sa.update(SignIn)
        .where(SignIn.token_hash == _hash_token(token), SignIn.ended_at.is_(None))
        .values(ended_at=now)
    )


def identify_person(database: Database, token: str, now: datetime) -> Actor | None:
    """Who a token belongs to, while the sign-in lasts; its use is noted once a minute at most."""
    with database.read() as session:
        row = session.execute(
            sa.select(SignIn, Person)
            .join(Person, Person.id == SignIn.person_id)
            .where(SignIn.token_hash == _hash_token(token), SignIn.ended_at.is_(None))
        ).one_or_none()
        if row is None:
            return None
        sign_in, person = row
        if not person.active or rules.is_over(sign_in.started_at, sign_in.seen_at, now):
            return None
        actor = Actor("person", person.id, person.name, frozenset(person.roles))
        stale = now - sign_in.seen_at > rules.SEEN_STEP
        sign_in_id = sign_in.id
    if stale:
        with database.write() as session:
            session.execute(sa.update(SignIn).where(SignIn.id == sign_in_id).values(seen_at=now))
            session.commit()
    return actor
