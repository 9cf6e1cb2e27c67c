"""What a form brings: its fields, its key against double taps, and what is wrong with it."""

import math
import uuid
from collections.abc import Mapping, Sequence
from datetime import date
from typing import Annotated

from fastapi import Depends, Request
from pydantic import ValidationError
from sqlalchemy.orm import Session
from starlette.datastructures import FormData

from service.errors import InvalidValue, Problem
from service.pages.numbers import PLAIN, Unit, read_number
from service.web.unit import LONGEST_KEY
from service.web.unit import Unit as UnitOfWork

KEY_FIELD = "idempotency_key"
LONGEST_TEXT = 1000
_MOST_FIELDS = 200


class Form:
    """The fields of one form as typed, and the problem with each field that has one.

    The reading methods collect what is wrong instead of stopping at the first; ``check`` raises
    it. What they return after a problem is a placeholder that ``check`` keeps from being used.
    """

    def __init__(self, fields: Mapping[str, Sequence[str]] | None = None, prefix: str = "") -> None:
        self._fields = {name: list(values) for name, values in (fields or {}).items()}
        # Goes before the ids of the fields, where a page has several forms.
        self.prefix = prefix
        self.problems: dict[str, Problem] = {}
        self.refusal: Problem | None = None

    def fresh(self, number: object) -> "Form":
        """An empty form beside this one on the same page."""
        return Form(prefix=f"{number}-")

    @property
    def is_entered(self) -> bool:
        return bool(self._fields)

    @property
    def status(self) -> int:
        """The status of a page that shows this form again."""
        return self.refusal.status if self.refusal else 200

    def value(self, name: str, default: object = "") -> str:
        """What was typed, or the default where the form is fresh."""
        if name in self._fields:
            return self._fields[name][-1]
        return "" if default is None or self.is_entered else str(default)

    def is_chosen(self, name: str, option: object, default: object = None) -> bool:
        if self.is_entered:
            return str(option) in self._fields.get(name, [])
        if isinstance(default, (list, tuple, set, frozenset)):
            return option in default
        return default is not None and str(option) == str(default)

    def text(self, name: str, longest: int = 120) -> str:
        """A text that must be there."""
        text = self.optional_text(name, longest)
        if text is None:
            self._problem(name, InvalidValue("This field is empty.", mend="Fill it in."))
            return ""
        return text

    def optional_text(self, name: str, longest: int = LONGEST_TEXT) -> str | None:
        text = self.value(name).strip()
        if len(text) > longest:
            self._problem(
                name,
                InvalidValue(
                    f"This text has {len(text)} characters; {longest} are kept.",
                    mend="Shorten it.",
                ),
            )
        if "\x00" in text:
            self._problem(
                name, InvalidValue("This text holds a NUL character.", mend="Take it out.")
            )
        return text or None

    def number(self, name: str, unit: Unit = PLAIN) -> float:
        """A number that must be there, in the field's unit."""
        number = self.optional_number(name, unit)
        if number is None:
            if name not in self.problems:
                self._problem(name, InvalidValue("A number is missing.", mend="Fill it in."))
            return math.nan
        return number

    def optional_number(self, name: str, unit: Unit = PLAIN) -> float | None:
        text = self.value(name).strip()
        if not text:
            return None
        try:
            return read_number(text, unit, f"/{name}")
        except InvalidValue as problem:
            self._problem(name, problem)
            return None

    def whole(self, name: str, unit: Unit = PLAIN) -> int:
        """A whole number that must be there."""
        number = self.number(name, unit)
        return 0 if math.isnan(number) else self._whole(name, number)

    def optional_whole(self, name: str, unit: Unit = PLAIN) -> int | None:
        number = self.optional_number(name, unit)
        return None if number is None else self._whole(name, number)

    def _whole(self, name: str, number: float) -> int:
        if number != int(number):
            self._problem(
                name, InvalidValue("This is not a whole number.", mend="Leave out the fraction.")
            )
        return int(number)

    def choice(self, name: str, options: Sequence[str]) -> str:
        """One of the options."""
        value = self.value(name)
        if value not in options:
            self._problem(name, InvalidValue("Nothing is chosen here.", mend="Choose one."))
            return options[0]
        return value

    def optional_choice(self, name: str, options: Sequence[str]) -> str | None:
        return self.choice(name, options) if self.value(name) else None

    def many(self, name: str) -> list[str]:
        return list(self._fields.get(name, []))

    def flag(self, name: str) -> bool:
        return bool(self._fields.get(name))

    def identifier(self, name: str) -> uuid.UUID:
        """The id of something chosen from a list."""
        found = self.optional_identifier(name)
        if found is None:
            if name not in self.problems:
                self._problem(name, InvalidValue("Nothing is chosen here.", mend="Choose one."))
            return uuid.UUID(int=0)
        return found

    def optional_identifier(self, name: str) -> uuid.UUID | None:
        text = self.value(name)
        if not text:
            return None
        try:
            return uuid.UUID(text)
        except ValueError:
            self._problem(name, InvalidValue("This is not in the list.", mend="Choose one."))
            return None

    def day(self, name: str) -> date:
        """A day that must be there."""
        found = self.optional_day(name)
        if found is None:
            if name not in self.problems:
                self._problem(name, InvalidValue("A day is missing.", mend="Fill it in."))
            return date.min
        return found

    def optional_day(self, name: str) -> date | None:
        text = self.value(name).strip()
        if not text:
            return None
        try:
            return date.fromisoformat(text)
        except ValueError:
            self._problem(
                name,
                InvalidValue(
                    f"“{text}” is not a day.", value=text, mend="Write it as in 2026-11-03."
                ),
            )
            return None

    def check(self) -> None:
        """Raise the first problem, if there is one."""
        if self.problems:
            raise next(iter(self.problems.values()))

    def take(self, problem: Problem) -> None:
        """Note what an act refused, beside its field where the form has that field."""
        self.refusal = problem
        path = (problem.pointer or "").strip("/").replace("/", ".")
        if (name := self._field_of(path)) in self._fields:
            self.problems.setdefault(name, problem)

    def take_validation(self, error: ValidationError) -> None:
        """Note what a schema refused, each beside its field."""
        for item in error.errors(include_url=False):
            path = ".".join(str(part) for part in item["loc"])
            message = str(item["msg"]).removeprefix("Value error, ")
            self._problem(self._field_of(path) or "form", InvalidValue(f"{message}."))

    def _field_of(self, path: str) -> str:
        """The field for a path in a body: of the same name, or of the name of its last part."""
        return path if path in self._fields else path.rsplit(".", 1)[-1]

    def _problem(self, name: str, problem: Problem) -> None:
        problem.pointer = problem.pointer or f"/{name}"
        self.problems.setdefault(name, problem)


async def _form(request: Request) -> Form:
    """Read the form; hand its key to the unit of work before that opens its transaction."""
    data: FormData = await request.form(max_files=0, max_fields=_MOST_FIELDS)
    fields: dict[str, list[str]] = {}
    for name, value in data.multi_items():
        if isinstance(value, str):
            fields.setdefault(name, []).append(value)
    key = (fields.pop(KEY_FIELD, None) or [""])[-1]
    unit: UnitOfWork = request.state.unit
    if unit.key is None and 0 < len(key) <= LONGEST_KEY:
        unit.key = key
    fields.setdefault("", [])  # a form without any field is still one that was sent
    return Form(fields)


Entered = Annotated[Form, Depends(_form)]


async def _form_work(request: Request, _form: Entered) -> Session:
    unit: UnitOfWork = request.state.unit
    return await unit.open()


# As service.web.unit.Work, with the form's key against double taps in force.
FormWork = Annotated[Session, Depends(_form_work)]


def new_key() -> str:
    return uuid.uuid4().hex
