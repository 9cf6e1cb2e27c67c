"""Routes of the counters: events from devices, keys, and counts that wait for a person."""

import asyncio
import uuid
from datetime import UTC, datetime
from typing import cast

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from pydantic import ValidationError

from service.counters import acts
from service.counters.ingest import Batch, Taken
from service.counters.live import LiveHub
from service.counters.models import CounterEvent, Device, Fold, Position
from service.counters.schemas import (
    BatchBody,
    Cardinal,
    DeviceBody,
    DeviceView,
    EventBody,
    FoldView,
    IssuedDeviceView,
    Ordinal,
    RefusedEvent,
    TakenView,
    WaitingView,
)
from service.errors import NotFound, shown_value
from service.runs.acts import run_by_label
from service.shop.models import Machine
from service.storage.writer import GroupWriter
from service.web import access
from service.web.schemas import Body, Name, Note
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1/counters", route_class=UnitRoute, tags=["counters"])
runs_router = APIRouter(prefix="/api/v1/runs", route_class=UnitRoute, tags=["counters"])

# Mends by the kind of fault in one event of a batch.
_MENDS = {
    "missing": "Add this field.",
    "extra_forbidden": "Take this field out.",
    "int_type": "Send a whole number.",
    "timezone_aware": "Send the time with its offset.",
}


def _checked(events: list[dict[str, object]]) -> tuple[list[EventBody], list[RefusedEvent]]:
    good: list[EventBody] = []
    refused: list[RefusedEvent] = []
    for index, event in enumerate(events):
        try:
            good.append(EventBody.model_validate(event))
        except ValidationError as error:
            first = error.errors()[0]
            path = [_shown(str(part)) for part in first["loc"]]
            refused.append(
                RefusedEvent(
                    index=index,
                    boot=_plain(event.get("boot")),
                    sequence=_plain(event.get("sequence")),
                    detail=f"{'.'.join(path)}: {first['msg']}.",
                    pointer=f"/events/{index}/{'/'.join(path)}",
                    mend=_MENDS.get(first["type"], first["msg"]),
                )
            )
    return good, refused


def _plain(value: object) -> object:
    return _shown(value) if isinstance(value, str) else value if isinstance(value, int) else None


def _shown(text: str) -> str:
    """Short, and without the lone surrogates that JSON lets through and UTF-8 cannot carry."""
    return str(shown_value(text.encode("utf-8", "replace").decode()))


@router.post("/events")
async def post_events(request: Request, body: BatchBody, device: access.Device) -> TakenView:
    """Store a batch of events of the device whose key is sent; the answer comes after the commit.

    A repeat is harmless: events are known by (boot, sequence). Good events are stored even where
    others of the batch are refused.
    """
    good, refused = _checked(body.events)
    writer: GroupWriter[Batch, Taken] = request.app.state.writer
    batch = Batch(cast(uuid.UUID, device.id), datetime.now(UTC), tuple(good))
    taken = await asyncio.wrap_future(writer.submit(batch))
    cast(LiveHub, request.app.state.live).publish(taken.news)
    refused += [
        RefusedEvent(
            index=-1,
            boot=contest.boot,
            sequence=contest.sequence,
            detail="This number was stored before with other content; kept aside for a person.",
            pointer="/events",
            mend="Give each event a sequence number of its own, and a new boot after a restart.",
        )
        for contest in taken.contested
    ]
    return TakenView(
        taken=taken.taken,
        duplicates=taken.duplicates,
        refused=refused,
        boot=taken.boot,
        stored_through=taken.stored_through,
    )


def _device_view(device: Device, position: Position | None) -> DeviceView:
    return DeviceView(
        id=device.id,
        name=device.name,
        machine_id=device.machine_id,
        machine=device.machine.name,
        issued_at=device.issued_at,
        revoked_at=device.revoked_at,
        heard_at=position.heard_at if position else None,
        boot=position.boot if position else None,
        stored_through=position.contiguous if position else None,
    )


@router.post("/devices", status_code=201)
def issue_device(
    body: DeviceBody, work: Work, now: Now, actor: access.LeadOrOwner, response: Response
) -> IssuedDeviceView:
    """Issue a counter's key. It is shown in this answer and nowhere else."""
    device, key = acts.issue_device(
        work, actor, name=body.name, machine_id=body.machine_id, now=now
    )
    response.headers["Location"] = f"/api/v1/counters/devices/{device.id}"
    return IssuedDeviceView(**_device_view(device, None).model_dump(), key=key)


@router.get("/devices")
def list_devices(reading: Reading, _actor: access.Anybody) -> list[DeviceView]:
    rows = reading.execute(
        sa.select(Device, Position)
        .outerjoin(Position, Position.device_id == Device.id)
        .order_by(Device.name)
    )
    return [_device_view(device, position) for device, position in rows]


@router.get("/devices/{device_id}")
def show_device(device_id: uuid.UUID, reading: Reading, _actor: access.Anybody) -> DeviceView:
    device = reading.get(Device, device_id)
    if device is None:
        raise NotFound("There is no such device.", value=str(device_id))
    return _device_view(device, reading.get(Position, device_id))


class RevokeBody(Body):
    reason: Note


@router.post("/devices/{device_id}/revocation")
def revoke_device(
    device_id: uuid.UUID, body: RevokeBody, work: Work, now: Now, actor: access.LeadOrOwner
) -> DeviceView:
    """Take a key out of force; its next request is refused."""
    device = acts.revoke_device(work, actor, device_id, reason=body.reason, now=now)
    return _device_view(device, work.get(Position, device_id))


@router.get("/waiting")
def waiting_counts(reading: Reading, _actor: access.Anybody) -> list[WaitingView]:
    """Counts that came while no coil was on the machine, by device and boot."""
    rows = reading.execute(
        sa.select(
            Device.name,
            Machine.name,
            CounterEvent.boot,
            sa.func.min(CounterEvent.sequence),
            sa.func.max(CounterEvent.sequence),
            sa.func.count(),
            sa.func.min(CounterEvent.count),
            sa.func.max(CounterEvent.count),
            sa.func.min(CounterEvent.arrived_at, type_=CounterEvent.arrived_at.type),
            sa.func.max(CounterEvent.arrived_at, type_=CounterEvent.arrived_at.type),
        )
        .join(Device, Device.id == CounterEvent.device_id)
        .join(Machine, Machine.id == Device.machine_id)
        .where(CounterEvent.place == "waiting")
        .group_by(Device.name, Machine.name, CounterEvent.boot)
        .order_by(Device.name, CounterEvent.boot)
    )
    return [
        WaitingView(
            device=row[0],
            machine=row[1],
            boot=row[2],
            first_sequence=row[3],
            last_sequence=row[4],
            events=row[5],
            first_count=row[6],
            last_count=row[7],
            first_arrived_at=row[8],
            last_arrived_at=row[9],
        )
        for row in rows
    ]


class AssignBody(Body):
    device: Name
    boot: Cardinal
    first_sequence: Ordinal
    last_sequence: Ordinal
    run: Name
    reason: Note


@router.post("/waiting/assignments")
def assign_waiting(body: AssignBody, work: Work, now: Now, actor: access.Operator) -> FoldView:
    """Give counts that waited to the coil that they belong to."""
    device_id = work.scalar(sa.select(Device.id).where(Device.name == body.device))
    run = run_by_label(work, body.run)
    if device_id is None or run.attempt is None:
        raise NotFound(
            "There is no such device, or the coil was never wound.",
            pointer="/device",
            value=body.device,
            mend="Take the device's name from the waiting list and a coil that was wound.",
        )
    row = acts.assign_waiting(
        work,
        actor,
        device_id=device_id,
        boot=body.boot,
        first_sequence=body.first_sequence,
        last_sequence=body.last_sequence,
        attempt_id=run.attempt.id,
        reason=body.reason,
        now=now,
    )
    return fold_view(row)


def fold_view(row: Fold) -> FoldView:
    return FoldView(
        turns=row.turns,
        late_turns=row.late_turns,
        events=row.events,
        heard_at=row.heard_at,
        missing=[list(gap) for gap in row.state["missing"]],
        questions=row.state["questions"],
    )


@runs_router.get("/{serial}/count")
def run_count(serial: str, reading: Reading, _actor: access.Anybody) -> FoldView:
    """The turns of the run's attempt in hand, or of its last one."""
    run = run_by_label(reading, serial)
    row = acts.fold_of(reading, run.attempt.id) if run.attempt else None
    if row is None:
        raise NotFound(f"No counter counted run {serial}.", value=serial)
    return fold_view(row)
