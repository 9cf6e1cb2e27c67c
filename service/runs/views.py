"""Answers about orders and runs, made while their session is open."""

from service.recipes.models import Revision
from service.runs.models import Attempt, Order, Run
from service.runs.orders import Progress
from service.runs.rules import RunState, moves_from
from service.runs.schemas import (
    AttemptView,
    DispositionView,
    MachineOf,
    OrderView,
    RecipeOf,
    RunLine,
    RunView,
    SpoolOf,
)
from service.storage.serials import shown
from service.web.schemas import Json


def recipe_of(revision: Revision) -> RecipeOf:
    return RecipeOf(
        recipe=revision.recipe.name,
        recipe_id=revision.recipe_id,
        revision=revision.number,
        revision_id=revision.id,
        state=revision.state,
    )


def order_view(order: Order, progress: Progress) -> OrderView:
    return OrderView(
        serial=order.serial,
        label=shown(order.serial),
        customer=order.customer,
        recipe=recipe_of(order.revision),
        quantity=order.quantity,
        promised_on=order.promised_on,
        state=order.state,
        note=order.note,
        created_at=order.created_at,
        runs=progress.by_state,
        done=progress.done,
        to_do=max(0, order.quantity - progress.done),
        version=order.version,
    )


def planned_turns(revision: Revision) -> int:
    return int(revision.body["turns"])


def expected(revision: Revision) -> Json:
    """The quantities of the frozen expectation, each with its standard uncertainty."""
    return {
        name: quantity
        for name, quantity in (revision.expectation or {}).items()
        if isinstance(quantity, dict) and "standard_uncertainty" in quantity
    }


def attempt_view(attempt: Attempt) -> AttemptView:
    spool = attempt.spool
    return AttemptView(
        id=attempt.id,
        number=attempt.number,
        machine=MachineOf(id=attempt.machine_id, name=attempt.machine.name),
        spool=SpoolOf(
            serial=spool.serial,
            wire_size=spool.wire_size,
            wire_build=spool.wire_build,
            conductor=spool.conductor,
        ),
        outcome=attempt.outcome,
        started_at=attempt.started_at,
        started_by=attempt.started_by,
        ended_at=attempt.ended_at,
        ended_by=attempt.ended_by,
        machine_turns=attempt.machine_turns,
        agreed_turns=attempt.agreed_turns,
        agreed_reason=attempt.agreed_reason,
        wire_length_m=attempt.wire_length_m,
        lost_cause=attempt.lost_cause,
    )


def run_line(run: Run) -> RunLine:
    attempt = run.attempt
    return RunLine(
        serial=run.serial,
        label=shown(run.serial),
        state=run.state,
        recipe=recipe_of(run.revision),
        order=run.order.serial if run.order else None,
        planned_turns=planned_turns(run.revision),
        attempt_number=run.attempt_number,
        machine=(MachineOf(id=attempt.machine_id, name=attempt.machine.name) if attempt else None),
        agreed_turns=attempt.agreed_turns if attempt else None,
        created_at=run.created_at,
        changed_at=run.changed_at,
    )


def run_view(run: Run) -> RunView:
    return RunView(
        **run_line(run).model_dump(),
        customer=run.order.customer if run.order else None,
        magnet_lot=run.magnet_lot.serial if run.magnet_lot else None,
        attempts=[attempt_view(attempt) for attempt in run.attempts],
        dispositions=[DispositionView.model_validate(one) for one in run.dispositions],
        expected=expected(run.revision),
        moves=[str(move) for move in moves_from(RunState(run.state))],
        version=run.version,
    )
