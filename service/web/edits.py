"""Conditional edits (RFC 9110, section 13): ETag out, If-Match in."""

from typing import Annotated

from fastapi import Header, Response

from service.errors import PreconditionMissing, StaleEdit

IfMatch = Annotated[str | None, Header(description='The ETag that you have seen, as in "3".')]


def etag(version: int) -> str:
    return f'"{version}"'


def tag(response: Response, version: int) -> None:
    response.headers["ETag"] = etag(version)


def check_seen(if_match: str | None, version: int) -> None:
    """Refuse an edit of a version that the caller has not seen. Weak tags never match."""
    if if_match is None:
        raise PreconditionMissing(
            "This edit says not which version it is based on.",
            pointer="If-Match",
            mend="Read it first and send its ETag as If-Match.",
        )
    seen = [part.strip() for part in if_match.split(",")]
    if etag(version) not in seen and seen != ["*"]:
        raise StaleEdit(
            "It was changed since you read it.",
            pointer="If-Match",
            value=if_match,
            mend="Read it again, look at what changed, and repeat your edit if it still holds.",
            extra={"current": etag(version)},
        )
