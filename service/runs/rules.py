"""Who may move a run where: one table, and the words for what is decided about a coil.

Dispositions are the words of ISO 9000:2015, clause 3.12 (from memory).
"""

from dataclasses import dataclass
from enum import StrEnum

from service.errors import NotAllowed, WrongState

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


def release_refusal(conformity: str | None) -> str | None:
    """Why a coil may not simply be released, or None where it may.

    A coil that does not conform, or of which it is not decided, leaves by concession only.
    """
    if conformity == "conforms":
        return None
    if conformity is None:
        return "It has no verdict yet."
    return f"Its last verdict is “{conformity}”."
