"""The record chain: every change by a person or a device is one row, hash-chained.

Each row's SHA-256 covers its own content and the hash before it, so that a row altered, taken out
or put in later shows at ``coilwright verify``.
"""

import hashlib
import json
import uuid
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

import sqlalchemy as sa
from sqlalchemy import text
from sqlalchemy.orm import Mapped, Session, mapped_column

from service.storage.types import Base, length, new_id, table_args

GENESIS = "0" * 64
_ADVISORY_LOCK = 727402  # any number that the project uses for nothing else


class Act(Base):
    """One change, with who, when, what and why."""

    __tablename__ = "act"
    __table_args__ = table_args(length("verb", 60), length("hash", 64, 64))

    position: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    id: Mapped[uuid.UUID] = mapped_column(default=new_id, unique=True)
    at: Mapped[datetime]
    actor_kind: Mapped[str]
    actor_id: Mapped[uuid.UUID | None]
    actor_name: Mapped[str]
    verb: Mapped[str]
    subject_kind: Mapped[str]
    subject_id: Mapped[str] = mapped_column(index=True)
    before: Mapped[dict[str, Any] | None]
    after: Mapped[dict[str, Any] | None]
    reason: Mapped[str | None]
    previous_hash: Mapped[str]
    hash: Mapped[str]


@dataclass(frozen=True)
class Actor:
    """Who acts: a person with roles, or a counter device."""

    kind: str  # "person" | "device" | "command line"
    id: uuid.UUID | None
    name: str
    roles: frozenset[str] = frozenset()


COMMAND_LINE = Actor("command line", None, "command line", frozenset({"owner", "lead"}))


def digest(act: Act) -> str:
    """SHA-256 over the row's content, in one fixed text form, and the hash before it."""
    content = [
        act.position,
        str(act.id),
        act.at.astimezone(UTC).isoformat(timespec="microseconds"),
        act.actor_kind,
        str(act.actor_id),
        act.actor_name,
        act.verb,
        act.subject_kind,
        act.subject_id,
        act.before,
        act.after,
        act.reason,
        act.previous_hash,
    ]
    line = json.dumps(content, sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return hashlib.sha256(line.encode()).hexdigest()


def record(
    session: Session,
    actor: Actor,
    verb: str,
    subject_kind: str,
    subject_id: object,
    *,
    at: datetime,
    before: dict[str, Any] | None = None,
    after: dict[str, Any] | None = None,
    reason: str | None = None,
) -> Act:
    """Append an act to the chain in the caller's transaction.

    On PostgreSQL an advisory lock queues the writers until commit; SQLite has one writer anyway.
    """
    if session.get_bind().dialect.name == "postgresql":
        session.execute(text("SELECT pg_advisory_xact_lock(:key)"), {"key": _ADVISORY_LOCK})
    last = session.execute(
        sa.select(Act.position, Act.hash).order_by(Act.position.desc()).limit(1)
    ).one_or_none()
    act = Act(
        position=(last.position if last else 0) + 1,
        id=new_id(),
        at=at,
        actor_kind=actor.kind,
        actor_id=actor.id,
        actor_name=actor.name,
        verb=verb,
        subject_kind=subject_kind,
        subject_id=str(subject_id),
        before=_plain(before),
        after=_plain(after),
        reason=reason,
        previous_hash=last.hash if last else GENESIS,
    )
    act.hash = digest(act)
    session.add(act)
    session.flush()
    return act


def _plain(values: dict[str, Any] | None) -> dict[str, Any] | None:
    """The values as they come back from a JSON column, so that the hash can be made again."""
    if values is None:
        return None
    plain: dict[str, Any] = json.loads(json.dumps(values, default=str, allow_nan=False))
    return plain


@dataclass(frozen=True)
class Break:
    """The first place where the chain does not hold."""

    position: int
    why: str


def verify(session: Session) -> tuple[int, Break | None]:
    """Walk the chain; the number of acts that hold, and the first break."""
    statement = sa.select(Act).order_by(Act.position).execution_options(yield_per=1000)
    rows = session.scalars(statement)
    try:
        return _walk(rows)
    finally:
        rows.close()


def _walk(acts: Iterable[Act]) -> tuple[int, Break | None]:
    held, previous = 0, GENESIS
    for act in acts:
        if act.position != held + 1:
            return held, Break(held + 1, "an act is missing")
        if act.previous_hash != previous:
            return held, Break(act.position, "does not follow the act before it")
        if act.hash != digest(act):
            return held, Break(act.position, "content was altered")
        held, previous = act.position, act.hash
    return held, None
