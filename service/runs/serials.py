"""Serials for new runs and orders that no table row bears yet."""

from typing import Any

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.storage.serials import draw_serial


def free_serials(session: Session, column: Any, kind: str, count: int) -> list[str]:
    """``count`` different serials of a kind of label that do not stand in ``column``.

    With a million labels in use one draw in twenty-five is taken; the unique index refuses what
    two transactions draw in the same moment.
    """
    found: set[str] = set()
    while len(found) < count:
        drawn = {draw_serial(kind) for _ in range(count - len(found))} - found
        taken = set(session.scalars(sa.select(column).where(column.in_(drawn))))
        found |= drawn - taken
    return sorted(found)
