"""Tables of the counters: devices and their keys, every event as it came, and the fold."""

import uuid
from datetime import datetime
from typing import Any

from sqlalchemy import BigInteger, CheckConstraint, ForeignKey, Index
from sqlalchemy.orm import Mapped, mapped_column, relationship

from service.counters.rules import EVENT_KINDS
from service.shop.models import Machine
from service.storage.types import Base, Id, between, in_list, length, table_args

PLACES = ["attempt", "late", "waiting"]


class Device(Base):
    """A counter on a machine. Only the SHA-256 of its key is kept; the key is shown once."""

    __tablename__ = "device"
    __table_args__ = table_args(length("name", 120), length("key_hash", 64, 64))

    id: Mapped[Id]
    name: Mapped[str] = mapped_column(unique=True)
    machine_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("machine.id"), index=True)
    key_hash: Mapped[str] = mapped_column(unique=True)
    issued_at: Mapped[datetime]
    revoked_at: Mapped[datetime | None]
    machine: Mapped[Machine] = relationship(lazy="joined", innerjoin=True)


class CounterEvent(Base):
    """One event as the device sent it; never changed. The key makes a repeat harmless."""

    __tablename__ = "counter_event"
    __table_args__ = table_args(
        in_list("kind", EVENT_KINDS),
        in_list("place", PLACES),
        CheckConstraint(
            "(place = 'waiting') = (attempt_id IS NULL)", name="waiting_has_no_attempt"
        ),
        between("count", 0, 2**53),
        Index("ix_counter_event_attempt", "attempt_id", "boot", "sequence"),
        Index("ix_counter_event_place", "place", "device_id"),
    )

    device_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("device.id"), primary_key=True)
    boot: Mapped[int] = mapped_column(BigInteger, primary_key=True, autoincrement=False)
    sequence: Mapped[int] = mapped_column(BigInteger, primary_key=True, autoincrement=False)
    device_time: Mapped[datetime | None]
    arrived_at: Mapped[datetime]
    kind: Mapped[str]
    count: Mapped[int] = mapped_column(BigInteger)
    speed_rpm: Mapped[float | None]
    tension_n: Mapped[float | None]
    place: Mapped[str]
    attempt_id: Mapped[uuid.UUID | None] = mapped_column(ForeignKey("attempt.id"))


class ContestedEvent(Base):
    """An event whose key was taken by one with other content: kept aside for a person."""

    __tablename__ = "contested_event"
    __table_args__ = table_args(in_list("kind", EVENT_KINDS))

    id: Mapped[Id]
    device_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("device.id"), index=True)
    boot: Mapped[int] = mapped_column(BigInteger)
    sequence: Mapped[int] = mapped_column(BigInteger)
    kind: Mapped[str]
    count: Mapped[int] = mapped_column(BigInteger)
    arrived_at: Mapped[datetime]


class Position(Base):
    """How far a device has been heard: the newest event, and what is stored without a gap."""

    __tablename__ = "device_position"
    __table_args__ = table_args()

    device_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("device.id"), primary_key=True)
    boot: Mapped[int] = mapped_column(BigInteger)
    sequence: Mapped[int] = mapped_column(BigInteger)
    count: Mapped[int] = mapped_column(BigInteger)
    contiguous: Mapped[int] = mapped_column(BigInteger)
    heard_at: Mapped[datetime]


class Fold(Base):
    """The turns of one attempt, folded from its events as they arrive.

    The window (start and end position in the device's stream) says which events belong to the
    attempt, whenever they arrive.
    """

    __tablename__ = "fold"
    __table_args__ = table_args(Index("ix_fold_device_start", "device_id", "start_boot"))

    attempt_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("attempt.id"), primary_key=True)
    device_id: Mapped[uuid.UUID] = mapped_column(ForeignKey("device.id"))
    start_boot: Mapped[int] = mapped_column(BigInteger)
    start_sequence: Mapped[int] = mapped_column(BigInteger)
    start_count: Mapped[int] = mapped_column(BigInteger)
    end_boot: Mapped[int | None] = mapped_column(BigInteger)
    end_sequence: Mapped[int | None] = mapped_column(BigInteger)
    turns: Mapped[float]
    late_turns: Mapped[float | None]
    state: Mapped[dict[str, Any]]
    events: Mapped[int]
    heard_at: Mapped[datetime | None]
