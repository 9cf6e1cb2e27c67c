"""Cursor pages: newest first by time-ordered id, with Link headers (RFC 8288)."""

import uuid
from collections.abc import Sequence
from typing import Annotated, Any, TypeVar

import sqlalchemy as sa
from fastapi import Query, Request, Response
from sqlalchemy.orm import Session

PAGE_LIMIT = 200

Row = TypeVar("Row")

Limit = Annotated[int, Query(ge=1, le=PAGE_LIMIT, description="Rows on one page.")]
After = Annotated[uuid.UUID | None, Query(description="The last id of the page before.")]


def page(
    session: Session,
    statement: "sa.Select[Row]",
    id_column: Any,
    limit: int,
    after: uuid.UUID | None,
) -> tuple[Sequence[Row], bool]:
    """One page of rows, newest first, and whether there are more."""
    if after is not None:
        statement = statement.where(id_column < after)
    rows = session.scalars(statement.order_by(id_column.desc()).limit(limit + 1)).all()
    return rows[:limit], len(rows) > limit


def link_next(request: Request, response: Response, last_id: uuid.UUID | None, more: bool) -> None:
    if more and last_id is not None:
        url = request.url.include_query_params(after=str(last_id))
        response.headers["Link"] = f'<{url.path}?{url.query}>; rel="next"'
