"""Stock: spools with what is left on them, and lots of magnets."""

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session

from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.numbers import CELSIUS, KILOGRAM, METRE, OHM, PERCENT
from service.pages.render import carry_out, page, see_other
from service.pages.shop import check_version
from service.recipes.models import Recipe, Revision
from service.runs.models import Attempt, Run
from service.stock import acts
from service.stock.models import SPOOL_STATES, MagnetLot, Spool
from service.stock.rules import CONDUCTORS
from service.storage.serials import shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/stock", route_class=UnitRoute, include_in_schema=False)

_ROWS = 60
_BUILDS = ("single", "heavy", "grade 1", "grade 2")
_WEIGHT_LIMIT_KG = 500.0


@router.get("")
def show(request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    return _page(request, reading)


def _page(
    request: Request, session: Session, spool: Form | None = None, magnets: Form | None = None
) -> Response:
    spools = session.scalars(
        sa.select(Spool)
        .order_by(sa.case((Spool.state == "empty", 1), else_=0), Spool.id.desc())
        .limit(_ROWS)
    ).all()
    spool_form, magnet_form = spool or Form(prefix="spool-"), magnets or Form(prefix="magnets-")
    return page(
        request,
        session,
        "stock.html",
        status=max(spool_form.status, magnet_form.status),
        spools=[(one, acts.remaining(one)) for one in spools],
        lots=session.scalars(sa.select(MagnetLot).order_by(MagnetLot.id.desc()).limit(_ROWS)).all(),
        spool_form=spool_form,
        magnet_form=magnet_form,
        builds=[(build, build) for build in _BUILDS],
        conductors=[(name, name) for name in CONDUCTORS],
    )


@router.post("/spools")
def receive_spool(
    request: Request, actor: access.FloorStaff, form: Entered, work: FormWork, now: Now
) -> Response:
    form.prefix = "spool-"
    size = form.text("wire_size", 20)
    build = form.choice("wire_build", _BUILDS)
    conductor = form.choice("conductor", list(CONDUCTORS))
    lot = form.text("supplier_lot", 60)
    mass = form.number("net_mass_kg", KILOGRAM)
    received: list[Spool] = []

    def act() -> None:
        _check_mass(mass)
        received.append(
            acts.add_spool(
                work,
                actor,
                wire_size=size,
                wire_build=build,
                conductor=conductor,
                supplier_lot=lot,
                net_mass_kg=mass,
                now=now,
            )
        )

    if carry_out(work, form, act):
        return see_other(f"/stock/spools/{shown(received[0].serial)}")
    return _page(request, work, spool=form)


def _check_mass(mass_kg: float) -> None:
    if not 0 < mass_kg <= _WEIGHT_LIMIT_KG:
        raise InvalidValue(
            f"{mass_kg:g} kg of wire cannot be on a spool.",
            pointer="/net_mass_kg",
            value=mass_kg,
            mend="Give the wire's mass without the spool, in kg or as in 250 g.",
        )


@router.post("/magnets")
def receive_magnets(
    request: Request, actor: access.FloorStaff, form: Entered, work: FormWork, now: Now
) -> Response:
    form.prefix = "magnets-"
    material = form.text("material", 60)
    piece = form.text("piece", 60)
    lot = form.text("supplier_lot", 60)
    pieces = form.whole("pieces")

    def act() -> None:
        if not 1 <= pieces <= 1_000_000:
            raise InvalidValue(
                f"A lot of {pieces} pieces cannot be received.",
                pointer="/pieces",
                value=pieces,
                mend="Count them: 1 to 1 000 000.",
            )
        acts.add_magnet_lot(
            work, actor, material=material, piece=piece, supplier_lot=lot, pieces=pieces, now=now
        )

    if carry_out(work, form, act):
        return see_other("/stock")
    return _page(request, work, magnets=form)


@router.get("/spools/{label}")
def show_spool(label: str, request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    return _spool_page(request, reading, label)


def _spool_page(
    request: Request,
    session: Session,
    label: str,
    which: str = "",
    form: Form | None = None,
) -> Response:
    spool = acts.shown_spool(session, label)
    forms = {name: Form(prefix=f"{name}-") for name in ("measure", "state", "receipt")}
    if form is not None:
        form.prefix = f"{which}-"
        forms[which] = form
    return page(
        request,
        session,
        "spool.html",
        status=form.status if form else 200,
        spool=spool,
        left=acts.remaining(spool),
        forms=forms,
        states=[(one, one) for one in SPOOL_STATES],
        coils=_coils_from(session, spool),
    )


def _coils_from(session: Session, spool: Spool) -> list[tuple[str, str, str, float | None]]:
    """Which coils came from this spool, the newest first."""
    rows = session.execute(
        sa.select(Run.serial, Run.state, Recipe.name, Attempt.wire_length_m)
        .join(Attempt, Attempt.run_id == Run.id)
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(Attempt.spool_id == spool.id)
        .order_by(Attempt.id.desc())
        .limit(_ROWS)
    )
    return [(row[0], row[1], row[2], row[3]) for row in rows]


@router.post("/spools/{label}/measurement")
def measure_spool(
    label: str,
    request: Request,
    actor: access.FloorStaff,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    """A measured length gives the spool its own ohm per metre."""
    resistance = form.number("resistance_ohm", OHM)
    length = form.number("length_m", METRE)
    temperature = form.number("temperature_c", CELSIUS)
    doubt = form.number("relative_uncertainty_percent", PERCENT)
    confirmed = form.flag("confirmed")

    def act() -> None:
        _check_trial(resistance, length, temperature, doubt)
        acts.measure_spool(
            work,
            actor,
            acts.spool_by_label(work, label),
            resistance_ohm=resistance,
            length_m=length,
            temperature_c=temperature,
            relative_uncertainty=doubt / 100.0,
            confirmed=confirmed,
            now=now,
        )

    if carry_out(work, form, act):
        return see_other(f"/stock/spools/{label}")
    return _spool_page(request, work, label, "measure", form)


def _check_trial(resistance: float, length: float, temperature: float, doubt: float) -> None:
    for value, name, low, high in (
        (resistance, "resistance_ohm", 0.0, 1e7),
        (length, "length_m", 0.0, 1e5),
        (temperature, "temperature_c", -40.0, 100.0),
        (doubt, "relative_uncertainty_percent", 0.0, 20.0),
    ):
        if not low < value <= high:
            raise InvalidValue(
                f"{value:g} is outside {low:g} to {high:g}.",
                pointer=f"/{name}",
                value=value,
                mend="Check the number and its unit.",
            )


@router.post("/spools/{label}/state")
def change_state(
    label: str,
    request: Request,
    actor: access.FloorStaff,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    state = form.choice("state", SPOOL_STATES)
    reason = form.text("reason", 1000)
    if carry_out(
        work,
        form,
        lambda: acts.set_spool_state(
            work, actor, acts.spool_by_label(work, label), state=state, reason=reason, now=now
        ),
    ):
        return see_other(f"/stock/spools/{label}")
    return _spool_page(request, work, label, "state", form)


@router.post("/spools/{label}/receipt")
def correct_receipt(
    label: str,
    request: Request,
    actor: access.FloorStaff,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    """Correct what was entered on receipt; the wire itself stays what it was entered as."""
    mass = form.number("net_mass_kg", KILOGRAM)
    changes = {"supplier_lot": form.text("supplier_lot", 60), "net_mass_kg": mass}
    reason = form.text("reason", 1000)

    def act() -> None:
        spool = acts.spool_by_label(work, label)
        check_version(form, spool.version)
        _check_mass(mass)
        acts.correct_spool(work, actor, spool, changes=changes, reason=reason, now=now)

    if carry_out(work, form, act):
        return see_other(f"/stock/spools/{label}")
    return _spool_page(request, work, label, "receipt", form)
