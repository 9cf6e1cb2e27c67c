"""What is decided about a coil: every disposition, by whom, and why."""

import uuid
from datetime import UTC, datetime, timedelta
from typing import Any

import pytest
import sqlalchemy as sa

from service.errors import InvalidValue, NotAllowed, NotFound, Problem, WrongState
from service.recipes.acts import create_recipe
from service.runs.acts import decide, run_by_label
from service.runs.models import Disposition, Run
from service.runs.rules import Move, RunState
from service.storage.engine import Database
from service.storage.records import Act, Actor, verify
from tests.recipes.bodies import recipe
from tests.runs.conftest import Hands

BENCH = Actor("person", None, "Invented Bench", frozenset({"bench"}))
LEAD = Actor("person", None, "Invented Lead", frozenset({"lead"}))
OPERATOR = Actor("person", None, "Invented Operator", frozenset({"operator"}))
AUDITOR = Actor("person", None, "Invented Auditor", frozenset({"auditor"}))


class Bench:
    """A run that was measured, and decisions about it."""

    def __init__(self, database: Database, serial: str) -> None:
        self.database, self.serial = database, serial
        self.put(RunState.MEASURED)

    def put(self, state: RunState) -> None:
        with self.database.write() as session:
            session.execute(
                sa.update(Run).where(Run.serial == self.serial).values(state=str(state))
            )
            session.commit()

    def decide(self, actor: Actor, move: Move, **how: Any) -> str:
        """The state after the decision."""
        usual = {
            "cause": None,
            "reason": "Seen by eye.",
            "regrade_recipe_id": None,
            "conformity": None,
            "now": datetime.now(UTC),
        }
        with self.database.write() as session:
            run = run_by_label(session, self.serial)
            decide(session, actor, run, move=move, **{**usual, **how})
            state = run.state
            session.commit()
        return state

    def decisions(self) -> list[tuple[str, str | None, str]]:
        with self.database.read() as session:
            rows = session.execute(
                sa.select(Disposition.kind, Disposition.cause, Disposition.decided_by).order_by(
                    Disposition.id
                )
            )
            return [(kind, cause, by) for kind, cause, by in rows]

    def state(self) -> str:
        with self.database.read() as session:
            return run_by_label(session, self.serial).state


@pytest.fixture
def bench(database: Database, operator: Hands) -> Bench:
    return Bench(database, operator.wound())


def refused(kind: type[Problem], bench: Bench, actor: Actor, move: Move, **how: Any) -> Problem:
    before = bench.state()
    with pytest.raises(kind) as refusal:
        bench.decide(actor, move, **how)
    assert bench.state() == before
    assert bench.decisions() == []
    return refusal.value


def test_a_coil_that_conforms_is_released(bench: Bench) -> None:
    assert bench.decide(BENCH, Move.RELEASE, conformity="conforms") == "accepted"
    assert bench.decisions() == [("release", None, "Invented Bench")]


@pytest.mark.parametrize("conformity", [None, "not decided", "does not conform"])
def test_a_coil_that_does_not_conform_leaves_by_concession_of_a_lead_only(
    bench: Bench, conformity: str | None
) -> None:
    problem = refused(WrongState, bench, LEAD, Move.RELEASE, conformity=conformity)
    assert "concession" in (problem.mend or "")
    refused(NotAllowed, bench, BENCH, Move.CONCESSION, conformity=conformity)
    assert bench.decide(LEAD, Move.CONCESSION, conformity=conformity) == "accepted"


def test_a_verdict_from_before_the_rework_releases_nothing(bench: Bench) -> None:
    now = datetime.now(UTC)
    bench.decide(BENCH, Move.REWORK, now=now, cause="open coil")
    bench.decide(BENCH, Move.HOLD, now=now)
    with pytest.raises(WrongState, match="after its last verdict"):
        bench.decide(
            BENCH, Move.RELEASE, conformity="conforms", judged_at=now - timedelta(minutes=5)
        )
    later = now + timedelta(minutes=5)
    assert bench.decide(BENCH, Move.RELEASE, conformity="conforms", judged_at=later) == "accepted"


def test_a_coil_is_regraded_to_another_recipe(
    bench: Bench, database: Database, operator: Hands
) -> None:
    own = uuid.UUID(operator.floor.recipe_id)
    with database.write() as session:
        other = create_recipe(
            session,
            LEAD,
            name="Harbour bridge",
            kind="pickup",
            body=recipe(turns=7500),
            note=None,
            now=datetime.now(UTC),
        ).recipe_id
        session.commit()
    for wrong, kind in ((None, InvalidValue), (own, InvalidValue), (uuid.uuid4(), NotFound)):
        problem = refused(kind, bench, LEAD, Move.REGRADE, regrade_recipe_id=wrong)
        assert problem.pointer == "/regrade_recipe_id"
    refused(InvalidValue, bench, LEAD, Move.CONCESSION, regrade_recipe_id=other)
    assert bench.decide(LEAD, Move.REGRADE, regrade_recipe_id=other) == "accepted"
    shown = operator.show(bench.serial)["dispositions"]
    assert [(one["kind"], one["regrade_recipe_id"]) for one in shown] == [("regrade", str(other))]


def test_scrap_needs_a_cause_and_is_the_end(bench: Bench) -> None:
    assert refused(InvalidValue, bench, BENCH, Move.SCRAP).pointer == "/cause"
    assert refused(InvalidValue, bench, BENCH, Move.SCRAP, cause="other").pointer == "/cause"
    assert bench.decide(BENCH, Move.SCRAP, cause="shorted turns") == "scrapped"
    for move in Move:
        with pytest.raises(Problem):
            bench.decide(LEAD, move, cause="handling", conformity="conforms")
    assert bench.decisions() == [("scrap", "shorted turns", "Invented Bench")]


def test_a_decision_needs_a_reason_and_a_role(bench: Bench) -> None:
    assert refused(InvalidValue, bench, BENCH, Move.HOLD, reason=" ").pointer == "/reason"
    refused(NotAllowed, bench, AUDITOR, Move.HOLD)
    refused(NotAllowed, bench, OPERATOR, Move.RELEASE, conformity="conforms")
    assert bench.decide(OPERATOR, Move.HOLD) == "on hold"


def test_winding_and_measuring_are_no_decisions(bench: Bench) -> None:
    for move in (Move.START, Move.FINISH, Move.LOSE, Move.MEASURE):
        assert refused(InvalidValue, bench, LEAD, move).pointer == "/decision"


def test_a_later_find_takes_an_accepted_coil_back_and_both_decisions_stay(bench: Bench) -> None:
    bench.decide(BENCH, Move.RELEASE, conformity="conforms")
    with pytest.raises(NotAllowed):
        bench.decide(BENCH, Move.HOLD)
    assert bench.decide(LEAD, Move.HOLD, reason="The meter was out.") == "on hold"
    assert [kind for kind, _, _ in bench.decisions()] == ["release", "hold"]


def test_a_reworked_coil_is_wound_again_as_the_same_run(bench: Bench, operator: Hands) -> None:
    bench.decide(BENCH, Move.REWORK, cause="shorted turns")
    assert operator.start(bench.serial).status_code == 201
    run = operator.finish(bench.serial).json()
    assert (run["attempt_number"], len(run["attempts"]), run["state"]) == (2, 2, "wound")


def test_decisions_are_acts_in_the_chain(bench: Bench, database: Database) -> None:
    bench.decide(BENCH, Move.HOLD, reason="Ask the customer.")
    bench.decide(LEAD, Move.CONCESSION, reason="The customer takes it.")
    with database.read() as session:
        acts = session.execute(
            sa.select(Act.verb, Act.actor_name, Act.reason, Act.before, Act.after)
            .where(Act.verb.in_(["hold", "concession"]))
            .order_by(Act.position)
        ).all()
        assert verify(session)[1] is None
    assert [(verb, name, reason) for verb, name, reason, _, _ in acts] == [
        ("hold", "Invented Bench", "Ask the customer."),
        ("concession", "Invented Lead", "The customer takes it."),
    ]
    assert [(before["state"], after["state"]) for *_, before, after in acts] == [
        ("measured", "on hold"),
        ("on hold", "accepted"),
    ]
