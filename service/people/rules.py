"""Rules of people: names, roles, passwords, and how long a sign-in lasts."""

import math
import unicodedata
from collections.abc import Collection, Iterable, Sequence
from datetime import datetime, timedelta

from service.errors import InvalidValue, WrongState

IDLE_LIMIT = timedelta(hours=12)
ABSOLUTE_LIMIT = timedelta(days=7)
SEEN_STEP = timedelta(minutes=1)
ATTEMPT_WINDOW = timedelta(minutes=15)
ATTEMPTS_PER_NAME = 5
# A shop's tablets share one address: one person's slips must not lock the others out.
ATTEMPTS_PER_ADDRESS = 30
SHORTEST_PASSWORD = 12
FEWEST_CHARACTERS = 5
LONGEST_NAME = 120


def same_name(name: str) -> str:
    """The form in which names are compared: one Unicode form, no case, single blanks.

    Canonical caseless matching (Unicode Standard, section 3.13, D145), shown composed.
    """
    folded = unicodedata.normalize("NFD", " ".join(name.split())).casefold()
    return unicodedata.normalize("NFC", folded)


def check_name(name: str) -> str:
    """The name as typed, with single blanks.

    Raises InvalidValue for a name that shows nothing or is too long, or that holds control
    characters, with which a name could pass for another line of a list or a log.
    """
    kept = " ".join(name.split())
    kinds = {unicodedata.category(character) for character in kept}
    if not any(kind[0] in "LNPS" for kind in kinds):
        why, mend = "A name needs something that can be seen.", "Type the name that people use."
    elif kinds & {"Cc", "Cs"}:
        why, mend = "A name cannot hold control characters.", "Leave them out."
    elif len(kept) > LONGEST_NAME:
        why, mend = f"A name has at most {LONGEST_NAME} characters.", "Shorten it."
    else:
        return kept
    raise InvalidValue(why, pointer="/name", value=name, mend=mend)


def check_roles(roles: Iterable[str], known: Collection[str]) -> list[str]:
    """The roles, each once and in order. Raises InvalidValue for none, or for an unknown one."""
    wanted = sorted({str(role) for role in roles})
    if not wanted:
        raise InvalidValue(
            "Somebody without a role can do nothing here.",
            pointer="/roles",
            mend=f"Choose one or more of {', '.join(known)}.",
        )
    for role in wanted:
        if role not in known:
            raise InvalidValue(
                f"There is no role “{role}”.",
                pointer="/roles",
                value=role,
                mend=f"Roles are {', '.join(known)}.",
            )
    return wanted


def check_password(password: str, pointer: str = "/password") -> None:
    """Refuse a password that is quickly guessed; the refusal does not repeat it.

    Length counts, and no mixture of signs is asked for.
    """
    if len(password) < SHORTEST_PASSWORD:
        why = f"A password has at least {SHORTEST_PASSWORD} characters."
    elif len(set(password)) < FEWEST_CHARACTERS:
        why = f"A password has at least {FEWEST_CHARACTERS} different characters."
    else:
        return
    mend = "Choose a longer one; several words are easy to remember."
    raise InvalidValue(why, pointer=pointer, mend=mend)


def is_over(started_at: datetime, seen_at: datetime, now: datetime) -> bool:
    """Whether a sign-in has ended by idleness or by age."""
    return now - seen_at > IDLE_LIMIT or now - started_at > ABSOLUTE_LIMIT


def seconds_to_wait(failures: Sequence[datetime], allowed: int, now: datetime) -> int:
    """Whole seconds until another attempt is let through; 0 where it is now.

    ``failures`` are the times of failed attempts, newest first. Another may be made once the
    oldest of the last ``allowed`` has left the window.
    """
    if len(failures) < allowed:
        return 0
    left = failures[allowed - 1] + ATTEMPT_WINDOW - now
    return max(0, math.ceil(left.total_seconds()))


def check_owner_remains(active_owners: Collection[object], leaving: object) -> None:
    """Refuse a change that would leave nobody who may add people."""
    if set(active_owners) == {leaving}:
        raise WrongState(
            "This is the last owner who can sign in.",
            pointer="/roles",
            mend="Give another person the role of owner first.",
        )
