"""Edges of the counters: batches of events in, what became of them out."""

import uuid
from datetime import datetime
from typing import Annotated, Literal

from pydantic import ConfigDict, Field

from service.web.schemas import Body, Moment, Name, Number, View, Whole

EventKind = Literal["total", "start", "stop", "wire break", "back-count", "index", "heartbeat"]
LARGEST = 2**53

Cardinal = Annotated[Whole, Field(ge=0, le=LARGEST)]
Ordinal = Annotated[Whole, Field(ge=1, le=LARGEST)]


class EventBody(Body):
    """One event. ``count`` is cumulative since the counter's own zero."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "boot": 12,
                    "sequence": 4711,
                    "kind": "total",
                    "count": 4210,
                    "device_time": "2026-11-03T14:05:00+01:00",
                    "speed_rpm": 980.0,
                }
            ]
        }
    )

    boot: Cardinal
    sequence: Ordinal
    kind: EventKind = "total"
    count: Cardinal
    device_time: Moment | None = None
    speed_rpm: Annotated[Number, Field(ge=0, le=100_000)] | None = None
    tension_n: Annotated[Number, Field(ge=0, le=1000)] | None = None


class BatchBody(Body):
    """1 to 1,000 events of the device whose key the request carries.

    The events are checked one by one, so that one bad event does not hold up the good ones.
    """

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"events": [{"boot": 12, "sequence": 1, "kind": "start", "count": 0}]}]
        }
    )

    events: Annotated[list[dict[str, object]], Field(min_length=1, max_length=1000)]


class RefusedEvent(View):
    """An event that was not taken, and why. Send it again only when mended."""

    index: int
    boot: object = None
    sequence: object = None
    detail: str
    pointer: str
    mend: str


class TakenView(View):
    """What became of a batch. ``stored_through`` is safe to forget on the device."""

    taken: int = Field(description="Events stored by this request.")
    duplicates: int = Field(description="Events that were stored before, with the same content.")
    refused: list[RefusedEvent]
    boot: int | None = Field(description="The newest boot heard of this device.")
    stored_through: int | None = Field(
        description="Every sequence number of that boot up to this one is safely stored."
    )


class DeviceBody(Body):
    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"name": "Counter A", "machine_id": "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f"}
            ]
        }
    )

    name: Name
    machine_id: uuid.UUID


class DeviceView(View):
    id: uuid.UUID
    name: str
    machine_id: uuid.UUID
    machine: str
    issued_at: datetime
    revoked_at: datetime | None
    heard_at: datetime | None
    boot: int | None
    stored_through: int | None


class IssuedDeviceView(DeviceView):
    key: str = Field(description="Shown once; only its hash is kept.")


class WaitingView(View):
    """Counts that came while no coil was on the machine."""

    device: str
    machine: str
    boot: int
    first_sequence: int
    last_sequence: int
    events: int
    first_count: int
    last_count: int
    first_arrived_at: datetime
    last_arrived_at: datetime


class FoldView(View):
    """The turns of an attempt as folded from its events, with what is open about them."""

    turns: float
    late_turns: float | None = Field(
        description="Turns with the events that came after the coil was taken off, if any did."
    )
    events: int
    heard_at: datetime | None
    missing: list[list[int]] = Field(description="Gaps: boot, first and last sequence missing.")
    questions: list[dict[str, object]]
