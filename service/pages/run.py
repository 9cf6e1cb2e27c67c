"""One run: where it stands, what can be done with it now, and how it came there."""

import uuid
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session

from service.bench import acts as bench
from service.bench.models import Verdict
from service.pages.answers import process_word
from service.pages.floor import MachineLine, machine_lines
from service.pages.forms import Entered, Form, FormWork
from service.pages.history import folds_of, history_of, measurements_of
from service.pages.numbers import TURNS, shown_quantity
from service.pages.render import carry_out, page, see_other
from service.recipes.models import Recipe, Revision
from service.runs import acts
from service.runs.models import Run
from service.runs.rules import (
    DISPOSITIONS,
    SCRAP_CAUSES,
    TABLE,
    Move,
    RunState,
    moves_from,
    release_refusal,
)
from service.stock import acts as stock
from service.stock.models import MagnetLot, Spool
from service.storage.records import Actor
from service.storage.serials import shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/runs", route_class=UnitRoute, include_in_schema=False)

FORMS = ("start", "finish", "correct", "loss", "decision")
_SPOOLS_OFFERED = 12
_LOTS_OFFERED = 8

WHAT_MOVES_MEAN = {
    Move.RELEASE: "It conforms and may leave.",
    Move.CONCESSION: "It may leave as it is, with permission.",
    Move.REGRADE: "It meets another recipe.",
    Move.HOLD: "It waits until somebody decides.",
    Move.REWORK: "It is made to conform, wound again or mended.",
    Move.REPAIR: "It is made usable, though it may not conform.",
    Move.SCRAP: "It is given up.",
}


@router.get("/{serial}")
def show(
    serial: str, request: Request, reading: Reading, actor: access.Anybody, machine: str = ""
) -> Response:
    run = acts.run_by_label(reading, serial)
    return run_page(request, reading, actor, run, machine=machine)


def run_page(
    request: Request,
    session: Session,
    actor: Actor,
    run: Run,
    *,
    which: str = "",
    form: Form | None = None,
    status: int = 200,
    machine: str = "",
) -> Response:
    """The page of a run; ``form`` is the refused form of the kind ``which``, if one was."""
    forms = {name: Form(prefix=f"{name}-") for name in FORMS}
    if form is not None:
        form.prefix = f"{which}-"
        forms[which] = form
    measurements = measurements_of(session, run.id)
    folds = folds_of(session, run)
    attempt = run.attempt
    verdict = bench.last_verdict(session, run.id)
    return page(
        request,
        session,
        "run.html",
        status=status,
        run=run,
        wanted=float(run.revision.body["turns"]),
        attempt=attempt,
        fold=folds.get(attempt.id) if attempt else None,
        verdict=verdict,
        process=process_word(verdict) if verdict else None,
        history=history_of(run, measurements, folds),
        forms=forms,
        can=_possible(run, actor),
        decisions=decisions_for(run, actor, verdict),
        causes=[(cause, cause) for cause in SCRAP_CAUSES],
        **_to_start(session, run, machine),
        recipes=other_recipes(session, run),
    )


def _possible(run: Run, actor: Actor) -> set[str]:
    """The moves that this person may make now, by name."""
    state = RunState(run.state)
    return {move.name for move in moves_from(state) if TABLE[(state, move)].roles & actor.roles}


@dataclass(frozen=True)
class Decision:
    """A decision that this person may take; ``refusal`` says why it is not open just now."""

    move: str
    meaning: str
    refusal: str | None


def decisions_for(run: Run, actor: Actor, verdict: Verdict | None) -> list[Decision]:
    possible = _possible(run, actor)
    conformity = verdict.conformity if verdict else None
    return [
        Decision(
            str(move),
            WHAT_MOVES_MEAN[move],
            release_refusal(conformity) if move is Move.RELEASE else None,
        )
        for move in DISPOSITIONS
        if move.name in possible
    ]


def other_recipes(session: Session, run: Run) -> list[tuple[uuid.UUID, str]]:
    """What a coil can be regraded to: recipes of its kind that are in use."""
    rows = session.execute(
        sa.select(Recipe.id, Recipe.name)
        .where(
            Recipe.kind == run.revision.recipe.kind,
            Recipe.id != run.revision.recipe_id,
            sa.exists().where(Revision.recipe_id == Recipe.id, Revision.state == "released"),
        )
        .order_by(Recipe.name)
    )
    return [(row.id, row.name) for row in rows]


def _to_start(session: Session, run: Run, machine: str) -> dict[str, Any]:
    """What a coil can be wound on and from; nothing where it cannot be started."""
    if Move.START not in moves_from(RunState(run.state)):
        return {"machines": [], "spools": [], "lots": [], "chosen": {}}
    machines = [_machine_choice(line) for line in machine_lines(session)]
    spools = _fitting_spools(session, run)
    lots = _magnet_lots(session) if run.revision.body.get("poles") else []
    free = [value for value, _name, _more, is_open in machines if is_open]
    before = run.attempt
    chosen = {
        "machine": machine or (str(before.machine_id) if before else ""),
        "spool": str(before.spool_id) if before else "",
        "lot": str(run.magnet_lot_id or ""),
    }
    if chosen["machine"] not in free and len(free) == 1:
        chosen["machine"] = free[0]
    if not chosen["spool"] and len(spools) == 1:
        chosen["spool"] = spools[0][0]
    if not chosen["lot"] and len(lots) == 1:
        chosen["lot"] = lots[0][0]
    return {"machines": machines, "spools": spools, "lots": lots, "chosen": chosen}


Choice = tuple[str, str, str, bool]


def _machine_choice(line: MachineLine) -> Choice:
    on_it = f"{shown(line.serial)} is on it" if line.serial else "free"
    return (str(line.id), line.name, on_it, line.serial is None)


def _fitting_spools(session: Session, run: Run) -> list[Choice]:
    """Spools on the shelf with the recipe's wire, measured ones and the newest first."""
    wire = run.revision.body["wire"]
    rows = session.scalars(
        sa.select(Spool)
        .where(
            Spool.state == "on the shelf",
            Spool.wire_size == wire["size"],
            Spool.wire_build == wire["build"],
            Spool.conductor == wire["conductor"],
        )
        .order_by(Spool.resistance_per_metre_ohm.is_(None), Spool.id.desc())
        .limit(_SPOOLS_OFFERED)
    )
    return [(str(spool.id), shown(spool.serial), spool_words(spool), True) for spool in rows]


def spool_words(spool: Spool) -> str:
    left = stock.remaining(spool)
    own = spool.resistance_per_metre_ohm
    measured = f"{own:.3f} Ω/m measured" if own is not None else "not measured"
    return (
        f"{spool.wire_size} {spool.wire_build}, {left.mass_kg * 1e3:.0f} g left "
        f"({shown_quantity(left.length_m, 'm', 3)}), {measured}"
    )


def _magnet_lots(session: Session) -> list[Choice]:
    rows: Sequence[MagnetLot] = session.scalars(
        sa.select(MagnetLot).order_by(MagnetLot.id.desc()).limit(_LOTS_OFFERED)
    ).all()
    return [(str(lot.id), shown(lot.serial), f"{lot.material}, {lot.piece}", True) for lot in rows]


def _again(
    request: Request, work: Session, actor: Actor, serial: str, which: str, form: Form
) -> Response:
    """The run's page with what was typed, and why it was refused."""
    run = acts.run_by_label(work, serial)
    return run_page(request, work, actor, run, which=which, form=form, status=form.status)


def _back(serial: str) -> Response:
    return see_other(f"/runs/{serial}")


@router.post("/{serial}/start")
def start(
    serial: str, request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    run = acts.run_by_label(work, serial)
    scanned = form.optional_text("spool_label")
    chosen = uuid.UUID(int=0) if scanned else form.identifier("spool")
    machine_id = form.identifier("machine_id")
    lot_id = form.optional_identifier("magnet_lot")

    def act() -> None:
        spool_id = stock.spool_by_label(work, scanned, "/spool_label").id if scanned else chosen
        acts.start(
            work,
            actor,
            run,
            machine_id=machine_id,
            spool_id=spool_id,
            magnet_lot_id=lot_id,
            now=now,
        )

    if carry_out(work, form, act):
        return _back(serial)
    return _again(request, work, actor, serial, "start", form)


@router.post("/{serial}/finish")
def finish(
    serial: str, request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    """Agree with the machine's count."""
    run = acts.run_by_label(work, serial)
    confirmed = form.flag("confirmed")
    if carry_out(
        work,
        form,
        lambda: acts.finish(
            work, actor, run, agreed_turns=None, reason=None, confirmed=confirmed, now=now
        ),
    ):
        return _back(serial)
    return _again(request, work, actor, serial, "finish", form)


@router.post("/{serial}/correct")
def correct(
    serial: str, request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    """Take the coil off with a count that a person gives."""
    run = acts.run_by_label(work, serial)
    turns = form.number("agreed_turns", TURNS)
    reason = form.optional_text("reason")
    confirmed = form.flag("confirmed")
    if carry_out(
        work,
        form,
        lambda: acts.finish(
            work, actor, run, agreed_turns=turns, reason=reason, confirmed=confirmed, now=now
        ),
    ):
        return _back(serial)
    return _again(request, work, actor, serial, "correct", form)


@router.post("/{serial}/loss")
def lose(
    serial: str, request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    run = acts.run_by_label(work, serial)
    cause = form.choice("cause", SCRAP_CAUSES)
    reason = form.optional_text("reason")
    scrap = form.flag("scrap")
    if carry_out(
        work,
        form,
        lambda: acts.lose(work, actor, run, cause=cause, reason=reason, scrap=scrap, now=now),
    ):
        return _back(serial)
    return _again(request, work, actor, serial, "loss", form)


@router.post("/{serial}/decision")
def decide(
    serial: str,
    request: Request,
    actor: access.FloorStaff,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    run = acts.run_by_label(work, serial)
    verdict = bench.last_verdict(work, run.id)
    move = Move(form.choice("kind", [str(move) for move in DISPOSITIONS]))
    cause = form.optional_choice("cause", SCRAP_CAUSES) if move is Move.SCRAP else None
    other = form.optional_identifier("regrade_recipe_id") if move is Move.REGRADE else None
    reason = form.text("reason", 1000)
    if carry_out(
        work,
        form,
        lambda: acts.decide(
            work,
            actor,
            run,
            move=move,
            cause=cause,
            reason=reason,
            regrade_recipe_id=other,
            conformity=verdict.conformity if verdict else None,
            now=now,
        ),
    ):
        return see_other("/bench") if form.value("onward") == "bench" else _back(serial)
    return _again(request, work, actor, serial, "decision", form)
