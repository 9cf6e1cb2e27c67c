"""Templates into pages: what every page needs, and how values are written."""

from collections.abc import Callable, Mapping
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import sqlalchemy as sa
from fastapi import Request
from fastapi.responses import HTMLResponse, RedirectResponse
from jinja2 import Environment, FileSystemLoader, StrictUndefined
from sqlalchemy.orm import Session

from service.errors import ConfirmationNeeded, Problem
from service.pages import numbers
from service.pages.assets import asset
from service.pages.forms import KEY_FIELD, Form, new_key
from service.pages.shapes import shape_of
from service.shop.models import THE_WORKSHOP, Workshop
from service.storage.records import Actor
from service.storage.serials import shown

TEMPLATES = Path(__file__).parent / "templates"
PRIVATE = {"Cache-Control": "no-store"}


def _environment() -> Environment:
    environment = Environment(
        loader=FileSystemLoader(TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        auto_reload=False,
    )
    environment.globals.update(asset=asset, new_key=new_key, key_field=KEY_FIELD, shape_of=shape_of)
    environment.tests["ask_back"] = lambda problem: isinstance(problem, ConfirmationNeeded)
    environment.filters.update(
        label=shown,
        number=numbers.shown_number,
        significant=numbers.shown_significant,
        turns=numbers.shown_turns,
        quantity=numbers.shown_quantity,
        uncertain=numbers.shown_uncertain,
        percent=numbers.shown_percent,
        editable=editable,
        mend=mend,
    )
    return environment


def mend(problem: Problem) -> str:
    """What a person at a page can do about it; an ask-back is answered by ticking a box."""
    if isinstance(problem, ConfirmationNeeded):
        guess, question, _rest = (problem.mend or "").partition("? ")
        return f"{guess + question if question else ''}Correct it, or tick “Yes, I mean it”."
    return problem.mend or ""


def editable(value: object) -> str:
    """A stored number as it stands in a field: with all its digits and no exponent."""
    if value is None or value == "":
        return ""
    if isinstance(value, float):
        text = f"{value:.9f}".rstrip("0").rstrip(".")
        return text if float(text) == value else repr(value)
    return str(value)


_JINJA = _environment()


class Clock:
    """Times as the workshop's clock on the wall shows them."""

    def __init__(self, zone: str, now: datetime) -> None:
        self.zone = zone
        self._zone = ZoneInfo(zone)
        self._now = now.astimezone(self._zone)

    def local(self, moment: datetime) -> datetime:
        return moment.astimezone(self._zone)

    def time(self, moment: datetime) -> str:
        """Hour and minute, with the day where it is not today."""
        there = self.local(moment)
        if there.date() == self._now.date():
            return f"{there:%H:%M}"
        return f"{self.day(there.date())} {there:%H:%M}"

    def day(self, day: date) -> str:
        text = f"{day.day} {day:%b}"
        return text if day.year == self._now.year else f"{text} {day.year}"

    def since(self, moment: datetime) -> str:
        """How long ago, roughly."""
        minutes = int((self._now - self.local(moment)).total_seconds() // 60)
        if minutes < 1:
            return "less than a minute"
        if minutes < 60:
            return f"{minutes} min"
        if minutes < 24 * 60:
            return f"{minutes // 60} h {minutes % 60:02d} min"
        days = minutes // (24 * 60)
        return "1 day" if days == 1 else f"{days} days"

    @property
    def today(self) -> date:
        return self._now.date()

    @property
    def month(self) -> str:
        return f"{self._now:%Y-%m}"


def clock_of(session: Session | None) -> Clock:
    """The workshop's clock; UTC where no workshop can be read, as on an error page."""
    zone = None
    if session is not None:
        zone = session.scalar(sa.select(Workshop.time_zone).where(Workshop.id == THE_WORKSHOP))
    return Clock(zone or "UTC", datetime.now(UTC))


def page(
    request: Request,
    session: Session | None,
    template: str,
    *,
    status: int = 200,
    headers: Mapping[str, str] | None = None,
    **context: Any,
) -> HTMLResponse:
    """Draw a page. Every page but the static files may hold private data, so none is stored."""
    actor: Actor | None = getattr(request.state, "actor", None)
    if actor is not None and actor.kind != "person":
        actor = None
    context.setdefault("form", Form())
    text = _JINJA.get_template(template).render(
        actor=actor,
        roles=actor.roles if actor else frozenset(),
        clock=clock_of(session),
        path=request.url.path,
        **context,
    )
    return HTMLResponse(text, status, headers={**PRIVATE, **(headers or {})})


def see_other(path: str) -> RedirectResponse:
    """After a form was carried out: go and see (RFC 9110, section 15.4.4)."""
    return RedirectResponse(path, 303, headers=PRIVATE)


def carry_out(session: Session, form: Form, act: Callable[[], object]) -> bool:
    """Carry out an act; where it is refused, note why on the form and undo what was begun.

    The page is then drawn again from the database as it is, with what was typed.
    """
    try:
        form.check()
        act()
    except Problem as problem:
        session.rollback()
        form.take(problem)
        return False
    return True
