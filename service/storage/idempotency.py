"""Answers kept by idempotency key, in the same transaction as the record that they answer."""

import uuid
from dataclasses import dataclass
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.orm import Mapped, Session, mapped_column

from service.errors import KeyReused
from service.storage.types import Base, length, table_args


class KeptAnswer(Base):
    """The first answer to a request that carries an Idempotency-Key, per actor."""

    __tablename__ = "kept_answer"
    __table_args__ = table_args(length("key", 200))

    actor: Mapped[str] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(primary_key=True)
    request_digest: Mapped[str]
    status: Mapped[int | None]
    media_type: Mapped[str | None]
    location: Mapped[str | None]
    body: Mapped[str | None]
    at: Mapped[datetime] = mapped_column(index=True)


@dataclass(frozen=True)
class Answer:
    status: int
    media_type: str
    location: str | None
    body: str


def claim(
    session: Session, actor_id: uuid.UUID | None, key: str, request_digest: str, at: datetime
) -> Answer | None:
    """Claim a key for this transaction, or give the answer that was kept under it.

    The insert itself is the lock: a second request with the same key waits at the unique index
    until the first has committed. Raises KeyReused where the key came with other content.
    """
    actor = str(actor_id)
    insert = postgresql.insert if session.get_bind().dialect.name == "postgresql" else sqlite.insert
    claimed = session.execute(
        insert(KeptAnswer)
        .values(actor=actor, key=key, request_digest=request_digest, at=at)
        .on_conflict_do_nothing()
        .returning(KeptAnswer.key)
    ).one_or_none()
    if claimed:
        return None
    kept = session.scalars(
        sa.select(KeptAnswer).where(KeptAnswer.actor == actor, KeptAnswer.key == key)
    ).one()
    if kept.request_digest != request_digest:
        raise KeyReused(
            "This Idempotency-Key was used before, for a request with other content.",
            value=key,
            mend="Send a new key with a new request; repeat a key only with the same content.",
        )
    return Answer(
        kept.status or 200, kept.media_type or "application/json", kept.location, kept.body or ""
    )


def keep(session: Session, actor_id: uuid.UUID | None, key: str, answer: Answer) -> None:
    """Store the answer under the key claimed before in this transaction."""
    session.execute(
        sa.update(KeptAnswer)
        .where(KeptAnswer.actor == str(actor_id), KeptAnswer.key == key)
        .values(
            status=answer.status,
            media_type=answer.media_type,
            location=answer.location,
            body=answer.body,
        )
    )
