"""Rules of people: names, passwords, how long a sign-in lasts, how many attempts there are."""

import unicodedata
from collections.abc import Iterable
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


def same_name(name: str) -> str:
    """The form in which names are compared: one Unicode form, no case, single blanks."""
    return unicodedata.normalize("NFC", " ".join(name.split())).casefold()


def check_password(password: str, pointer: str = "/password") -> None:
    if len(password) < SHORTEST_PASSWORD:
        raise InvalidValue(
            f"A password has at least {SHORTEST_PASSWORD} characters.",
            pointer=pointer,
            mend="Choose a longer one; several words are easy to remember.",
        )


def is_over(started_at: datetime, seen_at: datetime, now: datetime) -> bool:
    """Whether a sign-in has ended by idleness or by age."""
    return now - seen_at > IDLE_LIMIT or now - started_at > ABSOLUTE_LIMIT


def must_wait(failures_of_name: int, failures_of_address: int) -> bool:
    return failures_of_name >= ATTEMPTS_PER_NAME or failures_of_address >= ATTEMPTS_PER_ADDRESS


def check_owner_remains(active_owners: int, was_owner: bool, stays_owner: bool) -> None:
    """Refuse a change that would leave nobody who may add people."""
    if was_owner and not stays_owner and active_owners <= 1:
        raise WrongState(
            "This is the last owner who can sign in.",
            pointer="/roles",
            mend="Give another person the role of owner first.",
        )


def unknown_roles(roles: Iterable[str], known: Iterable[str]) -> list[str]:
    return sorted(set(roles) - set(known))
