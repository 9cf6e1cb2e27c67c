"""The sign-in cookie."""

from fastapi import Response

from service.people.rules import ABSOLUTE_LIMIT
from service.settings import Settings


def cookie_name(settings: Settings) -> str:
    """Under TLS the ``__Host-`` prefix binds the cookie to this host and to Secure."""
    return "__Host-coilwright" if settings.https else "coilwright"


def set_cookie(response: Response, settings: Settings, token: str) -> None:
    response.set_cookie(
        cookie_name(settings),
        token,
        max_age=int(ABSOLUTE_LIMIT.total_seconds()),
        path="/",
        secure=settings.https,
        httponly=True,
        samesite="lax",
    )


def clear_cookie(response: Response, settings: Settings) -> None:
    response.delete_cookie(
        cookie_name(settings), path="/", secure=settings.https, httponly=True, samesite="lax"
    )
