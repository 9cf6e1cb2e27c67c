"""What a lower subject tells a higher one: a short, typed list, in the same transaction.

``app.py`` says which functions hear which event; a publisher knows only this list.
"""

import uuid
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

SUBSCRIBERS_KEY = "subscribers"


@dataclass(frozen=True)
class AttemptStarted:
    """Winding of a coil began on a machine."""

    attempt_id: uuid.UUID
    machine_id: uuid.UUID
    at: datetime


@dataclass(frozen=True)
class AttemptEnded:
    """The coil was taken off, or lost."""

    attempt_id: uuid.UUID
    machine_id: uuid.UUID
    at: datetime


@dataclass(frozen=True)
class MachineTurns:
    """The counters' answer to AttemptEnded: what the machine counted, and what is open about it."""

    turns: float
    questions: int


@dataclass(frozen=True)
class Measured:
    """A coil was measured and judged; differences are standardised (measured less expected)."""

    run_id: uuid.UUID
    measurement_id: uuid.UUID
    supersedes_id: uuid.UUID | None
    revision_id: uuid.UUID
    machine_id: uuid.UUID
    at: datetime
    differences: Mapping[str, float]


@dataclass(frozen=True)
class ProcessState:
    """What a stream says after a point was added: learning, quiet or a signal, and its numbers."""

    stream: str
    characteristic: str
    points: int
    standardised_difference: float
    ewma: float
    learning: bool
    signal: str | None


Subscriber = Callable[[Session, Any], object]
Subscribers = Mapping[type, Sequence[Subscriber]]


def publish(session: Session, event: object) -> list[object]:
    """Hand the event to those who asked for it; their answers, in order."""
    subscribers: Subscribers = session.info.get(SUBSCRIBERS_KEY, {})
    return [hear(session, event) for hear in subscribers.get(type(event), ())]
