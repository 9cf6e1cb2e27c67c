"""What people do with counters: issue and revoke keys, and assign counts that waited."""

import hashlib
import secrets
import uuid
from datetime import datetime
from typing import Any, cast

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.counters.folding import fold_of, refold
from service.counters.models import CounterEvent, Device, Fold
from service.errors import AlreadyThere, NotFound, WrongState
from service.runs.models import Attempt
from service.shop import models as shop
from service.storage.records import Actor, record

KEY_PREFIX = "cwd_"

__all__ = ["assign_waiting", "fold_of", "identify_device", "issue_device", "revoke_device"]


def key_hash(key: str) -> str:
    """SHA-256 suffices for a key of 256 random bits; a slow hash would only slow every count."""
    return hashlib.sha256(key.encode()).hexdigest()


def issue_device(
    session: Session, actor: Actor, *, name: str, machine_id: uuid.UUID, now: datetime
) -> tuple[Device, str]:
    """A new device on a machine, and its key, which is not kept."""
    if session.get(shop.Machine, machine_id) is None:
        raise NotFound("There is no such machine.", pointer="/machine_id", value=str(machine_id))
    if session.scalar(sa.select(Device.id).where(Device.name == name)):
        raise AlreadyThere(
            f"There is a device named “{name}” already.",
            pointer="/name",
            value=name,
            mend="Give it another name.",
        )
    key = KEY_PREFIX + secrets.token_urlsafe(32)
    device = Device(name=name, machine_id=machine_id, key_hash=key_hash(key), issued_at=now)
    session.add(device)
    session.flush()
    after = {"name": name, "machine_id": machine_id}
    record(session, actor, "issue device key", "device", device.id, at=now, after=after)
    session.refresh(device, ["machine"])
    return device, key


def revoke_device(
    session: Session, actor: Actor, device_id: uuid.UUID, *, reason: str, now: datetime
) -> Device:
    device = session.get(Device, device_id)
    if device is None:
        raise NotFound("There is no such device.", value=str(device_id))
    if device.revoked_at is not None:
        raise WrongState("This device's key was revoked before.", mend="Issue a new device.")
    device.revoked_at = now
    record(session, actor, "revoke device key", "device", device.id, at=now, reason=reason)
    session.flush()
    return device


def identify_device(session: Session, key: str) -> Actor | None:
    """The device that a key belongs to, while the key is in force."""
    row = session.execute(
        sa.select(Device.id, Device.name).where(
            Device.key_hash == key_hash(key), Device.revoked_at.is_(None)
        )
    ).one_or_none()
    return Actor("device", row.id, row.name) if row else None


def assign_waiting(
    session: Session,
    actor: Actor,
    *,
    device_id: uuid.UUID,
    boot: int,
    first_sequence: int,
    last_sequence: int,
    attempt_id: uuid.UUID,
    reason: str,
    now: datetime,
) -> Fold:
    """Give waiting counts to the attempt that they belong to: a recorded act of a person."""
    row = session.get(Fold, attempt_id, with_for_update=True)
    attempt = session.get(Attempt, attempt_id)
    if row is None or attempt is None or row.device_id != device_id:
        raise NotFound(
            "That attempt was not wound on this counter's machine.",
            pointer="/attempt_id",
            value=str(attempt_id),
            mend="Choose an attempt of the same machine.",
        )
    result = session.execute(
        sa.update(CounterEvent)
        .where(
            CounterEvent.device_id == device_id,
            CounterEvent.boot == boot,
            CounterEvent.sequence.between(first_sequence, last_sequence),
            CounterEvent.place == "waiting",
        )
        .values(place="late", attempt_id=attempt_id)
    )
    moved = cast("sa.CursorResult[Any]", result).rowcount
    if moved == 0:
        raise NotFound("No waiting counts lie in that range.", pointer="/first_sequence")
    row.late_turns = refold(session, row, late=True).turns
    session.flush()
    after = {
        "device_id": device_id,
        "boot": boot,
        "first_sequence": first_sequence,
        "last_sequence": last_sequence,
        "events": moved,
        "turns_with_them": row.late_turns,
    }
    record(
        session, actor, "assign counts", "attempt", attempt_id, at=now, after=after, reason=reason
    )
    return row
