"""The fold: a run's turns as a pure function of its counter events.

Counts are cumulative since the counter's own zero, so a lost message costs nothing and a repeated
one is harmless. Events are ordered by (boot, sequence), never by clock. What the numbers alone
cannot settle (a count that falls, a restart, a jump that no spindle can make) is taken in the way
stated at each line and asked as a question, never dropped and never silently guessed.
"""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from datetime import datetime

EVENT_KINDS = ["total", "start", "stop", "wire break", "back-count", "index", "heartbeat"]
ROLLOVERS = (2**16, 2**32)
# A wrap is believed where the count stood within this share of the counter's end.
_NEAR_END = 0.9


@dataclass(frozen=True)
class Event:
    """One counter event as the fold needs it."""

    boot: int
    sequence: int
    kind: str
    count: int
    device_time: datetime | None = None

    @property
    def position(self) -> tuple[int, int]:
        return (self.boot, self.sequence)


@dataclass(frozen=True)
class Question:
    """Something that a person has to settle."""

    kind: str
    boot: int
    sequence: int
    text: str


@dataclass(frozen=True)
class FoldState:
    """The fold after some events; ``position`` is the last one taken in."""

    turns: float
    count: int
    boot: int
    sequence: int
    device_time: datetime | None = None
    events: int = 0
    missing: tuple[tuple[int, int, int], ...] = ()  # (boot, first, last) not yet arrived
    questions: tuple[Question, ...] = ()

    @property
    def position(self) -> tuple[int, int]:
        return (self.boot, self.sequence)


@dataclass(frozen=True)
class Machine:
    """What the fold must know of the machine."""

    top_speed_rpm: float
    pulses_per_turn: int = 1
    counts_direction: bool = False


def begin(boot: int, sequence: int, count: int) -> FoldState:
    """The state at the start of an attempt: the counter stands at ``count``."""
    return FoldState(turns=0.0, count=count, boot=boot, sequence=sequence)


def fold(state: FoldState, events: Iterable[Event], machine: Machine) -> FoldState:
    """Take in events that follow ``state`` in (boot, sequence); order of arrival does not matter.

    Duplicates (same position) count once. Raises ValueError for an event that lies before the
    state's position: its owner must fold again from the beginning.
    """
    by_position = {event.position: event for event in events}
    for position in sorted(by_position):
        if position <= state.position:
            raise ValueError(f"events: {position} does not follow {state.position}")
        state = _take(state, by_position[position], machine)
    return state


def _take(state: FoldState, event: Event, machine: Machine) -> FoldState:
    if event.boot == state.boot:
        missing = _gap(state.boot, state.sequence + 1, event.sequence - 1)
    else:
        missing = _gap(event.boot, 1, event.sequence - 1)
    pulses, question = _pulses(state, event, machine)
    pulses_since = pulses / machine.pulses_per_turn
    questions = [question] if question else []
    if too_fast := _too_fast(state, event, pulses_since, machine):
        questions.append(too_fast)
    return replace(
        state,
        turns=max(0.0, state.turns + pulses_since),
        count=event.count,
        boot=event.boot,
        sequence=event.sequence,
        device_time=event.device_time or state.device_time,
        events=state.events + 1,
        missing=state.missing + missing,
        questions=state.questions + tuple(questions),
    )


def _gap(boot: int, first: int, last: int) -> tuple[tuple[int, int, int], ...]:
    return ((boot, first, last),) if last >= first else ()


def _pulses(state: FoldState, event: Event, machine: Machine) -> tuple[int, Question | None]:
    """Pulses since the last event, and what to ask about them."""
    if event.boot != state.boot:
        return _pulses_over_restart(state, event)
    step = event.count - state.count
    if step >= 0 or event.kind == "back-count":
        return step, None
    return _pulses_of_fall(state, event, machine)


def _pulses_over_restart(state: FoldState, event: Event) -> tuple[int, Question | None]:
    if event.count >= state.count:
        return event.count - state.count, None  # the counter kept its total over the restart
    return event.count, Question(
        "restart",
        event.boot,
        event.sequence,
        f"The counter restarted: it stood at {state.count} and came back at {event.count}. "
        "Turns wound between its last message and the restart are not known.",
    )


def _pulses_of_fall(
    state: FoldState, event: Event, machine: Machine
) -> tuple[int, Question | None]:
    step = event.count - state.count
    if state.events == 0:
        # The counter was set to zero between two coils, as it should be.
        return (0 if event.kind == "start" else event.count), None
    for end in ROLLOVERS:
        if _NEAR_END * end <= state.count < end and event.count < (1 - _NEAR_END) * end:
            return step + end, None
    if event.kind in ("start", "index"):
        return event.count, Question(
            "zeroed",
            event.boot,
            event.sequence,
            f"The counter was set back from {state.count} to {event.count} during the coil; "
            "the turns before are kept.",
        )
    if machine.counts_direction:
        return step, None  # a direction-sensing counter that unwinds counts down
    return 0, Question(
        "fell",
        event.boot,
        event.sequence,
        f"The count fell from {state.count} to {event.count} without a back-count; "
        "no turns were taken off for it.",
    )


def _too_fast(state: FoldState, event: Event, turns: float, machine: Machine) -> Question | None:
    if state.device_time is None or event.device_time is None or event.boot != state.boot:
        return None
    seconds = (event.device_time - state.device_time).total_seconds()
    if seconds <= 0:
        return None
    # One turn of grace: a message may leave just before and just after a pulse.
    if turns - 1 <= machine.top_speed_rpm / 60 * seconds:
        return None
    return Question(
        "too fast",
        event.boot,
        event.sequence,
        f"{turns:g} turns in {seconds:g} s is more than the spindle's "
        f"{machine.top_speed_rpm:g} rpm can make: bounce, noise or a wrong clock?",
    )
