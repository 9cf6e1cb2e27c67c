"""What is decided about a coil: one way in for every disposition."""

import uuid
from datetime import datetime

from sqlalchemy.orm import Session

from service.errors import WrongState
from service.recipes.acts import recipe_by_id
from service.runs import rules
from service.runs.holding import hold_run, move_run
from service.runs.models import Disposition, Run
from service.runs.rules import Move, RunState
from service.storage.records import Actor, record


def decide(
    session: Session,
    actor: Actor,
    run: Run,
    *,
    move: Move,
    cause: str | None,
    reason: str,
    regrade_recipe_id: uuid.UUID | None,
    conformity: str | None,
    now: datetime,
    judged_at: datetime | None = None,
) -> Disposition:
    """Record a decision and move the run where it leads.

    ``conformity`` is that of the run's last verdict, None without one: a coil is released only
    where it conforms. ``judged_at`` is when that verdict was given; one from before the coil was
    wound again or reworked does not count. Raises WrongState, NotAllowed, or InvalidValue where
    the decision does not say what it must.
    """
    to_itself = None
    if regrade_recipe_id is not None:
        to_itself = regrade_recipe_id == run.revision.recipe_id
    rules.check_disposition(move, cause=cause, reason=reason, regrades_to_itself=to_itself)
    if regrade_recipe_id is not None:
        recipe_by_id(session, regrade_recipe_id, pointer="/regrade_recipe_id")
    run = hold_run(session, run)
    before = run.state
    state = rules.next_state(RunState(run.state), move, actor.roles)
    if move is Move.RELEASE:
        refusal = rules.release_refusal(conformity, judged_at, _last_worked_on(run))
        if refusal is not None:
            raise WrongState(
                f"This coil cannot be released. {refusal}",
                pointer="/decision",
                value=str(move),
                mend="Measure it again, or ask a lead for a concession, a regrade or a rework.",
            )
    decision = Disposition(
        run_id=run.id,
        kind=str(move),
        cause=cause,
        reason=reason.strip(),
        regrade_recipe_id=regrade_recipe_id,
        decided_by=actor.name,
        decided_at=now,
    )
    run.dispositions.append(decision)
    move_run(run, state, now)
    session.flush()
    after = {
        "state": run.state,
        "cause": cause,
        "regrade_recipe_id": regrade_recipe_id,
        "conformity": conformity,
    }
    record(
        session,
        actor,
        move,
        "run",
        run.id,
        at=now,
        before={"state": before},
        after=after,
        reason=reason,
    )
    return decision


def _last_worked_on(run: Run) -> datetime | None:
    """When the coil was last changed: taken off the machine, or given to be reworked."""
    ended = [attempt.ended_at for attempt in run.attempts if attempt.ended_at is not None]
    reworked = [
        decision.decided_at
        for decision in run.dispositions
        if decision.kind in (Move.REWORK, Move.REPAIR)
    ]
    return max(ended + reworked, default=None)
