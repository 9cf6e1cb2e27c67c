"""What may be done with a revision, which limits it sets, and how two revisions differ."""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from service.errors import WrongState

STAGES = ("raw", "potted", "final")
# Warnings of a prediction that mean that the coil cannot be wound as written.
UNWINDABLE = frozenset({"does-not-fit-the-flange", "layer-too-long"})
_ABOUT = 200  # one part in this many is near enough for "about N turns fit"


@dataclass(frozen=True)
class Limit:
    """A specification limit (the customer's) at one stage, SI, resistance at 20 °C."""

    stage: str
    characteristic: str
    lower: float | None
    upper: float | None


@dataclass(frozen=True)
class Centre:
    """What a tolerance stands around: the value, SI, and how far it may lie off, in percent."""

    characteristic: str
    value: float
    percent: float | None


def limits(centres: Sequence[Centre], stated: Sequence[Limit]) -> list[Limit]:
    """The limits of a revision: the tolerance at every stage, unless one is stated for a stage."""
    found = {
        (stage, centre.characteristic): Limit(
            stage,
            centre.characteristic,
            centre.value * (1.0 - centre.percent / 100.0),
            centre.value * (1.0 + centre.percent / 100.0),
        )
        for stage in STAGES
        for centre in centres
        if centre.percent is not None
    }
    found.update({(limit.stage, limit.characteristic): limit for limit in stated})
    return list(found.values())


def most_turns(fits: Callable[[int], bool], too_many: int) -> int:
    """About how many turns fit, given a count that does not; 0 where not even one does.

    ``fits`` must not become true again above a count for which it is false.
    """
    lower, upper = 0, too_many
    while upper - lower > max(1, upper // _ABOUT):
        middle = (lower + upper) // 2
        if fits(middle):
            lower = middle
        else:
            upper = middle
    return lower


def check_draft(state: str, wanted: str) -> None:
    """Refuse to change or release what is no draft any more.

    Raises WrongState.
    """
    if state != "draft":
        raise WrongState(
            f"This revision is {state}; a released revision never changes.",
            pointer="/state",
            value=state,
            mend=f"Make a new revision of the recipe to {wanted} it.",
        )


def check_released(state: str, wanted: str, *, pointer: str = "/state") -> None:
    """Refuse what can be done with a released revision only.

    Raises WrongState.
    """
    if state != "released":
        raise WrongState(
            f"This revision is {state}, not released.",
            pointer=pointer,
            value=state,
            mend=f"Choose a released revision to {wanted}.",
        )


@dataclass(frozen=True)
class Difference:
    """One field that differs; None where the field is absent on that side."""

    pointer: str
    before: Any
    after: Any


def difference(before: Any, after: Any) -> list[Difference]:
    """What differs between two bodies, field by field, by JSON Pointer (RFC 6901)."""
    return list(_differences("", before, after))


def _differences(pointer: str, before: Any, after: Any) -> Iterator[Difference]:
    if isinstance(before, Mapping) and isinstance(after, Mapping):
        for name in [*before, *(name for name in after if name not in before)]:
            step = f"{pointer}/{name.replace('~', '~0').replace('/', '~1')}"
            yield from _differences(step, before.get(name), after.get(name))
    elif isinstance(before, list) and isinstance(after, list):
        for index in range(max(len(before), len(after))):
            yield from _differences(
                f"{pointer}/{index}",
                before[index] if index < len(before) else None,
                after[index] if index < len(after) else None,
            )
    elif type(before) is bool or type(after) is bool:
        if before is not after:
            yield Difference(pointer, before, after)
    elif before != after:
        yield Difference(pointer, before, after)
