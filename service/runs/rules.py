"""Who may move a run where: one table, and the words for what is decided about a coil.

Dispositions are the words of ISO 9000:2015, clause 3.12 (from memory).
"""

from dataclasses import dataclass
from datetime import datetime
from enum import StrEnum

from service.errors import ConfirmationNeeded, InvalidValue, NotAllowed, WrongState

SCRAP_CAUSES = (
    "wire break",
    "miscount",
    "resistance",
    "inductance",
    "shorted turns",
    "open coil",
    "insulation",
    "geometry",
    "wrong wire",
    "wrong magnet",
    "handling",
    "not stated",
)


class RunState(StrEnum):
    PLANNED = "planned"
    WINDING = "winding"
    WOUND = "wound"
    MEASURED = "measured"
    ACCEPTED = "accepted"
    ON_HOLD = "on hold"
    REWORK = "rework"
    SCRAPPED = "scrapped"


class Move(StrEnum):
    """What is done to a run."""

    START = "start winding"
    FINISH = "finish winding"
    LOSE = "give up the coil"
    MEASURE = "measure"
    RELEASE = "release"
    CONCESSION = "concession"
    REGRADE = "regrade"
    HOLD = "hold"
    REWORK = "rework"
    REPAIR = "repair"
    SCRAP = "scrap"


DISPOSITIONS = (
    Move.RELEASE,
    Move.CONCESSION,
    Move.REGRADE,
    Move.HOLD,
    Move.REWORK,
    Move.REPAIR,
    Move.SCRAP,
)


@dataclass(frozen=True)
class Step:
    """One line of the table: where a move leads, and which roles may make it."""

    to: RunState
    roles: frozenset[str]


_FLOOR = frozenset({"operator", "lead"})
_BENCH = frozenset({"bench", "lead"})
_ANY_HAND = frozenset({"operator", "bench", "lead"})
_LEAD = frozenset({"lead"})

_S, _M = RunState, Move

TABLE: dict[tuple[RunState, Move], Step] = {
    (_S.PLANNED, _M.START): Step(_S.WINDING, _FLOOR),
    (_S.REWORK, _M.START): Step(_S.WINDING, _FLOOR),
    (_S.WINDING, _M.FINISH): Step(_S.WOUND, _FLOOR),
    (_S.WINDING, _M.LOSE): Step(_S.REWORK, _FLOOR),
    (_S.PLANNED, _M.SCRAP): Step(_S.SCRAPPED, _LEAD),
    (_S.WOUND, _M.MEASURE): Step(_S.MEASURED, _BENCH),
    (_S.MEASURED, _M.MEASURE): Step(_S.MEASURED, _BENCH),
    # A reworked coil that was not wound again (a joint, a lead, a magnet) is measured again.
    (_S.REWORK, _M.MEASURE): Step(_S.MEASURED, _BENCH),
    (_S.ON_HOLD, _M.MEASURE): Step(_S.ON_HOLD, _BENCH),
    (_S.WOUND, _M.HOLD): Step(_S.ON_HOLD, _ANY_HAND),
    (_S.WOUND, _M.SCRAP): Step(_S.SCRAPPED, _BENCH),
    (_S.WOUND, _M.REWORK): Step(_S.REWORK, _ANY_HAND),
    (_S.REWORK, _M.SCRAP): Step(_S.SCRAPPED, _BENCH | _FLOOR),
    (_S.REWORK, _M.HOLD): Step(_S.ON_HOLD, _ANY_HAND),
    **{
        (state, move): Step(to, roles)
        for state in (_S.MEASURED, _S.ON_HOLD)
        for move, to, roles in (
            (_M.RELEASE, _S.ACCEPTED, _BENCH),
            (_M.CONCESSION, _S.ACCEPTED, _LEAD),
            (_M.REGRADE, _S.ACCEPTED, _LEAD),
            (_M.HOLD, _S.ON_HOLD, _ANY_HAND),
            (_M.REWORK, _S.REWORK, _BENCH),
            (_M.REPAIR, _S.REWORK, _LEAD),
            (_M.SCRAP, _S.SCRAPPED, _BENCH),
        )
        if not (state is _S.ON_HOLD and move is _M.HOLD)
    },
    # A later find takes an accepted coil back; the first decision stays in the record.
    (_S.ACCEPTED, _M.HOLD): Step(_S.ON_HOLD, _LEAD),
}


def moves_from(state: RunState) -> list[Move]:
    """What can be done with a run in this state, in the order of the table."""
    return [move for (origin, move) in TABLE if origin is state]


def next_state(state: RunState, move: Move, roles: frozenset[str]) -> RunState:
    """Where ``move`` leads from ``state``.

    Raises WrongState where the table has no such line, NotAllowed where none of ``roles`` may.
    """
    step = TABLE.get((state, move))
    if step is None:
        possible = ", ".join(f"“{m}”" for m in moves_from(state)) or "nothing more"
        raise WrongState(
            f"A run that is {state} cannot take “{move}”.",
            pointer="/state",
            value=str(state),
            mend=f"Possible now: {possible}.",
        )
    if not step.roles & roles:
        raise NotAllowed(
            f"“{move}” is not for the roles {', '.join(sorted(roles)) or 'none'}.",
            mend=f"Ask somebody who may act as {' or '.join(sorted(step.roles))}.",
        )
    return step.to


def release_refusal(
    conformity: str | None,
    judged_at: datetime | None = None,
    worked_on_at: datetime | None = None,
) -> str | None:
    """Why a coil may not simply be released, or None where it may.

    A coil that does not conform, or of which it is not decided, leaves by concession only. A
    verdict given before the coil was last worked on tells of another coil than this one.
    """
    if conformity is None:
        return "It has no verdict yet."
    if conformity != "conforms":
        return f"Its last verdict is “{conformity}”."
    if judged_at is not None and worked_on_at is not None and judged_at < worked_on_at:
        return "It was wound or reworked after its last verdict."
    return None


# A count this far from the recipe's is asked back: a coil given up early, or a slip of the pen.
ASKED_BACK_SHARE = 0.2
# Below half a turn two counts are the same turn, seen at another place on the spindle.
SAME_TURN = 0.5
_SLIPS = (10.0, 100.0, 1000.0)
MOST_TURNS = 1_000_000


def agree_turns(machine: float | None, given: float | None, reason: str | None) -> float:
    """The turns that a coil was wound with: what a person says, else what the machine counted.

    Raises InvalidValue where neither is known, or where they differ and no reason is given.
    """
    if given is None:
        if machine is None or machine <= 0:
            raise InvalidValue(
                "No counter counted this coil.",
                pointer="/agreed_turns",
                mend="Send the turns that were wound.",
            )
        return machine
    if not 0 < given < MOST_TURNS:
        raise InvalidValue(
            "A coil has some turns, and fewer than a million.",
            pointer="/agreed_turns",
            value=given,
            mend="Send the turns that were wound.",
        )
    if machine is not None and abs(given - machine) >= SAME_TURN and not reason:
        raise InvalidValue(
            f"The machine counted {machine:g} turns, and {given:g} were entered.",
            pointer="/reason",
            value=given,
            mend="Say why they differ, or agree with the machine.",
            extra={"machine_turns": machine},
        )
    return given


def ask_back_turns(turns: float, planned: int, confirmed: bool) -> None:
    """Raise ConfirmationNeeded for a count far from the recipe's, unless it is confirmed."""
    if confirmed or abs(turns - planned) <= ASKED_BACK_SHARE * planned:
        return
    raise ConfirmationNeeded(
        f"{turns:g} turns are far from the recipe's {planned}.",
        pointer="/agreed_turns",
        value=turns,
        mend=_slip(turns, planned) + "Send it again with “confirmed”: true if it is meant; "
        "a coil that was given up is reported as lost instead.",
        extra={"planned_turns": planned},
    )


def tells_of_wire(turns: float, planned: int) -> bool:
    """Whether a count of a lost coil can be true, so that it tells how much wire was lost."""
    return 1.0 <= turns <= (1.0 + ASKED_BACK_SHARE) * planned


def _slip(turns: float, planned: int) -> str:
    for factor in _SLIPS:
        for meant in (turns * factor, turns / factor):
            if abs(meant - planned) <= ASKED_BACK_SHARE * planned:
                return f"Was {meant:g} meant? "
    return ""


def ask_back_count(asked: int, quantity: int, alive: int, confirmed: bool) -> None:
    """Raise ConfirmationNeeded where more coils are planned than the order wants."""
    wanted = max(0, quantity - alive)
    if confirmed or asked <= wanted:
        return
    raise ConfirmationNeeded(
        f"The order is for {quantity}, and {alive} are good or on their way.",
        pointer="/count",
        value=asked,
        mend=f"Plan {wanted}, or send it again with “confirmed”: true for spare coils."
        if wanted
        else "Send it again with “confirmed”: true if spare coils are meant.",
    )


def check_disposition(
    move: Move, *, cause: str | None, reason: str, regrades_to_itself: bool | None
) -> None:
    """Refuse a decision that does not say what a decision of its kind must say.

    ``regrades_to_itself`` is None where no recipe is named. Raises InvalidValue.
    """
    if move not in DISPOSITIONS:
        raise InvalidValue(
            f"“{move}” is not a decision about a coil.",
            pointer="/decision",
            value=str(move),
            mend=f"Choose one of: {', '.join(DISPOSITIONS)}.",
        )
    if not reason.strip():
        raise InvalidValue("A decision needs a reason.", pointer="/reason", mend="Say why.")
    if move is Move.SCRAP and cause is None:
        raise InvalidValue(
            "Scrap needs a cause.",
            pointer="/cause",
            mend=f"Choose one of: {', '.join(SCRAP_CAUSES)}.",
        )
    if cause is not None:
        check_cause(cause)
    if move is Move.REGRADE and regrades_to_itself is not False:
        raise InvalidValue(
            "A regrade names the recipe that the coil is moved to, another than its own.",
            pointer="/regrade_recipe_id",
            mend="Send the id of the recipe whose requirement the coil meets.",
        )
    if move is not Move.REGRADE and regrades_to_itself is not None:
        raise InvalidValue(
            "Only a regrade names another recipe.",
            pointer="/regrade_recipe_id",
            mend="Take it out, or decide to regrade.",
        )


def check_cause(cause: str) -> None:
    """Raise InvalidValue for a cause that the month's report would not know."""
    if cause not in SCRAP_CAUSES:
        raise InvalidValue(
            "This cause is not in the list.",
            pointer="/cause",
            value=cause,
            mend=f"Choose one of: {', '.join(SCRAP_CAUSES)}.",
        )


@dataclass(frozen=True)
class WireKind:
    """Which wire: what stands on the spool's label, and in the recipe."""

    conductor: str
    size: str
    build: str

    def __str__(self) -> str:
        return f"{self.size} {self.build} {self.conductor}"


def spool_refusal(wanted: WireKind, loaded: WireKind, state: str) -> tuple[str, str] | None:
    """Why a spool may not be wound from, and the mend; None where it may."""
    if wanted != loaded:
        return (
            f"The recipe is wound with {wanted}, and this spool carries {loaded}.",
            f"Load a spool of {wanted}.",
        )
    if state != "on the shelf":
        return f"This spool is {state}.", f"Load another spool of {wanted}."
    return None
