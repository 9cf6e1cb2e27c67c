"""What happens at the machine: a coil is started, taken off, or lost."""

import uuid
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.errors import InvalidValue, NotFound, WrongState
from service.physics.wire import StandardWire
from service.recipes.acts import body_of
from service.recipes.building import to_design
from service.recipes.winding import wire_for
from service.runs import rules
from service.runs.holding import hold_run, move_run
from service.runs.models import Attempt, Disposition, Run
from service.runs.orders import hold_order
from service.runs.rules import Move, RunState, WireKind
from service.shop.models import Machine
from service.stock.acts import draw_wire
from service.stock.models import MagnetLot, Spool
from service.stock.rules import wire_of
from service.storage.events import AttemptEnded, AttemptStarted, MachineTurns, publish
from service.storage.records import Actor, record
from service.storage.serials import shown


def start(
    session: Session,
    actor: Actor,
    run: Run,
    *,
    machine_id: uuid.UUID,
    spool_id: uuid.UUID,
    magnet_lot_id: uuid.UUID | None,
    now: datetime,
) -> Attempt:
    """Begin to wind the coil: its first attempt, or the next one on the same bobbin.

    Raises WrongState where the machine is busy (naming the run on it), the order is closed or the
    run cannot be started; InvalidValue for a spool of another wire, quarantined or empty.
    """
    run = hold_run(session, run)
    before = run.state
    state = rules.next_state(RunState(run.state), Move.START, actor.roles)
    if run.order_id is not None:
        _refuse_closed(session, run.order_id)
    machine = _free_machine(session, machine_id)
    spool = _fitting_spool(session, spool_id, run)
    if magnet_lot_id is not None:
        lot = session.get(MagnetLot, magnet_lot_id)
        if lot is None:
            raise NotFound(
                "There is no such magnet lot.", pointer="/magnet_lot", value=str(magnet_lot_id)
            )
        run.magnet_lot = lot
    attempt = Attempt(
        run_id=run.id,
        number=run.attempt_number + 1,
        machine_id=machine.id,
        spool_id=spool.id,
        outcome="winding",
        started_at=now,
        started_by=actor.name,
        machine=machine,
        spool=spool,
    )
    run.attempts.append(attempt)
    run.attempt_number = attempt.number
    move_run(run, state, now)
    session.flush()
    publish(session, AttemptStarted(attempt.id, machine.id, now))
    after = {
        "state": run.state,
        "attempt": attempt.number,
        "machine": machine.name,
        "spool": spool.serial,
        "magnet_lot_id": run.magnet_lot_id,
    }
    record(
        session,
        actor,
        Move.START,
        "run",
        run.id,
        at=now,
        before={"state": before},
        after=after,
    )
    return attempt


def _refuse_closed(session: Session, order_id: uuid.UUID) -> None:
    order = hold_order(session, order_id)
    if order.state != "open":
        raise WrongState(
            f"The order {shown(order.serial)} of this run is closed.",
            pointer="/state",
            value=order.state,
            mend="Plan the coil for an open order.",
        )


def _free_machine(session: Session, machine_id: uuid.UUID) -> Machine:
    machine = session.get(
        Machine, machine_id, with_for_update={"key_share": True}, populate_existing=True
    )
    if machine is None:
        raise NotFound("There is no such machine.", pointer="/machine_id", value=str(machine_id))
    if not machine.active:
        raise WrongState(
            f"{machine.name} is out of use.",
            pointer="/machine_id",
            value=str(machine_id),
            mend="Choose another machine.",
        )
    other = session.scalars(
        sa.select(Run.serial)
        .join(Attempt, Attempt.run_id == Run.id)
        .where(Attempt.machine_id == machine_id, Attempt.ended_at.is_(None))
    ).one_or_none()
    if other is not None:
        raise WrongState(
            f"Run {shown(other)} is on {machine.name}.",
            pointer="/machine_id",
            value=str(machine_id),
            mend=f"Finish run {shown(other)} or give it up first.",
            extra={"run": other},
        )
    return machine


def _fitting_spool(session: Session, spool_id: uuid.UUID, run: Run) -> Spool:
    spool = session.get(Spool, spool_id)
    if spool is None:
        raise NotFound("There is no such spool.", pointer="/spool", value=str(spool_id))
    wanted = to_design(body_of(run.revision)).wire
    loaded = wire_of(spool.wire_size, spool.wire_build, spool.conductor)
    refusal = rules.spool_refusal(_kind(wanted), _kind(loaded), spool.state)
    if refusal is not None:
        detail, mend = refusal
        raise InvalidValue(detail, pointer="/spool", value=spool.serial, mend=mend)
    return spool


def _kind(wire: StandardWire) -> WireKind:
    return WireKind(wire.conductor.name, wire.designation, wire.build)


def finish(
    session: Session,
    actor: Actor,
    run: Run,
    *,
    agreed_turns: float | None,
    reason: str | None,
    now: datetime,
    confirmed: bool = False,
) -> Attempt:
    """Take the coil off: agree on its turns and draw its wire from the spool.

    Raises WrongState where somebody ended it before, InvalidValue and ConfirmationNeeded as
    ``rules.agree_turns`` and ``rules.ask_back_turns`` say.
    """
    run = hold_run(session, run)
    state = rules.next_state(RunState(run.state), Move.FINISH, actor.roles)
    attempt = _attempt_in_hand(run)
    body = body_of(run.revision)
    _end(session, attempt, actor, "wound", now)
    turns = rules.agree_turns(attempt.machine_turns, agreed_turns, reason)
    rules.ask_back_turns(turns, body.turns, confirmed)
    attempt.agreed_turns, attempt.agreed_reason = turns, reason
    _draw(session, run, attempt, turns, f"run {run.serial}", now)
    move_run(run, state, now)
    session.flush()
    after = {
        "state": run.state,
        "attempt": attempt.number,
        "machine_turns": attempt.machine_turns,
        "agreed_turns": turns,
        "wire_length_m": attempt.wire_length_m,
        "confirmed": confirmed,
    }
    record(
        session,
        actor,
        Move.FINISH,
        "run",
        run.id,
        at=now,
        before={"state": str(RunState.WINDING)},
        after=after,
        reason=reason,
    )
    return attempt


def lose(
    session: Session,
    actor: Actor,
    run: Run,
    *,
    cause: str,
    reason: str | None,
    now: datetime,
    scrap: bool = False,
) -> Attempt:
    """Give the coil up on the machine. The run can be wound again unless it is scrapped.

    The attempt stays in the record and is counted, and what the machine had wound by then is
    drawn from the spool: wire of a lost coil is lost too.
    """
    rules.check_cause(cause)
    run = hold_run(session, run)
    state = rules.next_state(RunState(run.state), Move.LOSE, actor.roles)
    if scrap:
        state = rules.next_state(state, Move.SCRAP, actor.roles)
    attempt = _attempt_in_hand(run)
    body = body_of(run.revision)
    _end(session, attempt, actor, "lost", now)
    attempt.lost_cause = cause
    if attempt.machine_turns and rules.tells_of_wire(attempt.machine_turns, body.turns):
        _draw(session, run, attempt, attempt.machine_turns, f"run {run.serial}, lost", now)
    if scrap:
        run.dispositions.append(
            Disposition(
                run_id=run.id,
                kind=str(Move.SCRAP),
                cause=cause,
                reason=reason or f"Lost while winding: {cause}.",
                decided_by=actor.name,
                decided_at=now,
            )
        )
    move_run(run, state, now)
    session.flush()
    after = {
        "state": run.state,
        "attempt": attempt.number,
        "cause": cause,
        "machine_turns": attempt.machine_turns,
        "wire_length_m": attempt.wire_length_m,
    }
    record(
        session,
        actor,
        Move.LOSE,
        "run",
        run.id,
        at=now,
        before={"state": str(RunState.WINDING)},
        after=after,
        reason=reason,
    )
    return attempt


def _attempt_in_hand(run: Run) -> Attempt:
    attempt = run.attempt
    if attempt is None or attempt.ended_at is not None:
        raise WrongState(
            f"Run {shown(run.serial)} has no winding in hand.",
            pointer="/state",
            value=run.state,
        )
    return attempt


def _end(session: Session, attempt: Attempt, actor: Actor, outcome: str, now: datetime) -> None:
    """End the attempt; the counters answer what they saw."""
    attempt.outcome = outcome
    # A server's clock that was set back must not make a coil end before it began.
    attempt.ended_at = max(now, attempt.started_at)
    attempt.ended_by = actor.name
    session.flush()
    answers = publish(session, AttemptEnded(attempt.id, attempt.machine_id, now))
    counted = next((answer for answer in answers if isinstance(answer, MachineTurns)), None)
    attempt.machine_turns = None if counted is None else counted.turns


def _draw(
    session: Session, run: Run, attempt: Attempt, turns: float, purpose: str, now: datetime
) -> None:
    length = wire_for(body_of(run.revision), turns)
    attempt.wire_length_m = length
    draw_wire(session, attempt.spool, length_m=length, purpose=purpose, now=now)
