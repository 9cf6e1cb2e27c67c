"""Routes of stock: spools and magnet lots, named by their labels."""

from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response

from service.errors import InvalidValue
from service.stock import acts
from service.stock.models import MagnetLot, Spool
from service.stock.schemas import (
    MagnetLotBody,
    MagnetLotEdit,
    MagnetLotView,
    SpoolBody,
    SpoolEdit,
    SpoolMeasurementBody,
    SpoolState,
    SpoolView,
)
from service.storage.serials import shown
from service.web import access
from service.web.edits import IfMatch, check_seen, tag
from service.web.paging import After, Limit, link_next, page
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute, tags=["stock"])


def spool_view(spool: Spool) -> SpoolView:
    left = acts.remaining(spool)
    relative = spool.resistance_per_metre_relative_uncertainty
    return SpoolView(
        id=spool.id,
        serial=spool.serial,
        label=shown(spool.serial),
        wire_size=spool.wire_size,
        wire_build=spool.wire_build,
        conductor=spool.conductor,
        supplier_lot=spool.supplier_lot,
        net_mass_kg=spool.net_mass_kg,
        resistance_ohm_per_m=spool.resistance_per_metre_ohm,
        resistance_relative_uncertainty_percent=None if relative is None else 100 * relative,
        resistance_measured_at=spool.resistance_measured_at,
        remaining_length_m=left.length_m,
        remaining_mass_kg=left.mass_kg,
        state=spool.state,
        received_at=spool.received_at,
        version=spool.version,
    )


def magnet_lot_view(lot: MagnetLot) -> MagnetLotView:
    return MagnetLotView(
        id=lot.id,
        serial=lot.serial,
        label=shown(lot.serial),
        material=lot.material,
        piece=lot.piece,
        supplier_lot=lot.supplier_lot,
        pieces=lot.pieces,
        received_at=lot.received_at,
        version=lot.version,
    )


@router.get("/spools")
def list_spools(
    reading: Reading,
    request: Request,
    response: Response,
    _actor: access.Anybody,
    state: Annotated[SpoolState | None, Query()] = None,
    limit: Limit = 50,
    after: After = None,
) -> list[SpoolView]:
    statement = sa.select(Spool)
    if state is not None:
        statement = statement.where(Spool.state == state)
    rows, more = page(reading, statement, Spool.id, limit, after)
    link_next(request, response, rows[-1].id if rows else None, more)
    return [spool_view(row) for row in rows]


@router.post("/spools", status_code=201)
def add_spool(
    body: SpoolBody, work: Work, now: Now, response: Response, actor: access.FloorStaff
) -> SpoolView:
    """Receive a spool and give it a label."""
    spool = acts.add_spool(work, actor, **body.model_dump(), now=now)
    response.headers["Location"] = f"/api/v1/spools/{spool.serial}"
    tag(response, spool.version)
    return spool_view(spool)


@router.get("/spools/{label}")
def show_spool(
    label: str, reading: Reading, response: Response, _actor: access.Anybody
) -> SpoolView:
    spool = acts.shown_spool(reading, label)
    tag(response, spool.version)
    return spool_view(spool)


@router.post("/spools/{label}/measurements", status_code=201)
def measure_spool(
    label: str,
    body: SpoolMeasurementBody,
    work: Work,
    now: Now,
    response: Response,
    actor: access.FloorStaff,
) -> SpoolView:
    """Enter the resistance of a measured length: the spool's own ohm per metre."""
    spool = acts.spool_by_label(work, label)
    acts.measure_spool(
        work,
        actor,
        spool,
        resistance_ohm=body.resistance_ohm,
        length_m=body.length_m,
        temperature_c=body.temperature_c,
        relative_uncertainty=body.relative_uncertainty_percent / 100,
        confirmed=body.confirmed,
        now=now,
    )
    response.headers["Location"] = f"/api/v1/spools/{spool.serial}"
    tag(response, spool.version)
    return spool_view(spool)


@router.patch("/spools/{label}")
def change_spool(
    label: str,
    body: SpoolEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.FloorStaff,
    if_match: IfMatch = None,
) -> SpoolView:
    """Quarantine a spool, mark it empty, put it back, or correct its mass or its supplier's lot."""
    spool = acts.spool_by_label(work, label)
    check_seen(if_match, spool.version)
    changes = body.model_dump(exclude={"state", "reason"}, exclude_none=True)
    if body.state is None and not changes:
        raise InvalidValue(
            "This change says not what is to change.",
            pointer="/state",
            mend="Send a state, net_mass_kg or supplier_lot.",
        )
    acts.correct_spool(work, actor, spool, changes=changes, reason=body.reason, now=now)
    if body.state is not None:
        acts.set_spool_state(work, actor, spool, state=body.state, reason=body.reason, now=now)
    tag(response, spool.version)
    return spool_view(spool)


@router.get("/magnet-lots")
def list_magnet_lots(
    reading: Reading,
    request: Request,
    response: Response,
    _actor: access.Anybody,
    limit: Limit = 50,
    after: After = None,
) -> list[MagnetLotView]:
    rows, more = page(reading, sa.select(MagnetLot), MagnetLot.id, limit, after)
    link_next(request, response, rows[-1].id if rows else None, more)
    return [magnet_lot_view(row) for row in rows]


@router.post("/magnet-lots", status_code=201)
def add_magnet_lot(
    body: MagnetLotBody, work: Work, now: Now, response: Response, actor: access.FloorStaff
) -> MagnetLotView:
    lot = acts.add_magnet_lot(work, actor, **body.model_dump(), now=now)
    response.headers["Location"] = f"/api/v1/magnet-lots/{lot.serial}"
    tag(response, lot.version)
    return magnet_lot_view(lot)


@router.get("/magnet-lots/{label}")
def show_magnet_lot(
    label: str, reading: Reading, response: Response, _actor: access.Anybody
) -> MagnetLotView:
    lot = acts.magnet_lot_by_label(reading, label)
    tag(response, lot.version)
    return magnet_lot_view(lot)


@router.patch("/magnet-lots/{label}")
def correct_magnet_lot(
    label: str,
    body: MagnetLotEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.FloorStaff,
    if_match: IfMatch = None,
) -> MagnetLotView:
    """Correct what was entered when the lot came."""
    lot = acts.magnet_lot_by_label(work, label)
    check_seen(if_match, lot.version)
    changes = body.model_dump(exclude={"reason"}, exclude_none=True)
    acts.correct_magnet_lot(work, actor, lot, changes=changes, reason=body.reason, now=now)
    tag(response, lot.version)
    return magnet_lot_view(lot)
