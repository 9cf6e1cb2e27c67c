"""Signing in and out, and whose token a request carries."""

import hashlib
import logging
import secrets
import threading
import uuid
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import datetime

import sqlalchemy as sa
import sqlalchemy.exc
from sqlalchemy.orm import Session

from service.errors import InvalidValue, NotSignedIn, TooManyAttempts, Unavailable
from service.people import rules
from service.people.models import FailedSignIn, Person, PersonRole, SignIn
from service.people.passwords import hash_password, needs_new_hash, verify
from service.storage.engine import Database
from service.storage.records import Actor, record

TOKEN_PREFIX = "cws_"  # noqa: S105 - a prefix, not a secret
# Fewer than the threads that carry the routes: sign-ins wait for a hash and for the writer, and
# whoever holds the writer needs a thread to finish.
UNDER_WAY_AT_ONCE = 16
_LONGEST_KEPT_NAME = 120
_LONGEST_ADDRESS = 60
_ADVISORY_LOCK = 727403  # queues the counting of attempts among processes on PostgreSQL

log = logging.getLogger("coilwright.people")
_under_way = threading.BoundedSemaphore(UNDER_WAY_AT_ONCE)
_noting = threading.Lock()


@dataclass(frozen=True)
class _Known:
    """An active person whose name was given."""

    person_id: uuid.UUID
    password_hash: str


def _hash_token(token: str) -> str:
    """SHA-256 suffices for 256 random bits."""
    return hashlib.sha256(token.encode()).hexdigest()


def start_sign_in(
    database: Database,
    *,
    name: str,
    password: str,
    address: str,
    now: datetime,
    replaces: str = "",
) -> tuple[Person, str]:
    """Sign somebody in: the person and a new token.

    Has short transactions of its own, so that the slow check holds up no other writer. The
    sign-in of the token ``replaces``, which the caller still carries, ends. Raises NotSignedIn,
    TooManyAttempts (also for the right password), and Unavailable where too many sign in at once.
    """
    with _place():
        known = _prove(database, name=name, password=password, address=address, now=now)
        if known is None:
            raise _not_signed_in()
        stored = known.password_hash
        fresh = hash_password(password) if needs_new_hash(stored) else stored
        with database.write() as session:
            person = session.get(Person, known.person_id, with_for_update=True)
            if person is None or not person.active or person.password_hash != stored:
                raise _not_signed_in()  # left, or took another password, in this very moment
            person.password_hash = fresh
            forgive(session, person.name)
            if replaces:
                end_sign_in(session, replaces, now)
            token = TOKEN_PREFIX + secrets.token_urlsafe(32)
            session.add(
                SignIn(
                    person_id=person.id, token_hash=_hash_token(token), started_at=now, seen_at=now
                )
            )
            who = Actor("person", person.id, person.name, frozenset(person.roles))
            record(session, who, "sign in", "person", person.id, at=now)
            session.commit()
    return person, token


def prove_own_password(
    database: Database, *, name: str, password: str, address: str, now: datetime, pointer: str
) -> None:
    """Refuse unless the password is that of the person of this name.

    Counts like a sign-in, so that a stolen cookie gives no more guesses than the sign-in page.
    """
    with _place():
        if not _prove(database, name=name, password=password, address=address, now=now):
            raise InvalidValue(
                "The present password does not fit.",
                pointer=pointer,
                mend="Type the password that you signed in with.",
            )
        with database.write() as session:
            forgive(session, name)
            session.commit()


@contextmanager
def _place() -> Iterator[None]:
    if not _under_way.acquire(blocking=False):
        raise Unavailable(
            "Too many people sign in at this moment.",
            mend="Try again in a moment.",
            headers={"Retry-After": "1"},
        )
    try:
        yield
    finally:
        _under_way.release()


def _prove(
    database: Database, *, name: str, password: str, address: str, now: datetime
) -> _Known | None:
    """Whose password it is. Counted as failed before it is tried, so that of many guesses at once
    none slips by the limit; a success takes the count back.
    """
    with database.write() as session:
        _count_attempt(session, name, address[:_LONGEST_ADDRESS], now)
        known = _find(session, name)
        session.commit()
    if verify(known.password_hash if known else None, password):
        return known
    log.warning("refused to sign in: %r from %r", name, address)
    return None


def _find(session: Session, name: str) -> _Known | None:
    """Compared here: the two databases fold letters beyond ASCII in ways of their own."""
    wanted = rules.same_name(name)
    rows = session.execute(
        sa.select(Person.id, Person.name, Person.password_hash).where(Person.active)
    )
    return next(
        (_Known(row.id, row.password_hash) for row in rows if rules.same_name(row.name) == wanted),
        None,
    )


def _count_attempt(session: Session, name: str, address: str, now: datetime) -> None:
    if session.get_bind().dialect.name == "postgresql":
        session.execute(sa.text("SELECT pg_advisory_xact_lock(:key)"), {"key": _ADVISORY_LOCK})
    since = now - rules.ATTEMPT_WINDOW
    session.execute(sa.delete(FailedSignIn).where(FailedSignIn.at <= since))
    of_name = _failures(session, FailedSignIn.name == _kept(name))
    of_address = _failures(session, FailedSignIn.address == address)
    wait = max(
        rules.seconds_to_wait(of_name, rules.ATTEMPTS_PER_NAME, now),
        rules.seconds_to_wait(of_address, rules.ATTEMPTS_PER_ADDRESS, now),
    )
    if wait:
        log.warning("too many attempts to sign in: %r from %r", name, address)
        raise TooManyAttempts(
            "There were too many failed attempts to sign in.",
            mend=f"Wait {wait} seconds; an owner can set a new password meanwhile.",
            headers={"Retry-After": str(wait)},
        )
    session.add(FailedSignIn(name=_kept(name), address=address, at=now))


def _failures(session: Session, which: sa.ColumnElement[bool]) -> Sequence[datetime]:
    return session.scalars(
        sa.select(FailedSignIn.at).where(which).order_by(FailedSignIn.at.desc())
    ).all()


def _kept(name: str) -> str:
    return rules.same_name(name)[:_LONGEST_KEPT_NAME]


def forgive(session: Session, name: str) -> None:
    """Forget the failures of a name whose password was shown, or was set anew."""
    session.execute(sa.delete(FailedSignIn).where(FailedSignIn.name == _kept(name)))


def _not_signed_in() -> NotSignedIn:
    return NotSignedIn(
        "Name and password do not belong together.",
        mend="Check both; after some failures there is a pause of 15 minutes.",
    )


def end_sign_in(session: Session, token: str, now: datetime) -> None:
    session.execute(
        sa.update(SignIn)
        .where(SignIn.token_hash == _hash_token(token), SignIn.ended_at.is_(None))
        .values(ended_at=now)
    )


def end_all_sign_ins(session: Session, person_id: uuid.UUID, now: datetime) -> None:
    session.execute(
        sa.update(SignIn)
        .where(SignIn.person_id == person_id, SignIn.ended_at.is_(None))
        .values(ended_at=now)
    )


def identify_person(database: Database, token: str, now: datetime) -> Actor | None:
    """Who a token belongs to, while the sign-in lasts; its use is noted once a minute at most."""
    if not token.startswith(TOKEN_PREFIX):
        return None
    # On PostgreSQL the primary is asked: a replica may lag behind a sign-out.
    with database.read() if database.is_sqlite else database.write() as session:
        rows = session.execute(
            sa.select(
                SignIn.id.label("sign_in_id"),
                SignIn.started_at,
                SignIn.seen_at,
                Person.id,
                Person.name,
                PersonRole.role,
            )
            .join(Person, Person.id == SignIn.person_id)
            .outerjoin(PersonRole, PersonRole.person_id == Person.id)
            .where(
                SignIn.token_hash == _hash_token(token), SignIn.ended_at.is_(None), Person.active
            )
        ).all()
    if not rows or rules.is_over(rows[0].started_at, rows[0].seen_at, now):
        return None
    if now - rows[0].seen_at > rules.SEEN_STEP:
        _note_seen(database, rows[0].sign_in_id, now)
    roles = frozenset(row.role for row in rows if row.role)
    return Actor("person", rows[0].id, rows[0].name, roles)


def _note_seen(database: Database, sign_in_id: uuid.UUID, now: datetime) -> None:
    """Note that a sign-in is in use, unless another is being noted right now.

    One thread at most waits here for the writer, so that after a break the tablets that all wake
    at once do not take every thread; who is passed over is noted at the next request. Where
    nothing can be written, reading goes on.
    """
    if not _noting.acquire(blocking=False):
        return
    try:
        with database.write() as session:
            session.execute(
                sa.update(SignIn)
                .where(SignIn.id == sign_in_id, SignIn.seen_at < now)
                .values(seen_at=now)
            )
            session.commit()
    except sqlalchemy.exc.OperationalError as error:
        log.warning("could not note that a sign-in is in use: %s", error.orig)
    finally:
        _noting.release()
